"""
A plan worked out by hand, with every feature a plan can have, for the tests of this folder.

Graz (running) closes, Linz (running, small) moves to its large size, Brno opens, Wels is left. Farm stays, Orchard is
signed, Nursery is dropped. Vienna is split between two sites, Zlin is single-sourced, Ostrava is served straight from
Orchard. Amounts in pots and trees a year; a tree takes 3 units of load and weighs 2 t, a pot 1 unit and 0.5 t.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from siting.network.decisions import NO_SOURCE, Amounts, Decisions
from siting.network.network import Network, build_network
from siting.plan.draw_up import draw_up
from siting.plan.plan import Plan, Today, TodayOutcome
from siting.study.fingerprint import fingerprint
from siting.study.settings import Settings
from siting.study.tables import (
    CustomerRow,
    DemandRow,
    GoodRow,
    Leg,
    OfferRow,
    RuleKind,
    RuleRow,
    SiteRow,
    SiteStanding,
    SizeRow,
    Study,
    SupplierRow,
    SupplierStanding,
)
from tests.building import LaneRow, lane_table

IN, OUT, DIRECT = Leg.INBOUND, Leg.OUTBOUND, Leg.DIRECT

SETTINGS = Settings(
    title="Hand-worked",
    currency="EUR",
    unit="t",
    outbound_rate=0.2,
    inbound_rate=0.06,
    drop_charge=48.0,
    drop_size=2.5,
    interest_rate=0.08,
    life_years=10.0,
    service_km=250.0,
    service_share=0.6,
    fewest_sites=1,
    most_sites=3,
    one_off_budget=20_000.0,
    emission_kg_per_tkm=0.1,
    carbon_price_per_t=80.0,
)

SITES = (
    SiteRow(
        site="Graz",
        latitude=47.07,
        longitude=15.44,
        standing=SiteStanding.RUNNING,
        yearly_charge=9_000.0,
        closing_charge=1_500.0,
        capacity=400.0,
        handling_rate=4.0,
    ),
    SiteRow(site="Linz", latitude=48.31, longitude=14.29, standing=SiteStanding.RUNNING, handling_rate=5.0),
    SiteRow(
        site="Brno",
        latitude=49.19,
        longitude=16.61,
        opening_charge=8_000.0,
        residual_value=2_000.0,
        yearly_charge=3_000.0,
        capacity=250.0,
        least_throughput=100.0,
        handling_rate=3.0,
    ),
    SiteRow(site="Wels", latitude=48.16, longitude=14.03, opening_charge=500.0, yearly_charge=7_000.0),
)

SIZES = (
    SizeRow(site="Linz", size="small", standing=SiteStanding.RUNNING, yearly_charge=1_000.0, capacity=60.0),
    SizeRow(
        site="Linz",
        size="large",
        opening_charge=4_000.0,
        yearly_charge=1_800.0,
        capacity=120.0,
        least_throughput=70.0,
        residual_value=300.0,
    ),
)

CUSTOMERS = (
    CustomerRow(customer="Vienna", latitude=48.21, longitude=16.37),
    CustomerRow(customer="Salzburg", latitude=47.80, longitude=13.04, reach_km=300.0),
    CustomerRow(customer="Zlin", latitude=49.22, longitude=17.67, single_source=True),
    CustomerRow(customer="Ostrava", latitude=49.83, longitude=18.28),
)

SUPPLIERS = (
    SupplierRow(
        supplier="Farm",
        latitude=48.33,
        longitude=16.05,
        standing=SupplierStanding.SIGNED,
        yearly_charge=400.0,
        capacity=300.0,
        least_yearly=50.0,
    ),
    SupplierRow(
        supplier="Orchard", latitude=47.10, longitude=15.71, signing_charge=2_000.0, yearly_charge=600.0, capacity=250.0
    ),
    SupplierRow(
        supplier="Nursery",
        latitude=48.41,
        longitude=15.61,
        standing=SupplierStanding.SIGNED,
        dropping_charge=900.0,
        yearly_charge=1_100.0,
    ),
)

GOODS = (GoodRow(good="pots", weight_t=0.5, load=1.0), GoodRow(good="trees", weight_t=2.0, load=3.0))

DEMANDS = (
    DemandRow(customer="Vienna", good="pots", demand=100.0),
    DemandRow(customer="Vienna", good="trees", demand=20.0),
    DemandRow(customer="Salzburg", good="pots", demand=50.0),
    DemandRow(customer="Zlin", good="trees", demand=30.0),
    DemandRow(customer="Ostrava", good="pots", demand=40.0),
)

OFFERS = (
    OfferRow(supplier="Farm", good="pots", unit_price=20.0, capacity=200.0, least_yearly=10.0),
    OfferRow(supplier="Orchard", good="pots", unit_price=21.0),
    OfferRow(supplier="Orchard", good="trees", unit_price=50.0, capacity=60.0, least_yearly=45.0),
    OfferRow(supplier="Nursery", good="trees", unit_price=55.0, capacity=100.0),
)

LANES = (
    LaneRow(leg=DIRECT, origin="Orchard", destination="Ostrava", road_km=420.0),
    LaneRow(leg=OUT, origin="Brno", destination="Zlin", road_km=101.0),
    LaneRow(leg=OUT, origin="Brno", destination="Vienna", good="trees", unit_cost=70.0),
    LaneRow(leg=OUT, origin="Brno", destination="Vienna", road_km=138.0, unit_cost=29.0),
    LaneRow(leg=OUT, origin="Linz", destination="Zlin", barred=True),
)

RULES = (
    RuleRow(rule=RuleKind.ONE_OF, members=("Graz", "Brno"), row=2),
    RuleRow(rule=RuleKind.NOT_TOGETHER, members=("Nursery", "Orchard"), row=3),
    RuleRow(rule=RuleKind.TOGETHER, members=("Brno", "Orchard"), row=4),
    RuleRow(rule=RuleKind.NEEDS, members=("Orchard", "Farm", "Linz"), row=5),
    RuleRow(rule=RuleKind.AT_MOST, members=("Graz", "Linz", "Brno", "Wels"), number=2, row=6),
    RuleRow(rule=RuleKind.AT_LEAST, members=("Linz", "Farm", "Wels"), number=2, row=7),
)

STUDY = Study(
    settings=SETTINGS,
    sites=SITES,
    customers=CUSTOMERS,
    suppliers=SUPPLIERS,
    sizes=SIZES,
    goods=GOODS,
    demands=DEMANDS,
    offers=OFFERS,
    lanes=lane_table(LANES),
    rules=RULES,
)

Moved = dict[tuple[Leg, str, str, str], float]

PLAN_MOVES: Moved = {
    (IN, "Farm", "Linz", "pots"): 80.0,
    (IN, "Farm", "Brno", "pots"): 70.0,
    (IN, "Orchard", "Brno", "trees"): 50.0,
    (OUT, "Linz", "Salzburg", "pots"): 50.0,
    (OUT, "Linz", "Vienna", "pots"): 30.0,
    (OUT, "Brno", "Vienna", "pots"): 70.0,
    (OUT, "Brno", "Vienna", "trees"): 20.0,
    (OUT, "Brno", "Zlin", "trees"): 30.0,
    (DIRECT, "Orchard", "Ostrava", "pots"): 40.0,
}

TODAY_MOVES: Moved = {
    (IN, "Farm", "Graz", "pots"): 140.0,
    (IN, "Farm", "Linz", "pots"): 50.0,
    (IN, "Nursery", "Graz", "trees"): 50.0,
    (OUT, "Graz", "Vienna", "pots"): 100.0,
    (OUT, "Graz", "Vienna", "trees"): 20.0,
    (OUT, "Graz", "Zlin", "trees"): 30.0,
    (OUT, "Graz", "Ostrava", "pots"): 40.0,
    (OUT, "Linz", "Salzburg", "pots"): 50.0,
}


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Worked:
    """What `draw_up` is given."""

    network: Network
    decisions: Decisions
    amounts: Amounts


def worked(study: Study, opened: set[tuple[str, str]], signed: set[str], moved: Moved) -> Worked:
    """Return verdicts and flows by name as decisions and amounts by position."""
    network = build_network(study)

    def amounts(leg: Leg) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
        lanes = {IN: network.inbound, OUT: network.outbound, DIRECT: network.direct}[leg]
        origins = network.sites if leg is OUT else network.suppliers
        destinations = network.sites if leg is IN else network.customers
        names = [
            (leg, origins[i], destinations[j], network.goods[p])
            for i, j, p in zip(lanes.origin, lanes.destination, lanes.good, strict=True)
        ]
        assert {key for key in moved if key[0] is leg} <= set(names)
        return np.array([moved.get(name, 0.0) for name in names], dtype=np.float64)

    source = np.full(len(network.customers), NO_SOURCE, dtype=np.int32)
    for leg, origin, customer, _ in moved:
        j = network.customers.index(customer) if leg is not IN else -1
        if j >= 0 and network.single_source[j]:
            sites = len(network.sites)
            source[j] = network.sites.index(origin) if leg is OUT else sites + network.suppliers.index(origin)
    marginal = np.where(network.demand > 0, 12.5, np.nan)
    return Worked(
        network=network,
        decisions=Decisions(
            option_open=np.array([(option.site, option.size) in opened for option in study.options], dtype=np.bool_),
            supplier_signed=np.array([row.supplier in signed for row in study.suppliers], dtype=np.bool_),
            source=source,
        ),
        amounts=Amounts(inbound=amounts(IN), outbound=amounts(OUT), direct=amounts(DIRECT), marginal_cost=marginal),
    )


def draw(study: Study, case: Worked, *, today: Today | None = None, bound_share: float = 0.99999) -> Plan:
    """Return the plan, its bound set at a share of its cost."""

    def plan(bound: float | None) -> Plan:
        return draw_up(
            study,
            case.network,
            case.decisions,
            case.amounts,
            bound=bound,
            gap_asked=1e-4,
            seconds=0.5,
            engine="direct",
            today=today,
        )

    return plan(plan(None).cost * bound_share)


def today_of(study: Study = STUDY) -> Today:
    """Return the plan of today: Graz and the small Linz, Farm and Nursery."""
    case = worked(study, {("Graz", ""), ("Linz", "small")}, {"Farm", "Nursery"}, TODAY_MOVES)
    return Today(outcome=TodayOutcome.SERVED, reason="", plan=draw(study, case))


def case_of(study: Study = STUDY) -> Worked:
    """Return the decisions and amounts of the plan."""
    return worked(study, {("Linz", "large"), ("Brno", "")}, {"Farm", "Orchard"}, PLAN_MOVES)


def plan_of(study: Study = STUDY) -> Plan:
    """Return the plan with its today."""
    return draw(study, case_of(study), today=today_of(study))


def stamped(study: Study, plan: Plan) -> Plan:
    """Return a plan, and its plan of today, as if they had been made for another study."""
    mark = fingerprint(study)
    today = plan.today
    if today is not None and today.plan is not None:
        today = replace(today, plan=replace(today.plan, fingerprint=mark))
    return replace(plan, fingerprint=mark, today=today)


def settings_for(title: str) -> Settings:
    """Return settings with nothing but what must be there."""
    return Settings(title=title, currency="EUR", unit="t")
