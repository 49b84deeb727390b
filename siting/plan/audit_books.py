"""
What the tables say about each flow of a plan: worked out again from the study alone, for the audit.

Shares no code with the network or the solvers but the geodesic itself, so that a slip there cannot hide here.
"""

from __future__ import annotations

import math
from collections import defaultdict
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.network.distance import geodesic_km
from siting.plan.audit_tariffs import Haul, TariffBook
from siting.study.countries import country_key
from siting.study.tables import Leg, SiteStanding, SupplierStanding

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.arrays import Floats
    from siting.plan.plan import Flow, Plan, SiteLine, SupplierLine
    from siting.study.tables import CustomerRow, GoodRow, LaneTable, SiteRow, SizeRow, Study, SupplierRow

    Place = SiteRow | CustomerRow | SupplierRow

RELATIVE = 1e-6
"""Relative tolerance of every comparison."""

FLOOR = 1e-9
"""Absolute tolerance, as a share of the whole (all load, all money) the compared amount is part of."""


def differs(stated: float, right: float, scale: float) -> bool:
    """Return whether a stated amount is not the right one, `scale` being the whole it is part of."""
    return not abs(stated - right) <= RELATIVE * abs(right) + FLOOR * abs(scale)


def exceeds(amount: float, limit: float, scale: float) -> bool:
    """Return whether an amount is above its limit, `scale` being the whole it is part of."""
    return not amount <= limit + RELATIVE * abs(limit) + FLOOR * abs(scale)


def shown(amount: float) -> str:
    """Return a number for a fault: thousands separated, at most six decimals."""
    return f"{amount:,.6f}".rstrip("0").rstrip(".") if abs(amount) >= RELATIVE or amount == 0 else f"{amount:.3g}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Move:
    """A flow with what the tables say about it. Money and kg are for the whole flow, a year."""

    flow: Flow
    load: float
    tonnes: float
    km: float | None
    km_given: bool
    freight: float
    delivery: float
    own: float
    """Price of the goods (inbound, direct) or handling (outbound)."""
    kg_co2e: float
    carbon: float
    tariffs: Mapping[str, float]
    """What each tariff that fits would charge for the whole flow; empty where `lanes` or the rates set freight."""
    refusal: str
    """Why the lane may not be used; empty where it may."""

    @property
    def cost(self) -> float:
        """All money of the flow."""
        return self.freight + self.delivery + self.own + self.carbon

    @property
    def name(self) -> str:
        """The lane and good, for a fault."""
        return f"flow of {self.flow.good} from {self.flow.origin} to {self.flow.destination}"


@dataclass(frozen=True, slots=True, kw_only=True)
class _Lane:
    """What the tables say about a lane."""

    km: float | None
    km_given: bool
    unit_cost: float | None
    """Freight that `lanes` sets, money per unit of the good."""
    barred: bool
    listed: bool
    """True where a row of `lanes` is about it."""


class Books:
    """The tables by name, and the plan's flows worked out again from them."""

    def __init__(self, study: Study, plan: Plan, *, of_today: bool) -> None:
        self.study, self.plan, self.of_today = study, plan, of_today
        self.goods: dict[str, GoodRow] = {row.good: row for row in study.all_goods}
        self.sites: dict[str, SiteRow] = {row.site: row for row in study.sites}
        self.suppliers: dict[str, SupplierRow] = {row.supplier: row for row in study.suppliers}
        self.customers: dict[str, CustomerRow] = {row.customer: row for row in study.customers}
        self.offers = {(row.supplier, row.good): row for row in study.all_offers}
        self.options: dict[str, dict[str, SizeRow]] = defaultdict(dict)
        for option in study.options:
            self.options[option.site][option.size] = option
        self.running: dict[str, str] = {row.site: "" for row in study.sites if row.standing is SiteStanding.RUNNING}
        """Size in place of each running site."""
        self.running |= {
            option.site: option.size for option in study.options if option.standing is SiteStanding.RUNNING
        }
        self.signed = {row.supplier for row in study.suppliers if row.standing is SupplierStanding.SIGNED}
        self.demand: dict[tuple[str, str], float] = {(row.customer, row.good): row.demand for row in study.all_demands}
        self.site_lines: dict[str, SiteLine] = {line.site: line for line in plan.sites}
        self.supplier_lines: dict[str, SupplierLine] = {line.supplier: line for line in plan.suppliers}
        self.all_load = sum(
            amount * self.goods[good].load for (_, good), amount in self.demand.items() if good in self.goods
        )
        """Load of all demand: the whole that amounts are part of."""
        self._tariffs = TariffBook(study)
        self._ends: dict[Leg, tuple[Mapping[str, Place], Mapping[str, Place]]] = {
            Leg.INBOUND: (self.suppliers, self.sites),
            Leg.OUTBOUND: (self.sites, self.customers),
            Leg.DIRECT: (self.suppliers, self.customers),
        }
        """Tables of origins and destinations of each leg."""
        known = [flow for flow in plan.flows if not self._stranger(flow)]
        self.strangers = [(flow, what) for flow in plan.flows if (what := self._stranger(flow))]
        """Flows that name something no table has, and what that is."""
        self.moves = self._work_out(known)

    def _stranger(self, flow: Flow) -> str:
        """Return what of the flow no table has; empty where all is known."""
        origins, destinations = self._ends[flow.leg]
        if flow.origin not in origins:
            return f"origin {flow.origin!r}"
        if flow.destination not in destinations:
            return f"destination {flow.destination!r}"
        return "" if flow.good in self.goods else f"good {flow.good!r}"

    def _work_out(self, flows: Sequence[Flow]) -> list[Move]:
        """Return every flow with its distance, money and right to exist."""
        rows = overriding_rows(self.study.lanes, flows)
        estimates = self._estimates(flows).tolist()
        return [
            self._move(flow, self._lane(flow, row, estimate))
            for flow, row, estimate in zip(flows, rows, estimates, strict=True)
        ]

    def _lane(self, flow: Flow, row: int | None, estimate: float) -> _Lane:
        """Return what the overriding row, or else the coordinates, say about a lane."""
        guess = None if math.isnan(estimate) else estimate
        if row is None:
            return _Lane(km=guess, km_given=False, unit_cost=None, barred=False, listed=False)
        lanes = self.study.lanes
        road, unit_cost = float(lanes.road_km[row]), float(lanes.unit_cost[row])
        per_unit = 1.0 if lanes.good[row] >= 0 else self.goods[flow.good].load
        return _Lane(
            km=guess if math.isnan(road) else road,
            km_given=not math.isnan(road),
            unit_cost=None if math.isnan(unit_cost) else unit_cost * per_unit,
            barred=bool(lanes.barred[row]),
            listed=True,
        )

    def _estimates(self, flows: Sequence[Flow]) -> Floats:
        """Return road km of each flow from coordinates alone; NaN where an end has none."""
        places = [
            (origins[flow.origin], destinations[flow.destination])
            for flow in flows
            for origins, destinations in [self._ends[flow.leg]]
        ]
        points = np.array(
            [
                [math.nan if at is None else at for at in (a.latitude, a.longitude, b.latitude, b.longitude)]
                for a, b in places
            ],
            dtype=np.float64,
        ).reshape(len(flows), 4)
        factors = np.array([circuity_between(self.study, a.country, b.country) for a, b in places], dtype=np.float64)
        return factors * geodesic_km(*points.T)

    def _charges(self, flow: Flow, lane: _Lane, load: float) -> dict[str, float]:
        """Return what each tariff that fits charges for a flow; empty where `lanes` sets its freight."""
        if lane.unit_cost is not None:
            return {}
        haul = Haul(leg=flow.leg, origin=flow.origin, destination=flow.destination, km=lane.km)
        return {name: charge * load for name, charge in self._tariffs.charges(haul).items()}

    def _move(self, flow: Flow, lane: _Lane) -> Move:
        """Return one flow worked out."""
        settings, good = self.study.settings, self.goods[flow.good]
        load, tonnes, km = flow.amount * good.load, flow.amount * good.weight_t, lane.km or 0.0
        rate = settings.inbound_rate if flow.leg is Leg.INBOUND else settings.outbound_rate
        freight, delivery, tariffs = rate * km * load, 0.0, self._charges(flow, lane, load)
        if lane.unit_cost is not None:
            freight = lane.unit_cost * flow.amount
        elif tariffs:
            freight = min(tariffs.values())
        elif flow.leg is not Leg.INBOUND and settings.drop_charge:
            delivery = (
                settings.drop_charge / (self._tariffs.delivery_size(flow.leg, flow.destination) or math.nan) * load
            )
        if flow.leg is Leg.OUTBOUND:
            own = self.sites[flow.origin].handling_rate * load
        else:
            offer = self.offers.get((flow.origin, flow.good))
            own = offer.unit_price * flow.amount if offer else 0.0
        kg = (settings.emission_kg_per_tkm or 0.0) * km * tonnes
        return Move(
            flow=flow,
            load=load,
            tonnes=tonnes,
            km=lane.km,
            km_given=lane.km_given,
            tariffs=tariffs,
            freight=freight,
            delivery=delivery,
            own=own,
            kg_co2e=kg,
            carbon=settings.carbon_price_per_t * kg / 1000.0,
            refusal=self._refusal(flow, lane),
        )

    def _refusal(self, flow: Flow, lane: _Lane) -> str:
        """Return why the lane may not be used; empty where it may."""
        if lane.barred:
            return "the lane is barred"
        if flow.leg is Leg.DIRECT and not lane.listed:
            return "a direct lane exists only where `lanes` lists it"
        if lane.km is None and lane.unit_cost is None:
            return "neither coordinates nor `lanes` give the lane"
        if flow.leg is not Leg.OUTBOUND and (flow.origin, flow.good) not in self.offers:
            return f"{flow.origin} does not offer {flow.good}"
        if flow.leg is not Leg.INBOUND:
            reach = self.customers[flow.destination].reach_km
            if reach is not None and lane.km is not None and exceeds(lane.km, reach, reach):
                return f"the lane is {shown(lane.km)} km long, the customer's reach is {shown(reach)} km"
        return ""

    def is_open(self, site: str) -> bool:
        """Return whether the plan has the site open."""
        line = self.site_lines.get(site)
        return line is not None and line.verdict in {"keep", "open"}

    def is_signed(self, supplier: str) -> bool:
        """Return whether the plan has the supplier signed."""
        line = self.supplier_lines.get(supplier)
        return line is not None and line.verdict in {"stay", "sign"}

    def option(self, site: str) -> SizeRow | None:
        """Return the size the plan has open at a site; None where shut or where no such size exists."""
        return self.options[site].get(self.site_lines[site].size) if self.is_open(site) else None

    def load_of(self, key: str, *legs: Leg) -> dict[str, float]:
        """Return load a year by `origin` or `destination` of the flows on these legs."""
        held: dict[str, float] = defaultdict(float)
        for move in self.moves:
            if move.flow.leg in legs:
                held[getattr(move.flow, key)] += move.load
        return held

    @property
    def deliveries(self) -> list[Move]:
        """The flows that end at customers."""
        return [move for move in self.moves if move.flow.leg is not Leg.INBOUND]


def circuity_between(study: Study, country: str, other: str) -> float:
    """
    Return road km per geodesic km between places in two countries.

    Parameters
    ----------
    study
        Its `circuity` table and settings.
    country, other
        As typed; may be blank.

    Returns
    -------
    factor
        That of the pair's row; else the mean of both ends', of which one without a row goes by the settings.
    """
    if not study.circuity:
        return study.settings.circuity
    ends, found = (country_key(country), country_key(other)), [study.settings.circuity] * 2
    for row in study.circuity:
        named = country_key(row.country), country_key(row.other_country) or country_key(row.country)
        if set(named) == set(ends):
            return row.circuity
        if named[0] == named[1]:
            found = [row.circuity if end == named[0] else held for end, held in zip(ends, found, strict=True)]
    return sum(found) / len(found)


def overriding_rows(lanes: LaneTable, flows: Sequence[Flow]) -> list[int | None]:
    """
    Return the row of `lanes` that overrides each flow: one that names the good, else one that names none.

    Parameters
    ----------
    lanes
        The table; may hold a million rows, of which only those between used pairs are looked at one by one.
    flows
        The flows of a plan.

    Returns
    -------
    rows
        Position in the table, None where no row fits; in the order of the flows.
    """
    if not len(lanes) or not flows:
        return [None] * len(flows)
    position = {name: at for at, name in enumerate(lanes.names)}
    legs = {leg: at for at, leg in enumerate(lanes.LEGS)}
    names = len(lanes.names)

    def pair(flow: Flow) -> int:
        origin, destination = position.get(flow.origin), position.get(flow.destination)
        return -1 if origin is None or destination is None else (legs[flow.leg] * names + origin) * names + destination

    used = [pair(flow) for flow in flows]
    codes = (lanes.leg.astype(np.int64) * names + lanes.origin) * names + lanes.destination
    sought = np.unique(np.array(used, dtype=np.int64))
    place = np.minimum(np.searchsorted(sought, codes), sought.size - 1)
    found = np.flatnonzero(sought[place] == codes)
    rows = {
        (code, good): row
        for code, good, row in zip(codes[found].tolist(), lanes.good[found].tolist(), found.tolist(), strict=True)
    }
    return [
        rows.get((code, position.get(flow.good, -2)), rows.get((code, -1)))
        for code, flow in zip(used, flows, strict=True)
    ]
