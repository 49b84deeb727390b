"""Runners-up: published second-best sets, ties, completeness, the store, stops and refusals."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from siting.errors import PlanFileError, SettingsError
from siting.listener import Stop
from siting.plan.audit import audit
from siting.plan.proof import Outcome
from siting.questions.runners_up import runners_up
from siting.questions.runners_up_result import runners_up_to_json
from siting.questions.store import MemoryStore
from siting.solving.solve import solve
from siting.study.tables import SiteRow, SiteRuling, Study
from tests.answers import EXACT
from tests.building import lane_rows, lane_table, one_echelon
from tests.published import instances as given

if TYPE_CHECKING:
    from collections.abc import Callable

MONEY = 1e-6


def test_published_second_best_sets() -> None:
    """Sources stand at each instance; second-best sets by enumeration of every set of open sites."""
    for make, within, costs in PUBLISHED:
        study = make()
        found = runners_up(study, within=within, most=len(costs), settings=EXACT)
        assert [each.cost for each in found.answers] == pytest.approx(costs, abs=5e-3), study.settings.title
        assert found.complete, study.settings.title
        for each in found.answers:
            assert audit(study, each.plan).passed


def with_both_sizes() -> Study:
    """Return the regional plants where a region may have the small plant and the large one at once."""
    study = given.regional_plants()
    sites = tuple(
        SiteRow(site=f"{row.site} {row.size}", yearly_charge=row.yearly_charge, capacity=row.capacity)
        for row in study.sizes
    )
    rows = [
        replace(row, origin=f"{row.origin} {size}") for row in lane_rows(study.lanes) for size in ("small", "large")
    ]
    return replace(study, sites=sites, sizes=(), lanes=lane_table(rows))


PUBLISHED: list[tuple[Callable[[], Study], float, list[float]]] = [
    (given.stores, 0.066, [383, 408]),
    (given.three_depots, 0.08, [5610, 6050]),
    (given.distribution_centres, 0.17, [860, 940, 1005, 1005]),
    (with_both_sizes, 0.066, [23_751, 25_287]),
    (given.regional_plants, 0.082, [23_751, 25_689]),
    (given.merger, 0.01, [47_401, 47_813]),
    (given.farms_as_suppliers, 0.01, [2082.3, 2082.7]),
    (given.farms_as_sites, 0.01, [2082.3, 2082.7]),
    (given.refrigerators, 0.03, [1_757_000, 1_808_000]),
]
"""
Instance, percentage to look within, and costs from the best up, no other set within the percentage.

The book of the regional plants lets a region have both sizes; with one size a region the second set is another one.
"""


def test_each_says_what_it_does_otherwise() -> None:
    """The line names what replaces what; both sets at 1005 are there, in any order."""
    found = runners_up(given.distribution_centres(), within=0.2, settings=EXACT)
    lines = [each.differs for each in found.answers]
    assert lines[:2] == ["", "Detroit and Denver instead of Kansas City"]
    assert sorted(lines[2:]) == ["Toledo and Denver instead of Kansas City", "opens Detroit too"]
    farms = runners_up(given.farms_as_suppliers(), within=0.001, settings=EXACT)
    assert farms.answers[1].differs == "farm 3 instead of farm 6"
    assert farms.answers[1].used_suppliers == ("farm 1", "farm 2", "farm 3", "farm 4")


def two(charge: float = 10.0, second: float = 10.0, **settings: object) -> Study:
    """Return two sites that serve one customer at the same cost."""
    sites = [SiteRow(site="A", yearly_charge=charge), SiteRow(site="B", yearly_charge=second)]
    return one_echelon("two", sites, {"C": 1}, [[5.0], [5.0]], **settings)


def test_a_tie_is_listed_and_named() -> None:
    """Two sites that cost the same are two answers, within nothing at all; both at once is not a third."""
    found = runners_up(two(), within=0.0, settings=EXACT)
    assert [each.cost for each in found.answers] == pytest.approx([15, 15])
    assert len(found.tied) == 1
    assert found.complete
    assert {each.used_sites for each in found.answers} == {(("A", ""),), (("B", ""),)}


@pytest.mark.parametrize(("within", "count"), [(0.0999, 1), (0.1001, 2)])
def test_the_percentage_is_a_limit(within: float, count: int) -> None:
    """A set 10 % dearer is listed just above the percentage and not just below."""
    found = runners_up(two(15.0, 17.0), within=within, settings=EXACT)
    assert len(found.answers) == count
    assert found.complete


def test_a_site_nobody_uses_makes_no_other_answer() -> None:
    """With B free of charge and never cheaper, {A} and {A, B} are one answer; {B} is the other."""
    found = runners_up(two(10.0, 0.0), within=5.0, settings=EXACT)
    assert [each.used_sites for each in found.answers] == [(("B", ""),), (("A", ""),)]
    assert [each.cost for each in found.answers] == pytest.approx([5, 15])
    assert found.complete


def test_a_site_kept_because_closing_costs_more_is_not_used() -> None:
    """A pinned site that nobody uses stays out of every answer, though its charge is in every cost."""
    study = given.with_sites(two(10.0, 3.0), SiteRuling.PINNED_OPEN, "A")
    found = runners_up(replace(study, lanes=lane_table(lane_rows(study.lanes)[1:])), within=9.0, settings=EXACT)
    assert [each.used_sites for each in found.answers] == [(("B", ""),)]
    assert found.answers[0].cost == pytest.approx(18)
    assert found.complete


def test_most_cuts_the_list_and_says_so() -> None:
    """One runner-up where three are within the percentage: complete up to its cost only."""
    found = runners_up(given.distribution_centres(), within=0.2, most=1, settings=EXACT)
    assert [each.cost for each in found.answers] == pytest.approx([860, 940])
    assert not found.complete
    assert found.complete_to == pytest.approx(940, abs=1e-2)


def test_what_is_kept_is_not_searched_again() -> None:
    """Asked again, every answer comes from the store; asked for more, only the new ones are searched."""

    class Counting(MemoryStore):
        def __init__(self) -> None:
            super().__init__()
            self.puts = 0

        def put(self, key: object, answer: object) -> None:
            self.puts += 1
            super().put(key, answer)  # type: ignore[arg-type]  # passed on as it came

    study, store = given.distribution_centres(), Counting()
    first = runners_up(study, within=0.2, most=1, settings=EXACT, store=store)
    before = store.puts
    again = runners_up(study, within=0.2, most=1, settings=EXACT, store=store)
    assert store.puts == before
    assert [each.used for each in again.answers] == [each.used for each in first.answers]
    more = runners_up(study, within=0.2, most=2, settings=EXACT, store=store)
    assert store.puts == before + 1
    assert [each.cost for each in more.answers] == pytest.approx([860, 940, 1005])


def test_a_plan_given_is_not_found_again() -> None:
    """A proved plan of the study is the best; the plan of another study is refused."""
    study = given.distribution_centres()
    answer = solve(study, EXACT)
    found = runners_up(study, answer, within=0.1, settings=EXACT)
    assert [each.cost for each in found.answers] == pytest.approx([860, 940])
    with pytest.raises(PlanFileError, match="the plan is of another study"):
        runners_up(given.merger(), answer, settings=EXACT)


def test_a_stop_keeps_the_best_and_claims_nothing_more() -> None:
    """Stopped before the first runner-up, the best is there and the list is not called complete."""
    study, stop = given.distribution_centres(), Stop()
    answer = solve(study, EXACT)
    stop.request()
    found = runners_up(study, answer, within=0.2, settings=EXACT, stop=stop)
    assert [each.cost for each in found.answers] == pytest.approx([860])
    assert not found.complete


def test_an_impossible_study_has_no_answers() -> None:
    """Without a plan there is nothing next to it, and the reason is said."""
    study = given.distribution_centres()
    shut = given.with_sites(study, SiteRuling.PINNED_SHUT, *(row.site for row in study.sites))
    found = runners_up(shut, settings=EXACT)
    assert found.answers == ()
    assert found.outcome is Outcome.IMPOSSIBLE
    assert found.why_none[0].startswith("Impossible")
    assert runners_up_to_json(found)["answers"] == []


@pytest.mark.parametrize(("within", "most"), [(-0.01, 1), (float("inf"), 1), (0.1, 0)])
def test_ranges_are_refused(within: float, most: int) -> None:
    """A negative or endless percentage and an empty list are refused."""
    with pytest.raises(SettingsError, match="runners-up need a fraction of at least 0 and a number of at least 1"):
        runners_up(two(), within=within, most=most)


def test_json_has_one_entry_an_answer() -> None:
    """The JSON form holds cost, bound, what is used and what differs, best first."""
    held = runners_up_to_json(runners_up(given.distribution_centres(), within=0.1, settings=EXACT))
    assert [entry["cost"] for entry in held["answers"]] == pytest.approx([860, 940])
    assert held["complete"] is True
    assert held["answers"][1]["used_sites"][0] == {"site": "Detroit", "size": ""}
    assert held["answers"][1]["differs"] == "Detroit and Denver instead of Kansas City"
    assert set(held["answers"][0]["sites"]) == {"keep", "open", "close", "leave"}
    assert held["answers"][0]["bound"] <= held["answers"][0]["cost"] + MONEY
