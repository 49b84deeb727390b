"""
The PLAN folder: an answer on disk, complete in itself.

It holds plan.json, `study/` (the tables as read), the result tables as CSV and whatever else its maker adds (a map).
It is written beside its place and moved in whole, so that nobody ever reads half a plan.
"""

from __future__ import annotations

import json
import shutil
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING

from siting.cells import write_csv
from siting.errors import PlanFileError, StudyError
from siting.plan.contract import FORMAT_VERSION, answer_from_json, answer_to_json, to_text
from siting.plan.result_tables import TABLE_NAMES, result_tables
from siting.study.fingerprint import fingerprint
from siting.study.read import read_study
from siting.study.write import write_study

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from siting.plan.audit import AuditReport
    from siting.plan.plan import Answer
    from siting.study.tables import Study

PLAN_FILE = "plan.json"
STUDY_FOLDER = "study"
MAP_FILE = "map.html"
VARIANTS_FILE = "variants.toml"
"""The variants applied to the study before it was planned, where there were any; `study/` has them applied already."""

OWN_NAMES = frozenset({PLAN_FILE, STUDY_FOLDER, MAP_FILE, VARIANTS_FILE, *(f"{name}.csv" for name in TABLE_NAMES)})
"""What a PLAN folder may hold when it is written again; anything else is somebody's and stays."""

NOTHING_MORE: Mapping[str, str] = {}


def write_plan_folder(
    folder: Path,
    study: Study,
    answer: Answer,
    report: AuditReport | None,
    *,
    more: Mapping[str, str] = NOTHING_MORE,
) -> None:
    """
    Write an answer with its study, in one move.

    Parameters
    ----------
    folder
        Where; made with its parents, or replaced where it is a PLAN folder or empty.
    study
        The study that was answered.
    answer
        What was found.
    report
        The audit of its plan; None without a plan.
    more
        Text of further files by name, such as the map, written with the rest.

    Raises
    ------
    PlanFileError
        If the folder holds something that no plan writes, or cannot be written. The message names it.
    """
    folder = Path(folder).absolute()
    check_place(folder, more)
    try:
        folder.parent.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryDirectory(prefix=f".{folder.name}-", dir=folder.parent) as beside:
            made = Path(beside) / "new"
            made.mkdir()
            _fill(made, study, answer, report)
            for name, text in more.items():
                (made / name).write_text(text, encoding="utf-8")
            _move_in(made, folder, Path(beside) / "old")
    except OSError as error:
        msg = f"{folder} cannot be written: {error.strerror or error}. Choose another folder with --out."
        raise PlanFileError(msg) from error


def check_place(folder: Path, more: Iterable[str] = ()) -> None:
    """
    Refuse a place that `write_plan_folder` would refuse, so that nobody solves for an hour before they hear of it.

    Parameters
    ----------
    folder
        Where a plan is to be written.
    more
        Names of further files that are written with it.

    Raises
    ------
    PlanFileError
        If replacing the folder would take something that no plan wrote. The message names it.
    """
    folder = Path(folder).absolute()
    if folder.is_symlink() or (folder.exists() and not folder.is_dir()):
        msg = f"{folder} is there already and is not a folder. Choose another with --out."
        raise PlanFileError(msg)
    if not folder.is_dir():
        return
    held = {path.name for path in folder.iterdir()}
    if held and not _is_plan(folder / PLAN_FILE):
        msg = (
            f"{folder} is there already and is not a PLAN folder, so it is not overwritten. Choose another with --out."
        )
        raise PlanFileError(msg)
    if foreign := sorted(held - OWN_NAMES - set(more)):
        msg = f"{folder} holds {', '.join(foreign)}, which no plan wrote. Move that away, or choose another with --out."
        raise PlanFileError(msg)


def _is_plan(path: Path) -> bool:
    """Return whether a file is a plan.json of any version."""
    try:
        held = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return False
    return isinstance(held, dict) and {"format_version", "outcome", "fingerprint"} <= held.keys()


def _fill(folder: Path, study: Study, answer: Answer, report: AuditReport | None) -> None:
    """Write everything of a PLAN folder into an empty one."""
    held = answer_to_json(answer, report, fingerprint=fingerprint(study))
    (folder / PLAN_FILE).write_text(to_text(held), encoding="utf-8")
    write_study(study, folder / STUDY_FOLDER)
    for table in result_tables(answer):
        write_csv(folder / f"{table.name}.csv", table.header, table.rows)


def _move_in(made: Path, folder: Path, old: Path) -> None:
    """Put the new folder in its place; what was there comes back if that fails."""
    was_there = folder.exists()
    if was_there:
        folder.rename(old)
    try:
        made.rename(folder)
    except OSError:
        if was_there:
            old.rename(folder)
        raise
    if was_there:
        shutil.rmtree(old)


def read_plan_folder(folder: Path) -> tuple[Study, Answer]:
    """
    Return the study and the answer of a PLAN folder.

    Parameters
    ----------
    folder
        What `siting plan --out` wrote.

    Returns
    -------
    study
        As read from the folder's own tables.
    answer
        Equal to the one written.

    Raises
    ------
    PlanFileError
        If it is no PLAN folder, something in it cannot be read, or plan and tables do not belong together.
    """
    folder = Path(folder)
    path = folder / PLAN_FILE
    try:
        held = json.loads(path.read_text(encoding="utf-8"), parse_constant=_refuse_constant)
    except FileNotFoundError:
        msg = f"{folder} is not a PLAN folder: it holds no {PLAN_FILE}. Give the folder that `siting plan --out` wrote."
        raise PlanFileError(msg) from None
    except (OSError, ValueError) as error:
        msg = f"{path} cannot be read: {error}. Write the plan again with `siting plan --out`."
        raise PlanFileError(msg) from error
    answer = answer_from_json(held)
    try:
        study = read_study(folder / STUDY_FOLDER)
    except StudyError as error:
        msg = f"the tables in {folder / STUDY_FOLDER} cannot be used any more; plan the study again.\n{error}"
        raise PlanFileError(msg) from error
    if fingerprint(study) != held["fingerprint"]:
        msg = (
            f"{folder}: the tables in {STUDY_FOLDER} are not those the plan was made from (the fingerprints differ). "
            "Put them back, or plan the study again."
        )
        raise PlanFileError(msg)
    return study, answer


def _refuse_constant(name: str) -> float:
    """Refuse NaN and Infinity, which JSON does not have."""
    msg = f"{name} is not JSON (format version {FORMAT_VERSION} holds finite numbers only)"
    raise ValueError(msg)
