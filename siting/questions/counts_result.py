"""What counts returns: the best cost for each number of open sites."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from siting.plan.plan import CostLine, Plan
from siting.plan.proof import PROVED_GAP, Outcome, gap_of
from siting.questions.restriction import OPEN

FIXED = (
    CostLine.OPENING,
    CostLine.SITES,
    CostLine.CLOSING,
    CostLine.SIGNING,
    CostLine.SUPPLIERS,
    CostLine.DROPPING,
)
"""What is paid before anything moves."""
FREIGHT = (CostLine.INBOUND, CostLine.OUTBOUND, CostLine.DIRECT, CostLine.DELIVERY)


@dataclass(frozen=True, slots=True, kw_only=True)
class CountLine:
    """The best plan with one number of open sites. Money a year."""

    count: int
    outcome: Outcome
    """`impossible` where no plan opens just this many."""
    plan: Plan | None
    """Audited; None where impossible or not found yet."""
    bound: float | None
    """No plan with this many sites can cost less."""
    allowed: bool
    """False where the study's own fewest_sites or most_sites rules the number out."""

    @property
    def cost(self) -> float | None:
        """Money a year."""
        return self.plan.cost if self.plan else None

    @property
    def gap(self) -> float | None:
        """(cost - bound) / |cost|, at least 0; the height of the band."""
        return gap_of(self.cost, self.bound)

    @property
    def fixed(self) -> float | None:
        """Charges of sites and suppliers, one-off ones annualised."""
        return self._sum(FIXED)

    @property
    def freight(self) -> float | None:
        """Inbound, outbound and direct freight, and deliveries."""
        return self._sum(FREIGHT)

    @property
    def rest(self) -> float | None:
        """Goods, handling and carbon."""
        return self._sum(tuple(line for line in CostLine if line not in {*FIXED, *FREIGHT}))

    @property
    def average_km(self) -> float | None:
        """Road km to customers, on average by load; None where unknown."""
        return self.plan.service.average_km if self.plan else None

    @property
    def share_within(self) -> float | None:
        """Share of weight within the service distance; None where none is set."""
        return self.plan.service.share_within if self.plan else None

    @property
    def open_sites(self) -> tuple[str, ...]:
        """The sites open, in the order of the table."""
        return tuple(line.site for line in self.plan.sites if line.verdict in OPEN) if self.plan else ()

    def _sum(self, lines: tuple[CostLine, ...]) -> float | None:
        return sum(self.plan.cost_lines[line] for line in lines) if self.plan else None


@dataclass(frozen=True, slots=True, kw_only=True)
class Pruned:
    """Numbers of sites that were not searched, since none of them can win."""

    least: int
    most: int
    bound: float
    """Money a year that no plan with any of these numbers can undercut."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Counts:
    """The best cost for each number of sites."""

    title: str
    currency: str
    fingerprint: str
    """Of the study."""
    outcome: Outcome
    """Of the best plan whatever its number of sites."""
    gap_asked: float
    lines: tuple[CountLine, ...]
    """By rising number."""
    pruned: tuple[Pruned, ...]
    not_asked: tuple[int, ...]
    """Numbers left out by a stop."""
    service_km: float | None
    why_none: tuple[str, ...] = ()
    """Where there is no plan with any number: why."""
    seconds: float = 0.0

    @property
    def best(self) -> CountLine | None:
        """The cheapest number, the fewest sites of those that tie; None where there is none."""
        found = [line for line in self.lines if line.cost is not None]
        least = min((line.cost or 0.0 for line in found), default=0.0)
        room = PROVED_GAP * abs(least)
        return next((line for line in found if (line.cost or 0.0) <= least + room), None)

    @property
    def best_allowed(self) -> CountLine | None:
        """The cheapest number that the study's own limits allow."""
        found = [line for line in self.lines if line.cost is not None and line.allowed]
        return min(found, key=lambda line: line.cost or 0.0, default=None)

    @property
    def fewest(self) -> int | None:
        """The fewest sites with which a plan was found; None where there is none."""
        return next((line.count for line in self.lines if line.plan is not None), None)


def counts_to_json(found: Counts) -> dict[str, Any]:
    """
    Return the object of `siting counts --json`.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    object
        Plain JSON values: money unrounded, one entry a number of sites; null where something does not exist.
    """
    return {
        "outcome": str(found.outcome),
        "best": None if found.best is None else found.best.count,
        "fewest": found.fewest,
        "gap_asked": found.gap_asked,
        "seconds": found.seconds,
        "fingerprint": found.fingerprint,
        "why_none": list(found.why_none),
        "not_asked": list(found.not_asked),
        "pruned": [{"from": each.least, "to": each.most, "bound": each.bound} for each in found.pruned],
        "counts": [
            {
                "count": line.count,
                "outcome": str(line.outcome),
                "allowed": line.allowed,
                "cost": line.cost,
                "bound": line.bound,
                "gap": line.gap,
                "fixed": line.fixed,
                "freight": line.freight,
                "rest": line.rest,
                "average_km": line.average_km,
                "share_within": line.share_within,
                "open_sites": list(line.open_sites),
            }
            for line in found.lines
        ],
    }
