"""
What moving one unit of a good over a lane costs: freight, deliveries, carbon, and what is added to them.

Freight is what comes first of `lanes.unit_cost`, the cheapest tariff that fits, and the rates of the settings; the
first two take in the delivery.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

import numpy as np

from siting.network.tariffs import NO_TARIFF, OWN_COST, delivery_sizes, price_by_tariff
from siting.study.tables import Leg

if TYPE_CHECKING:
    from siting.arrays import Flags, Floats, Positions
    from siting.network.lanes import FoundLanes
    from siting.study.tables import Study

KG_PER_T = 1000.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LegLanes:
    """
    The lanes of one leg, sorted by origin, destination and good; every array of shape (lanes,).

    A lane is one origin, destination and good. Only lanes that exist are here: reach, bars, offers, demand above 0 and
    single sourcing (origin that cannot hold or bring all the customer needs) have removed the others.
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
    """Money per unit of the good for deliveries; 0 inbound and where another than the rates sets freight."""
    tariff: Positions
    """Position in `Network.tariffs` of the tariff that sets freight, `NO_TARIFF` (rates) or `OWN_COST` (unit_cost)."""
    kg_co2e: Floats
    """kg CO2e per unit of the good, also where it has no price; 0 where no factor is set or km is NaN."""
    cost: Floats
    """All that moving one unit here costs: freight + delivery + carbon, + handling (outbound) or price (others)."""

    def __len__(self) -> int:
        """Return the number of lanes."""
        return int(self.origin.shape[0])


class GoodNumbers(Protocol):
    """What freight goes by of each good, of shape (goods,): parties and networks both have it."""

    @property
    def load(self) -> Floats:
        """Capacity used by one unit."""

    @property
    def weight_t(self) -> Floats:
        """Tonnes per unit."""


def price_lanes(leg: Leg, lanes: FoundLanes, study: Study, goods: GoodNumbers, added: Floats) -> LegLanes:
    """
    Return the lanes with what one unit of the good costs on each.

    Parameters
    ----------
    leg
        Inbound goes at the inbound rate and has no deliveries; the others go at the outbound rate with deliveries.
    lanes
        The lanes of the leg that exist.
    study
        Its settings, and its `lanes` table, which says whether a unit_cost is per unit of the good or of load.
    goods
        Load and weight of the goods.
    added
        Shape (lanes,). Money per unit of the good on top: handling or price.

    Returns
    -------
    priced
        freight = load x rate x km and delivery = load x drop_charge / drop_size, or unit_cost or a tariff in place of
        both; carbon = emission_kg_per_tkm x weight_t x km / 1000 x carbon_price_per_t.
    """
    settings = study.settings
    inbound = leg is Leg.INBOUND
    rate = settings.inbound_rate if inbound else settings.outbound_rate
    per_drop = np.zeros(len(lanes))
    if settings.drop_charge and not inbound:
        per_drop = settings.drop_charge / delivery_sizes(leg, study)[lanes.destination]
    unit_load = goods.load[lanes.good]
    costed = ~np.isnan(lanes.unit_cost)
    names_good = np.append(study.lanes.good >= 0, np.False_)[lanes.row]  # lanes without a row take the last element
    row_cost = lanes.unit_cost * np.where(names_good, 1.0, unit_load)
    by_tariff = price_by_tariff(leg, lanes, study)
    tariff = np.where(costed, np.int32(OWN_COST), by_tariff.tariff)
    rated = np.where(tariff == NO_TARIFF, rate * lanes.km, by_tariff.per_load)
    freight = np.where(costed, row_cost, unit_load * rated)
    delivery = np.where(tariff == NO_TARIFF, unit_load * per_drop, 0.0)
    km = np.where(np.isnan(lanes.km), 0.0, lanes.km)
    kg_co2e = (settings.emission_kg_per_tkm or 0.0) * goods.weight_t[lanes.good] * km
    return LegLanes(
        origin=lanes.origin,
        destination=lanes.destination,
        good=lanes.good,
        km=lanes.km,
        km_given=lanes.km_given,
        freight=freight,
        delivery=delivery,
        tariff=tariff,
        kg_co2e=kg_co2e,
        cost=freight + delivery + kg_co2e / KG_PER_T * settings.carbon_price_per_t + added,
    )
