"""The files that leave the pages, as bytes made on demand."""

from __future__ import annotations

import io
import tempfile
import zipfile
from pathlib import Path
from typing import TYPE_CHECKING

import tomli_w

from siting.cells import write_csv
from siting.plan.audit import audit
from siting.plan.contract import answer_to_json, to_text
from siting.plan.folder import MAP_FILE, write_plan_folder
from siting.study.read import SETTINGS_FILE
from siting.study.write import write_workbook

if TYPE_CHECKING:
    from siting.browse.kept import Kept
    from siting.plan.audit import AuditReport
    from siting.plan.result_tables import ResultTable
    from siting.study.raw import RawStudy
    from siting.study.tables import Study


def map_file(kept: Kept) -> bytes:
    """Return the map of the plan as one HTML document."""
    return kept.map_html.encode("utf-8")


def plan_json_file(kept: Kept) -> bytes:
    """Return plan.json of the answer."""
    return to_text(answer_to_json(kept.answer, _report(kept))).encode("utf-8")


def plan_zip(kept: Kept) -> bytes:
    """Return the PLAN folder, map included, as one zip file."""
    with tempfile.TemporaryDirectory(prefix="siting-share-") as scratch:
        folder = Path(scratch) / "plan"
        write_plan_folder(
            folder, kept.study, kept.answer, _report(kept), more={MAP_FILE: kept.map_html} if kept.answer.plan else {}
        )
        return _zipped(folder)


def table_file(table: ResultTable) -> bytes:
    """Return a result table as a CSV file."""
    with tempfile.TemporaryDirectory(prefix="siting-share-") as scratch:
        path = Path(scratch) / "table.csv"
        write_csv(path, table.header, table.rows)
        return path.read_bytes()


def tables_zip(raw: RawStudy) -> bytes:
    """Return tables and settings as typed, faults and all, as one zip file of CSV tables and study.toml."""
    with tempfile.TemporaryDirectory(prefix="siting-share-") as scratch:
        folder = Path(scratch) / "study"
        folder.mkdir()
        for name, table in raw.tables.items():
            columns = [column.to_pylist() for column in table.columns]
            write_csv(folder / f"{name}.csv", table.header, zip(*columns, strict=True))
        (folder / SETTINGS_FILE).write_bytes(tomli_w.dumps(raw.settings).encode())
        return _zipped(folder)


def study_workbook(study: Study) -> bytes:
    """Return the study as an .xlsx workbook that reads back as a study."""
    with tempfile.TemporaryDirectory(prefix="siting-share-") as scratch:
        path = Path(scratch) / "study.xlsx"
        write_workbook(study, path)
        return path.read_bytes()


def _zipped(folder: Path) -> bytes:
    """Return a folder as a zip file that unpacks to one folder of its name."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as parcel:
        for path in sorted(folder.rglob("*")):
            parcel.write(path, path.relative_to(folder.parent))
    return buffer.getvalue()


def _report(kept: Kept) -> AuditReport | None:
    return audit(kept.study, kept.answer.plan) if kept.answer.plan else None
