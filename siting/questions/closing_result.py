"""What a closing test returns."""

from __future__ import annotations

from dataclasses import dataclass, field, fields
from typing import TYPE_CHECKING, Any

from siting.plan.codec import encode
from siting.plan.plan import CostLine, Plan, Reason, Unserved  # noqa: TC001 - the codec reads the hints at run time
from siting.plan.proof import PROVED_GAP, Outcome, gap_of
from siting.questions.differences import Filling, Shift, VerdictChange  # noqa: TC001 - as above

if TYPE_CHECKING:
    from collections.abc import Mapping


@dataclass(frozen=True, slots=True, kw_only=True)
class Without:
    """What happens without a site or supplier. Differences are to the plan, positive where it is more without."""

    outcome: Outcome
    """`impossible` where there is no plan without it; `no-plan-yet` where none was found in time."""
    cost: float | None = None
    """Money a year."""
    bound: float | None = None
    """Money a year that no plan without it can undercut."""
    extra_cost: float | None = None
    """Money a year: `cost` less the cost of the plan."""
    extra_least: float | None = None
    """Money a year that the extra cost is at least, whatever was left unproved here."""
    extra_most: float | None = None
    """Money a year that the extra cost is at most, whatever was left unproved in the plan."""
    extra_one_off: float | None = None
    """One-off money on top of the plan's: such as the closing charge, less an opening charge saved."""
    cost_lines: Mapping[CostLine, float] = field(default_factory=dict)
    """By how much each cost line differs; they add up to the extra cost."""
    changes: tuple[VerdictChange, ...] = ()
    """Verdicts that differ, its own among them."""
    shifts: tuple[Shift, ...] = ()
    """Customers that are served from elsewhere, and by how much."""
    fillings: tuple[Filling, ...] = ()
    """Sites and suppliers through which more or less moves, and whether that fills them."""
    average_km: float | None = None
    """Road km of customers from what serves them, by load; None where a used lane has no distance."""
    extra_km: float | None = None
    share_within: float | None = None
    """Share of weight within service_km; None where it is not set."""
    extra_share: float | None = None
    unserved: tuple[Unserved, ...] = ()
    """The least that cannot be served, when re-routing is impossible for want of capacity or lanes."""
    unserved_load: float = 0.0
    why: tuple[str, ...] = ()
    """When impossible: sentences."""
    reasons: tuple[Reason, ...] = ()
    """When impossible for other reasons: each alone repairs it; or, `together`, only all of them do."""
    together: bool = False
    seconds: float = 0.0
    plan: Plan | None = None
    """Audited against the study without it."""

    @property
    def possible(self) -> bool | None:
        """Whether there is a plan without it; None where that is not known yet."""
        if self.outcome is Outcome.IMPOSSIBLE:
            return False
        return None if self.cost is None else True

    @property
    def gap(self) -> float | None:
        """(cost - bound) / |cost|; None without cost or bound."""
        return gap_of(self.cost, self.bound)

    @property
    def tied(self) -> bool:
        """True where doing without it costs the same, as far as a proof can tell."""
        return self.extra_cost is not None and abs(self.extra_cost) <= PROVED_GAP * abs(self.cost or 0.0)

    @property
    def saves(self) -> bool:
        """True where doing without it is cheaper: then the plan is not the best."""
        return self.extra_cost is not None and self.extra_cost < 0 and not self.tied

    @property
    def filled(self) -> tuple[str, ...]:
        """Sites and suppliers that it fills to capacity."""
        return tuple(filling.name for filling in self.fillings if filling.full and filling.after > filling.before)


@dataclass(frozen=True, slots=True, kw_only=True)
class ClosingLine:
    """One site closed, or one supplier dropped."""

    kind: str
    """`site` or `supplier`."""
    name: str
    verdict: str
    """What the plan does with it: `keep` or `open`, `stay` or `sign`."""
    reroute: Without | None
    """The others keep their verdict and size; None where stopped before it was asked."""
    replan: Without | None
    """Everything else is decided afresh; None where stopped before it was asked."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ClosingTest:
    """Every site and supplier of a plan, closed or dropped one at a time."""

    title: str
    currency: str
    unit: str
    fingerprint: str
    """Of the study."""
    outcome: Outcome
    """Of the plan that is tested."""
    cost: float | None
    """Money a year of the plan; None where there is none, and then there are no lines."""
    bound: float | None
    gap_asked: float
    lines: tuple[ClosingLine, ...]
    """The cheapest to do without, by re-planning, first; then those without a plan yet, then the impossible."""
    why_none: tuple[str, ...] = ()
    """Where there is no plan to test: why."""
    seconds: float = 0.0

    @property
    def complete(self) -> bool:
        """True where nothing was left out by a stop."""
        return all(line.reroute is not None and line.replan is not None for line in self.lines)


def closing_to_json(test: ClosingTest) -> dict[str, Any]:
    """
    Return the object of `siting closing --json`.

    Parameters
    ----------
    test
        What was found.

    Returns
    -------
    object
        Plain JSON values: money unrounded, one entry a site and a supplier with `reroute` and `replan` (null where not
        asked before a stop); null where something does not exist.
    """
    return {
        "outcome": str(test.outcome),
        "cost": test.cost,
        "bound": test.bound,
        "gap_asked": test.gap_asked,
        "complete": test.complete,
        "seconds": test.seconds,
        "fingerprint": test.fingerprint,
        "why_none": list(test.why_none),
        "sites": [_line(line) for line in test.lines if line.kind == "site"],
        "suppliers": [_line(line) for line in test.lines if line.kind == "supplier"],
    }


def _line(line: ClosingLine) -> dict[str, Any]:
    return {
        line.kind: line.name,
        "verdict": line.verdict,
        "reroute": None if line.reroute is None else _without(line.reroute),
        "replan": None if line.replan is None else _without(line.replan),
    }


def _without(found: Without) -> dict[str, Any]:
    own = {each.name: encode(getattr(found, each.name)) for each in fields(found) if each.name != "plan"}
    gap = found.gap
    return {
        "possible": found.possible,
        **own,
        "gap": None if gap == float("inf") else gap,
        "tied": found.tied,
        "saves": found.saves,
        "filled": list(found.filled),
    }
