"""
Closings and headroom of published problems.

Second-best sets are those of the project's list of published values, found there by enumeration ("CALC"): they are no
printed figures. What a book prints is named beside it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.questions.closing import closing
from siting.questions.headroom import headroom
from siting.questions.headroom_result import Room
from siting.solving.solve import solve
from tests.answers import open_sites, signed_suppliers
from tests.published import instances
from tests.questions.asked import EXACT, CountingStore, dearer
from tests.questions.test_against_enumeration import check_closing, check_headroom

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.questions.headroom_result import HeadroomLine
    from siting.study.tables import Study

CENT = 0.01

STUDIES: dict[str, Callable[[], Study]] = {
    "three depots": instances.three_depots,
    "three plants": instances.three_plants,
    "distribution centres": instances.distribution_centres,
    "farms as suppliers": instances.farms_as_suppliers,
    "farms as sites": instances.farms_as_sites,
    "refrigerators": instances.refrigerators,
    "single-sourced plants": lambda: instances.single_sourced(instances.three_plants()),
}


@pytest.mark.parametrize("name", STUDIES)
def test_closings_are_what_enumeration_says(name: str) -> None:
    """Re-plans and re-routes of published problems cost what trying every set says."""
    check_closing(STUDIES[name]())


@pytest.mark.parametrize("name", STUDIES)
def test_headroom_is_what_enumeration_says(name: str) -> None:
    """Headroom in published problems is the difference of enumerated costs."""
    check_headroom(STUDIES[name]())


def room_of(study: Study, name: str) -> HeadroomLine:
    """Return the headroom of one site or supplier, at the full proof."""
    return next(line for line in headroom(study, settings=EXACT).lines if line.name == name)


def used_names(study: Study) -> set[str]:
    """Return what the proved plan has open and signed."""
    plan = solve(study, EXACT).plan
    assert plan is not None
    return open_sites(plan) | signed_suppliers(plan)


def test_the_switch_from_kansas_city_is_where_the_second_best_set_says() -> None:
    """
    The plan opens Kansas City beside St. Louis for 860 ($000); the best set without it costs 940.

    Anderson, Sweeney & Williams, An Introduction to Management Science, integer programming chapter. So Kansas City may
    cost 80 more, and a cent beyond that Detroit and Denver open in its place.
    """
    study = instances.distribution_centres()
    line = room_of(study, "Kansas City")
    assert line.yearly == pytest.approx(80.0)
    assert line.room is Room.RISE
    assert used_names(dearer(study, "Kansas City", 80.0 - CENT)) == {"Kansas City", "St. Louis"}
    assert used_names(dearer(study, "Kansas City", 80.0 + CENT)) == {"Detroit", "Denver", "St. Louis"}


def test_st_louis_keeps_running_up_to_its_headroom() -> None:
    """St. Louis runs at no charge; a cent below its headroom it is kept, a cent above the best plan closes it."""
    study = instances.distribution_centres()
    line = room_of(study, "St. Louis")
    assert line.yearly is not None
    assert line.yearly > 2 * CENT
    assert line.one_off is None
    assert "St. Louis" in used_names(dearer(study, "St. Louis", line.yearly - CENT))
    assert "St. Louis" not in used_names(dearer(study, "St. Louis", line.yearly + CENT))


@pytest.mark.parametrize("name", ["distribution centres", "farms as suppliers", "farms as sites", "three depots"])
def test_a_cent_decides(name: str) -> None:
    """A charge raised by its headroom less a cent keeps the verdict, plus a cent changes it; falls likewise."""
    study = STUDIES[name]()
    checked = 0
    for line in headroom(study, settings=EXACT).lines:
        if line.room not in {Room.RISE, Room.FALL} or line.yearly is None or line.yearly <= 2 * CENT:
            continue
        sign = 1.0 if line.inside else -1.0
        assert (line.name in used_names(dearer(study, line.name, sign * (line.yearly - CENT)))) is line.inside
        assert (line.name in used_names(dearer(study, line.name, sign * (line.yearly + CENT)))) is not line.inside
        checked += 1
    assert checked >= 2


def test_farm_6_is_worth_four_tenths() -> None:
    """
    Farms 1, 2, 4, 6 cost 2,082.3 ($000) and farms 1, 2, 3, 4 cost 2,082.7: farm 6 may cost 0.4 more, farm 3 0.4 less.

    Taylor, Introduction to Management Science, chapter 5: Frijo-Lane potato farms.
    """
    study = instances.farms_as_suppliers()
    assert room_of(study, "farm 6").yearly == pytest.approx(0.4, abs=1e-6)
    assert room_of(study, "farm 3").yearly == pytest.approx(0.4, abs=1e-6)


def test_dropping_a_farm_takes_the_next_set() -> None:
    """Without farm 6 the second-best set is the plan: 0.4 ($000) dearer, with farm 3 signed in its place."""
    study = instances.farms_as_suppliers()
    test = closing(study, suppliers=["farm 6"], settings=EXACT)
    (line,) = test.lines
    assert line.replan is not None
    assert line.replan.extra_cost == pytest.approx(0.4, abs=1e-6)
    assert {(change.name, change.after) for change in line.replan.changes} == {("farm 3", "sign"), ("farm 6", "leave")}


def test_headroom_and_closing_share_their_searches() -> None:
    """What closing found at the same gap, headroom does not search again; nor does either when asked once more."""
    study, store = instances.distribution_centres(), CountingStore()
    test = closing(study, settings=EXACT, store=store)
    assert len(store.keys) == 1 + 2 * len(test.lines)
    before = len(store.keys)
    found = headroom(study, settings=EXACT, store=store)
    outside = [line for line in found.lines if not line.inside]
    assert len(store.keys) == before + len(outside)
    before = len(store.keys)
    assert headroom(study, settings=EXACT, store=store).lines == found.lines
    assert [line.replan for line in closing(study, settings=EXACT, store=store).lines] == [
        line.replan for line in test.lines
    ]
    assert len(store.keys) == before


def test_a_changed_study_finds_nothing_old() -> None:
    """A study with another charge has another fingerprint: all is searched anew and the old answers are left alone."""
    study, store = instances.distribution_centres(), CountingStore()
    headroom(study, settings=EXACT, store=store)
    before = len(store.keys)
    changed = headroom(dearer(study, "Kansas City", 10.0), settings=EXACT, store=store)
    assert len(store.keys) == 2 * before
    assert next(line.yearly for line in changed.lines if line.name == "Kansas City") == pytest.approx(70.0)
    assert len({key.fingerprint for key in store.keys}) == 2
