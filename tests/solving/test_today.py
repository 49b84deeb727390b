"""Today in its three outcomes: served, short, absent; and what it ignores or keeps."""

from __future__ import annotations

from dataclasses import replace

import pytest

from siting.listener import Stop
from siting.network.network import build_network
from siting.plan.audit import audit
from siting.plan.plan import SiteVerdict, SupplierVerdict, Today, TodayOutcome
from siting.plan.proof import Outcome
from siting.solving.today import plan_today
from siting.study.tables import (
    CustomerRow,
    Leg,
    RuleKind,
    RuleRow,
    SiteRow,
    SiteRuling,
    SiteStanding,
    SizeRow,
    Study,
    SupplierRow,
    SupplierStanding,
)
from tests.building import cost_rows, lane_table, settings_of

RUNNING = SiteStanding.RUNNING


@pytest.fixture
def study() -> Study:
    """
    Return two running sites and a proposed one; customers A and B need 30 and 20.

    Today: charges 100 + 80, A from Graz at 1, B from Brno at 2: 180 + 30 + 40 = 250. Linz alone would cost 30 + 50.
    """
    costs = [[1, 5], [6, 2], [1, 1]]
    return Study(
        settings=settings_of("today", interest_rate=0.08, life_years=10.0),
        sites=(
            SiteRow(site="Graz", standing=RUNNING, yearly_charge=100, closing_charge=40, capacity=30),
            SiteRow(site="Brno", standing=RUNNING, yearly_charge=80, capacity=40),
            SiteRow(site="Linz", yearly_charge=30, opening_charge=500),
        ),
        customers=(CustomerRow(customer="A", demand=30), CustomerRow(customer="B", demand=20)),
        lanes=lane_table(cost_rows(Leg.OUTBOUND, ["Graz", "Brno", "Linz"], ["A", "B"], costs)),
    )


def today_of(study: Study) -> Today:
    """Return the plan of today of a study."""
    return plan_today(study, build_network(study))


def test_served(study: Study) -> None:
    """Both running sites keep running, nothing opens, nothing is paid once, and the cost is 250 and proved."""
    today = today_of(study)
    assert today.outcome is TodayOutcome.SERVED
    assert today.reason == ""
    assert today.cost == pytest.approx(250)
    plan = today.plan
    assert plan is not None
    assert plan.today is None
    assert plan.one_off == 0
    assert plan.proof.outcome is Outcome.PROVED
    assert [line.verdict for line in plan.sites] == [SiteVerdict.KEEP, SiteVerdict.KEEP, SiteVerdict.LEAVE]
    assert audit(study, plan, of_today=True).passed


def test_what_the_analyst_imposes_is_ignored(study: Study) -> None:
    """Rulings, rules, counts, budget, service share and least throughput leave today as it is."""
    sites = (
        replace(study.sites[0], ruling=SiteRuling.PINNED_SHUT, least_throughput=30.5),
        study.sites[1],
        replace(study.sites[2], ruling=SiteRuling.PINNED_OPEN),
    )
    settings = replace(
        study.settings, fewest_sites=3, most_sites=1, one_off_budget=0.0, service_km=1.0, service_share=1.0
    )
    lanes = replace(study.lanes, road_km=study.lanes.unit_cost * 100)
    rules = (RuleRow(rule=RuleKind.NOT_TOGETHER, members=("Graz", "Brno")),)
    today = today_of(replace(study, sites=sites, settings=settings, rules=rules, lanes=lanes))
    assert today.cost == pytest.approx(250)


@pytest.mark.parametrize(("capacity", "cost"), [(30.0, 250.0), (29.0, 255.0), (10.0, 350.0)])
def test_capacity_is_kept(study: Study, capacity: float, cost: float) -> None:
    """Each unit of A that Graz cannot take costs 5 more from Brno, down to where both are full."""
    sites = (replace(study.sites[0], capacity=capacity), *study.sites[1:])
    assert today_of(replace(study, sites=sites)).cost == pytest.approx(cost)


def test_short(study: Study) -> None:
    """With 9 + 40 of capacity for 50, one unit stays unserved; no cost, no saving, the amount with its unit."""
    sites = (replace(study.sites[0], capacity=9), *study.sites[1:])
    today = today_of(replace(study, sites=sites))
    assert today.outcome is TodayOutcome.SHORT
    assert today.plan is None
    assert today.cost is None
    assert sum(short.amount for short in today.unserved) == pytest.approx(1)
    assert today.reason == "Today's sites leave 1 unit a year unserved, so no saving is stated."


def test_short_of_a_customer_nobody_running_reaches(study: Study) -> None:
    """A customer without a lane from a running site is unserved whole, by name."""
    rows = cost_rows(Leg.OUTBOUND, ["Graz", "Brno", "Linz"], ["A", "B"], [[1, float("nan")], [6, float("nan")], [1, 1]])
    today = today_of(replace(study, lanes=lane_table(rows)))
    assert [(short.customer, short.good, short.amount) for short in today.unserved] == [("B", "goods", 20.0)]


@pytest.mark.parametrize(("standing", "outcome"), [(RUNNING, "served"), (SiteStanding.PROPOSED, "absent")])
def test_absent_without_a_running_site(study: Study, standing: SiteStanding, outcome: str) -> None:
    """Where nothing runs there is no today, and the reason says so."""
    sites = (replace(study.sites[0], capacity=None, standing=standing), *study.sites[2:])
    today = today_of(replace(study, sites=sites))
    assert today.outcome == outcome
    assert today.reason == (
        "" if outcome == "served" else "No site is running, so there is no today to measure a saving from."
    )
    assert (today.plan is None) is (outcome == "absent")


def supplied(study: Study, *standings: SupplierStanding) -> Study:
    """Return the study with suppliers at 1, 2, ... a unit to every site."""
    names = [f"K{number}" for number in range(len(standings))]
    rows = cost_rows(Leg.OUTBOUND, ["Graz", "Brno", "Linz"], ["A", "B"], [[1, 5], [6, 2], [1, 1]])
    rows += cost_rows(Leg.INBOUND, names, ["Graz", "Brno", "Linz"], [[0.5] * 3] * len(names))
    suppliers = tuple(
        SupplierRow(supplier=name, standing=standing, unit_price=number, yearly_charge=10, signing_charge=99)
        for number, (name, standing) in enumerate(zip(names, standings, strict=True), start=1)
    )
    return replace(study, suppliers=suppliers, lanes=lane_table(rows))


def test_signed_suppliers_are_all_in_use(study: Study) -> None:
    """Two of three are signed: both charges are paid, everything comes from the cheaper, nobody new is signed."""
    signed, offered = SupplierStanding.SIGNED, SupplierStanding.OFFERED
    today = today_of(supplied(study, offered, signed, signed))
    assert today.cost == pytest.approx(250 + 2 * 10 + 50 * (2 + 0.5))
    assert today.plan is not None
    verdicts = [line.verdict for line in today.plan.suppliers]
    assert verdicts == [SupplierVerdict.LEAVE, SupplierVerdict.STAY, SupplierVerdict.STAY]


def test_absent_without_a_signed_supplier(study: Study) -> None:
    """Where suppliers exist and none is signed there is no today."""
    today = today_of(supplied(study, SupplierStanding.OFFERED))
    assert today.outcome is TodayOutcome.ABSENT
    assert today.reason == "No supplier is signed, so there is no today to measure a saving from."


def test_the_running_size_counts(study: Study) -> None:
    """A larger proposed size does not help today: 20 of 50 fit into Brno's running size, 30 into Graz."""
    sites = (study.sites[0], replace(study.sites[1], yearly_charge=0, capacity=None), study.sites[2])
    sizes = (
        SizeRow(site="Brno", size="small", standing=RUNNING, yearly_charge=80, capacity=20),
        SizeRow(site="Brno", size="large", yearly_charge=10, opening_charge=5, capacity=90),
    )
    today = today_of(replace(study, sites=sites, sizes=sizes))
    assert today.cost == pytest.approx(250)
    tight = (replace(sizes[0], capacity=19.0), sizes[1])
    assert today_of(replace(study, sites=sites, sizes=tight)).outcome is TodayOutcome.SHORT


def test_single_sourced_customers_stay_whole(study: Study) -> None:
    """A does not fit into Graz by one unit, so all of it comes from Brno, and B from Graz: 180 + 180 + 100."""
    settings = replace(study.settings, single_source=True)
    sites = (replace(study.sites[0], capacity=29), *study.sites[1:])
    today = today_of(replace(study, settings=settings, sites=sites))
    assert today.cost == pytest.approx(460)
    assert today.plan is not None
    assert today.plan.proof.outcome is Outcome.PROVED
    assert [line.origins for line in today.plan.customers] == [("Brno",), ("Graz",)]


def test_single_sourced_customers_are_unserved_whole(study: Study) -> None:
    """With room for 19 in Graz and 30 in Brno only one of the two fits: the smaller, B with 20, stays out."""
    settings = replace(study.settings, single_source=True)
    sites = (replace(study.sites[0], capacity=19), replace(study.sites[1], capacity=30), study.sites[2])
    today = today_of(replace(study, settings=settings, sites=sites))
    assert [(short.customer, short.amount) for short in today.unserved] == [("B", 20.0)]


def test_told_to_stop_a_search_for_today_still_says_what_it_knows(study: Study) -> None:
    """Stopped before the sources are found, today is what the quick search for the least unserved finds: all served."""
    settings = replace(study.settings, single_source=True)
    stop = Stop()
    stop.request()
    stopped = replace(study, settings=settings)
    today = plan_today(stopped, build_network(stopped), stop=stop)
    assert today.outcome is TodayOutcome.SERVED
    assert today.plan is not None
    assert today.plan.proof.outcome is Outcome.STOPPED
    assert today.plan.proof.bound is None
