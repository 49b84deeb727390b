"""Freight as it is quoted: each basis by a number worked out by hand, and which row and tariff price a lane."""

from __future__ import annotations

import time
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest

from siting.network.network import build_network
from siting.network.tariffs import NO_TARIFF, OWN_COST
from siting.study.settings import Settings
from siting.study.tables import (
    CustomerRow,
    GoodRow,
    Leg,
    SiteRow,
    Study,
    SupplierRow,
    TariffBasis,
    TariffRow,
)
from tests.building import LaneRow, lane_table

if TYPE_CHECKING:
    from siting.network.freight import LegLanes

SETTINGS = Settings(currency="EUR", unit="t", outbound_rate=0.5, inbound_rate=0.25, drop_charge=48.0, drop_size=2.0)


def row(basis: str, rate: float, **values: object) -> TariffRow:
    """Return a row of the tariff `Road`, unless another is named."""
    return TariffRow(**{"tariff": "Road", "basis": TariffBasis(basis), "rate": rate, **values})  # type: ignore[arg-type]  # fields by name


def study_of(*tariffs: TariffRow, km: float = 100.0, load: float = 1.0, **tables: object) -> Study:
    """Return a study of one supplier in CZ, one site in AT and one customer in DE, both legs of the same length."""
    lanes = (
        LaneRow(leg=Leg.INBOUND, origin="Farm", destination="Linz", road_km=km),
        LaneRow(leg=Leg.OUTBOUND, origin="Linz", destination="Munich", road_km=km),
    )
    given = {
        "settings": SETTINGS,
        "suppliers": (SupplierRow(supplier="Farm", country="CZ"),),
        "sites": (SiteRow(site="Linz", country="AT"),),
        "customers": (CustomerRow(customer="Munich", country="Germany", demand=10.0),),
        "goods": (GoodRow(good="pots", load=load),),
        "lanes": lane_table(lanes),
        **tables,
    }
    return Study(tariffs=tariffs, **given)  # type: ignore[arg-type]  # tables by name


def outbound(study: Study) -> LegLanes:
    """Return the one outbound lane."""
    return build_network(study).outbound


@pytest.mark.parametrize(
    ("tariff", "per_load"),
    [
        (row("per_unit_km", 0.3), 30.0),
        (row("per_unit_km", 0.3, minimum=59.0), 30.0),
        (row("per_unit_km", 0.3, minimum=61.0), 30.5),
        (row("per_unit", 25.0), 25.0),
        (row("per_unit", 25.0, minimum=49.9), 25.0),
        (row("per_unit", 25.0, minimum=50.1), 25.05),
        (row("per_delivery", 90.0), 45.0),
        (row("per_delivery", 90.0, minimum=100.0), 50.0),
        (row("per_truck", 480.0, truck_load=24.0), 20.0),
        (row("per_truck", 480.0, truck_load=24.0, fill=0.8), 25.0),
        (row("per_truck_km", 1.2, truck_load=24.0, fill=0.5), 10.0),
        (row("per_truck_km", 1.2, truck_load=24.0, fill=0.5, minimum=240.0), 20.0),
    ],
)
def test_each_basis_is_what_it_says(tariff: TariffRow, per_load: float) -> None:
    """Over 100 km at deliveries of 2 t: a charge is divided by what is delivered; a good of load 3 pays three times."""
    lanes = outbound(study_of(tariff))
    assert lanes.freight == pytest.approx([per_load], rel=1e-12)
    assert lanes.delivery.tolist() == [0.0]
    assert lanes.tariff.tolist() == [0]
    assert outbound(study_of(tariff, load=3.0)).freight == pytest.approx([3 * per_load], rel=1e-12)


def test_unit_cost_comes_first_then_tariffs_then_rates() -> None:
    """`lanes.unit_cost` beats a tariff, a tariff beats rate and delivery charge, which price what no tariff fits."""
    plain = study_of()
    assert outbound(plain).freight.tolist() == [50.0]
    assert outbound(plain).delivery.tolist() == [24.0]
    assert outbound(plain).tariff.tolist() == [NO_TARIFF]
    tariff = row("per_unit", 25.0)
    far = outbound(study_of(replace(tariff, from_km=100.0)))
    assert (far.freight.tolist(), far.delivery.tolist()) == ([50.0], [24.0])
    costed = (LaneRow(leg=Leg.OUTBOUND, origin="Linz", destination="Munich", road_km=100.0, unit_cost=7.0),)
    own = outbound(study_of(tariff, lanes=lane_table(costed)))
    assert (own.freight.tolist(), own.delivery.tolist(), own.tariff.tolist()) == ([7.0], [0.0], [OWN_COST])


@pytest.mark.parametrize(
    ("km", "price"), [(0.0, 1.0), (99.9, 1.0), (100.0, 1.0), (100.1, 2.0), (300.0, 2.0), (300.1, 50.0 * 300.1 / 100)]
)
def test_bands_hold_their_upper_end(km: float, price: float) -> None:
    """0 to 100, above 100 to 300, and beyond it the rates of the settings; 0 km is in the first band."""
    bands = row("per_unit", 1.0, to_km=100.0), row("per_unit", 2.0, from_km=100.0, to_km=300.0)
    assert outbound(study_of(*bands, km=km)).freight == pytest.approx([price], rel=1e-12)


@pytest.mark.parametrize(("size", "price"), [(1.9, 9.0), (2.0, 6.0), (2.1, 6.0), (4.9, 6.0), (5.0, 4.0), (99.0, 4.0)])
def test_weight_breaks_hold_their_lower_end(size: float, price: float) -> None:
    """From 0, from 2 and from 5 t a delivery; a customer's own drop_size goes before that of the settings."""
    breaks = row("per_unit", 9.0), row("per_unit", 6.0, from_size=2.0), row("per_unit", 4.0, from_size=5.0)
    customer = CustomerRow(customer="Munich", demand=10.0, drop_size=size)
    assert outbound(study_of(*breaks, customers=(customer,))).freight == pytest.approx([price], rel=1e-12)


def test_the_delivery_charge_goes_by_the_size_too() -> None:
    """48 a delivery of 6 t is 8 a ton where no tariff fits."""
    customer = CustomerRow(customer="Munich", demand=10.0, drop_size=6.0)
    assert outbound(study_of(customers=(customer,))).delivery.tolist() == [8.0]


def test_the_more_particular_row_of_a_tariff_wins() -> None:
    """Leg before destination before origin before size, whatever the prices and the order of the rows."""
    rows = [
        row("per_unit", 1.0, from_size=2.0),
        row("per_unit", 2.0, from_country="AT"),
        row("per_unit", 3.0, to_country="DE"),
        row("per_unit", 4.0, leg=Leg.OUTBOUND),
        row("per_unit", 5.0, leg=Leg.OUTBOUND, from_country="Austria", to_country="DEU"),
    ]
    for count in range(1, 6):
        for given in (rows[:count], rows[count - 1 :: -1]):
            assert outbound(study_of(*given)).freight.tolist() == [float(count)]
    other = row("per_unit", 9.0, leg=Leg.OUTBOUND, to_country="FR"), row("per_unit", 9.0, leg=Leg.DIRECT)
    assert outbound(study_of(*other)).tariff.tolist() == [NO_TARIFF]


def test_the_cheapest_tariff_prices_the_lane() -> None:
    """Of two that cost the same the first by name; which one is told by position among the names."""
    dear = row("per_unit", 9.0, tariff="A"), row("per_unit", 8.0, tariff="C")
    network = build_network(study_of(*dear, row("per_unit", 8.0, tariff="B")))
    assert network.tariffs == ("A", "B", "C")
    assert network.outbound.tariff.tolist() == [1]
    assert network.outbound.freight.tolist() == [8.0]


def test_inbound_goes_by_its_own_size() -> None:
    """A charge of 60 for a shipment of 20 t is 3 a ton; there is no delivery charge to replace."""
    settings = replace(SETTINGS, inbound_size=20.0)
    network = build_network(study_of(row("per_delivery", 60.0), settings=settings))
    assert network.inbound.freight.tolist() == [3.0]
    assert network.outbound.freight.tolist() == [30.0]


def test_a_lane_without_distance_fits_no_tariff() -> None:
    """It has a unit_cost, or it would not be there."""
    costed = (LaneRow(leg=Leg.OUTBOUND, origin="Linz", destination="Munich", unit_cost=7.0),)
    lanes = outbound(study_of(row("per_unit", 1.0), lanes=lane_table(costed)))
    assert (lanes.freight.tolist(), lanes.tariff.tolist()) == ([7.0], [OWN_COST])


def test_many_lanes_take_no_long_time() -> None:
    """200 x 2,000 lanes over five countries with a tariff of 25 zones, ten bands and four breaks: 1,000 rows."""
    countries, rng = ("AT", "DE", "CZ", "HU", "SK"), np.random.default_rng(1)
    rows = [
        row(
            "per_unit", 1.0 + band, from_country=start, to_country=stop, from_size=2.0 * size,
            from_km=100.0 * band, to_km=100.0 * (band + 1) if band < 9 else None,
        )
        for start in countries for stop in countries for band in range(10) for size in range(4)
    ]  # fmt: skip
    sites = tuple(
        SiteRow(site=f"S{n}", country=countries[n % 5], latitude=rng.uniform(45, 52), longitude=rng.uniform(8, 20))
        for n in range(200)
    )
    customers = tuple(
        CustomerRow(
            customer=f"C{n}", country=countries[n % 5], demand=1.0, drop_size=rng.uniform(0.1, 9),
            latitude=rng.uniform(45, 52), longitude=rng.uniform(8, 20),
        )
        for n in range(2000)
    )  # fmt: skip
    without = Study(settings=SETTINGS, sites=sites, customers=customers)
    started = time.process_time()
    build_network(without)
    plain = time.process_time() - started
    started = time.process_time()
    network = build_network(replace(without, tariffs=tuple(rows)))
    assert time.process_time() - started < plain + 3.0
    assert (network.outbound.tariff == 0).all()
    assert network.outbound.freight == pytest.approx(np.minimum(np.ceil(network.outbound.km / 100), 10))
