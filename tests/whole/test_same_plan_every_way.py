"""One study as a folder of CSV files, as a workbook and inside a PLAN folder: the same plan, the same faults."""

from __future__ import annotations

import csv
import tempfile
from dataclasses import replace
from io import StringIO
from pathlib import Path
from typing import TYPE_CHECKING

import pytest
from hypothesis import HealthCheck, given, settings
from openpyxl import Workbook

from siting.errors import StudyError
from siting.plan.audit import audit
from siting.plan.folder import read_plan_folder, write_plan_folder
from siting.study.check import check_raw
from siting.study.demo import demo_folder
from siting.study.fingerprint import fingerprint
from siting.study.read import read_raw, read_study
from siting.study.write import write_study, write_workbook
from tests.answers import EXACT, audited, open_sites, proved
from tests.published import instances
from tests.whole.generator import studies

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.errors import Fault
    from siting.plan.plan import Answer
    from siting.study.tables import Study

THREE_DEPOTS = {
    "study.toml": 'title = "three depots"\ncurrency = "XXX"\nunit = "unit"\n',
    "sites.csv": "site,standing,yearly_charge,capacity\n"
    "site 1,proposed,1000,500\nsite 2,proposed,1000,500\nsite 3,proposed,1000,500\n",
    "customers.csv": "customer,demand\nA,80\nB,270\nC,250\nD,160\nE,180\n",
    "lanes.csv": "origin,destination,unit_cost\n"
    "site 1,A,4\nsite 1,B,5\nsite 1,C,6\nsite 1,D,8\nsite 1,E,10\n"
    "site 2,A,6\nsite 2,B,4\nsite 2,C,3\nsite 2,D,5\nsite 2,E,8\n"
    "site 3,A,9\nsite 3,B,7\nsite 3,C,4\nsite 3,D,3\nsite 3,E,4\n",
}
"""Pedroso & Kubo, chapter on facility location, typed as an analyst would."""

BROKEN = {
    **THREE_DEPOTS,
    "sites.csv": "site,standing,yearly_charge,capacity,latitude,longitude\n"
    "site 1,proposed,1000,500,,\n"
    "site 1,proposed,-5,500,,\n"
    "site 2,planned,1000,lots,,\n"
    "site 3,,1000,500,95,10\n",
    "customers.csv": "customer,demannd\nA,80\nB,abc\n,250\nD,\n",
    "lanes.csv": "origin,destination,unit_cost,barred\nsite 1,A,4,\nsite 1,A,4,\nsite 9,A,5,\nsite 2,D,x,perhaps\n",
    "rules.csv": "rule,members,number\nat_most,site 1;site 7,2\nnever,site 1;site 2,\n",
}
"""The same with faults of many kinds."""


def write_csv_files(files: Mapping[str, str], folder: Path) -> Path:
    """Write the files into a new folder."""
    folder.mkdir()
    for name, text in files.items():
        (folder / name).write_text(text, encoding="utf-8")
    return folder


def write_sheets(files: Mapping[str, str], path: Path) -> Path:
    """Write the same as a workbook: settings as a sheet `study`, numbers as numbers, blanks as empty cells."""
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "study"
    sheet.append(["setting", "value"])
    for line in files["study.toml"].splitlines():
        name, value = line.split(" = ")
        sheet.append([name, value.strip('"')])
    for name, text in files.items():
        if name.endswith(".csv"):
            table = book.create_sheet(name.removesuffix(".csv"))
            for record in csv.reader(StringIO(text)):
                table.append([_as_cell(cell) for cell in record])
    book.save(path)
    return path


def _as_cell(text: str) -> str | float | None:
    try:
        return float(text) if text else None
    except ValueError:
        return text


def without_time(answer: Answer) -> Answer:
    """Return the answer as if it had taken no time, so that two runs compare."""
    proof = replace(answer.proof, seconds=0.0)
    today = answer.today
    if today is not None and today.plan is not None:
        still = replace(today.plan, proof=replace(today.plan.proof, seconds=0.0))
        today = replace(today, plan=still)
    plan = None if answer.plan is None else replace(answer.plan, proof=proof, today=today)
    return replace(answer, proof=proof, plan=plan, today=today)


def faults_of(path: Path) -> list[Fault]:
    """Return the faults of a study that cannot be used."""
    with pytest.raises(StudyError, match="faults in the study") as caught:
        read_study(path)
    return list(caught.value.faults)


def test_tables_as_typed_reach_the_published_optimum(tmp_path: Path) -> None:
    """Typed as CSV files and as a workbook, the published problem is answered with its published optimum."""
    folder = write_csv_files(THREE_DEPOTS, tmp_path / "typed")
    workbook = write_sheets(THREE_DEPOTS, tmp_path / "typed.xlsx")
    one, other = read_study(folder), read_study(workbook)
    assert fingerprint(one) == fingerprint(other)
    for study in (one, other):
        plan = proved(study)
        assert plan.proof.cost == pytest.approx(5610, abs=0.005)
        assert open_sites(plan) == {"site 2", "site 3"}


def test_a_folder_and_a_workbook_have_the_same_faults(tmp_path: Path) -> None:
    """Every fault of every table is the same: table, row, column, value, what is wrong and the repair."""
    in_folder = faults_of(write_csv_files(BROKEN, tmp_path / "broken"))
    in_workbook = faults_of(write_sheets(BROKEN, tmp_path / "broken.xlsx"))
    assert [str(fault) for fault in in_folder] == [str(fault) for fault in in_workbook]
    assert {fault.table for fault in in_folder} == {"sites", "customers", "lanes", "rules"}
    assert len(in_folder) >= 12


@pytest.mark.parametrize(
    "study",
    [
        instances.stores(),
        instances.regional_plants(),
        instances.merger(),
        instances.depot_location(savings=True),
        instances.farms_as_suppliers(),
        instances.two_warehouses(("w1", "c1")),
        instances.fire_stations(15),
    ],
    ids=lambda study: study.settings.title,
)
def test_published_problems_survive_being_written(study: Study, tmp_path: Path) -> None:
    """Written as a folder and as a workbook and read back, a published problem has the same plan, flow by flow."""
    write_study(study, tmp_path / "folder")
    write_workbook(study, tmp_path / "book.xlsx")
    first = without_time(audited(study))
    for path in (tmp_path / "folder", tmp_path / "book.xlsx"):
        again = read_study(path)
        assert fingerprint(again) == fingerprint(study)
        assert without_time(audited(again)) == first


@settings(max_examples=25, deadline=None, derandomize=True, database=None, suppress_health_check=tuple(HealthCheck))
@given(study=studies())
def test_random_studies_survive_being_written(study: Study) -> None:
    """A random study written both ways is the same study, or is refused with the same faults; its plan is the same."""
    with tempfile.TemporaryDirectory() as place:
        folder, workbook = Path(place) / "folder", Path(place) / "book.xlsx"
        write_study(study, folder)
        write_workbook(study, workbook)
        checked = [check_raw(read_raw(path)) for path in (folder, workbook)]
        one, other = (result.study for result in checked)
        if one is None or other is None:
            assert one is other
            assert [fault.wrong for fault in checked[0].faults] == [fault.wrong for fault in checked[1].faults]
            return
        assert fingerprint(one) == fingerprint(other) == fingerprint(study)
        first = without_time(audited(one))
        assert without_time(audited(other)) == first
        assert without_time(audited(study)).plan == first.plan


def test_a_plan_folder_answers_as_its_study_does(tmp_path: Path) -> None:
    """The PLAN folder gives back study and answer; planning its study again gives the same plan and audit."""
    study = instances.depot_location(savings=True)
    answer = audited(study)
    assert answer.plan is not None
    write_plan_folder(tmp_path / "plan", study, answer, audit(study, answer.plan))
    inside, held = read_plan_folder(tmp_path / "plan")
    assert held == answer
    assert fingerprint(inside) == fingerprint(study)
    assert without_time(audited(inside)) == without_time(answer)
    assert without_time(audited(read_study(tmp_path / "plan" / "study"))) == without_time(answer)


def test_the_demo_is_the_same_study_every_way(tmp_path: Path) -> None:
    """The demo study as a folder, as a workbook and from its PLAN folder: one fingerprint, one plan."""
    study = read_study(demo_folder())
    write_workbook(study, tmp_path / "demo.xlsx")
    from_book = read_study(tmp_path / "demo.xlsx")
    assert fingerprint(from_book) == fingerprint(study)
    quick = replace(EXACT, gap=1e-3)
    answer = audited(study, quick)
    assert answer.plan is not None
    assert without_time(audited(from_book, quick)) == without_time(answer)
    write_plan_folder(tmp_path / "plan", study, answer, audit(study, answer.plan))
    inside, held = read_plan_folder(tmp_path / "plan")
    assert held == answer
    assert fingerprint(inside) == fingerprint(study)
