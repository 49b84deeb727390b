"""Tariffs from the tables to a proved plan: they decide, and the plan passes its audit."""

from __future__ import annotations

from dataclasses import replace

import pytest

from siting.plan.audit import audit
from siting.plan.plan import CostLine
from siting.plan.proof import Outcome
from siting.solving.solve import solve
from siting.study.settings import Settings
from siting.study.tables import CustomerRow, Leg, SiteRow, Study, TariffBasis, TariffRow
from tests.building import LaneRow, lane_table

KM = {("Linz", "Vienna"): 185.0, ("Linz", "Munich"): 255.0, ("Graz", "Vienna"): 195.0, ("Graz", "Munich"): 400.0}
STUDY = Study(
    settings=Settings(title="Quoted", currency="EUR", unit="t", outbound_rate=1.0, drop_size=2.0),
    sites=(SiteRow(site="Linz", yearly_charge=500.0), SiteRow(site="Graz", yearly_charge=480.0)),
    customers=(CustomerRow(customer="Vienna", demand=100.0), CustomerRow(customer="Munich", demand=20.0)),
    lanes=lane_table(
        LaneRow(leg=Leg.OUTBOUND, origin=origin, destination=end, road_km=km) for (origin, end), km in KM.items()
    ),
)


def test_tariffs_decide_which_site_opens() -> None:
    """
    Linz is nearer and opens at 1 EUR/t-km; zones of 300 km make Graz, the cheaper site, as near.

    500 + 100 x 185 + 20 x 255 = 24,100 by the rate; by zones 480 + 2,000 + 410 for Graz against 500 + 2,400 for Linz.
    """
    answer = solve(STUDY)
    assert answer.plan is not None
    assert answer.plan.cost == pytest.approx(24_100.0)
    rows = (
        TariffRow(tariff="Zones", basis=TariffBasis.PER_DELIVERY, rate=40.0, to_km=300.0),
        TariffRow(tariff="Zones", basis=TariffBasis.PER_DELIVERY, rate=41.0, from_km=300.0),
    )
    quoted = replace(STUDY, tariffs=rows)
    plan = solve(quoted).plan
    assert plan is not None
    assert [line.site for line in plan.sites if line.verdict == "open"] == ["Graz"]
    assert plan.cost == pytest.approx(480 + 100 * 20 + 20 * 20.5)
    assert plan.cost_lines[CostLine.DELIVERY] == 0.0
    assert plan.proof.outcome is Outcome.PROVED
    assert {flow.tariff for flow in plan.flows} == {"Zones"}
    assert audit(quoted, plan).faults == ()
    dearer = replace(STUDY, tariffs=(rows[0], replace(rows[1], rate=43.0)))
    plan = solve(dearer).plan
    assert plan is not None
    assert [line.site for line in plan.sites if line.verdict == "open"] == ["Linz"]
    assert plan.cost == pytest.approx(500 + 120 * 20)
