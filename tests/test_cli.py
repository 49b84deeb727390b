"""The command line: what it prints, where, and with which exit code."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from dataclasses import replace
from typing import TYPE_CHECKING

import highspy
import jsonschema
import pulp
import pytest

import siting
from siting import cli
from siting.commands import plan as plan_command
from siting.plan.contract import schema
from siting.study.demo import demo_folder
from tests.builders import TINY, TINY_SETTINGS, with_cells, without_column, write_folder

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

COLUMNS = 100


@pytest.fixture
def tiny(tmp_path: Path) -> Path:
    """Write the tiny study as a folder."""
    return write_folder(tmp_path / "tiny")


def test_version_and_help_load_nothing_heavy() -> None:
    """Neither numpy, pandas, PuLP, HiGHS nor pyproj is imported before a command runs."""
    script = (
        "import sys; from siting.cli import main\n"
        "for word in ('--version', '--help'):\n"
        "    try: main([word])\n"
        "    except SystemExit as ended: assert ended.code == 0\n"
        "heavy = {'numpy', 'pandas', 'pulp', 'highspy', 'pyproj', 'babel', 'openpyxl'} & set(sys.modules)\n"
        "sys.exit(f'imported {heavy}' if heavy else 0)\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=False)  # noqa: S603  (our own)
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith(f"siting {siting.__version__}\n")
    assert "exit codes: 0 plan found and audited" in done.stdout


def test_check_says_what_a_sound_study_holds(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Without a fault the exit code is 0 and the counts are told."""
    assert cli.main(["check", str(tiny)]) == 0
    out = capsys.readouterr().out
    assert out.startswith("No fault. Tiny: 2 sites (1 running), 2 suppliers (1 signed), 4 customers, one good.")


def test_check_counts_one_of_a_kind(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The singular."""
    lanes = "origin,destination,unit_cost\nLinz,Vienna,3\n"
    tables = {
        "sites": "site,standing,yearly_charge,capacity\nLinz,running,9,unlimited\n",
        "customers": "customer,demand\nVienna,7\n",
        "lanes": lanes,
        "rules": "rule,members,number\nat_least,Linz,1\n",
    }
    write_folder(tmp_path / "one", tables)
    assert cli.main(["check", str(tmp_path / "one")]) == 0
    out = capsys.readouterr().out
    assert out.startswith("No fault. Tiny: 1 site (1 running), 1 customer, one good, 1 row of lanes, 1 rule.\n")


def test_check_as_json_keeps_to_its_schema(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """With and without faults the object is as the shipped schema says, and nothing else is printed."""
    assert cli.main(["check", "--json", str(tiny)]) == 0
    sound = json.loads(capsys.readouterr().out)
    (tiny / "sites.csv").write_text("site\nLinz\n\nLinz\n", encoding="utf-8")
    assert cli.main(["check", "--json", str(tiny)]) == 2
    broken = json.loads(capsys.readouterr().out)
    jsonschema.validate(sound, schema("check"))
    jsonschema.validate(broken, schema("check"))
    assert sound["faults"] == []
    assert broken["faults"] != []


BROKEN: dict[str, tuple[str, Callable[[str], str], str]] = {
    "a key column deleted": (
        "customers.csv",
        lambda text: without_column(text, "customer"),
        "customers, customer: ",
    ),
    "a blank key": (
        "customers.csv",
        lambda text: text.replace("Munich,Munich,", ",Munich,"),
        "customers, row 4, column customer: ",
    ),
    "a key twice": (
        "sites.csv",
        lambda text: text.replace("Vienna,Vienna,", "Linz,Vienna,"),
        "sites, row 7, column site, value 'Linz': ",
    ),
    "text in a number": (
        "offers.csv",
        lambda text: text.replace("Deggendorf,media,104,", "Deggendorf,media,about 104,"),
        "offers, row 2, column unit_price, value 'about 104': ",
    ),
    "a negative demand": (
        "demands.csv",
        lambda text: text.replace("Vienna,media,1700", "Vienna,media,-1700"),
        "demands, row 3, column demand, value '-1700': ",
    ),
    "a latitude out of range": (
        "customers.csv",
        lambda text: text.replace("48.20849,16.37208", "148.2,16.37208"),
        "customers, row 3, column latitude, value '148.2': ",
    ),
    "a key that no table defines": (
        "rules.csv",
        lambda text: text.replace("Vienna;Trnava", "Vienna;Trnawa"),
        "rules, row 2, column members, value 'Vienna;Trnawa': ",
    ),
    "a slip in a column's name": (
        "sites.csv",
        lambda text: text.replace("yearly_charge", "yearly_chrage", 1),
        "sites, yearly_charge: ",
    ),
    "a setting out of range": (
        "study.toml",
        lambda text: text.replace("interest_rate = 0.08", "interest_rate = 8"),
        "study.toml, interest_rate, value '8': ",
    ),
    "a currency nobody uses": (
        "study.toml",
        lambda text: text.replace('"EUR"', '"EUX"'),
        "study.toml, currency, value 'EUX': ",
    ),
}


@pytest.mark.parametrize("kind", BROKEN)
def test_broken_copies_of_the_demo_are_explained(kind: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Each fault comes with table, row, column, value and repair; `check` and `plan` both exit with 2."""
    name, change, place = BROKEN[kind]
    folder = tmp_path / "broken"
    shutil.copytree(demo_folder(), folder)
    text = (folder / name).read_bytes().decode("utf-8")
    assert change(text) != text
    (folder / name).write_bytes(change(text).encode("utf-8"))
    assert cli.main(["check", str(folder)]) == 2
    out, err = capsys.readouterr()
    (line, *_) = [line for line in out.splitlines() if line.strip().startswith(place)]
    assert line.endswith(".")
    assert line.count(". ") >= 1, "a repair follows what is wrong"
    assert err == ""
    assert cli.main(["plan", str(folder)]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert line in err
    assert "Traceback" not in err


def test_plan_prints_the_verdict_first_and_fits_the_page(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Headline, verdicts, cost lines that end in the cost, proof and cautions, in lines of at most 100 columns."""
    assert cli.main(["plan", str(tiny), "--gap", "0"]) == 0
    out, err = capsys.readouterr()
    lines = out.splitlines()
    assert lines[0].startswith("Run ")
    assert max(len(line) for line in lines) <= COLUMNS
    order = ["Sites: load a year (t)", "Suppliers: load a year (t)", "EUR a year ", "Proof: proved", "Cautions:"]
    places = [next(n for n, line in enumerate(lines) if line.startswith(start)) for start in order]
    assert places == sorted(places)
    assert err.splitlines()[0] == "planning Tiny ..."


def test_quiet_and_json_say_nothing_beside_the_answer(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """With --quiet or --json the error stream stays empty."""
    assert cli.main(["plan", str(tiny), "--quiet"]) == 0
    assert capsys.readouterr().err == ""
    assert cli.main(["plan", str(tiny), "--json"]) == 0
    assert capsys.readouterr().err == ""


def test_plan_as_json_keeps_to_its_schema(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """One object, as the shipped schema says, whose cost lines add up to its cost."""
    assert cli.main(["plan", str(tiny), "--json", "--gap", "0"]) == 0
    held = json.loads(capsys.readouterr().out)
    jsonschema.validate(held, schema())
    assert held["outcome"] == "proved"
    assert held["audit"] == {"passed": True, "faults": []}
    assert sum(held["cost_lines"].values()) == pytest.approx(held["cost"])
    assert held["saving"] == pytest.approx(held["today"]["cost"] - held["cost"])


def test_a_written_plan_is_audited_from_its_own_tables(
    tiny: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """`plan --out` writes all that `audit` needs; the study it came from may be gone."""
    out = tmp_path / "my plan"
    assert cli.main(["plan", str(tiny), "--quiet", "--out", str(out)]) == 0
    assert f"Written to {out}" in capsys.readouterr().out
    assert (out / "map.html").read_text(encoding="utf-8").startswith("<!")
    shutil.rmtree(tiny)
    assert cli.main(["audit", str(out)]) == 0
    assert capsys.readouterr().out.startswith("Passed: ")
    assert cli.main(["audit", "--json", str(out)]) == 0
    assert json.loads(capsys.readouterr().out) == {"passed": True, "faults": []}


def test_a_tampered_plan_fails_its_audit(tiny: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A plan whose first flow was cut by half exits with 5 and says what does not add up."""
    study = siting.read_study(tiny)
    answer = siting.solve(study)
    plan = answer.plan
    assert plan is not None
    first, *rest = plan.flows
    cut = replace(plan, flows=(replace(first, amount=first.amount / 2), *rest))
    siting.write_plan_folder(tmp_path / "cut", study, replace(answer, plan=cut), None)
    assert cli.main(["audit", str(tmp_path / "cut")]) == 5
    assert capsys.readouterr().out.startswith("Failed: ")
    assert cli.main(["audit", "--json", str(tmp_path / "cut")]) == 5
    assert json.loads(capsys.readouterr().out)["passed"] is False


def test_audit_of_what_is_no_plan_is_bad_input(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The folder of a study, given in place of a plan, is refused by name."""
    assert cli.main(["audit", str(tiny)]) == 2
    assert "is not a PLAN folder: it holds no plan.json" in capsys.readouterr().err


def test_an_impossible_study_is_explained(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Exit code 3 and the shortfall in words: 100 t needed, 90 t of capacity."""
    tables = with_cells(TINY, "sites", {2: {"capacity": "50"}, 3: {"capacity": "40"}})
    write_folder(tmp_path / "short", tables)
    assert cli.main(["plan", str(tmp_path / "short"), "--quiet"]) == 3
    out, err = capsys.readouterr()
    assert out.startswith("Impossible")
    assert "10 t" in " ".join(out.split())
    assert err == ""
    kept = tmp_path / "kept"
    assert cli.main(["plan", str(tmp_path / "short"), "--quiet", "--out", str(kept)]) == 3
    out = capsys.readouterr().out
    assert out.endswith(f"Written to {kept}, the reasons in plan.json.\n")
    assert "Today: " not in out
    assert cli.main(["audit", str(kept)]) == 2
    assert "holds no plan to audit (outcome: impossible)" in capsys.readouterr().err
    assert cli.main(["plan", str(tmp_path / "short"), "--json"]) == 3
    held = json.loads(capsys.readouterr().out)
    jsonschema.validate(held, schema())
    assert held["outcome"] == "impossible"
    assert held["cost"] is None


@pytest.mark.parametrize(
    ("settings", "brno", "deggendorf", "first"),
    [
        ("one_off_budget = 0\n", "unlimited", "unlimited", "Impossible. Any one of these repairs it."),
        ("", "40", "5", "Impossible. All of these together must be met."),
    ],
)
def test_several_reasons_are_a_point_each(  # noqa: PLR0917  (what differs, and the two fixtures)
    settings: str,
    brno: str,
    deggendorf: str,
    first: str,
    tmp_path: Path,
    capsys: pytest.CaptureFixture[str],
) -> None:
    """Whether any one or all must be met comes first, then one point a reason, in lines of at most 100 columns."""
    tables = with_cells(TINY, "sites", {2: {"capacity": "50"}, 3: {"capacity": brno}})
    tables = with_cells(tables, "suppliers", {2: {"capacity": deggendorf}})
    write_folder(tmp_path / "short", tables, TINY_SETTINGS + settings)
    assert cli.main(["plan", str(tmp_path / "short"), "--quiet"]) == 3
    lines = capsys.readouterr().out.splitlines()
    assert lines[0] == first
    assert sum(line.startswith("- ") for line in lines) == 2
    assert max(len(line) for line in lines) <= COLUMNS


def test_a_study_stopped_before_any_plan(
    tiny: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """With a stop requested before the search begins the exit code is 4, and no plan is printed."""

    def stopped(work: Callable[[], object], stop: siting.Stop) -> object:
        stop.request()
        return work()

    monkeypatch.setattr("siting.commands.interrupt.run_stoppable", stopped)
    assert cli.main(["plan", str(tiny), "--quiet"]) == 4
    assert capsys.readouterr().out.startswith("No plan yet")


@pytest.mark.parametrize("gap", ["0", "0.5", "0.999"])
def test_gaps_below_1_are_taken(gap: str, tiny: Path) -> None:
    """A gap is a fraction from 0 to below 1."""
    assert cli.main(["plan", str(tiny), "--quiet", "--gap", gap]) == 0


@pytest.mark.parametrize(
    ("option", "value", "message"),
    [
        ("--gap", "1", "a gap is a fraction from 0 to below 1, got 1; write 1 % as 0.01"),
        ("--gap", "-0.001", "a gap is a fraction from 0 to below 1, got -0.001; write 1 % as 0.01"),
        ("--gap", "nan", "a gap is a fraction from 0 to below 1, got nan; write 1 % as 0.01"),
        ("--gap", "1%", "'1%' is not a number; write one such as 0.01 or 120"),
        ("--time-limit", "0", "a time limit is a number of seconds above 0, got 0; write two minutes as 120"),
        ("--time-limit", "inf", "a time limit is a number of seconds above 0, got inf; write two minutes as 120"),
        ("--engine", "fast", "invalid choice: 'fast'"),
    ],
)
def test_options_out_of_range_are_refused(
    option: str, value: str, message: str, tiny: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """A bad option ends with exit code 2 and says what to write."""
    with pytest.raises(SystemExit, match="2"):
        cli.main(["plan", str(tiny), f"{option}={value}"])
    assert message in capsys.readouterr().err


def test_options_win_over_the_study(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The engine named on the command line runs, whatever `study.toml` says."""
    assert cli.main(["plan", str(tiny), "--json", "--engine", "cbc", "--time-limit", "60"]) == 0
    assert json.loads(capsys.readouterr().out)["engine"] == "cbc"


def test_written_models_have_the_same_optimum(tiny: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """MPS and LP file, read back by HiGHS and by CBC, cost what the plan costs."""
    mps, lp = tmp_path / "model.mps", tmp_path / "model.lp"
    arguments = ["plan", str(tiny), "--json", "--gap", "0", "--mps", str(mps), "--lp", str(lp)]
    assert cli.main(arguments) == 0
    cost = json.loads(capsys.readouterr().out)["cost"]
    for path in (mps, lp):
        assert optimum_by_highs(path) == pytest.approx(cost, rel=1e-6)
        assert optimum_by_cbc(path) == pytest.approx(cost, rel=1e-6)


def optimum_by_highs(path: Path) -> float:
    """Return the optimum of a model file, found by HiGHS."""
    highs = highspy.Highs()  # type: ignore[no-untyped-call]  # the library's constructor has no types
    highs.setOptionValue("output_flag", False)  # noqa: FBT003  (the library's own form)
    highs.readModel(str(path))
    highs.setOptionValue("mip_rel_gap", 0.0)
    highs.run()
    return float(highs.getObjectiveValue())


def optimum_by_cbc(path: Path) -> float:
    """Return the optimum of a model file, found by the CBC program that comes with PuLP."""
    solution = path.with_suffix(".txt")
    command = [pulp.PULP_CBC_CMD.pulp_cbc_path, str(path), "-ratio", "0", "-solve", "-solution", str(solution)]
    subprocess.run(command, check=True, capture_output=True, timeout=60)  # noqa: S603  (PuLP's own)
    head = solution.read_text(encoding="utf-8").partition("\n")[0]
    assert head.startswith("Optimal")
    return float(head.rpartition(" ")[2])


def test_a_folder_that_is_no_plan_is_refused_before_solving(
    tiny: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """Nobody waits for a solve to hear that its plan cannot be written over their own files."""

    def never(*_: object, **__: object) -> None:
        pytest.fail("solved before the place was checked")

    monkeypatch.setattr("siting.solving.solve.solve", never)
    assert cli.main(["plan", str(tiny), "--out", str(tiny)]) == 2
    assert "is not a PLAN folder, so it is not overwritten" in capsys.readouterr().err


def test_a_place_that_cannot_be_written_is_bad_input(tiny: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A file in a folder that is not there is named, with what to do."""
    assert cli.main(["plan", str(tiny), "--quiet", "--mps", str(tiny / "nowhere" / "model.mps")]) == 2
    assert "nowhere/model.mps: No such file or directory. Check the path" in capsys.readouterr().err


def test_an_internal_error_is_one_paragraph(
    tiny: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """Exit code 1, no traceback, and how to see one; with SITING_DEBUG the error itself comes through."""

    def broken(*_: object) -> None:
        msg = "wheel came off"
        raise ZeroDivisionError(msg)

    monkeypatch.setattr(plan_command, "solve_settings", broken)
    monkeypatch.delenv("SITING_DEBUG", raising=False)
    assert cli.main(["plan", str(tiny)]) == 1
    err = capsys.readouterr().err
    assert err.startswith(
        "Internal error, a fault of the program and not of the study: ZeroDivisionError: wheel came off."
    )
    assert len(err.splitlines()) == 1
    monkeypatch.setenv("SITING_DEBUG", "1")
    with pytest.raises(ZeroDivisionError, match="wheel came off"):
        cli.main(["plan", str(tiny)])


def test_a_reader_that_stops_reading_is_no_error(tiny: Path) -> None:
    """`siting check ... | head -0` ends quietly."""
    script = "import sys; from siting.cli import main; sys.exit(main(sys.argv[1:]))"
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "wb") as closed:
        done = subprocess.run(  # noqa: S603  (our own)
            [sys.executable, "-c", script, "check", str(tiny)], stdout=closed, stderr=subprocess.PIPE, check=False
        )
    assert done.stderr == b""
    assert done.returncode == 0


def test_a_study_as_folder_workbook_and_plan_folder_gives_one_plan(
    tiny: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """CSV, workbook and the study inside a PLAN folder: same fingerprint, same verdicts, same cost."""
    study = siting.read_study(tiny)
    siting.write_workbook(study, tmp_path / "tiny.xlsx")
    assert cli.main(["plan", str(tiny), "--json", "--gap", "0", "--out", str(tmp_path / "kept")]) == 0
    given = [json.loads(capsys.readouterr().out)]
    for path in (tmp_path / "tiny.xlsx", tmp_path / "kept" / "study"):
        assert cli.main(["plan", str(path), "--json", "--gap", "0"]) == 0
        given.append(json.loads(capsys.readouterr().out))
    for held in given[1:]:
        assert {**held, "seconds": 0} == {**given[0], "seconds": 0}
