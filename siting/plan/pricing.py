"""
What moves in a plan and what it costs, from the network's arrays and the tables.

Money a year throughout. No number here comes from a solver but the amounts themselves.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.plan.plan import CostLine
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.arrays import Flags, Floats, Positions
    from siting.network.decisions import Amounts, Decisions
    from siting.network.freight import LegLanes
    from siting.network.network import Network
    from siting.study.tables import Study

NEGLIGIBLE_SHARE = 1e-9
"""An amount at most this share of what the destination needs is a solver's rounding, not a flow."""

KG_PER_T = 1000.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Moves:
    """The used lanes of one leg, in the order of the network; every array of shape (moves,)."""

    leg: Leg
    origin: Positions
    destination: Positions
    good: Positions
    amount: Floats
    """Units of the good a year, above 0."""
    load: Floats
    """Load a year."""
    tonnes: Floats
    """Tonnes a year."""
    km: Floats
    """Road km; NaN where nothing gives it."""
    km_given: Flags
    tariff: Positions
    """Position in the network's tariffs of the one that sets freight, or which other it is, as on the lanes."""
    freight: Floats
    """Money a year."""
    delivery: Floats
    """Money a year."""
    bought_or_handled: Floats
    """Money a year, from the tables: price of the goods (inbound, direct) or handling (outbound)."""
    kg_co2e: Floats
    """kg a year."""
    cost: Floats
    """Money a year: all of the above with carbon, by the network's cost per unit."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class AllMoves:
    """The used lanes of all three legs."""

    inbound: Moves
    outbound: Moves
    direct: Moves

    def __iter__(self) -> Iterator[Moves]:
        """Return the legs in the order inbound, outbound, direct."""
        return iter((self.inbound, self.outbound, self.direct))


def moves_of(study: Study, network: Network, amounts: Amounts) -> AllMoves:
    """
    Return what moves, without the amounts that are only a solver's rounding.

    Parameters
    ----------
    study
        The study the network was built from.
    network
        Its numbers.
    amounts
        Units of the good a year on each lane, in the order of the network's lanes.

    Returns
    -------
    moves
        The used lanes with their amounts and money a year.
    """
    price = _prices(study, network)
    handling = np.array([row.handling_rate for row in study.sites])
    needed = network.demand.sum(axis=0)

    def used(leg: Leg, lanes: LegLanes, amount: Floats) -> Moves:
        need = needed[lanes.good] if leg is Leg.INBOUND else network.demand[lanes.destination, lanes.good]
        at = np.flatnonzero(amount > NEGLIGIBLE_SHARE * need)
        origin, good, moved = lanes.origin[at], lanes.good[at], amount[at]
        load = moved * network.load[good]
        own = handling[origin] * load if leg is Leg.OUTBOUND else price[origin, good] * moved
        return Moves(
            leg=leg,
            origin=origin,
            destination=lanes.destination[at],
            good=good,
            amount=moved,
            load=load,
            tonnes=moved * network.weight_t[good],
            km=lanes.km[at],
            km_given=lanes.km_given[at],
            tariff=lanes.tariff[at],
            freight=lanes.freight[at] * moved,
            delivery=lanes.delivery[at] * moved,
            bought_or_handled=own,
            kg_co2e=lanes.kg_co2e[at] * moved,
            cost=lanes.cost[at] * moved,
        )

    return AllMoves(
        inbound=used(Leg.INBOUND, network.inbound, amounts.inbound),
        outbound=used(Leg.OUTBOUND, network.outbound, amounts.outbound),
        direct=used(Leg.DIRECT, network.direct, amounts.direct),
    )


def _prices(study: Study, network: Network) -> Floats:
    """Return the price of each good at each supplier, money per unit, shape (suppliers, goods)."""
    price = np.zeros((len(network.suppliers), len(network.goods)))
    supplier = {name: k for k, name in enumerate(network.suppliers)}
    good = {name: g for g, name in enumerate(network.goods)}
    for offer in study.all_offers:
        price[supplier[offer.supplier], good[offer.good]] = offer.unit_price
    return price


def cost_lines(study: Study, network: Network, decisions: Decisions, moves: AllMoves) -> dict[CostLine, float]:
    """
    Return every part of the plan's cost, money a year; the parts add up to the cost.

    Parameters
    ----------
    study
        The study, for charges and settings as typed.
    network
        Its numbers, for annualised charges.
    decisions
        Which options open and which suppliers are signed.
    moves
        What moves.

    Returns
    -------
    lines
        Every `CostLine`, zero where it does not apply.
    """
    opened = np.flatnonzero(decisions.option_open)
    signed = decisions.supplier_signed
    site_yearly = np.array([option.yearly_charge for option in study.options])
    supplier_yearly = np.array([row.yearly_charge for row in study.suppliers])
    closed = shut_sites(network, decisions)
    carbon_kg = sum(float(leg.kg_co2e.sum()) for leg in moves)
    return {
        CostLine.OPENING: float((network.option_charge - site_yearly)[opened].sum()),
        CostLine.SITES: float(site_yearly[opened].sum()),
        CostLine.CLOSING: float(network.site_closing[closed].sum()),
        CostLine.SIGNING: float((network.supplier_charge - supplier_yearly)[signed].sum()),
        CostLine.SUPPLIERS: float(supplier_yearly[signed].sum()),
        CostLine.DROPPING: float(network.supplier_dropping[~signed].sum()),
        CostLine.GOODS: float(moves.inbound.bought_or_handled.sum() + moves.direct.bought_or_handled.sum()),
        CostLine.INBOUND: float(moves.inbound.freight.sum()),
        CostLine.HANDLING: float(moves.outbound.bought_or_handled.sum()),
        CostLine.OUTBOUND: float(moves.outbound.freight.sum()),
        CostLine.DIRECT: float(moves.direct.freight.sum()),
        CostLine.DELIVERY: float(moves.outbound.delivery.sum() + moves.direct.delivery.sum()),
        CostLine.CARBON: study.settings.carbon_price_per_t * carbon_kg / KG_PER_T,
    }


def shut_sites(network: Network, decisions: Decisions) -> Flags:
    """Return which sites have no option open, shape (sites,)."""
    shut = np.ones(len(network.sites), dtype=np.bool_)
    shut[network.option_site[decisions.option_open]] = False
    return shut


def costs_to_serve(network: Network, moves: AllMoves) -> Floats:
    """
    Return what serving each customer costs, money a year, charges left out.

    Own freight, delivery, handling, carbon and price; what came in at its site is counted at that site's average
    inbound cost per unit of the good.

    Parameters
    ----------
    network
        The numbers of the study.
    moves
        What moves.

    Returns
    -------
    cost
        Shape (customers,). Over all customers it adds up to everything that is not a charge.
    """
    shape = (len(network.sites), len(network.goods))
    inflow, spent = np.zeros(shape), np.zeros(shape)
    into = (moves.inbound.destination, moves.inbound.good)
    np.add.at(inflow, into, moves.inbound.amount)
    np.add.at(spent, into, moves.inbound.cost)
    average = np.divide(spent, inflow, out=np.zeros(shape), where=inflow > 0)
    out = moves.outbound
    cost = np.zeros(len(network.customers))
    np.add.at(cost, out.destination, out.cost + out.amount * average[out.origin, out.good])
    np.add.at(cost, moves.direct.destination, moves.direct.cost)
    return cost
