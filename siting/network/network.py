"""
A study turned into numbers: arrays of charges, capacities and lane costs per unit.

Positions follow the order of the study's tables. An *option* is one way a site may be open: one of its sizes, or the
site itself where it has none (`Study.options`). Money is yearly unless the name says one-off; amounts are units of the
good a year; load = amount x the good's load.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from siting.arrays import Flags, Floats, Positions
    from siting.study.tables import RuleKind, Study


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LegLanes:
    """
    The lanes of one leg, sorted by origin, destination and good; every array of shape (lanes,).

    A lane is one origin, destination and good. Only lanes that exist are here: reach, bars, offers, demand above 0 and
    single sourcing (origin too small to hold the customer whole) have removed the others.
    """

    origin: Positions
    """Position of a supplier (inbound, direct) or a site (outbound)."""
    destination: Positions
    """Position of a site (inbound) or a customer (outbound, direct)."""
    good: Positions
    km: Floats
    """Road km; NaN where nothing gives a distance (then unit_cost came from `lanes`)."""
    km_given: Flags
    """True where `lanes.road_km` gives the distance, False where it is estimated (or NaN)."""
    freight: Floats
    """Money per unit of the good, without the delivery charge."""
    delivery: Floats
    """Money per unit of the good for deliveries at drop_size; 0 inbound and where unit_cost is given."""
    kg_co2e: Floats
    """kg CO2e per unit of the good; 0 where no factor is set."""
    cost: Floats
    """All that moving one unit here costs: freight + delivery + carbon, + handling (outbound) or price (others)."""

    def __len__(self) -> int:
        """Return the number of lanes."""
        return int(self.origin.shape[0])


@dataclass(frozen=True, slots=True, kw_only=True)
class NetworkRule:
    """One rule with its members as positions."""

    kind: RuleKind
    members: tuple[tuple[str, int], ...]
    """("site" or "supplier", position) in the order typed."""
    number: int | None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Network:
    """
    Numbers of a study; see the module for the words.

    Shapes: S sites, O options, K suppliers, C customers, G goods.
    """

    sites: tuple[str, ...]
    suppliers: tuple[str, ...]
    customers: tuple[str, ...]
    goods: tuple[str, ...]

    load: Floats
    """(G,) capacity used by one unit."""
    weight_t: Floats
    """(G,) tonnes per unit."""
    demand: Floats
    """(C, G) units a year."""
    single_source: Flags
    """(C,)"""

    option_site: Positions
    """(O,) ascending."""
    option_running: Flags
    """(O,) True for the size that is there today."""
    option_charge: Floats
    """(O,) yearly_charge + annualised opening charge less residual (proposed options only)."""
    option_one_off: Floats
    """(O,) opening charge, one-off; 0 for a running option."""
    option_capacity: Floats
    """(O,) load a year; inf = unlimited."""
    option_least: Floats
    """(O,) load a year."""

    site_running: Flags
    """(S,)"""
    site_closing: Floats
    """(S,) annualised closing charge, paid when no option of the site is open; 0 unless running."""
    site_closing_one_off: Floats
    """(S,) the same, one-off."""
    site_pinned_open: Flags
    """(S,)"""
    site_pinned_shut: Flags
    """(S,)"""

    supplier_signed: Flags
    """(K,)"""
    supplier_charge: Floats
    """(K,) yearly_charge + annualised signing charge (offered suppliers only)."""
    supplier_one_off: Floats
    """(K,) signing charge, one-off; 0 for a signed supplier."""
    supplier_dropping: Floats
    """(K,) annualised dropping charge, paid when a signed supplier is dropped; 0 unless signed."""
    supplier_dropping_one_off: Floats
    """(K,) the same, one-off."""
    supplier_capacity: Floats
    """(K,) load a year over all goods; inf = unlimited."""
    supplier_least: Floats
    """(K,) load a year over all goods, while signed."""
    supplier_pinned_signed: Flags
    """(K,)"""
    supplier_pinned_unsigned: Flags
    """(K,)"""
    offer_capacity: Floats
    """(K, G) units a year; 0 where not offered, inf = unlimited."""
    offer_least: Floats
    """(K, G) units a year, while signed."""

    inbound: LegLanes
    outbound: LegLanes
    direct: LegLanes

    rules: tuple[NetworkRule, ...]
    fewest_sites: int
    """0 where not set."""
    most_sites: int
    """S where not set."""
    one_off_budget: float
    """inf where not set."""
    service_km: float
    """inf where not set."""
    service_share: float
    """0 where not set."""
    annuity: float
    """Yearly money per one-off money; 0 where the study has no one-off charge."""

    @property
    def two_echelons(self) -> bool:
        """True where suppliers and sites exist, so that inflow equals outflow at each site and good."""
        return bool(self.suppliers) and bool(self.sites)


def build_network(study: Study) -> Network:
    """Return the numbers of a checked study."""
    raise NotImplementedError
