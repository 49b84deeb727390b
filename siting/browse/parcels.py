"""The files that leave the pages, as bytes made on demand."""

from __future__ import annotations

import io
import tempfile
import zipfile
from pathlib import Path
from typing import TYPE_CHECKING

from siting.plan.audit import audit
from siting.plan.contract import answer_to_json, to_text
from siting.plan.folder import write_plan_folder
from siting.study.write import write_workbook

if TYPE_CHECKING:
    from siting.browse.kept import Kept
    from siting.plan.audit import AuditReport
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
        write_plan_folder(folder, kept.study, kept.answer, _report(kept), more={"map.html": kept.map_html})
        buffer = io.BytesIO()
        with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as parcel:
            for path in sorted(folder.rglob("*")):
                parcel.write(path, path.relative_to(folder.parent))
        return buffer.getvalue()


def study_workbook(study: Study) -> bytes:
    """Return the study as an .xlsx workbook that reads back as a study."""
    with tempfile.TemporaryDirectory(prefix="siting-share-") as scratch:
        path = Path(scratch) / "study.xlsx"
        write_workbook(study, path)
        return path.read_bytes()


def _report(kept: Kept) -> AuditReport | None:
    return audit(kept.study, kept.answer.plan) if kept.answer.plan else None
