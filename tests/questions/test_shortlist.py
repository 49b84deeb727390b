"""The shortlist: words by headroom just below, at and above the limit; how often each is used; stop and refusals."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.errors import SettingsError
from siting.listener import Stop
from siting.plan.proof import Outcome
from siting.questions.headroom_result import HeadroomLine
from siting.questions.shortlist import Firmness, firmness_of, shortlist
from siting.solving.solve import solve
from siting.study.read import read_study
from tests.browse.studies import towns_folder

if TYPE_CHECKING:
    from pathlib import Path

    from siting.study.tables import Study

COST, WITHIN = 1000.0, 0.02


def line(*, inside: bool, yearly: float | None, least: float | None, **more: object) -> HeadroomLine:
    """Return a headroom of a site that costs a thousandth of the plan's cost."""
    held: dict[str, object] = {
        "kind": "site", "name": "Linz", "verdict": "keep" if inside else "leave", "inside": inside, "ruling": "free",
        "outcome": Outcome.PROVED, "yearly": yearly, "least": least, "most": yearly, "per_one_off": None,
        "charge": 1.0, "tolerance": 0.001,
    }  # fmt: skip
    return HeadroomLine(**(held | more))  # type: ignore[arg-type] # names are checked when made


@pytest.mark.parametrize(
    ("inside", "yearly", "word"),
    [
        (True, 19.99, Firmness.REPLACEABLE),
        (True, 20.0, Firmness.REPLACEABLE),
        (True, 20.01, Firmness.ROBUST),
        (True, 0.0, Firmness.REPLACEABLE),
        (False, 19.99, Firmness.STAND_IN),
        (False, 20.0, Firmness.STAND_IN),
        (False, 20.01, Firmness.NEVER),
    ],
)
def test_the_word_turns_at_the_limit(inside: bool, yearly: float, word: Firmness) -> None:  # noqa: FBT001 - a parameter
    """2 % of 1,000 is 20: at most that is near the best, more is not."""
    assert firmness_of(line(inside=inside, yearly=yearly, least=yearly), COST, WITHIN) is word


def test_what_is_impossible_on_the_other_side_is_irreplaceable_or_never() -> None:
    """No plan without it: irreplaceable. No plan with it: never."""
    gone = {"yearly": None, "least": None, "outcome": Outcome.IMPOSSIBLE}
    assert firmness_of(line(inside=True, **gone), COST, WITHIN) is Firmness.IRREPLACEABLE  # type: ignore[arg-type]
    assert firmness_of(line(inside=False, **gone), COST, WITHIN) is Firmness.NEVER  # type: ignore[arg-type]


def test_what_is_not_proved_has_no_word() -> None:
    """A cost above the limit whose bound is below it, or no cost at all, decides nothing; a ruling alone is said."""
    assert firmness_of(line(inside=True, yearly=30.0, least=10.0), COST, WITHIN) is Firmness.UNKNOWN
    assert firmness_of(line(inside=True, yearly=None, least=None, outcome=None), COST, WITHIN) is Firmness.UNKNOWN
    pinned = line(inside=True, yearly=-5.0, least=-5.0, ruling="pinned-open")
    assert firmness_of(pinned, COST, WITHIN) is Firmness.PINNED


@pytest.fixture
def towns(tmp_path: Path) -> Study:
    """Read the study of a few towns."""
    return read_study(towns_folder(tmp_path / "towns"))


def test_words_agree_with_the_near_best_plans(towns: Study) -> None:
    """With every near-best plan listed: robust is used in all of them, never in none, the others in some."""
    found = shortlist(towns, solve(towns), within=0.06, most=40)
    assert found.near.complete
    assert found.count > 3
    for each in found.lines:
        if each.firmness in {Firmness.ROBUST, Firmness.IRREPLACEABLE}:
            assert each.used_in == found.count, each
        elif each.firmness is Firmness.NEVER:
            assert each.used_in == 0, each
        else:
            assert 0 < each.used_in < found.count, each
    assert {Firmness.REPLACEABLE, Firmness.STAND_IN} <= {each.firmness for each in found.lines}


def test_a_stop_keeps_what_is_done(towns: Study) -> None:
    """Stopped at once, everything is there without a word of its own, and it is said not to be complete."""
    stop = Stop()
    stop.request()
    found = shortlist(towns, solve(towns), stop=stop)
    assert not found.complete
    assert {each.firmness for each in found.lines} <= {Firmness.UNKNOWN}


def test_a_percentage_below_nothing_is_refused(towns: Study) -> None:
    """The refusal says what is allowed."""
    with pytest.raises(SettingsError, match=r"a fraction of at least 0 and a number of at least 1, got -0\.1"):
        shortlist(towns, within=-0.1)
