"""`siting closing` and `siting headroom`: the answer first, in 100 columns, as JSON, of a study or a written plan."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Any

import pytest

from siting.cli import main
from siting.plan.proof import Outcome
from siting.questions.runners_up import MOST, WITHIN
from siting.study.write import write_study
from tests.builders import TINY, with_cells, write_folder
from tests.published import instances

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

WIDTH = 100


@pytest.fixture
def centres(tmp_path: Path) -> Path:
    """Write the distribution centres as a folder: Kansas City opens beside St. Louis."""
    write_study(instances.distribution_centres(), tmp_path / "centres")
    return tmp_path / "centres"


def asked(capsys: pytest.CaptureFixture[str], *arguments: str, code: int = 0) -> str:
    """Run a command and return what it printed."""
    assert main(arguments) == code
    return capsys.readouterr().out


def as_json(capsys: pytest.CaptureFixture[str], *arguments: str) -> dict[str, Any]:
    """Run a command with --json and return the object."""
    found: dict[str, Any] = json.loads(asked(capsys, *arguments, "--json"))
    return found


def by_name(lines: Sequence[dict[str, Any]], kind: str = "site") -> dict[str, dict[str, Any]]:
    """Return entries by the name of their site or supplier."""
    return {line[kind]: line for line in lines}


def test_closing_answers_first(centres: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The cheapest to do without stands in the first sentence; nothing is wider than 100 columns."""
    text = asked(capsys, "closing", str(centres), "--gap", "0", "--quiet")
    assert text.startswith("Cheapest to do without: close Kansas City: 80 XXX a year more (9.3 %)")
    assert "Re-planned: open Detroit, Denver; more load (unit) at Denver +30, Detroit +10" in text
    assert "impossible" in text
    assert max(map(len, text.splitlines())) <= WIDTH


def test_closing_one_site_in_full(centres: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Asked about one site, cost lines and customers are listed too."""
    text = asked(capsys, "closing", str(centres), "--site", "Kansas City", "--quiet")
    assert text.startswith("Close Kansas City: 80 XXX a year more (9.3 %), everything else decided afresh; proved.")
    assert "Cost lines (XXX a year): sites +50, outbound +30." in text
    assert "Houston 20 from Kansas City to St. Louis" in " ".join(text.split())
    assert "St. Louis:" not in text


def test_closing_as_json(centres: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The object lists sites and suppliers, each re-routed and re-planned, money unrounded."""
    found = as_json(capsys, "closing", str(centres), "--gap", "0")
    assert (found["outcome"], found["cost"], found["complete"]) == ("proved", 860.0, True)
    assert found["suppliers"] == []
    line = by_name(found["sites"])["Kansas City"]
    assert line["verdict"] == "open"
    assert line["replan"]["possible"] is True
    assert line["replan"]["extra_cost"] == pytest.approx(80.0)
    assert sum(line["replan"]["cost_lines"].values()) == pytest.approx(80.0)
    assert line["reroute"]["possible"] is False
    assert line["reroute"]["unserved_load"] == pytest.approx(40.0)
    assert line["reroute"]["why"][-1] == "The sites left have a capacity of 30 unit; 70 unit are needed."


def test_closing_a_written_plan_solves_it_no_more(
    centres: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """The folder that --out wrote brings its plan along."""
    asked(capsys, "plan", str(centres), "--out", str(tmp_path / "plan"), "--quiet")
    monkeypatch.setattr("siting.questions.resolver.solve", None)
    found = as_json(capsys, "closing", str(tmp_path / "plan"))
    assert found["cost"] == 860.0


def test_closing_suppliers(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Dropping a supplier is asked with --supplier, and nothing else is tested then."""
    write_study(instances.farms_as_suppliers(), tmp_path / "farms")
    found = as_json(capsys, "closing", str(tmp_path / "farms"), "--supplier", "farm 6", "--gap", "0")
    assert found["sites"] == []
    (line,) = found["suppliers"]
    assert line["replan"]["extra_cost"] == pytest.approx(0.4, abs=1e-6)
    text = asked(capsys, "closing", str(tmp_path / "farms"), "--supplier", "farm 6", "--gap", "0", "--quiet")
    assert text.startswith("Drop farm 6: 0.40 XXX a year more (0.02 %)")


def test_closing_refuses_what_is_not_in_the_plan(centres: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A site that the plan leaves alone is refused in one sentence, with exit code 2."""
    assert main(["closing", str(centres), "--site", "Denver", "--quiet"]) == 2
    assert "the site Denver is not in the plan (verdict: leave)" in capsys.readouterr().err


def test_an_impossible_study_exits_with_3(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Without a plan there is nothing to close; the reasons are printed."""
    tables = with_cells(TINY, "sites", {2: {"capacity": "10"}, 3: {"capacity": "10"}})
    folder = write_folder(tmp_path / "study", tables)
    for command in ("closing", "headroom"):
        assert asked(capsys, command, str(folder), "--quiet", code=3).startswith("Impossible")


def test_headroom_answers_first(centres: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The tightest charge stands in the first sentence; cents are shown; nothing is wider than 100 columns."""
    text = asked(capsys, "headroom", str(centres), "--quiet")
    assert text.startswith(
        "Tightest in the plan: the charge of Kansas City may rise by 80 XXX a year; nearest outside:"
    )
    assert "80.00" in text
    assert max(map(len, text.splitlines())) <= WIDTH


def test_headroom_as_json(centres: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Each line carries its interval, its word and its charge."""
    found = as_json(capsys, "headroom", str(centres))
    lines = by_name(found["sites"])
    assert lines["Kansas City"]["yearly"] == pytest.approx(80.0)
    assert lines["Kansas City"]["room"] == "may rise"
    assert lines["Kansas City"]["exact"] is True
    assert lines["Kansas City"]["charge"] == 500.0
    assert {line["outcome"] for line in lines.values()} <= {Outcome.PROVED, Outcome.IMPOSSIBLE}
    assert lines["Denver"]["inside"] is False
    assert lines["Denver"]["yearly"] > 0


def test_headroom_of_a_named_supplier(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """One-off headroom is the yearly one over the annuity, and blank for a supplier that is signed already."""
    folder = write_folder(tmp_path / "study")
    found = as_json(capsys, "headroom", str(folder), "--supplier", "Szombathely", "--supplier", "Deggendorf")
    lines = by_name(found["suppliers"], "supplier")
    assert found["sites"] == []
    assert lines["Deggendorf"]["one_off"] is None
    annuity = 0.08 / (1 - 1.08**-10)
    assert lines["Szombathely"]["one_off"] == pytest.approx(lines["Szombathely"]["yearly"] / annuity)


def test_help_of_runners_up_states_the_defaults_of_the_question(capsys: pytest.CaptureFixture[str]) -> None:
    """The command names them without loading the question, which would slow every --help down."""
    with pytest.raises(SystemExit, match="0"):
        main(["runners-up", "--help"])
    text = " ".join(capsys.readouterr().out.split())
    assert f"as 0.02 or 2% (default: {WITHIN:.0%})" in text
    assert f"next to the best (default: {MOST})" in text
