"""What a comparison holds: plans side by side, what differs first, and the places of a map of the differences."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from siting.plan.proof import Outcome
    from siting.study.tables import Leg

Place = tuple[float, float]
"""Latitude and longitude, degrees."""


@dataclass(frozen=True, slots=True, kw_only=True)
class CostRow:
    """A cost line in every plan."""

    name: str
    amounts: tuple[float, ...]
    """Money a year."""


@dataclass(frozen=True, slots=True, kw_only=True)
class VerdictRow:
    """A site or supplier in every plan."""

    kind: str
    """`site` or `supplier`."""
    name: str
    verdicts: tuple[str, ...]
    """Empty where the plan's study does not have it."""
    sizes: tuple[str, ...]
    """Size open; empty where there is none."""
    loads: tuple[float, ...]
    """Load a year through it."""
    place: Place | None
    """None where no study says where it is."""

    @property
    def differs(self) -> bool:
        """Whether verdict or size differ between any two plans."""
        return len(set(zip(self.verdicts, self.sizes, strict=True))) > 1


@dataclass(frozen=True, slots=True, kw_only=True)
class CustomerMove:
    """A customer that is not served from the same places in every plan."""

    customer: str
    origins: tuple[tuple[str, ...], ...]
    """Of each plan: the sites and suppliers that serve it, by name; empty where it is not served or not there."""
    loads: tuple[float, ...]
    """Load a year delivered to it."""
    place: Place | None


@dataclass(frozen=True, slots=True, kw_only=True)
class LaneChange:
    """A lane over which not the same moves in every plan."""

    leg: Leg
    origin: str
    destination: str
    loads: tuple[float, ...]
    """Load a year."""
    from_place: Place | None
    to_place: Place | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Figures:
    """What one plan amounts to."""

    name: str
    cost: float
    """Money a year."""
    bound: float | None
    outcome: Outcome
    gap: float | None
    saving: float | None
    """Money a year less than today; None where there is no today or it cannot serve everything."""
    one_off: float
    """Money once."""
    open_sites: int
    signed_suppliers: int
    average_km: float | None
    share_within: float | None
    """Share of weight within its study's service distance; None where none is set."""
    tonnes_co2e: float | None
    fingerprint: str
    """Of its study."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """Plans side by side; every tuple in a row is in the order of `plans`."""

    plans: tuple[Figures, ...]
    currency: str
    unit: str
    cost_lines: tuple[CostRow, ...]
    """Lines that are 0 in every plan are left out."""
    verdicts: tuple[VerdictRow, ...]
    """Those that differ first, then the others; sites before suppliers."""
    customers: tuple[CustomerMove, ...]
    """Only those that change; the largest first."""
    lanes: tuple[LaneChange, ...]
    """Only those that differ, the largest difference first: with places, what a map of the differences shows."""

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the plans."""
        return tuple(plan.name for plan in self.plans)

    @property
    def differing(self) -> tuple[VerdictRow, ...]:
        """The sites and suppliers whose verdict or size differs."""
        return tuple(row for row in self.verdicts if row.differs)

    @property
    def one_study(self) -> bool:
        """Whether all plans answer the same study."""
        return len({plan.fingerprint for plan in self.plans}) == 1


def comparison_to_json(found: Comparison) -> dict[str, Any]:
    """
    Return the object of `siting compare --json`.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    object
        Plain JSON values; every list of a row is in the order of `plans`. Null where something does not exist.
    """
    return {
        "currency": found.currency,
        "unit": found.unit,
        "one_study": found.one_study,
        "plans": [
            {name: getattr(plan, name) for name in Figures.__dataclass_fields__ if name != "outcome"}
            | {"outcome": str(plan.outcome)}
            for plan in found.plans
        ],
        "cost_lines": {row.name: list(row.amounts) for row in found.cost_lines},
        "verdicts": [
            {
                row.kind: row.name,
                "differs": row.differs,
                "verdicts": list(row.verdicts),
                "sizes": list(row.sizes),
                "loads": list(row.loads),
                "place": _place(row.place),
            }
            for row in found.verdicts
        ],
        "customers": [
            {
                "customer": row.customer,
                "origins": [list(names) for names in row.origins],
                "loads": list(row.loads),
                "place": _place(row.place),
            }
            for row in found.customers
        ],
        "lanes": [
            {
                "leg": str(row.leg),
                "origin": row.origin,
                "destination": row.destination,
                "loads": list(row.loads),
                "from": _place(row.from_place),
                "to": _place(row.to_place),
            }
            for row in found.lanes
        ],
    }


def _place(place: Place | None) -> dict[str, float] | None:
    return None if place is None else {"latitude": place[0], "longitude": place[1]}
