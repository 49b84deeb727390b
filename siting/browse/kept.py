"""What pages derive from an ended job, derived once per job: the answer in our types, and its maps."""

from __future__ import annotations

import threading
from collections import OrderedDict
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any

from siting.browse.tasks import result_of
from siting.plan.contract import answer_from_json
from siting.plan.words import headline
from siting.sharing.map import draw_map

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

    from siting.browse.jobs import JobView
    from siting.plan.plan import Answer, Plan
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


MOST_MAPS = 12
"""Maps kept of one answer to a question."""


@dataclass(frozen=True, kw_only=True, eq=False)
class KeptQuestion:
    """The answer to a question, with the study and the plan it is about."""

    study: Study
    plan: Plan
    found: Any
    """The frozen result of the question."""
    parameters: Mapping[str, Any]
    _maps: OrderedDict[str, str] = field(default_factory=OrderedDict)

    def map_of(self, name: str, draw: Callable[[], str]) -> str:
        """Return the map of a name, drawn when it is first asked for."""
        if name not in self._maps:
            self._maps[name] = draw()
        self._maps.move_to_end(name)
        while len(self._maps) > MOST_MAPS:
            self._maps.popitem(last=False)
        return self._maps[name]


_kept: OrderedDict[int, Kept] = OrderedDict()
_kept_questions: OrderedDict[int, KeptQuestion] = OrderedDict()
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


def kept_question(job: JobView) -> KeptQuestion:
    """
    Return the answer of a question's job that is done.

    Raises
    ------
    LookupError
        If the job has no answer, or was not given the plan it is about.
    """
    if job.answer is None or job.plan is None:
        msg = f"job {job.number} has no answer to a question"
        raise LookupError(msg)
    with _guard:
        kept = _kept_questions.get(job.number)
        if kept is None:
            kept = _kept_questions[job.number] = _read_question(job, job.plan)
        _kept_questions.move_to_end(job.number)
        while len(_kept_questions) > MOST_KEPT:
            _kept_questions.popitem(last=False)
    return kept


def _read_question(job: JobView, plan_json: dict[str, Any]) -> KeptQuestion:
    plan = answer_from_json(plan_json).plan
    if plan is None:
        msg = f"job {job.number} was not given a plan"
        raise LookupError(msg)
    return KeptQuestion(
        study=job.study, plan=plan, found=result_of(job.question, job.answer), parameters=job.parameters
    )
