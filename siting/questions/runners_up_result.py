"""What runners-up returns: the next-best answers, in order, and how sure it is that none is missing."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from siting.plan.contract import summary_to_json
from siting.plan.plan import Answer, Plan, SiteVerdict, SupplierVerdict
from siting.plan.proof import PROVED_GAP, Outcome, gap_of

Part = tuple[str, str]
"""A site with its size, "" where it has none; or a supplier with ""."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RunnerUp:
    """One of the answers; the best is the first."""

    plan: Plan
    """The cheapest plan that uses just these sites, sizes and suppliers; audited."""
    used_sites: tuple[Part, ...]
    """Site and size through which something moves, in the order of the table."""
    used_suppliers: tuple[str, ...]
    """In the order of the table."""
    extra: float
    """Money a year on top of the best; 0 for the best itself."""
    differs: str
    """What differs from the best in one line, such as `Wroclaw instead of Katowice; drops Jihlava`."""

    @property
    def cost(self) -> float:
        """Money a year."""
        return self.plan.cost

    @property
    def bound(self) -> float | None:
        """Money a year that no answer but those listed before can undercut."""
        return self.plan.proof.bound

    @property
    def gap(self) -> float | None:
        """(cost - bound) / |cost|, at least 0."""
        return gap_of(self.cost, self.bound)

    @property
    def used(self) -> frozenset[tuple[str, str, str]]:
        """What tells answers apart: ("site", name, size) and ("supplier", name, "")."""
        sites = {("site", name, size) for name, size in self.used_sites}
        return frozenset(sites | {("supplier", name, "") for name in self.used_suppliers})


@dataclass(frozen=True, slots=True, kw_only=True)
class RunnersUp:
    """The best answer and those next to it."""

    title: str
    currency: str
    fingerprint: str
    """Of the study."""
    outcome: Outcome
    """Of the best plan."""
    within: float
    """How far above the best was asked for, as a fraction of its cost."""
    most: int
    """How many next to the best were asked for."""
    gap_asked: float
    answers: tuple[RunnerUp, ...]
    """The best first; empty where there is no plan."""
    complete_to: float | None
    """Money a year up to which no answer is missing; None where that is not known."""
    why_none: tuple[str, ...] = ()
    """Where there is no plan: why."""
    seconds: float = 0.0

    @property
    def best(self) -> RunnerUp | None:
        """The best answer; None where there is no plan."""
        return self.answers[0] if self.answers else None

    @property
    def limit(self) -> float | None:
        """Money a year up to which answers were asked for."""
        return None if self.best is None else limit_of(self.best.cost, self.within)

    @property
    def complete(self) -> bool:
        """True where it is proved that every answer within the limit is listed."""
        limit, known = self.limit, self.complete_to
        return limit is not None and known is not None and known >= limit - PROVED_GAP * abs(limit)

    @property
    def tied(self) -> tuple[RunnerUp, ...]:
        """The answers that cost the same as the best, as far as a proof can tell; without the best itself."""
        best = self.best
        if best is None:
            return ()
        return tuple(each for each in self.answers[1:] if each.extra <= PROVED_GAP * abs(best.cost))


def limit_of(cost: float, within: float) -> float:
    """Return the money a year up to which answers within a fraction of the best cost are asked for."""
    return cost + within * abs(cost)


def runners_up_to_json(found: RunnersUp) -> dict[str, Any]:
    """
    Return the object of `siting runners-up --json`.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    object
        Plain JSON values: money unrounded, one entry an answer, the best first; null where something does not exist.
    """
    return {
        "outcome": str(found.outcome),
        "within": found.within,
        "most": found.most,
        "limit": found.limit,
        "complete": found.complete,
        "complete_to": found.complete_to,
        "gap_asked": found.gap_asked,
        "seconds": found.seconds,
        "fingerprint": found.fingerprint,
        "why_none": list(found.why_none),
        "answers": [_answer(place, each) for place, each in enumerate(found.answers)],
    }


def _answer(place: int, each: RunnerUp) -> dict[str, Any]:
    whole = summary_to_json(Answer(proof=each.plan.proof, plan=each.plan, today=each.plan.today), None)
    return {
        "place": place,
        "cost": each.cost,
        "bound": each.bound,
        "gap": each.gap,
        "extra": each.extra,
        "differs": each.differs,
        "used_sites": [{"site": name, "size": size} for name, size in each.used_sites],
        "used_suppliers": list(each.used_suppliers),
        "sites": whole["sites"],
        "suppliers": whole["suppliers"],
        "cost_lines": whole["cost_lines"],
    }


def differs_line(best: RunnerUp | None, plan: Plan, sites: tuple[Part, ...], suppliers: tuple[str, ...]) -> str:
    """
    Return what an answer does otherwise than the best, in one line.

    Parameters
    ----------
    best
        The best; None for the best itself.
    plan
        The plan of the answer, for its verdicts.
    sites, suppliers
        What it uses.

    Returns
    -------
    line
        Empty for the best itself.
    """
    if best is None:
        return ""
    before, after = dict(best.used_sites), dict(sites)
    resized = [
        f"{name} {after[name]} instead of {before[name]}"
        for name in after
        if before.get(name, after[name]) != after[name]
    ]
    parts = [*resized, _sites(best, plan, sites), _suppliers(best, plan, suppliers)]
    said = "; ".join(part for part in parts if part)
    return said or "the same sites and suppliers"


def _sites(best: RunnerUp, plan: Plan, sites: tuple[Part, ...]) -> str:
    before, after = dict(best.used_sites), dict(sites)
    opens = {line.site for line in plan.sites if line.verdict is SiteVerdict.OPEN}
    words = ("opens {} too", "keeps {} too", "does without {}")
    return _swapped([name for name in after if name not in before], [n for n in before if n not in after], opens, words)


def _suppliers(best: RunnerUp, plan: Plan, suppliers: tuple[str, ...]) -> str:
    new = [name for name in suppliers if name not in best.used_suppliers]
    signs = {line.supplier for line in plan.suppliers if line.verdict is SupplierVerdict.SIGN}
    words = ("signs {}", "stays with {}", "drops {}")
    return _swapped(new, [name for name in best.used_suppliers if name not in suppliers], signs, words)


def _swapped(new: list[str], gone: list[str], begins: set[str], words: tuple[str, str, str]) -> str:
    """Return what is used instead, or in words for what begins, what goes on and what is gone."""
    if new and gone:
        return f"{_listed(new)} instead of {_listed(gone)}"
    groups = ([name for name in new if name in begins], [name for name in new if name not in begins], gone)
    return "; ".join(word.format(_listed(names)) for word, names in zip(words, groups, strict=True) if names)


def _listed(names: list[str]) -> str:
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"
