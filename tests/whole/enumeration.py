"""
Find the best plan of a small study by trying every verdict: the witness that shares nothing with the product.

Costs are derived here from the tables with loops and the formulas of the documentation; nothing of `siting.network` or
`siting.solving` is used. Flows come from `networkx.network_simplex` where the data are whole numbers of one good, and
from CBC elsewhere: never from HiGHS, which the product uses.

Sets of verdicts are visited from the cheapest lower bound up (charges + each demand at its cheapest way), and left out
only once that bound is above the best plan found, so that the answer is the same as trying them all.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from pyproj import Geod

from siting.study.tables import (
    CustomerRow,
    Leg,
    RuleKind,
    SiteRow,
    SiteRuling,
    SiteStanding,
    SupplierRow,
    SupplierRuling,
    SupplierStanding,
)
from tests.building import lane_rows
from tests.whole.flow_witnesses import flow_by_cbc, flow_by_network_simplex, unlimited

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from siting.study.tables import GoodRow, OfferRow, SizeRow, Study

    Pair = tuple[str, str]
    """Customer and good."""
    Way = tuple[Leg, str, str, str]
    """Leg, origin, destination and good of one lane."""
    Origin = SiteRow | SupplierRow
    Destination = SiteRow | CustomerRow

SLACK = 1e-9
"""Relative: sums of quarters that agree to this are equal."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Lane:
    """A lane that exists."""

    km: float | None
    cost: float
    """Money per unit of the good, everything included."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Verdicts:
    """One set of verdicts."""

    options: Mapping[str, SizeRow | None]
    """What is open at each site, None = nothing."""
    signed: frozenset[str]
    charge: float
    """Money a year of all verdicts."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Best:
    """The cheapest plan there is."""

    cost: float
    open_sites: frozenset[str]
    sizes: Mapping[str, str]
    signed: frozenset[str]


@dataclass(kw_only=True)
class Enumeration:
    """Every verdict of one study, priced."""

    study: Study
    witness: str = "auto"
    """`simplex`, `cbc`, or `auto`: network simplex where the data allow it."""
    flows_solved: int = 0
    demand: dict[Pair, float] = field(init=False)
    lanes: dict[Way, Lane] = field(init=False)

    def __post_init__(self) -> None:
        """Derive demand and lanes from the tables."""
        self.demand = {(row.customer, row.good): row.demand for row in self.study.all_demands}
        self.load = {row.good: row.load for row in self.study.all_goods}
        self.weight = {row.good: row.weight_t for row in self.study.all_goods}
        self.offers: dict[Pair, OfferRow] = {(row.supplier, row.good): row for row in self.study.all_offers}
        self.lanes = dict(_lanes(self.study, self.demand, self.offers))
        self.single = {row.customer for row in self.study.customers if self.study.is_single_sourced(row)}
        self.whole = self._is_whole()

    def best(self) -> Best | None:
        """Return the cheapest plan, or None where no set of verdicts can serve the demand."""
        ranked: list[tuple[float, int, Verdicts]] = []
        for verdicts in self._verdicts():
            bound = self._lower_bound(verdicts)
            if bound is not None:
                ranked.append((bound, len(ranked), verdicts))
        best: Best | None = None
        for bound, _, verdicts in sorted(ranked, key=lambda entry: entry[:2]):
            if best is not None and bound >= best.cost - SLACK * abs(best.cost):
                break
            flow = self._cheapest_flow(verdicts, math.inf if best is None else best.cost - verdicts.charge)
            if flow is not None and (best is None or flow + verdicts.charge < best.cost):
                best = _as_best(flow + verdicts.charge, verdicts)
        return best

    def cost_of(self, sizes: Mapping[str, str], signed: frozenset[str] = frozenset()) -> float | None:
        """Return the cost with exactly these sites open (site to size) and suppliers signed; None where impossible."""
        for verdicts in self._verdicts():
            chosen = {site: option.size for site, option in verdicts.options.items() if option is not None}
            if chosen == dict(sizes) and verdicts.signed == signed and self._lower_bound(verdicts) is not None:
                flow = self._cheapest_flow(verdicts, math.inf)
                return None if flow is None else flow + verdicts.charge
        return None

    def every(self) -> Iterator[tuple[Best, float]]:
        """Yield every set of verdicts that can serve the demand, with its cost, and what moving costs of that."""
        for verdicts in self._verdicts():
            if self._lower_bound(verdicts) is not None:
                flow = self._cheapest_flow(verdicts, math.inf)
                if flow is not None:
                    yield _as_best(flow + verdicts.charge, verdicts), flow

    def _verdicts(self) -> Iterator[Verdicts]:
        """Yield every set of verdicts that rulings, rules, counts and the budget allow."""
        study = self.study
        choices: list[list[SizeRow | None]] = []
        for row in study.sites:
            options: list[SizeRow | None] = [option for option in study.options if option.site == row.site]
            if row.ruling is SiteRuling.PINNED_SHUT:
                options = []
            choices.append(options if row.ruling is SiteRuling.PINNED_OPEN else [None, *options])
        takes = [
            {SupplierRuling.FREE: (False, True), SupplierRuling.PINNED_SIGNED: (True,)}.get(row.ruling, (False,))
            for row in study.suppliers
        ]
        for opened in itertools.product(*choices):
            options_of = {row.site: option for row, option in zip(study.sites, opened, strict=True)}
            for taken in itertools.product(*takes):
                signed = frozenset(row.supplier for row, yes in zip(study.suppliers, taken, strict=True) if yes)
                charge, one_off = _charges(study, options_of, signed)
                if _allowed(study, options_of, signed, one_off):
                    yield Verdicts(options=options_of, signed=signed, charge=charge)

    def _ways(self, verdicts: Verdicts) -> dict[Way, Lane]:
        """Return the lanes whose ends are open and signed."""
        shut = {site for site, option in verdicts.options.items() if option is None}
        return {
            way: lane
            for way, lane in self.lanes.items()
            if way[1] not in shut and way[2] not in shut and (way[0] is Leg.OUTBOUND or way[1] in verdicts.signed)
        }

    def _origins(self, ways: Mapping[Way, Lane], pair: Pair) -> dict[str, float]:
        """Return the least money per unit from each origin to one customer and good."""
        customer, good = pair
        least: dict[str, float] = {}
        for (leg, origin, destination, of), lane in ways.items():
            if destination != customer or of != good or leg is Leg.INBOUND:
                continue
            cost = lane.cost
            if leg is Leg.OUTBOUND and self.study.suppliers:
                cost += min(
                    (
                        inbound.cost
                        for (to, _, site, moved), inbound in ways.items()
                        if to is Leg.INBOUND and site == origin and moved == good
                    ),
                    default=math.inf,
                )
            if math.isfinite(cost):
                least[origin] = cost
        return least

    def _lower_bound(self, verdicts: Verdicts) -> float | None:
        """Return charges + each demand at its cheapest way; None where some demand has no way."""
        ways = self._ways(verdicts)
        total = verdicts.charge
        for pair, amount in self.demand.items():
            costs = self._origins(ways, pair)
            if not costs:
                return None
            total += amount * min(costs.values())
        return total

    def _cheapest_flow(self, verdicts: Verdicts, below: float) -> float | None:
        """Return the cheapest flow, over every assignment of single-sourced customers; None where none is below."""
        ways = self._ways(verdicts)
        single = [customer for customer in sorted(self.single) if any(name == customer for name, _ in self.demand)]
        costs = {pair: self._origins(ways, pair) for pair in self.demand}
        rest = sum(amount * min(costs[pair].values()) for pair, amount in self.demand.items() if pair[0] not in single)
        best: float | None = None
        for assignment in self._assignments(verdicts, single, costs):
            bound = rest + sum(
                amount * costs[pair][assignment[pair[0]]]
                for pair, amount in self.demand.items()
                if pair[0] in assignment
            )
            ceiling = below if best is None else min(below, best)
            if math.isfinite(ceiling) and bound >= ceiling - SLACK * abs(ceiling):
                continue
            allowed = {
                way: lane
                for way, lane in ways.items()
                if way[0] is Leg.INBOUND or assignment.get(way[2], way[1]) == way[1]
            }
            flow = self._flow(verdicts, allowed)
            if flow is not None and (best is None or flow < best):
                best = flow
        return best

    def _assignments(
        self, verdicts: Verdicts, single: list[str], costs: Mapping[Pair, Mapping[str, float]]
    ) -> Iterator[dict[str, str]]:
        """Yield every assignment of the single-sourced customers to one origin each, within the sites' capacity."""
        if not single:
            yield {}
            return
        head, *tail = single
        pairs = [pair for pair in self.demand if pair[0] == head]
        origins = set.intersection(*(set(costs[pair]) for pair in pairs))
        for origin in sorted(origins):
            for others in self._assignments(verdicts, tail, costs):
                assignment = {head: origin, **others}
                option = verdicts.options.get(origin)
                if option is None or self._load_at(origin, assignment) <= option.capacity * (1 + SLACK):
                    yield assignment

    def _load_at(self, origin: str, assignment: Mapping[str, str]) -> float:
        return sum(
            amount * self.load[good]
            for (customer, good), amount in self.demand.items()
            if assignment.get(customer) == origin
        )

    def _flow(self, verdicts: Verdicts, ways: Mapping[Way, Lane]) -> float | None:
        self.flows_solved += 1
        if self.whole and self.witness != "cbc":
            return flow_by_network_simplex(self, verdicts, ways)
        return flow_by_cbc(self, verdicts, ways)

    def _is_whole(self) -> bool:
        """Return whether one good of load 1 moves in whole numbers at whole costs, so that network simplex is exact."""
        study = self.study
        numbers = [
            *self.demand.values(),
            *(lane.cost for lane in self.lanes.values()),
            *(value for option in study.options for value in (option.capacity, option.least_throughput)),
            *(value for row in study.suppliers for value in (unlimited(row.capacity), row.least_yearly)),
            *(value for offer in study.all_offers for value in (unlimited(offer.capacity), offer.least_yearly)),
        ]
        return (
            len(study.all_goods) == 1
            and self.load[study.all_goods[0].good] == 1.0
            and study.settings.service_share is None
            and all(math.isinf(number) or float(number).is_integer() for number in numbers)
        )


def _as_best(cost: float, verdicts: Verdicts) -> Best:
    sizes = {site: option.size for site, option in verdicts.options.items() if option is not None}
    return Best(cost=cost, open_sites=frozenset(sizes), sizes=sizes, signed=verdicts.signed)


def annuity(interest: float, years: float) -> float:
    """Return yearly money per money paid once at the start of `years` years: 1 / (sum of discounted ones)."""
    if interest == 0:
        return 1 / years
    return interest / (1 - math.pow(1 + interest, -years))


def _charges(study: Study, options: Mapping[str, SizeRow | None], signed: frozenset[str]) -> tuple[float, float]:
    """Return the yearly charge and the one-off money of a set of verdicts."""
    settings = study.settings
    interest, years = settings.interest_rate, settings.life_years
    factor = 0.0 if interest is None or years is None else annuity(interest, years)
    present = 1.0 if interest is None or years is None else (1 + interest) ** -years
    charge = one_off = 0.0
    for row in study.sites:
        option = options[row.site]
        if option is not None:
            charge += option.yearly_charge
            if option.standing is SiteStanding.PROPOSED:
                charge += factor * (option.opening_charge - option.residual_value * present)
                one_off += option.opening_charge
        elif row.standing is SiteStanding.RUNNING:
            charge += factor * row.closing_charge
            one_off += row.closing_charge
    for supplier in study.suppliers:
        if supplier.supplier in signed:
            charge += supplier.yearly_charge
            if supplier.standing is SupplierStanding.OFFERED:
                charge += factor * supplier.signing_charge
                one_off += supplier.signing_charge
        elif supplier.standing is SupplierStanding.SIGNED:
            charge += factor * supplier.dropping_charge
            one_off += supplier.dropping_charge
    return charge, one_off


def _allowed(study: Study, options: Mapping[str, SizeRow | None], signed: frozenset[str], one_off: float) -> bool:
    """Return whether counts, budget and rules allow a set of verdicts."""
    settings = study.settings
    count = sum(option is not None for option in options.values())
    if settings.fewest_sites is not None and count < settings.fewest_sites:
        return False
    if settings.most_sites is not None and count > settings.most_sites:
        return False
    if settings.one_off_budget is not None and one_off > settings.one_off_budget + SLACK:
        return False
    for rule in study.rules:
        held = [name in signed or options.get(name) is not None for name in rule.members]
        number = rule.number or 0
        holds = {
            RuleKind.ONE_OF: sum(held) == 1,
            RuleKind.NOT_TOGETHER: sum(held) <= 1,
            RuleKind.TOGETHER: all(held) or not any(held),
            RuleKind.NEEDS: not held[0] or all(held[1:]),
            RuleKind.AT_MOST: sum(held) <= number,
            RuleKind.AT_LEAST: sum(held) >= number,
        }
        if not holds[rule.rule]:
            return False
    return True


def _lanes(study: Study, demand: Mapping[Pair, float], offers: Mapping[Pair, OfferRow]) -> Iterator[tuple[Way, Lane]]:
    """Yield every lane that exists, with what moving one unit on it costs."""
    overrides = _overrides(study)
    wanted = {good for _, good in demand}
    for good in (row for row in study.all_goods if row.good in wanted):
        receivers = [row for row in study.customers if (row.customer, good.good) in demand]
        sellers = [row for row in study.suppliers if (row.supplier, good.good) in offers]
        legs: tuple[tuple[Leg, Sequence[Origin], Sequence[Destination]], ...] = (
            (Leg.INBOUND, sellers, study.sites),
            (Leg.OUTBOUND, study.sites, receivers),
            (Leg.DIRECT, sellers, receivers),
        )
        for leg, origins, destinations in legs:
            for origin, destination in itertools.product(origins, destinations):
                ends = (leg, _name(origin), _name(destination))
                given = overrides.get((*ends, good.good)) or overrides.get((*ends, ""))
                if (given is None and leg is Leg.DIRECT) or (given is not None and given.barred):
                    continue
                lane = _priced(study, leg, origin, destination, good, given or Given())
                if lane is None:
                    continue
                if isinstance(origin, SiteRow):
                    added = origin.handling_rate * good.load
                else:
                    added = offers[origin.supplier, good.good].unit_price
                yield (*ends, good.good), Lane(km=lane.km, cost=lane.cost + added)


@dataclass(frozen=True, slots=True, kw_only=True)
class Given:
    """What one row of `lanes` gives."""

    km: float | None = None
    money: float | None = None
    barred: bool = False
    names_good: bool = False


def _overrides(study: Study) -> dict[Way, Given]:
    """Return what each row of `lanes` gives, by leg, origin, destination and good ("" = every good)."""
    return {
        (row.leg, row.origin, row.destination, row.good): Given(
            km=row.road_km, money=row.unit_cost, barred=row.barred, names_good=bool(row.good)
        )
        for row in lane_rows(study.lanes)
    }


def _name(row: Origin | Destination) -> str:
    if isinstance(row, SiteRow):
        return row.site
    return row.customer if isinstance(row, CustomerRow) else row.supplier


def _priced(  # noqa: PLR0917 - all that a lane depends on
    study: Study, leg: Leg, origin: Origin, destination: Destination, good: GoodRow, given: Given
) -> Lane | None:
    """Return km and freight, delivery and carbon per unit of a lane; None where it does not exist."""
    settings = study.settings
    km = given.km
    if km is None:
        km = _estimated_km(origin, destination, settings.circuity)
    if given.money is not None:
        cost = given.money if given.names_good else given.money * good.load
    elif km is None:
        return None
    else:
        cost = (settings.inbound_rate if leg is Leg.INBOUND else settings.outbound_rate) * km * good.load
        if leg is not Leg.INBOUND and settings.drop_size is not None:
            cost += settings.drop_charge / settings.drop_size * good.load
    reach = destination.reach_km if isinstance(destination, CustomerRow) else None
    if reach is not None and km is not None and km > reach:
        return None
    if settings.emission_kg_per_tkm is not None and km is not None:
        cost += settings.carbon_price_per_t * settings.emission_kg_per_tkm * good.weight_t * km / 1000
    return Lane(km=km, cost=cost)


def _estimated_km(origin: Origin, destination: Destination, circuity: float) -> float | None:
    if origin.latitude is None or origin.longitude is None:
        return None
    if destination.latitude is None or destination.longitude is None:
        return None
    ends = (origin.longitude, origin.latitude, destination.longitude, destination.latitude)
    return float(Geod(ellps="WGS84").inv(*ends)[2]) / 1000 * circuity
