"""Counts: the curve of a published instance, what is pruned, limits of the study, stops and refusals."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from siting.errors import PlanFileError, SettingsError
from siting.listener import Stop
from siting.network.network import build_network
from siting.plan.audit import audit
from siting.plan.proof import Outcome
from siting.questions.counts import counts, fewest_that_may_do
from siting.questions.counts_result import counts_to_json
from siting.solving.solve import solve
from siting.study.tables import SiteRow, SiteRuling
from tests.answers import EXACT
from tests.building import one_echelon
from tests.published import instances as given

if TYPE_CHECKING:
    from siting.study.tables import Study


def limited(study: Study, **settings: object) -> Study:
    """Return a study with other settings."""
    return replace(study, settings=replace(study.settings, **settings))  # type: ignore[arg-type]  # one of each kind


def test_the_curve_of_a_published_instance() -> None:
    """
    Pedroso & Kubo's three depots: two sites 5610, three 6370 (by enumeration); one of 500 cannot hold 940.

    Two sites pay 2000 for their charges and 3610 for freight.
    """
    found = counts(given.three_depots(), settings=EXACT)
    assert [line.count for line in found.lines] == [2, 3]
    assert [line.cost for line in found.lines] == pytest.approx([5610, 6370])
    assert (found.lines[0].fixed, found.lines[0].freight, found.lines[0].rest) == pytest.approx((2000, 3610, 0))
    assert found.lines[0].open_sites == ("site 2", "site 3")
    assert found.fewest == 2
    assert found.best is found.lines[0]
    assert found.pruned == ()
    assert all(line.gap == pytest.approx(0, abs=1e-6) for line in found.lines)


def test_numbers_far_above_the_best_are_pruned_with_a_bound() -> None:
    """Merged plants, three best: four and five are searched; asked to four only, five is pruned with a true bound."""
    whole = counts(given.merger(), settings=EXACT)
    assert whole.best is not None
    assert whole.best.count == 3
    assert whole.lines[-1].count == 5
    assert whole.lines[-1].cost == pytest.approx(48_913)
    found = counts(given.merger(), most=4, settings=EXACT)
    (pruned,) = found.pruned
    assert (pruned.least, pruned.most) == (5, 5)
    assert 47_401 - 0.1 <= pruned.bound <= 48_913


def test_the_studys_own_limits_are_lifted_and_marked() -> None:
    """With at most two plants the curve still shows three, and says that the study rules it out."""
    study = limited(given.merger(), most_sites=2)
    found = counts(study, settings=EXACT)
    assert [line.allowed for line in found.lines if line.count in {2, 3, 4}] in ([True, False, False], [False, False])
    assert found.best is not None
    assert found.best.count == 3
    assert not found.best.allowed


@pytest.mark.parametrize(("most", "allowed"), [(2, False), (3, True), (4, True)])
def test_the_limit_itself_is_allowed(most: int, allowed: bool) -> None:  # noqa: FBT001 - a value of the table
    """Three sites are allowed from most_sites = 3 on."""
    found = counts(limited(given.merger(), most_sites=most), settings=EXACT)
    (three,) = (line for line in found.lines if line.count == 3)
    assert three.allowed is allowed
    assert three.cost == pytest.approx(47_401)


def test_fewest_comes_from_capacity_pins_and_reach() -> None:
    """Below the bound from capacities no plan is searched for; a bound met exactly by capacity still holds."""
    for demand, fewest in ((9.999, 1), (10.0, 1), (10.001, 2)):
        sites = [SiteRow(site=name, capacity=10.0) for name in "AB"]
        study = one_echelon("fewest", sites, {"C": demand}, [[1.0], [1.0]])
        assert fewest_that_may_do(build_network(study)) == fewest
        assert counts(study, settings=EXACT).fewest == fewest
    pinned = given.with_sites(study, SiteRuling.PINNED_OPEN, "A", "B")
    assert fewest_that_may_do(build_network(pinned)) == 2


def test_impossible_numbers_before_the_first_are_left_out_and_shown_when_asked_for() -> None:
    """Fire stations within 15 minutes: one cannot cover the cities, so that the curve begins at two."""
    study = given.fire_stations(15.0)
    found = counts(study, settings=EXACT)
    assert found.lines[0].count == 2
    asked = counts(study, least=1, most=2, settings=EXACT)
    assert [line.outcome for line in asked.lines] == [Outcome.IMPOSSIBLE, Outcome.PROVED]
    assert asked.fewest == 2


def test_every_plan_passes_its_audit_for_its_number() -> None:
    """The best plan is audited against the study, each other against the study held to its number."""
    study = given.distribution_centres()
    found = counts(study, settings=EXACT)
    for line in found.lines:
        held = limited(study, fewest_sites=line.count, most_sites=line.count)
        assert line.plan is not None
        assert audit(study if line is found.best else held, line.plan).passed


def test_a_stop_names_what_was_not_asked() -> None:
    """Stopped at once, the plan given is the one line and the other numbers are named."""
    study, stop = given.merger(), Stop()
    answer = solve(study, EXACT)
    stop.request()
    found = counts(study, answer, settings=EXACT, stop=stop)
    assert [line.count for line in found.lines] == [3]
    assert set(found.not_asked) >= {4, 5}


def test_refusals() -> None:
    """Studies without sites, numbers there are not, and plans of another study are refused."""
    with pytest.raises(SettingsError, match="the study has no sites to count"):
        counts(given.farms_as_suppliers())
    with pytest.raises(SettingsError, match="numbers of sites go from 0 to 5, got from 0 to 6"):
        counts(given.merger(), most=6)
    with pytest.raises(SettingsError, match="numbers of sites go from 0 to 5, got from 4 to 3"):
        counts(given.merger(), least=4, most=3)
    answer = solve(given.three_depots(), EXACT)
    for study in (given.merger(), limited(given.merger(), most_sites=4)):
        with pytest.raises(PlanFileError, match="the plan is of another study"):
            counts(study, answer)


def test_an_impossible_study_has_no_curve() -> None:
    """Without any plan there is no line, and the reason is said."""
    study = given.merger()
    shut = given.with_sites(study, SiteRuling.PINNED_SHUT, *(row.site for row in study.sites))
    found = counts(shut, settings=EXACT)
    assert (found.lines, found.best, found.fewest) == ((), None, None)
    assert found.why_none[0].startswith("Impossible")
    assert counts_to_json(found)["counts"] == []


def test_json_has_one_entry_a_number() -> None:
    """The JSON form holds the band and the split of each number."""
    held = counts_to_json(counts(given.three_depots(), settings=EXACT))
    assert [entry["count"] for entry in held["counts"]] == [2, 3]
    assert held["best"] == 2
    first = held["counts"][0]
    assert first["bound"] <= first["cost"] == pytest.approx(first["fixed"] + first["freight"] + first["rest"])
    assert first["open_sites"] == ["site 2", "site 3"]
