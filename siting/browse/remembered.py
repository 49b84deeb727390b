"""Plans of a draft, remembered under names of the analyst: each solve that ended with one, and plans from files."""

from __future__ import annotations

import io
import tempfile
import zipfile
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from siting.browse.jobs import JobState, find_job
from siting.browse.kept import kept_answer
from siting.errors import PlanFileError
from siting.plan.folder import read_plan_folder

if TYPE_CHECKING:
    from siting.browse.drafts import Draft
    from siting.plan.plan import Plan
    from siting.study.tables import Study

MOST_REMEMBERED = 12
"""Plans remembered of one draft; the oldest goes first."""

LARGEST_UNPACKED_BYTES = 400_000_000
"""Largest plan.zip, unpacked, that is read."""

PLAN_NAME = "plan.json"


@dataclass(slots=True, kw_only=True, eq=False)
class Remembered:
    """A plan with the study it answers."""

    name: str
    """As the analyst calls it."""
    study: Study
    plan: Plan
    number: int | None = None
    """Of the job it came from; None for a plan from a file."""


def remember(draft: Draft) -> None:
    """Remember the plan last asked for, once its solve has ended with one."""
    job = find_job(draft.asked) if draft.asked else None
    if job is None or job.state is not JobState.DONE or any(each.number == job.number for each in draft.plans):
        return
    kept = kept_answer(job)
    plan = kept.answer.plan
    if plan is None:
        return
    same = [each for each in draft.plans if (each.plan.fingerprint, each.plan.cost) == (plan.fingerprint, plan.cost)]
    if same:
        same[0].number = job.number
    else:
        _add(draft, _unused_name(draft, "Plan"), kept.study, plan, job.number)


def remember_zip(draft: Draft, name: str, content: bytes) -> Remembered:
    """
    Remember the plan of a plan.zip, as the Share page makes it.

    Parameters
    ----------
    draft
        Whose plans it joins.
    name
        What to call it.
    content
        The file.

    Returns
    -------
    remembered
        Under its name, made different where another plan has it.

    Raises
    ------
    PlanFileError
        If the file is no zip, is too large, or holds no plan or not the tables the plan was made from.
    StudyError
        If the tables in it have faults.
    """
    with tempfile.TemporaryDirectory(prefix="siting-upload-") as scratch:
        study, answer = read_plan_folder(_unpacked(content, Path(scratch)))
    if answer.plan is None:
        msg = f"the file holds no plan (outcome: {answer.proof.outcome}). Choose the plan.zip of a plan."
        raise PlanFileError(msg)
    return _add(draft, _unused_name(draft, name.removesuffix(".zip") or "File"), study, answer.plan, None)


def _unpacked(content: bytes, scratch: Path) -> Path:
    """Return the folder in the zip file that holds plan.json."""
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as parcel:
            size = sum(member.file_size for member in parcel.infolist())
            if size > LARGEST_UNPACKED_BYTES:
                msg = f"the file unpacks to {size:,} bytes, more than {LARGEST_UNPACKED_BYTES:,}. Choose a plan.zip."
                raise PlanFileError(msg)
            parcel.extractall(scratch)
    except zipfile.BadZipFile as error:
        msg = "the file is no zip file. Choose the plan.zip that the page Share offers as The plan, whole."
        raise PlanFileError(msg) from error
    found = sorted(scratch.rglob(PLAN_NAME), key=lambda path: len(path.parts))
    if not found:
        msg = f"the file holds no {PLAN_NAME}. Choose the plan.zip that the page Share offers as The plan, whole."
        raise PlanFileError(msg)
    return found[0].parent


def _add(draft: Draft, name: str, study: Study, plan: Plan, number: int | None) -> Remembered:
    made = Remembered(name=name, study=study, plan=plan, number=number)
    draft.plans.append(made)
    del draft.plans[:-MOST_REMEMBERED]
    return made


def _unused_name(draft: Draft, wanted: str) -> str:
    names = {each.name for each in draft.plans}
    first = f"{wanted} 1" if wanted == "Plan" else wanted
    numbered = (f"{wanted} {number}" for number in range(2, len(names) + 3))
    return next(name for name in (first, *numbered) if name not in names)
