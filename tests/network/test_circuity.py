"""Estimated distances by country: within one, between two, and where nothing is said."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from siting.network.distance import geodesic_km
from siting.network.network import build_network
from siting.plan.audit import audit
from siting.study.settings import Settings
from siting.study.tables import CircuityRow, CustomerRow, SiteRow, Study, SupplierRow
from tests.plan import hand

STRAIGHT_KM = float(geodesic_km(48.31, 14.29, 48.21, 16.37))
ROWS = (
    CircuityRow(country="AT", circuity=1.2),
    CircuityRow(country="Germany", circuity=1.6),
    CircuityRow(country="CZ", other_country="AT", circuity=1.9),
)


def factor(start: str, stop: str, rows: tuple[CircuityRow, ...] = ROWS) -> float:
    """Return road km over straight km from a site in one country to a customer in another."""
    study = Study(
        settings=Settings(currency="EUR", unit="t", circuity=1.3),
        sites=(SiteRow(site="Linz", latitude=48.31, longitude=14.29, country=start),),
        customers=(CustomerRow(customer="Vienna", latitude=48.21, longitude=16.37, country=stop, demand=1.0),),
        circuity=rows,
    )
    return float(build_network(study).outbound.km[0]) / STRAIGHT_KM


@pytest.mark.parametrize(
    ("start", "stop", "expected"),
    [
        ("AT", "Austria", 1.2),
        ("AT", "DE", 1.4),
        ("DE", "AT", 1.4),
        ("AT", "CZ", 1.9),
        ("CZ", "AT", 1.9),
        ("CZ", "CZ", 1.3),
        ("CZ", "DE", 1.45),
        ("DE", "", 1.45),
        ("", "", 1.3),
    ],
)
def test_each_pair_of_countries(start: str, stop: str, expected: float) -> None:
    """Own row, row of the pair in either order, mean of both ends, of which one may go by the settings."""
    assert factor(start, stop) == pytest.approx(expected, rel=1e-12)


def test_without_the_table_countries_do_not_matter() -> None:
    """The circuity of the settings holds everywhere."""
    assert factor("AT", "DE", ()) == pytest.approx(1.3, rel=1e-12)


def test_the_audit_finds_the_same_factors_by_itself(monkeypatch: pytest.MonkeyPatch) -> None:
    """A plan over four countries passes, and fails where the network takes another factor."""
    countries = ("AT", "DE", "CZ", "")
    study = replace(
        hand.STUDY,
        circuity=ROWS,
        sites=tuple(replace(row, country=at) for row, at in zip(hand.SITES, countries, strict=True)),
        customers=tuple(replace(row, country=at) for row, at in zip(hand.CUSTOMERS, countries[::-1], strict=True)),
        suppliers=tuple(replace(row, country=at) for row, at in zip(hand.SUPPLIERS, ("CZ", "AT", "DE"), strict=True)),
    )
    study = replace(study, settings=replace(study.settings, service_share=0.1))
    customers = tuple(replace(row, reach_km=None) for row in study.customers)
    study = replace(study, customers=customers)
    assert audit(study, hand.plan_of(study)).faults == ()
    monkeypatch.setattr("siting.network.legs.factors_between", lambda *_: np.full((9, 9), 1.3))
    assert "km long, the tables give" in "\n".join(audit(study, hand.plan_of(study)).faults)


def test_a_published_route_by_its_published_factor() -> None:
    """Newport to Cleveland, 866.455 km on WGS84 (geopy's documentation), times 1.20 for the US."""
    study = Study(
        settings=Settings(currency="USD", unit="t", circuity=1.3),
        suppliers=(SupplierRow(supplier="Newport", latitude=41.49008, longitude=-71.312796, country="US"),),
        sites=(SiteRow(site="Cleveland", latitude=41.499498, longitude=-81.695391, country="USA"),),
        customers=(CustomerRow(customer="Anyone", demand=1.0),),
        circuity=(CircuityRow(country="US", circuity=1.2),),
    )
    assert build_network(study).inbound.km == pytest.approx([866.455433 * 1.2], abs=1e-5)
