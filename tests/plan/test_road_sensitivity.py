"""What longer and shorter roads do to a plan's freight: re-priced, and told where most of the load is estimated."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from siting.plan.draw_up import MOST_OF_THE_LOAD
from siting.plan.freight_words import circuity_words
from siting.plan.plan import CostLine, Plan
from siting.plan.pricing import moves_of
from siting.plan.road_sensitivity import road_sensitivity
from siting.study.tables import CircuityRow, Leg, TariffBasis, TariffRow
from tests.building import lane_table
from tests.plan import hand

ESTIMATED = replace(hand.STUDY, lanes=lane_table([row for row in hand.LANES if row.leg is Leg.DIRECT]))
SETTINGS = replace(hand.SETTINGS, service_share=0.1)


def at_factor(share: float) -> Plan:
    """Return the plan's flows drawn up at another circuity."""
    settings = replace(SETTINGS, circuity=hand.SETTINGS.circuity * share)
    customers = tuple(replace(row, reach_km=None) for row in hand.CUSTOMERS)
    study = replace(ESTIMATED, settings=settings, customers=customers)
    return hand.plan_of(study)


def test_it_is_what_the_same_flows_cost_at_another_circuity() -> None:
    """At 10 % more and less, freight and carbon of estimated lanes; the given direct lane stays as it is."""
    case = hand.case_of(ESTIMATED)
    found = road_sensitivity(ESTIMATED, case.network, moves_of(ESTIMATED, case.network, case.amounts))
    assert found.longer == pytest.approx(at_factor(1.1).cost - at_factor(1.0).cost, rel=1e-9)
    assert found.shorter == pytest.approx(at_factor(0.9).cost - at_factor(1.0).cost, rel=1e-9)
    assert found.longer == pytest.approx(-found.shorter, rel=1e-9)


def test_bands_of_a_tariff_are_looked_up_anew() -> None:
    """A zone that is left by 10 % more distance costs what the next zone does, not 10 % more."""
    rows = (
        TariffRow(tariff="Zones", basis=TariffBasis.PER_UNIT, rate=10.0, leg=Leg.OUTBOUND, to_km=150.0),
        TariffRow(tariff="Zones", basis=TariffBasis.PER_UNIT, rate=50.0, leg=Leg.OUTBOUND, from_km=150.0),
    )
    free = replace(hand.SETTINGS, carbon_price_per_t=0.0, inbound_rate=0.0)
    study = replace(ESTIMATED, tariffs=rows, settings=free)
    case = hand.case_of(study)
    moves = moves_of(study, case.network, case.amounts)
    out = moves.outbound
    crossing = (out.km <= 150) & (out.km * 1.1 > 150)
    assert crossing.any()
    found = road_sensitivity(study, case.network, moves)
    assert found.longer == pytest.approx(40.0 * out.load[crossing].sum())


def test_it_is_told_where_most_of_the_load_is_estimated() -> None:
    """The hand-worked plan estimates 41 % and is silent; with all but one distance estimated it speaks."""
    told = [warning for warning in hand.plan_of().warnings if "roads were" in warning]
    share = hand.plan_of().service.estimated_share
    assert share is not None
    assert (share < MOST_OF_THE_LOAD, told) == (True, [])
    plan = hand.plan_of(ESTIMATED)
    (sentence,) = (warning for warning in plan.warnings if "roads were" in warning)
    amount = r"[\d,]+ EUR a year (more|less) \([\d.]+ %\)"
    assert re.fullmatch(
        rf"If roads were 10 % longer than estimated, the same flows would cost {amount} in freight; "
        rf"10 % shorter, {amount}\.",
        sentence,
    )
    carried = plan.cost_lines[CostLine.INBOUND] + plan.cost_lines[CostLine.OUTBOUND]
    assert (
        float(re.findall(r"[\d,]{3,}", sentence)[0].replace(",", ""))
        < 0.11 * carried + plan.cost_lines[CostLine.CARBON]
    )


def test_the_factors_are_named() -> None:
    """One factor, one by country, or a range of them."""
    assert circuity_words(hand.STUDY) == "1.3"
    one = replace(hand.STUDY, circuity=(CircuityRow(country="AT", circuity=1.2),))
    assert circuity_words(one) == "1.2 by country, 1.3 elsewhere"
    two = replace(one, circuity=(*one.circuity, CircuityRow(country="FR", circuity=1.65)))
    assert circuity_words(two) == "1.2 to 1.65 by country, 1.3 elsewhere"
