"""Parcels: every file that leaves the pages opens without them and holds what the page shows."""

from __future__ import annotations

import csv
import io
import json
import zipfile
from typing import TYPE_CHECKING

import pytest

from siting.browse.kept import Kept, kept_answer
from siting.browse.parcels import map_file, plan_json_file, plan_zip, study_workbook, table_file, tables_zip
from siting.browse.upload import read_upload
from siting.plan.folder import read_plan_folder
from siting.plan.result_tables import result_tables
from siting.plan.words import headline
from siting.sharing.map_data import shortened_headline
from siting.solving.solve import solve
from siting.study.check import check_raw
from siting.study.fingerprint import fingerprint
from siting.study.raw import RawStudy, table_from_rows
from tests.builders import tiny_study

if TYPE_CHECKING:
    from pathlib import Path

    from siting.browse.jobs import JobView
    from siting.study.tables import Study


@pytest.fixture(scope="module")
def kept() -> Kept:
    """Solve the tiny study."""
    study = tiny_study()
    return Kept(study=study, answer=solve(study))


def unzipped(content: bytes) -> dict[str, bytes]:
    """Return the files of a zip by name."""
    with zipfile.ZipFile(io.BytesIO(content)) as parcel:
        return {name: parcel.read(name) for name in parcel.namelist() if not name.endswith("/")}


def test_the_zip_is_a_plan_folder(kept: Kept, tmp_path: Path) -> None:
    """Unpacked, it reads as the PLAN folder that the command line writes, with a map inside."""
    with zipfile.ZipFile(io.BytesIO(plan_zip(kept))) as parcel:
        parcel.extractall(tmp_path)
    study, answer = read_plan_folder(tmp_path / "plan")
    assert fingerprint(study) == fingerprint(kept.study)
    assert answer.plan is not None
    assert kept.answer.plan is not None
    assert answer.plan.cost == kept.answer.plan.cost
    assert (tmp_path / "plan" / "map.html").read_bytes() == map_file(kept)


def test_plan_json_says_the_cost_and_the_audit(kept: Kept) -> None:
    """The object of the plan, unrounded, with its audit."""
    told = json.loads(plan_json_file(kept))
    assert told["cost"] == kept.answer.proof.cost
    assert told["audit"] == {"passed": True, "faults": []}


def test_only_the_shared_map_has_the_headline(kept: Kept) -> None:
    """The map that is mailed says the answer itself; the one on the page leaves it to the page."""
    said = json.dumps(shortened_headline(headline(kept.answer)), ensure_ascii=False)[1:-1]
    assert said in map_file(kept).decode()
    assert said not in kept.map_on_page
    assert '"headline":""' in kept.map_on_page


def test_the_workbook_reads_back(kept: Kept) -> None:
    """The study as a workbook is the same study."""
    raw = read_upload([("study.xlsx", study_workbook(kept.study))])
    assert fingerprint(check_raw(raw).sound()) == fingerprint(kept.study)


def test_result_tables_are_csv(kept: Kept) -> None:
    """Each table has its header and as many rows as the plan."""
    for table in result_tables(kept.answer):
        rows = list(csv.reader(io.StringIO(table_file(table).decode())))
        assert tuple(rows[0]) == table.header
        assert len(rows) == len(table.rows) + 1


def test_tables_as_typed_come_back_as_typed(raw: RawStudy, tiny: Study) -> None:
    """Saved and opened again, tables and settings are the same study."""
    files = unzipped(tables_zip(raw))
    assert set(files) == {"study/study.toml", "study/sites.csv", "study/customers.csv", "study/suppliers.csv"}
    assert fingerprint(check_raw(read_upload(list(files.items()))).sound()) == fingerprint(tiny)


def test_tables_with_faults_are_saved_all_the_same() -> None:
    """Text for a number, a formula and a strange column survive; no spreadsheet runs what is in the file."""
    table = table_from_rows(("site", "capacity", "=1+1"), [("=cmd|' /C calc'!A0", "much", "x")])
    files = unzipped(tables_zip(RawStudy(tables={"sites": table}, settings={"currency": "EUR", "solve": {"gap": 0.1}})))
    assert b"\"'=cmd" in files["study/sites.csv"]
    back = read_upload(list(files.items()))
    assert back.tables["sites"].header == table.header
    assert [column.to_pylist() for column in back.tables["sites"].columns] == [["=cmd|' /C calc'!A0"], ["much"], ["x"]]
    assert back.settings == {"currency": "EUR", "solve": {"gap": 0.1}}


def test_a_job_without_an_answer_has_nothing_to_share(tiny: Study) -> None:
    """A job that failed is refused by number."""
    from siting.browse.jobs import JobState, JobView  # noqa: PLC0415 - one test needs them
    from siting.listener import Progress  # noqa: PLC0415

    job: JobView = JobView(
        key="k",
        number=7_000_001,
        study=tiny,
        state=JobState.FAILED,
        progress=Progress(elapsed_s=0.0),
        history=(),
        answer=None,
        error="no",
    )
    with pytest.raises(LookupError, match="job 7000001 has no answer"):
        kept_answer(job)
