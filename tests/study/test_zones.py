"""Zones: where they lie, what they need, and what keeps customers apart."""

from __future__ import annotations

import time
from dataclasses import replace

import numpy as np
import pytest

from siting.errors import DataFileError
from siting.study.settings import Settings
from siting.study.tables import CircuityRow, CustomerRow, DemandRow, GoodRow, Leg, SiteRow, Study
from siting.study.zones import NO_ZONE, Zoned, zone_study
from tests.building import LaneRow, lane_rows, lane_table


def customer(name: str, longitude: float, demand: float = 1.0, **values: object) -> CustomerRow:
    """Return a customer on the equator."""
    given = {"latitude": 0.0, "longitude": longitude, "demand": demand, **values}
    return CustomerRow(customer=name, **given)  # type: ignore[arg-type]  # cells by name


def study_of(*customers: CustomerRow, **tables: object) -> Study:
    """Return a study with one site."""
    given = {
        "settings": Settings(currency="EUR", unit="t", outbound_rate=0.2),
        "sites": (SiteRow(site="Linz"),),
        **tables,
    }
    return Study(customers=customers, **given)  # type: ignore[arg-type]  # tables by name


WEST = (customer("A", 0.0, 3.0), customer("B", 4.0, 1.0))
EAST = (customer("C", 100.0, 2.0), customer("D", 101.0, 2.0), customer("E", 102.0, 6.0))


def zones(zoned: Zoned) -> dict[str, CustomerRow]:
    """Return the zones by name."""
    return {row.customer: row for row in zoned.study.customers}


def test_a_zone_lies_at_its_demand_weighted_centre_and_needs_all_of_it() -> None:
    """A 3 and B 1 at 0 and 4 degrees on the equator lie together at 1 degree (to the curvature of 4 degrees)."""
    zoned = zone_study(study_of(*WEST, *EAST), count=2)
    west, east = zones(zoned)["A +1"], zones(zoned)["E +2"]
    assert west.latitude == pytest.approx(0)
    assert [west.longitude, east.longitude] == pytest.approx([1.0, 101.4], abs=1e-3)
    assert [west.demand, east.demand] == [4.0, 10.0]
    assert zoned.zone.tolist() == [0, 0, 1, 1, 1]
    assert zoned.notes == ("5 customers in 2 zones, the largest of 3 customers.",)


def test_enough_zones_change_nothing_but_names_of_customers_at_one_point() -> None:
    """Customers at one point are one zone even then."""
    zoned = zone_study(study_of(*WEST, customer("F", 4.0, 5.0)), count=9)
    assert set(zones(zoned)) == {"A", "F +1"}
    assert zones(zoned)["A"] == replace(WEST[0], row=2)


def test_goods_are_kept_apart() -> None:
    """Demands by good are summed good by good; centres go by load."""
    goods = GoodRow(good="pots", load=1.0), GoodRow(good="trees", load=4.0)
    needs = DemandRow(customer="A", good="pots", demand=4.0), DemandRow(customer="B", good="trees", demand=3.0)
    more = DemandRow(customer="B", good="pots", demand=2.0), DemandRow(customer="C", good="pots", demand=0.0)
    rows = (customer("A", 0.0), customer("B", 4.0), customer("C", 8.0))
    study = study_of(*(replace(row, demand=None) for row in rows), goods=goods, demands=(*needs, *more))
    zoned = zone_study(study, count=1)
    assert {(row.customer, row.good): row.demand for row in zoned.study.demands} == {
        ("B +1", "pots"): 6.0,
        ("B +1", "trees"): 3.0,
    }
    assert zones(zoned)["B +1"].longitude == pytest.approx(4 * 14 / 18, abs=1e-3)
    assert zoned.zone.tolist() == [0, 0, NO_ZONE]
    assert "1 customers that need nothing are left out." in zoned.notes


def test_reach_and_single_sourcing_follow_their_rule() -> None:
    """The shortest reach holds; single-sourced customers have zones of their own, even where one zone was asked for."""
    rows = (
        customer("A", 0.0, reach_km=300.0), customer("B", 1.0, reach_km=200.0), customer("C", 2.0),
        customer("D", 0.5, 9.0, single_source=True),
    )  # fmt: skip
    zoned = zone_study(study_of(*rows), count=1)
    assert {name: (row.reach_km, row.single_source) for name, row in zones(zoned).items()} == {
        "A +2": (200.0, None),
        "D": (None, True),
    }
    assert any("shortest of its customers" in note for note in zoned.notes)
    assert any("zones of their own" in note for note in zoned.notes)


def test_countries_stay_apart_where_freight_goes_by_them() -> None:
    """Without tariffs or circuity by country a zone crosses borders and takes the country of most load."""
    rows = (
        customer("A", 0.0, 3.0, country="AT"),
        customer("B", 1.0, 2.0, country="DE"),
        customer("C", 2.0, 2.0, country="DE"),
    )
    across = zones(zone_study(study_of(*rows), count=1))
    assert {name: row.country for name, row in across.items()} == {"A +2": "DE"}
    apart = zones(zone_study(study_of(*rows, circuity=(CircuityRow(country="AT", circuity=1.2),)), count=1))
    assert {name: row.country for name, row in apart.items()} == {"A": "AT", "B +1": "DE"}


def test_the_number_of_deliveries_is_kept() -> None:
    """6 t in drops of 2 and 4 t in drops of 1 are 7 deliveries of 10/7 t; a blank counts as the settings' size."""
    rows = customer("A", 0.0, 6.0, drop_size=2.0), customer("B", 1.0, 4.0, drop_size=1.0)
    assert zones(zone_study(study_of(*rows), count=1))["A +1"].drop_size == pytest.approx(10 / 7)
    mixed = study_of(rows[0], replace(rows[1], drop_size=None))
    assert zones(zone_study(mixed, count=1))["A +1"].drop_size is None
    sized = replace(mixed, settings=replace(mixed.settings, drop_charge=9.0, drop_size=1.0))
    assert zones(zone_study(sized, count=1))["A +1"].drop_size == pytest.approx(10 / 7)


def test_groups_by_place_and_by_the_start_of_a_column() -> None:
    """One zone a place or postcode area; blanks stay alone; with a number of zones, near groups are put together."""
    rows = (
        customer("A", 0.0, place="Linz", attributes={"postcode": "4020"}),
        customer("B", 1.0, place="linz ", attributes={"postcode": "4040"}),
        customer("C", 50.0, attributes={"postcode": "8010"}),
        customer("D", 51.0, attributes={"postcode": ""}),
    )
    study = study_of(*rows)
    assert zone_study(study, by="place").zone.tolist() == [0, 0, 1, 2]
    assert zone_study(study, by="postcode:2").zone.tolist() == [0, 0, 1, 2]
    assert zone_study(study, by="postcode").zone.tolist() == [0, 1, 2, 3]
    assert zone_study(study, by="postcode", count=2).zone.tolist() == [0, 0, 1, 1]
    bare = study_of(*(replace(row, latitude=None, longitude=None) for row in rows))
    assert zones(zone_study(bare, by="place"))["A +1"].latitude is None


@pytest.mark.parametrize(
    ("by", "count", "message"),
    [
        ("sphere", None, r"the number of zones is None; give a whole number of at least 1, such as --zones 150"),
        ("place", 0, r"the number of zones is 0"),
        ("postcode", 5, r"'postcode' is neither sphere nor place nor a column .* the columns to group by are region"),
        ("region:x", 5, r"'region:x' is neither sphere nor place"),
        ("sphere", 1, r"customer 'B' has no coordinates to group by"),
        ("region", 1, r"customer 'B' has no coordinates, so that its group cannot be put together"),
    ],
)
def test_what_cannot_be_grouped_is_refused(by: str, count: int | None, message: str) -> None:
    """Each error names the repair."""
    rows = customer("A", 0.0, attributes={"region": "west"}), customer("B", 1.0, attributes={"region": "east"})
    study = study_of(rows[0], replace(rows[1], latitude=None, longitude=None))
    with pytest.raises(DataFileError, match=message):
        zone_study(study, count=count, by=by)


def lane(destination: str, leg: Leg = Leg.OUTBOUND, **values: object) -> LaneRow:
    """Return a lane from Linz or, inbound, to it."""
    ends = ("Farm", "Linz") if leg is Leg.INBOUND else ("Linz", destination)
    return LaneRow(leg=leg, origin=ends[0], destination=ends[1], **values)  # type: ignore[arg-type]  # cells by name


def test_lanes_to_customers_become_lanes_to_zones() -> None:
    """Means by load where every customer of the zone has a row; barred where all are; the rest is counted."""
    lanes = (
        lane("", Leg.INBOUND, road_km=7.0),
        lane("A", road_km=10.0, unit_cost=2.0), lane("B", road_km=30.0),
        lane("C", barred=True), lane("D", barred=True), lane("E", barred=True),
        lane("A", good="pots", unit_cost=4.0), lane("B", good="pots", unit_cost=8.0),
        lane("C", good="pots", road_km=1.0),
    )  # fmt: skip
    study = study_of(*WEST, *EAST, goods=(GoodRow(good="pots"),), lanes=lane_table(lanes))
    zoned = zone_study(study, count=2)
    assert lane_rows(zoned.study.lanes) == (
        lane("", Leg.INBOUND, road_km=7.0),
        lane("A +1", road_km=15.0),
        lane("E +2", barred=True),
        lane("A +1", good="pots", unit_cost=5.0),
    )
    assert any(note.startswith("1 rows of lanes are left out") for note in zoned.notes)


def test_a_bar_on_some_of_a_zone_is_left_out() -> None:
    """A lane that only a part of the zone may use is neither given nor barred, and counted."""
    study = study_of(*WEST, lanes=lane_table([lane("A", road_km=10.0), lane("B", barred=True)]))
    zoned = zone_study(study, count=1)
    assert len(zoned.study.lanes) == 0
    assert any(note.startswith("2 rows of lanes are left out") for note in zoned.notes)


def test_a_name_that_is_taken_is_changed() -> None:
    """A customer may be called as a zone would be."""
    assert set(zones(zone_study(study_of(*WEST, customer("A +1", 150.0)), count=2))) == {"A +1'", "A +1"}


def test_a_hundred_thousand_customers_take_no_long_time() -> None:
    """The target is ten seconds for 200 zones on a machine at rest; here processor time, with the load all kept."""
    draw = np.random.default_rng(3)
    weight = draw.lognormal(0, 1, 100_000)
    places = np.stack([draw.normal(48, 3, 100_000), draw.normal(12, 4, 100_000), weight], axis=1).tolist()
    rows = [
        CustomerRow(customer=f"C{n}", latitude=north, longitude=east, demand=demand)
        for n, (north, east, demand) in enumerate(places)
    ]
    started = time.process_time()
    zoned = zone_study(study_of(*rows), count=200)
    assert time.process_time() - started < 10.0
    assert len(zoned.study.customers) == 200
    assert sum(row.demand or 0.0 for row in zoned.study.customers) == pytest.approx(weight.sum())
