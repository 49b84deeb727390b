"""What pages derive from an ended solve, derived once per solve: the answer in our types, and its map."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from siting.browse.jobs import find_job
from siting.plan.contract import answer_from_json
from siting.plan.words import headline
from siting.sharing.map import draw_map

if TYPE_CHECKING:
    from siting.browse.jobs import JobView
    from siting.plan.plan import Answer
    from siting.study.tables import Study

MOST_KEPT = 8
"""Answers kept with their maps; a map is up to 2 MB."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Kept:
    """An answer, the study it answers and its map."""

    study: Study
    answer: Answer
    map_html: str
    """Empty without a plan."""


def kept_answer(job: JobView) -> Kept:
    """Return the answer of a job that is done, with its map."""
    return _derived(job.key, job.number)


@lru_cache(maxsize=MOST_KEPT)
def _derived(key: str, number: int) -> Kept:  # noqa: ARG001 - the number tells two jobs of one key apart
    job = find_job(key)
    if job is None or job.answer is None:
        msg = f"job {key} has no answer"
        raise LookupError(msg)
    answer = answer_from_json(job.answer)
    plan = answer.plan
    drawn = draw_map(job.study, plan, headline=headline(answer)).html if plan else ""
    return Kept(study=job.study, answer=answer, map_html=drawn)
