"""The best plan under a restriction, as it is kept: in the study's own names, without loss in JSON."""

from __future__ import annotations

from dataclasses import dataclass

from siting.plan.plan import Answer, Plan, Reason, Unserved
from siting.plan.proof import Outcome, Proof


@dataclass(frozen=True, slots=True, kw_only=True)
class Resolved:
    """The best plan under a restriction, or why there is none."""

    proof: Proof
    plan: Plan | None
    """Audited against the restricted study; None when impossible or stopped before any plan."""
    time_limit_s: float
    """Seconds it was allowed."""
    reasons: tuple[Reason, ...] = ()
    """When impossible and asked why: each alone repairs it; or, `together`, only all of them do."""
    together: bool = False
    unserved: tuple[Unserved, ...] = ()
    """When impossible with every verdict held: the least load that cannot be served."""

    @property
    def impossible(self) -> bool:
        """True where it is proved that there is no plan."""
        return self.proof.outcome is Outcome.IMPOSSIBLE

    @property
    def within(self) -> bool:
        """True where it is settled: impossible, or a plan within the gap asked."""
        return self.proof.outcome in {Outcome.PROVED, Outcome.WITHIN_GAP, Outcome.IMPOSSIBLE}

    @property
    def cost(self) -> float | None:
        """Money a year; None without a plan."""
        return self.proof.cost

    @property
    def bound(self) -> float | None:
        """Money a year that no plan under the restriction can undercut; None where none was found."""
        return self.proof.bound

    def as_answer(self) -> Answer:
        """Return it as `solve` returns a study's answer."""
        today = self.plan.today if self.plan else None
        return Answer(proof=self.proof, plan=self.plan, today=today, reasons=self.reasons, together=self.together)
