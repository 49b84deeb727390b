"""The map of the differences: only what differs, by how much, who is touched, and what cannot be placed."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from siting.sharing.map import draw_differences
from siting.sharing.map_differences import differences_json
from siting.solving.solve import solve
from siting.study.read import read_study
from siting.study.tables import SiteRuling
from tests.browse.studies import towns_folder

if TYPE_CHECKING:
    from pathlib import Path

    from siting.plan.plan import Plan
    from siting.study.tables import Study

NAMES = ("the plan", "Graz shut")


@pytest.fixture(scope="module")
def both(tmp_path_factory: pytest.TempPathFactory) -> tuple[Study, Plan, Plan]:
    """Return the study of a few towns, its plan, and the plan with Graz shut."""
    folder: Path = tmp_path_factory.mktemp("towns") / "towns"
    study = read_study(towns_folder(folder))
    sites = tuple(replace(row, ruling=SiteRuling.PINNED_SHUT) if row.site == "Graz" else row for row in study.sites)
    before, after = solve(study).plan, solve(replace(study, sites=sites)).plan
    assert before is not None
    assert after is not None
    return study, before, after


def _moved(plan: Plan) -> dict[tuple[str, str, str], float]:
    moved: dict[tuple[str, str, str], float] = {}
    for flow in plan.flows:
        lane = (str(flow.leg), flow.origin, flow.destination)
        moved[lane] = moved.get(lane, 0.0) + flow.amount
    return moved


def test_each_lane_drawn_carries_the_difference(both: tuple[Study, Plan, Plan]) -> None:
    """Every lane whose load differs is drawn with that difference, dashed for less and solid for more; no other is."""
    study, before, after = both
    payload = differences_json(study, before, after, names=NAMES, headline="")
    was, now = _moved(before), _moved(after)
    wanted = {
        lane: now.get(lane, 0.0) - was.get(lane, 0.0)
        for lane in {*was, *now}
        if abs(now.get(lane, 0.0) - was.get(lane, 0.0)) > 1e-3
    }
    ends = {
        "outbound": ("sites", "customers"),
        "inbound": ("suppliers", "sites"),
        "direct": ("suppliers", "customers"),
    }
    drawn = {}
    for lane in payload["lanes"]:
        start, end = ends[lane["leg"]]
        key = (lane["leg"], payload[start][lane["from"]]["name"], payload[end][lane["to"]]["name"])
        drawn[key] = sum(lane["load"]) * (1 if lane["pen"] == "more" else -1)
    assert drawn == pytest.approx(wanted)
    pens = {pen["pen"]: pen for pen in payload["legs"]}
    assert pens["less"]["dashes"]
    assert not pens["more"]["dashes"]
    assert pens["less"]["colour"] != pens["more"]["colour"]


def test_only_who_is_touched_is_drawn(both: tuple[Study, Plan, Plan]) -> None:
    """Sites of another verdict say what they were; what neither moves nor changes is left out."""
    study, before, after = both
    payload = differences_json(study, before, after, names=NAMES, headline="")
    notes = {site["name"]: site["note"] for site in payload["sites"]}
    was = {line.site: str(line.verdict) for line in before.sites}
    now = {line.site: str(line.verdict) for line in after.sites}
    assert notes["Graz"] == "was: open"
    assert {name for name, note in notes.items() if note} == {name for name in was if was[name] != now[name]}
    idle = {line.site for line in after.sites if was[line.site] == now[line.site] and line.throughput == 0}
    assert idle
    assert not idle & set(notes)


def test_the_same_plan_twice_draws_nothing(both: tuple[Study, Plan, Plan]) -> None:
    """No lane, no site, no customer; the page can still be drawn."""
    study, before, _ = both
    payload = differences_json(study, before, before, names=NAMES, headline="")
    assert [payload[kind] for kind in ("lanes", "sites", "suppliers", "customers")] == [[], [], [], []]
    assert "what differs" in draw_differences(study, before, before, names=NAMES, headline="x").html


def test_places_of_the_other_study_alone_are_counted(both: tuple[Study, Plan, Plan]) -> None:
    """Lanes of a customer that the second study does not have are not drawn, and it is said how many."""
    study, before, after = both
    fewer = replace(study, customers=tuple(row for row in study.customers if row.customer != "Munich"))
    shrunk = replace(
        after,
        customers=tuple(line for line in after.customers if line.customer != "Munich"),
        flows=tuple(flow for flow in after.flows if flow.destination != "Munich"),
    )
    payload = differences_json(fewer, before, shrunk, names=NAMES, headline="")
    said = "Not drawn: 1 lane of places that the study of Graz shut does not have."
    assert said in payload["notes"]
