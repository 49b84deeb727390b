"""The commands runners-up, counts and compare, and the option --variant: text, JSON, exit codes, refusals."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Any

import jsonschema
import pytest

from siting.cli import main
from siting.commands.layout import WIDTH
from siting.plan.contract import schema
from tests.builders import TINY, with_cells, write_folder

if TYPE_CHECKING:
    from pathlib import Path

DEAR = """\
name = "Dear Linz"
note = "a letter"
[[change]]
table = "sites"
key = { site = "Linz" }
column = "yearly_charge"
value = 9000
"""


@pytest.fixture
def study(tmp_path: Path) -> Path:
    """Return the folder of the tiny study, Munich within reach of both sites."""
    return write_folder(tmp_path / "study", with_cells(TINY, "customers", {3: {"reach_km": ""}}))


@pytest.fixture
def variant(tmp_path: Path) -> Path:
    """Return the file of a variant that makes Linz dear."""
    (tmp_path / "dear.toml").write_text(DEAR, encoding="utf-8")
    return tmp_path / "dear.toml"


def told(capsys: pytest.CaptureFixture[str], *given: object, code: int = 0) -> str:
    """Run a command and return what it printed; no line without a path is wider than the page."""
    assert main([str(word) for word in given]) == code
    printed = capsys.readouterr()
    text = printed.out or printed.err
    assert "--json" in given or all(len(line) <= WIDTH for line in text.splitlines() if "/pytest-" not in line)
    return text


def held(capsys: pytest.CaptureFixture[str], *given: object) -> dict[str, Any]:
    """Run a command with --json and return the one object it printed."""
    loaded: dict[str, Any] = json.loads(told(capsys, *given, "--json"))
    return loaded


def test_runners_up_answers_first(study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The first line names the next-best set and its price; completeness is said at the end."""
    text = told(capsys, "runners-up", study, "--within", "100%", "--quiet")
    assert text.startswith("The next-best set costs ")
    assert "Otherwise than the best:\n1. " in text
    assert "Complete: no other set within 100 % of the best" in text
    found = held(capsys, "runners-up", study, "--within", "1.0")
    assert found["within"] == 1.0
    assert found["complete"] is True
    assert len(found["answers"]) > 1


def test_runners_up_says_when_there_is_none_and_when_it_is_cut(study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Nothing within a tenth of a per mille is proved; one asked for where there are more is said."""
    text = told(capsys, "runners-up", study, "--within", "0.0001", "--quiet")
    assert text.startswith("No other set of sites and suppliers comes within 0.01 % of the best: proved.")
    text = told(capsys, "runners-up", study, "--within", "1000%", "--most", "1", "--quiet")
    assert "not up to 1,000 %: only as many were" in text


@pytest.mark.parametrize(
    ("option", "value", "said"),
    [
        ("--within", "a lot", "'a lot' is not a share of at least 0; write 2 % as 0.02 or 2%"),
        ("--within", "-1%", "expected one argument"),
        ("--most", "0", "'0' is not a whole number of at least 1; write one such as 10"),
        ("--most", "2.5", "'2.5' is not a whole number of at least 1"),
    ],
)
def test_runners_up_refuses(
    option: str, value: str, said: str, study: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Shares below 0 and numbers below 1 are refused with the way to write them."""
    with pytest.raises(SystemExit, match="2"):
        main(["runners-up", str(study), option, value])
    assert said in capsys.readouterr().err


def test_counts_answers_first(study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The first line names the best number; the table has the split, the band and the distance."""
    text = told(capsys, "counts", study, "--quiet")
    assert text.startswith("1 site is best, at ")
    assert "\nsites   cost  at least  fixed  freight   rest   km\n1      8,426     8,426" in text
    found = held(capsys, "counts", study, "--from", "1", "--to", "1")
    assert [entry["count"] for entry in found["counts"]] == [1]
    assert found["pruned"][0]["from"] == 2


def test_counts_refuses_what_is_no_number(study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A fraction of a site is refused, and so is a number that the study does not have."""
    with pytest.raises(SystemExit, match="2"):
        main(["counts", str(study), "--from", "1.5"])
    assert "'1.5' is not a whole number of sites; write one such as 5" in capsys.readouterr().err
    assert "numbers of sites go from 0 to 2, got from 0 to 3" in told(capsys, "counts", study, "--to", "3", code=2)


def test_an_impossible_study_ends_with_3(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Without a plan both questions say why and return the code of an impossible study."""
    shut = with_cells(TINY, "sites", {2: {"ruling": "pinned-shut"}, 3: {"ruling": "pinned-shut"}})
    folder = write_folder(tmp_path / "shut", shut)
    for command in ("runners-up", "counts"):
        assert told(capsys, command, folder, "--quiet", code=3).startswith("Impossible")


def test_compare_shows_a_variant_beside_its_study(
    study: Path, variant: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Each goes by its own name; what differs, and who moves, is there; the JSON form lists every plan."""
    told(capsys, "plan", study, "--quiet", "--out", tmp_path / "base")
    told(capsys, "plan", study, "--quiet", "--variant", variant, "--out", tmp_path / "dear")
    text = told(capsys, "compare", tmp_path / "base", tmp_path / "dear")
    assert text.startswith("base is the cheapest, ")
    assert "4 customers change\nsite." in text
    assert "Dear Linz" in text
    found = held(capsys, "compare", tmp_path / "base", tmp_path / "dear")
    assert [plan["name"] for plan in found["plans"]] == ["base", "Dear Linz"]
    same = told(capsys, "compare", tmp_path / "base", tmp_path / "base", code=2)
    assert "two plans go by the name" in same
    told(capsys, "plan", study, "--quiet", "--out", tmp_path / "dear")
    assert "dear" in told(capsys, "compare", tmp_path / "base", tmp_path / "dear")
    assert "Every verdict is the same." in told(capsys, "compare", tmp_path / "base", tmp_path / "dear")


def test_long_names_are_listed_under_letters(study: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Names too long for a column stand in a key above the tables."""
    folders = [tmp_path / f"a plan with a long name {n}" for n in (1, 2)]
    for folder in folders:
        told(capsys, "plan", study, "--quiet", "--out", folder)
    text = told(capsys, "compare", *folders)
    assert "A  a plan with a long name 1\nB  a plan with a long name 2" in text


def test_a_variant_is_applied_named_and_listed(study: Path, variant: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """`plan --variant` solves the changed study and says what was changed, in text and in JSON of the schema."""
    text = told(capsys, "plan", study, "--quiet", "--variant", variant)
    assert "Variant: Dear Linz (a letter). It changes:\n- sites Linz yearly_charge: 1000 -> 9000" in text
    plain, changed = held(capsys, "plan", study), held(capsys, "plan", study, "--variant", variant)
    assert changed["variants"] == [{"name": "Dear Linz", "note": "a letter"}]
    assert changed["changes"] == ["sites Linz yearly_charge: 1000 -> 9000"]
    assert "variants" not in plain
    assert changed["fingerprint"] != plain["fingerprint"]
    assert changed["cost"] > plain["cost"]
    for summary in (plain, changed):
        jsonschema.validate(summary, schema())


@pytest.mark.parametrize("command", ["closing", "headroom", "runners-up", "counts"])
def test_every_question_takes_variants(
    command: str, study: Path, variant: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Each question is asked of the changed study, and lists the changes."""
    plain, changed = held(capsys, command, study), held(capsys, command, study, "--variant", variant)
    assert changed["fingerprint"] != plain["fingerprint"]
    assert changed["changes"] == ["sites Linz yearly_charge: 1000 -> 9000"]
    text = told(capsys, command, study, "--quiet", "--variant", variant)
    assert "Variant: Dear Linz (a letter). It changes:" in text


def test_variants_stack_on_the_command_line(
    study: Path, variant: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """A second file is applied on top of the first; a plan folder is asked about with its variants on top too."""
    back = tmp_path / "back.toml"
    back.write_text(DEAR.replace("Dear Linz", "Back").replace("9000", "1000"), encoding="utf-8")
    plain = held(capsys, "plan", study)
    both = held(capsys, "plan", study, "--variant", variant, "--variant", back)
    assert both["fingerprint"] == plain["fingerprint"]
    assert [each["name"] for each in both["variants"]] == ["Dear Linz", "Back"]
    told(capsys, "plan", study, "--quiet", "--out", tmp_path / "base")
    asked = held(capsys, "counts", tmp_path / "base", "--variant", variant)
    assert asked["fingerprint"] == held(capsys, "plan", study, "--variant", variant)["fingerprint"]


def test_a_variant_that_does_not_fit_ends_with_2(
    study: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """The fault names the variant's change; a missing file is named too."""
    wrong = tmp_path / "wrong.toml"
    wrong.write_text(DEAR.replace('site = "Linz"', 'site = "Lintz"'), encoding="utf-8")
    text = told(capsys, "plan", study, "--variant", wrong, "--json", code=2)
    assert "variant 'Dear Linz', change 1 (sites Lintz yearly_charge): the table has no such row." in text
    text = told(capsys, "closing", study, "--variant", tmp_path / "none.toml", "--json", code=2)
    assert "there is no such file. Give the TOML file of a variant." in text
