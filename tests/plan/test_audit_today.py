"""The audit of the plan of today, and of studies with a great many lanes."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from siting.plan.audit import audit
from siting.plan.plan import CostLine, SiteVerdict, SupplierVerdict, Today, TodayOutcome, Unserved
from siting.study.tables import CustomerRow, LaneTable, Leg, SiteRow, Study
from tests.building import LaneRow, lane_table
from tests.plan import hand
from tests.plan.tampering import Tamper, objections, today_plan, with_line, with_site, with_supplier, with_today

TODAYS: list[tuple[str, Tamper, str]] = [
    ("left out", lambda p: replace(p, today=None), r"the plan does not say what today costs"),
    (
        "dearer than it is",
        lambda p: with_today(p, plan=with_line(today_plan(p), CostLine.GOODS, 2.0)),
        r"today: cost line goods is stated as [\d,.]+ EUR",
    ),
    (
        "a running site shut",
        lambda p: with_today(p, plan=with_site(today_plan(p), "Graz", verdict=SiteVerdict.CLOSE)),
        r"today: site Graz is running at size '' today, not close",
    ),
    (
        "a running site at another size",
        lambda p: with_today(p, plan=with_site(today_plan(p), "Linz", size="large")),
        r"today: site Linz is running at size 'small' today, not keep at size 'large'",
    ),
    (
        "a proposed site open",
        lambda p: with_today(p, plan=with_site(today_plan(p), "Wels", verdict=SiteVerdict.OPEN)),
        r"today: site Wels is proposed, so it is not open today",
    ),
    (
        "an offered supplier signed",
        lambda p: with_today(p, plan=with_supplier(today_plan(p), "Orchard", verdict=SupplierVerdict.SIGN)),
        r"today: supplier Orchard is offered today, .* verdict sign",
    ),
    (
        "a today of its own",
        lambda p: with_today(p, plan=replace(today_plan(p), today=p.today)),
        r"today: the plan of today has a today of its own",
    ),
    (
        "absent",
        lambda p: with_today(p, outcome=TodayOutcome.ABSENT, plan=None),
        r"stated as absent, .* there is a today",
    ),
    ("served without a plan", lambda p: with_today(p, plan=None), r"today is served without a plan"),
    ("short with a plan", lambda p: with_today(p, outcome=TodayOutcome.SHORT), r"today is short with a plan"),
    (
        "short of nothing",
        lambda p: with_today(p, outcome=TodayOutcome.SHORT, plan=None),
        r"today is short without unserved demand",
    ),
    (
        "short of more than the need",
        lambda p: with_today(
            p, outcome=TodayOutcome.SHORT, plan=None, unserved=(Unserved(customer="Zlin", good="trees", amount=31.0),)
        ),
        r"today: 31 t of trees unserved at customer Zlin, who needs 30",
    ),
]


@pytest.mark.parametrize(("tamper", "message"), [pytest.param(*case[1:], id=case[0]) for case in TODAYS])
def test_tampering_with_today_is_caught(tamper: Tamper, message: str) -> None:
    """The saving is measured from a plan of today that is audited as well."""
    assert re.search(message, objections(tamper(hand.plan_of())))


def test_today_is_absent_where_nothing_runs() -> None:
    """Without running sites, or without signed suppliers, a stated today is a fault and an absent one none."""
    study = Study(
        settings=hand.settings_for("Nothing runs"),
        sites=(SiteRow(site="A"),),
        customers=(CustomerRow(customer="B", demand=1.0),),
        lanes=lane_table([LaneRow(leg=hand.OUT, origin="A", destination="B", unit_cost=1.0)]),
    )
    case = hand.worked(study, {("A", "")}, set(), {(hand.OUT, "A", "B", "goods"): 1.0})
    absent = Today(outcome=TodayOutcome.ABSENT, reason="No site is running.", plan=None)
    plan = hand.draw(study, case, today=absent)
    assert audit(study, plan).passed
    short = Today(
        outcome=TodayOutcome.SHORT,
        reason="Short.",
        plan=None,
        unserved=(Unserved(customer="B", good="goods", amount=1.0),),
    )
    assert "the standings say that there is no today" in objections(replace(plan, today=short), study)


def test_a_million_lanes_are_looked_up_at_once() -> None:
    """A row that names the good is found among a million, one that names none else, and none where none is."""
    sites, customers = 1000, 1000
    names = (*(f"s{i}" for i in range(sites)), *(f"c{j}" for j in range(customers)), "goods")
    origin = np.repeat(np.arange(sites, dtype=np.int32), customers)
    destination = np.tile(np.arange(sites, sites + customers, dtype=np.int32), sites)
    rows = origin.shape[0]
    lanes = LaneTable(
        names=names,
        origin=origin,
        destination=destination,
        good=np.where(destination % 2 == 0, len(names) - 1, -1).astype(np.int32),
        leg=np.full(rows, LaneTable.LEGS.index(Leg.OUTBOUND), dtype=np.int32),
        road_km=np.full(rows, np.nan),
        unit_cost=np.arange(rows, dtype=np.float64),
        barred=np.zeros(rows, dtype=np.bool_),
        row=np.arange(rows, dtype=np.int32),
    )
    study = Study(
        settings=hand.settings_for("Many lanes"),
        sites=tuple(SiteRow(site=f"s{i}", latitude=47.0, longitude=15.0) for i in range(sites)),
        customers=tuple(CustomerRow(customer=f"c{j}", demand=1.0) for j in range(customers)),
        lanes=lanes,
    )
    moved = {(hand.OUT, f"s{j % 7}", f"c{j}", "goods"): 1.0 for j in range(customers)}
    plan = hand.draw(study, hand.worked(study, {(f"s{i}", "") for i in range(7)}, set(), moved))
    absent = Today(outcome=TodayOutcome.ABSENT, reason="No site is running.", plan=None)
    assert audit(study, replace(plan, today=absent)).faults == ()
    assert plan.cost == pytest.approx(sum((j % 7) * customers + j for j in range(customers)))
