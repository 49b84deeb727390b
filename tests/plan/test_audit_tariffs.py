"""The audit reads tariffs on its own: it agrees with the network throughout, and objects when either is off."""

from __future__ import annotations

import random
import re
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
import pytest

from siting.network import freight, tariffs
from siting.network.network import build_network
from siting.plan.audit import audit
from siting.plan.audit_tariffs import Haul, TariffBook
from siting.plan.freight_words import tariff_sentence
from siting.plan.words import delivery_sentence
from siting.study.tables import CustomerRow, Leg, SiteRow, Study, SupplierRow, TariffBasis, TariffRow
from tests.building import lane_table
from tests.plan import hand

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.plan.plan import Flow, Plan

ROWS = (
    TariffRow(tariff="Road", basis=TariffBasis.PER_DELIVERY, rate=70.0, leg=Leg.OUTBOUND, to_km=150.0, row=2),
    TariffRow(
        tariff="Road", basis=TariffBasis.PER_UNIT, rate=30.0, minimum=90.0, leg=Leg.OUTBOUND, from_km=150.0, row=3
    ),
    TariffRow(
        tariff="Truck", basis=TariffBasis.PER_TRUCK_KM, rate=1.3, truck_load=24.0, fill=0.8, leg=Leg.INBOUND, row=4
    ),
)
STUDY = replace(hand.STUDY, tariffs=ROWS)
PLAN = hand.plan_of(STUDY)


def faults(plan: Plan, study: Study = STUDY) -> str:
    """Return what the audit says."""
    return "\n".join(audit(study, plan).faults)


def changed(flow: Callable[[Flow], Flow]) -> Plan:
    """Return the plan with its first outbound flow over a tariff changed."""
    at = next(n for n, held in enumerate(PLAN.flows) if held.tariff == "Road")
    return replace(PLAN, flows=(*PLAN.flows[:at], flow(PLAN.flows[at]), *PLAN.flows[at + 1 :]))


def test_a_plan_priced_by_tariffs_passes() -> None:
    """Tariffs price most lanes, `lanes` and rates the others, and the flow says which."""
    assert faults(PLAN) == ""
    assert {flow.tariff for flow in PLAN.flows} == {"Road", "Truck", ""}
    assert all((flow.tariff == "Truck") is (flow.leg is Leg.INBOUND) for flow in PLAN.flows)
    own = [flow for flow in PLAN.flows if flow.origin == "Brno" and flow.destination == "Vienna"]
    assert [flow.tariff for flow in own] == ["", ""]


def test_a_flow_by_another_tariff_is_caught() -> None:
    """A flow said to go by no tariff, by one that does not exist, or by one that does not fit."""
    for name in ("", "Rail", "Truck"):
        plan = changed(lambda flow, name=name: replace(flow, tariff=name))  # type: ignore[misc]  # bound at once
        assert re.search(rf"is stated to go by tariff '{name}', the tables give 'Road'", faults(plan))


FORMULAS: list[tuple[str, str, Callable[[Any], Any]]] = [
    ("minimum and rate", "_prices", lambda price: price * 1.01),
    ("full trucks", "_truck", lambda load: load * 1.25),
    ("size of deliveries", "delivery_sizes", lambda size: size * 2),
    ("rank of rows", "_particular", lambda rank: (*(not part for part in rank[:3]), -rank[3])),
    ("countries", "_countries", lambda found: (found[0], np.zeros_like(found[1]))),
]


@pytest.mark.parametrize(("name", "change"), [pytest.param(*case[1:], id=case[0]) for case in FORMULAS])
def test_a_corrupted_tariff_formula_is_caught(
    monkeypatch: pytest.MonkeyPatch, name: str, change: Callable[[Any], Any]
) -> None:
    """Each formula of the network's tariffs, off by itself, gives a plan that the audit refuses."""
    zone = {"to_country": "SK", "to_km": 150.0, "leg": Leg.OUTBOUND}
    extra = TariffRow(tariff="Road", basis=TariffBasis.PER_DELIVERY, rate=60.0, **zone)  # type: ignore[arg-type]  # by name
    wide = TariffRow(tariff="Road", basis=TariffBasis.PER_UNIT, rate=99.0, to_km=900.0)
    countries = ["AT", "AT", "SK", "CZ"]
    customers = tuple(replace(row, country=country) for row, country in zip(hand.CUSTOMERS, countries, strict=True))
    settings = replace(hand.SETTINGS, inbound_size=20.0)
    study = replace(STUDY, settings=settings, tariffs=(*ROWS, extra, wide), customers=customers)
    assert faults(hand.plan_of(study), study) == ""
    right: Any = getattr(tariffs, name)
    monkeypatch.setattr(tariffs, name, lambda *given: change(right(*given)))
    assert re.search(r"cost line (inbound|outbound) is stated as|to go by tariff", faults(hand.plan_of(study), study))


def test_a_delivery_charge_on_top_of_a_tariff_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """A tariff takes in the delivery; the network charges it as well when it takes every lane for one at the rates."""
    monkeypatch.setattr(freight, "NO_TARIFF", 0)
    assert re.search(r"cost line delivery is stated as", faults(hand.plan_of(STUDY)))


def random_study(seed: int) -> Study:
    """Return a study of all three legs with random tariffs that never fit one lane twice."""
    draw = random.Random(seed)  # noqa: S311  # cases, not secrets
    countries = ("AT", "DE", "CZ", "")
    edges = sorted(draw.sample(range(1, 700), 3))
    bands = [(0, edges[0]), (edges[0], edges[1]), (edges[1], edges[2]), (edges[2], None)]
    rows = []
    for tariff in ("Road", "Rail", "Van"):
        for leg in draw.sample([None, *Leg], 2):
            for start, stop in {(draw.choice(countries), draw.choice(countries)) for _ in range(3)}:
                for size in draw.sample((0.0, 1.0, 3.0), 2):
                    for low, high in draw.sample(bands, 3):
                        basis = draw.choice(list(TariffBasis))
                        by_truck = basis in {TariffBasis.PER_TRUCK, TariffBasis.PER_TRUCK_KM}
                        rows.append(
                            TariffRow(
                                tariff=tariff, leg=leg, from_country=start, to_country=stop, from_km=float(low),
                                to_km=None if high is None else float(high), from_size=size, basis=basis,
                                rate=draw.uniform(0.1, 60), minimum=draw.choice((0.0, 40.0)),
                                truck_load=24.0 if by_truck else None,
                                fill=draw.choice((None, 0.7)) if by_truck else None,
                            )
                        )  # fmt: skip

    def place() -> dict[str, Any]:
        return {
            "country": draw.choice(countries), "latitude": draw.uniform(46, 51), "longitude": draw.uniform(9, 19),
        }  # fmt: skip

    return replace(
        hand.STUDY,
        settings=replace(hand.SETTINGS, inbound_size=draw.uniform(1, 9)),
        sites=tuple(SiteRow(site=f"S{n}", **place()) for n in range(4)),
        suppliers=tuple(SupplierRow(supplier=f"K{n}", **place()) for n in range(3)),
        customers=tuple(
            CustomerRow(customer=f"C{n}", demand=1.0, drop_size=draw.choice((None, 0.5, 1.0, 4.0)), **place())
            for n in range(6)
        ),
        sizes=(), goods=(), demands=(), offers=(), rules=(), tariffs=tuple(rows),
    )  # fmt: skip


@pytest.mark.parametrize("seed", range(12))
def test_network_and_audit_read_tariffs_alike(seed: int) -> None:
    """On random tariffs with zones, bands, breaks and every basis, both name the same price for every lane."""
    study = random_study(seed)
    network, book = build_network(replace(study, lanes=lane_table([]))), TariffBook(study)
    priced = 0
    for leg, lanes, starts, stops in (
        (Leg.INBOUND, network.inbound, network.suppliers, network.sites),
        (Leg.OUTBOUND, network.outbound, network.sites, network.customers),
    ):
        for n in range(len(lanes)):
            haul = Haul(
                leg=leg, origin=starts[lanes.origin[n]], destination=stops[lanes.destination[n]], km=float(lanes.km[n])
            )  # fmt: skip
            charges = book.charges(haul)
            assert bool(lanes.tariff[n] >= 0) is bool(charges)
            if charges:
                priced += 1
                assert lanes.freight[n] == pytest.approx(min(charges.values()), rel=1e-12)
                assert charges[network.tariffs[lanes.tariff[n]]] == pytest.approx(min(charges.values()), rel=1e-12)
    assert priced > 5


def test_the_plan_says_what_its_freight_rests_on() -> None:
    """Shares by tariff, the size of a delivery, what is left out, and a warning of what no tariff fits."""
    sentence = tariff_sentence(STUDY, PLAN)
    assert re.search(r"by tariff: Road [\d.]+ %, Truck [\d.]+ %; [\d.]+ % by lanes or rates\.", sentence)
    assert "every delivery at one size (2.5 t to customers)" in sentence
    assert "deliveries declared larger to reach a cheaper break are left out" in sentence
    assert any("of all load moved fits no tariff and goes at the rates" in warning for warning in PLAN.warnings)
    assert tariff_sentence(hand.STUDY, hand.plan_of()) == ""
    assert delivery_sentence(STUDY, PLAN) == ""


def test_sizes_are_told_as_they_are_set() -> None:
    """Customers' own sizes and the inbound one are named; without any, freight is in proportion."""
    own = tuple(replace(row, drop_size=size) for row, size in zip(hand.CUSTOMERS, (1.0, 2.0, 3.0, None), strict=True))
    study = replace(STUDY, customers=own, settings=replace(hand.SETTINGS, inbound_size=24.0))
    assert "(2.5 t to customers, 1 to 3 t to those with a drop_size of their own, 24 t inbound)" in tariff_sentence(
        study, PLAN
    )
    bare = replace(STUDY, settings=replace(hand.SETTINGS, drop_size=None, drop_charge=0.0))
    assert "(where none is set, in proportion to the load)" in tariff_sentence(bare, PLAN)
