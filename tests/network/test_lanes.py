"""Which lanes exist, how long they are and what they cost, each by a number worked out by hand."""

from __future__ import annotations

import math
import time
from dataclasses import replace

import numpy as np
import pytest

from siting.network.network import LegLanes, Network, build_network
from siting.study.settings import Settings
from siting.study.tables import (
    CustomerRow,
    DemandRow,
    GoodRow,
    LaneTable,
    Leg,
    OfferRow,
    SiteRow,
    SizeRow,
    Study,
    SupplierRow,
)
from tests.building import LaneRow, lane_table

DEGREE_KM = 110.5743885577
"""One degree of latitude from the equator northwards on WGS84 (Karney's meridian arc, recomputed by series below)."""

SETTINGS = Settings(currency="EUR", unit="t", circuity=1.2, outbound_rate=0.1, inbound_rate=0.05)
SITES = (SiteRow(site="Brno", latitude=0.0, longitude=0.0, handling_rate=4.0), SiteRow(site="Graz"))
CUSTOMERS = (
    CustomerRow(customer="Linz", latitude=1.0, longitude=0.0, demand=30.0),
    CustomerRow(customer="Wels", demand=50.0),
)
SUPPLIERS = (SupplierRow(supplier="North", latitude=-1.0, longitude=0.0, unit_price=9.0),)


def study_of(*lanes: LaneRow, settings: Settings = SETTINGS, **tables: object) -> Study:
    """Return a study of two sites, two customers and one supplier, of which one each has coordinates."""
    given = {"sites": SITES, "customers": CUSTOMERS, "suppliers": SUPPLIERS, **tables}
    return Study(settings=settings, lanes=lane_table(lanes), **given)  # type: ignore[arg-type]  # tables by name


def names(network: Network, leg: Leg) -> dict[tuple[str, str, str], int]:
    """Return the position of each lane of a leg by its names."""
    lanes: LegLanes = getattr(network, leg)
    origins = network.sites if leg is Leg.OUTBOUND else network.suppliers
    ends = network.sites if leg is Leg.INBOUND else network.customers
    ways = zip(lanes.origin, lanes.destination, lanes.good, strict=True)
    return {(origins[i], ends[j], network.goods[p]): n for n, (i, j, p) in enumerate(ways)}


def pairs(network: Network, leg: Leg) -> set[tuple[str, str]]:
    """Return the origins and destinations of a leg that have a lane."""
    return {(origin, end) for origin, end, _ in names(network, leg)}


def outbound(origin: str, destination: str, **values: object) -> LaneRow:
    """Return an outbound row."""
    return LaneRow(leg=Leg.OUTBOUND, origin=origin, destination=destination, **values)  # type: ignore[arg-type]


def direct(origin: str, destination: str, **values: object) -> LaneRow:
    """Return a row of a lane straight from a supplier to a customer."""
    return LaneRow(leg=Leg.DIRECT, origin=origin, destination=destination, **values)  # type: ignore[arg-type]


def test_meridian_degree_is_right() -> None:
    """The degree used below, by Simpson's rule on the meridian's radius of curvature (WGS84 a and 1/f)."""
    a, f = 6378.137, 1 / 298.257223563
    e2 = f * (2 - f)
    latitude = np.radians(np.linspace(0, 1, 101))
    radius = a * (1 - e2) / (1 - e2 * np.sin(latitude) ** 2) ** 1.5
    weights = np.array([1, *[4, 2] * 49, 4, 1])
    assert (radius * weights).sum() * np.radians(0.01) / 3 == pytest.approx(DEGREE_KM, abs=1e-9)


def test_coordinates_give_distance_freight_and_handling() -> None:
    """Road km = geodesic x 1.2; freight = km x 0.1; handling 4 on top; the place without coordinates has no lane."""
    network = build_network(study_of())
    lanes = network.outbound
    assert pairs(network, Leg.OUTBOUND) == {("Brno", "Linz")}
    assert lanes.km == pytest.approx([DEGREE_KM * 1.2], rel=1e-10)
    assert lanes.km_given.tolist() == [False]
    assert lanes.freight == pytest.approx([DEGREE_KM * 0.12], rel=1e-10)
    assert lanes.delivery.tolist() == [0.0]
    assert lanes.cost == pytest.approx([DEGREE_KM * 0.12 + 4.0], rel=1e-10)
    assert len(lanes) == 1


def test_inbound_pays_its_own_rate_and_the_price() -> None:
    """Inbound: km x 0.05 and the price of 9; no delivery, no handling."""
    settings = replace(SETTINGS, drop_charge=40.0, drop_size=2.0)
    network = build_network(study_of(settings=settings))
    assert pairs(network, Leg.INBOUND) == {("North", "Brno")}
    assert network.inbound.freight == pytest.approx([DEGREE_KM * 1.2 * 0.05], rel=1e-10)
    assert network.inbound.delivery.tolist() == [0.0]
    assert network.inbound.cost == pytest.approx([DEGREE_KM * 0.06 + 9.0], rel=1e-10)


def test_road_km_replaces_the_estimate() -> None:
    """A row's 200 km: freight 20, delivery 40 / 2.5 = 16, handling 4, in all 40; the distance is given."""
    settings = replace(SETTINGS, drop_charge=40.0, drop_size=2.5)
    lanes = build_network(study_of(outbound("Brno", "Linz", road_km=200.0), settings=settings)).outbound
    assert (lanes.km.tolist(), lanes.km_given.tolist()) == ([200.0], [True])
    assert (lanes.freight.tolist(), lanes.delivery.tolist(), lanes.cost.tolist()) == ([20.0], [16.0], [40.0])


def test_unit_cost_replaces_freight_and_delivery() -> None:
    """A row's 7 per unit: freight 7, no delivery, handling 4 on top; the distance stays, estimated."""
    settings = replace(SETTINGS, drop_charge=40.0, drop_size=2.5)
    lanes = build_network(study_of(outbound("Brno", "Linz", unit_cost=7.0), settings=settings)).outbound
    assert (lanes.freight.tolist(), lanes.delivery.tolist(), lanes.cost.tolist()) == ([7.0], [0.0], [11.0])
    assert lanes.km == pytest.approx([DEGREE_KM * 1.2], rel=1e-10)
    assert lanes.km_given.tolist() == [False]


def test_unit_cost_sets_the_money_and_road_km_the_distance() -> None:
    """Both given: 7 a unit however long; carbon goes by the 500 km."""
    settings = replace(SETTINGS, emission_kg_per_tkm=0.1, carbon_price_per_t=80.0)
    network = build_network(study_of(outbound("Brno", "Wels", unit_cost=7.0, road_km=500.0), settings=settings))
    lane = names(network, Leg.OUTBOUND)["Brno", "Wels", "goods"]
    assert network.outbound.kg_co2e[lane] == pytest.approx(50.0)
    assert network.outbound.cost[lane] == pytest.approx(7 + 4 + 50 / 1000 * 80)


def test_unit_cost_alone_makes_a_lane_without_distance() -> None:
    """Places without coordinates: a row's cost makes the lane, a blank row does not."""
    network = build_network(study_of(outbound("Graz", "Wels", unit_cost=3.0), outbound("Graz", "Linz")))
    assert pairs(network, Leg.OUTBOUND) == {("Brno", "Linz"), ("Graz", "Wels")}
    lane = names(network, Leg.OUTBOUND)["Graz", "Wels", "goods"]
    assert math.isnan(network.outbound.km[lane])
    assert not network.outbound.km_given[lane]
    assert network.outbound.cost[lane] == 3.0
    assert network.outbound.kg_co2e[lane] == 0.0


def test_emissions_count_without_a_price() -> None:
    """0.1 kg a t-km over 200 km with 0.5 t a unit is 10 kg a unit, and costs nothing at price 0."""
    settings = replace(SETTINGS, emission_kg_per_tkm=0.1)
    goods = (GoodRow(good="pots", weight_t=0.5),)
    lanes = build_network(study_of(outbound("Brno", "Linz", road_km=200.0), settings=settings, goods=goods)).outbound
    assert lanes.kg_co2e.tolist() == [10.0]
    assert lanes.cost.tolist() == [24.0]


TWO_GOODS = (GoodRow(good="pots", weight_t=0.5, load=2.0), GoodRow(good="trees"))
BOTH = tuple(DemandRow(customer="Linz", good=good, demand=3.0) for good in ("pots", "trees"))


def test_goods_pay_by_load() -> None:
    """A unit of load 2 pays freight, delivery and handling twice."""
    settings = replace(SETTINGS, drop_charge=40.0, drop_size=2.5)
    study = study_of(outbound("Brno", "Linz", road_km=200.0), settings=settings, goods=TWO_GOODS, demands=BOTH)
    lanes = build_network(study).outbound
    assert lanes.freight.tolist() == [40.0, 20.0]
    assert lanes.delivery.tolist() == [32.0, 16.0]
    assert lanes.cost.tolist() == [80.0, 40.0]


def test_row_with_a_good_beats_one_without_as_a_whole() -> None:
    """7 per load is 14 a pot; the trees' own row says 5 per tree, and does not inherit the other row's distance."""
    rows = (
        outbound("Brno", "Linz", good="trees", unit_cost=5.0),
        outbound("Brno", "Linz", unit_cost=7.0, road_km=200.0),
    )
    lanes = build_network(study_of(*rows, goods=TWO_GOODS, demands=BOTH)).outbound
    assert lanes.freight.tolist() == [14.0, 5.0]
    assert lanes.km == pytest.approx([200.0, DEGREE_KM * 1.2], rel=1e-10)
    assert lanes.km_given.tolist() == [True, False]


def test_unit_cost_with_a_good_is_per_unit_of_it() -> None:
    """7 per pot is 7, though a pot has load 2."""
    lanes = build_network(
        study_of(outbound("Brno", "Linz", good="pots", unit_cost=7.0), goods=TWO_GOODS, demands=BOTH)
    ).outbound
    assert lanes.freight[0] == 7.0


def test_bars_remove_lanes() -> None:
    """A barred row removes every good; a row with a good lifts the bar for that good."""
    bar = outbound("Brno", "Linz", barred=True)
    assert pairs(build_network(study_of(bar)), Leg.OUTBOUND) == set()
    lifted = study_of(bar, outbound("Brno", "Linz", good="trees"), goods=TWO_GOODS, demands=BOTH)
    assert set(names(build_network(lifted), Leg.OUTBOUND)) == {("Brno", "Linz", "trees")}
    one = study_of(outbound("Brno", "Linz", good="trees", barred=True), goods=TWO_GOODS, demands=BOTH)
    assert set(names(build_network(one), Leg.OUTBOUND)) == {("Brno", "Linz", "pots")}


@pytest.mark.parametrize(
    ("reach", "exists"), [(199.999, False), (200 * (1 - 2e-9), False), (200.0, True), (200.001, True)]
)
def test_reach_removes_longer_lanes(reach: float, exists: bool) -> None:  # noqa: FBT001 - a table of cases
    """A lane of 200 km exists at a reach of 200 km and above, not below; a direct lane likewise."""
    customers = (replace(CUSTOMERS[0], reach_km=reach),)
    rows = (outbound("Brno", "Linz", road_km=200.0), direct("North", "Linz", road_km=200.0))
    network = build_network(study_of(*rows, customers=customers))
    assert (len(network.outbound) == 1) is exists
    assert (len(network.direct) == 1) is exists


def test_reach_forgives_rounding() -> None:
    """One part in 1e10 over the reach is still within."""
    customers = (replace(CUSTOMERS[0], reach_km=200.0),)
    rows = (outbound("Brno", "Linz", road_km=200 * (1 + 1e-10)),)
    assert len(build_network(study_of(*rows, customers=customers)).outbound) == 1


def test_inbound_has_no_reach() -> None:
    """The customer's reach of 1 km leaves the inbound lane of 133 km alone."""
    customers = (replace(CUSTOMERS[0], reach_km=1.0),)
    network = build_network(study_of(customers=customers))
    assert (len(network.inbound), len(network.outbound)) == (1, 0)


def test_direct_lanes_only_where_listed() -> None:
    """Coordinates alone make none; a blank row does, at the outbound rate, with delivery and price."""
    settings = replace(SETTINGS, drop_charge=40.0, drop_size=2.5)
    assert len(build_network(study_of(settings=settings)).direct) == 0
    lanes = build_network(study_of(direct("North", "Linz"), settings=settings)).direct
    two_degrees = lanes.km[0] / 1.2
    assert two_degrees == pytest.approx(2 * DEGREE_KM, rel=1e-10)
    assert lanes.cost == pytest.approx([two_degrees * 0.12 + 16 + 9], rel=1e-10)


def test_a_listed_direct_lane_needs_a_distance_or_a_cost() -> None:
    """A blank row to a customer without coordinates gives nothing."""
    assert len(build_network(study_of(direct("North", "Wels"))).direct) == 0
    assert build_network(study_of(direct("North", "Wels", unit_cost=6.0))).direct.cost.tolist() == [15.0]


def test_only_offered_goods_come_in() -> None:
    """Inbound and direct lanes only for offered pairs, at the offer's price; listed rows do not add others."""
    suppliers = (*SUPPLIERS, SupplierRow(supplier="South", latitude=-1.0, longitude=0.0))
    offers = (OfferRow(supplier="South", good="pots", unit_price=2.5),)
    rows = (
        LaneRow(leg=Leg.INBOUND, origin="North", destination="Brno", unit_cost=1.0),
        LaneRow(leg=Leg.INBOUND, origin="South", destination="Brno", unit_cost=1.0),
        direct("South", "Linz", unit_cost=1.0),
    )
    study = study_of(*rows, suppliers=suppliers, goods=TWO_GOODS, demands=BOTH, offers=offers)
    network = build_network(study)
    assert set(names(network, Leg.INBOUND)) == {("South", "Brno", "pots")}
    assert set(names(network, Leg.DIRECT)) == {("South", "Linz", "pots")}
    assert network.inbound.cost.tolist() == [2 * 1.0 + 2.5]
    assert network.direct.cost.tolist() == [2 * 1.0 + 2.5]


def test_only_demanded_goods_go_out() -> None:
    """A customer without demand for a good has no lane for it, listed or not."""
    demands = (DemandRow(customer="Linz", good="trees", demand=3.0),)
    rows = (outbound("Brno", "Linz", unit_cost=1.0), outbound("Brno", "Linz", good="pots", unit_cost=1.0))
    network = build_network(study_of(*rows, goods=TWO_GOODS, demands=demands))
    assert set(names(network, Leg.OUTBOUND)) == {("Brno", "Linz", "trees")}


def test_without_suppliers_goods_appear_at_the_sites() -> None:
    """No suppliers: no inbound lanes and nothing added to outbound."""
    network = build_network(study_of(suppliers=()))
    assert (len(network.inbound), len(network.direct), len(network.outbound)) == (0, 0, 1)
    assert not network.two_echelons


def test_without_sites_suppliers_deliver_straight() -> None:
    """No sites: direct lanes only."""
    network = build_network(study_of(direct("North", "Linz", unit_cost=6.0), sites=()))
    assert (len(network.inbound), len(network.outbound), len(network.direct)) == (0, 0, 1)
    assert network.most_sites == 0


def test_lanes_are_sorted_by_origin_destination_and_good() -> None:
    """Whatever the order of the rows, and with rows between estimated lanes."""
    rows = [outbound(site, customer, unit_cost=1.0) for site in ("Graz", "Brno") for customer in ("Wels", "Linz")]
    demands = tuple(
        DemandRow(customer=customer, good=good, demand=1.0)
        for good in ("trees", "pots")
        for customer in ("Wels", "Linz")
    )
    network = build_network(study_of(*rows, goods=TWO_GOODS, demands=demands))
    assert list(names(network, Leg.OUTBOUND)) == [
        (site, customer, good)
        for site in ("Brno", "Graz")
        for customer in ("Linz", "Wels")
        for good in ("pots", "trees")
    ]


@pytest.mark.parametrize(
    ("capacity", "exists"), [(29.99, False), (30 * (1 - 1e-10), True), (30.0, True), (30.01, True)]
)
def test_single_sourced_customer_needs_a_site_that_holds_it(capacity: float, exists: bool) -> None:  # noqa: FBT001 - a table of cases
    """A customer of 30 only from sites of 30 and more; one that may split keeps its lane."""
    sites = (replace(SITES[0], capacity=capacity),)
    single = (replace(CUSTOMERS[0], single_source=True),)
    assert (len(build_network(study_of(sites=sites, customers=single)).outbound) == 1) is exists
    assert len(build_network(study_of(sites=sites, customers=CUSTOMERS[:1])).outbound) == 1


def test_largest_size_decides_what_a_site_holds() -> None:
    """Sizes of 10 and 30 hold a customer of 30; sizes of 10 and 29 do not."""
    single = (replace(CUSTOMERS[0], single_source=True),)

    def lanes_with(large: float) -> int:
        sizes = (SizeRow(site="Brno", size="s", capacity=10), SizeRow(site="Brno", size="l", capacity=large))
        return len(build_network(study_of(sizes=sizes, customers=single)).outbound)

    assert (lanes_with(30), lanes_with(29)) == (1, 0)


def test_single_sourced_customer_is_held_with_all_its_goods() -> None:
    """3 pots of load 2 and 3 trees are a load of 9: a site of 8 has no lane, one of 9 has both."""
    single = (replace(CUSTOMERS[0], demand=None, single_source=True),)

    def lanes_with(capacity: float) -> int:
        sites = (replace(SITES[0], capacity=capacity),)
        return len(build_network(study_of(sites=sites, customers=single, goods=TWO_GOODS, demands=BOTH)).outbound)

    assert (lanes_with(8), lanes_with(9)) == (0, 2)


def test_single_sourced_customer_needs_a_lane_for_every_good() -> None:
    """With its trees barred, the site cannot be the only origin, so its pots have no lane either."""
    single = (replace(CUSTOMERS[0], demand=None, single_source=True),)
    bar = outbound("Brno", "Linz", good="trees", barred=True)
    assert len(build_network(study_of(bar, customers=single, goods=TWO_GOODS, demands=BOTH)).outbound) == 0


def test_single_sourced_customer_needs_a_supplier_that_delivers_it_whole() -> None:
    """Direct lanes exist where both the supplier's capacity in load and each offer's in units hold the customer."""
    single = (replace(CUSTOMERS[0], demand=None, single_source=True),)
    row = direct("North", "Linz", unit_cost=1.0)

    def lanes_with(capacity: float, pots: float) -> int:
        suppliers = (replace(SUPPLIERS[0], capacity=capacity),)
        offers = (
            OfferRow(supplier="North", good="pots", capacity=pots),
            OfferRow(supplier="North", good="trees", capacity=3.0),
        )
        study = study_of(row, suppliers=suppliers, customers=single, goods=TWO_GOODS, demands=BOTH, offers=offers)
        return len(build_network(study).direct)

    assert (lanes_with(9, 3), lanes_with(8.99, 3), lanes_with(9, 2.99)) == (2, 0, 0)


def test_single_sourced_customer_needs_one_supplier_that_offers_everything() -> None:
    """A supplier of pots alone is no origin for a customer who also needs trees."""
    single = (replace(CUSTOMERS[0], demand=None, single_source=True),)
    offers = (OfferRow(supplier="North", good="pots"),)
    study = study_of(
        direct("North", "Linz", unit_cost=1.0), customers=single, goods=TWO_GOODS, demands=BOTH, offers=offers
    )
    assert len(build_network(study).direct) == 0


def test_large_studies_build_fast() -> None:
    """200 sites x 10,000 customers from coordinates and 1,000,000 shuffled rows build in seconds, far from minutes."""
    draws = np.random.default_rng(3)
    sites = tuple(SiteRow(site=f"s{i}", latitude=45 + i / 100, longitude=10.0) for i in range(200))
    customers = tuple(
        CustomerRow(customer=f"c{j}", latitude=48.0, longitude=5 + j / 1000, demand=1.0) for j in range(10_000)
    )
    began = time.perf_counter()
    assert len(build_network(Study(settings=SETTINGS, sites=sites, customers=customers)).outbound) == 2_000_000
    row = draws.permutation(1_000_000).astype(np.int32)
    table = LaneTable(
        names=tuple(f"s{i}" for i in range(100)) + tuple(f"c{j}" for j in range(10_000)),
        origin=row // 10_000,
        destination=100 + row % 10_000,
        good=np.full(row.size, -1, dtype=np.int32),
        leg=np.full(row.size, LaneTable.LEGS.index(Leg.OUTBOUND), dtype=np.int32),
        road_km=row.astype(np.float64) + 1.0,
        unit_cost=np.full(row.size, np.nan),
        barred=np.zeros(row.size, dtype=np.bool_),
        row=np.arange(2, row.size + 2, dtype=np.int32),
    )
    study = Study(settings=SETTINGS, sites=sites[:100], customers=customers, lanes=table)
    lanes = build_network(study).outbound
    assert time.perf_counter() - began < 30
    assert np.array_equal(lanes.km, np.arange(1.0, 1_000_001.0))
    assert bool(lanes.km_given.all())
