"""What pages derive from an ended solve, derived once per solve: the answer in our types, and its maps."""

from __future__ import annotations

import threading
from collections import OrderedDict
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

from siting.plan.contract import answer_from_json
from siting.plan.words import headline
from siting.sharing.map import draw_map

if TYPE_CHECKING:
    from siting.browse.jobs import JobView
    from siting.plan.plan import Answer
    from siting.study.tables import Study

MOST_KEPT = 8
"""Answers kept with their maps; a map is up to 2 MB."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Kept:
    """An answer and the study it answers."""

    study: Study
    answer: Answer

    @cached_property
    def map_html(self) -> str:
        """The map that is shared, with its headline; empty without a plan."""
        plan = self.answer.plan
        return draw_map(self.study, plan, headline=headline(self.answer)).html if plan else ""

    @cached_property
    def map_on_page(self) -> str:
        """The map on a page that opens with the headline itself; empty without a plan."""
        plan = self.answer.plan
        return draw_map(self.study, plan, headline="").html if plan else ""


_kept: OrderedDict[int, Kept] = OrderedDict()
_guard = threading.Lock()


def kept_answer(job: JobView) -> Kept:
    """
    Return the answer of a job that is done.

    Raises
    ------
    LookupError
        If the job has no answer.
    """
    if job.answer is None:
        msg = f"job {job.number} has no answer"
        raise LookupError(msg)
    with _guard:
        kept = _kept.get(job.number)
        if kept is None:
            kept = _kept[job.number] = Kept(study=job.study, answer=answer_from_json(job.answer))
        _kept.move_to_end(job.number)
        while len(_kept) > MOST_KEPT:
            _kept.popitem(last=False)
    return kept
