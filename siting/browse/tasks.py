"""
What a job may be asked: the plan of a study, or a follow-up question on it; and its answer as JSON and back.

The answer to a question travels between the processes as the JSON of its frozen result, without loss.
"""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Any

from siting.plan.codec import decode, encode
from siting.plan.contract import answer_from_json, answer_to_json

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

    from siting.listener import Listener, Stop
    from siting.plan.plan import Answer
    from siting.questions.resolved import Resolved
    from siting.questions.store import Key, Store
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

PLAN = "plan"
QUESTIONS = ("closing", "shortlist", "counts")
"""The questions that a page asks as a job."""

NOTHING: Mapping[str, Any] = {}


def answer_task(  # noqa: PLR0913 - a question with all that it is asked with
    question: str,
    study: Study,
    answer: Answer | None,
    parameters: Mapping[str, Any],
    *,
    settings: SolveSettings,
    store: Store,
    listener: Listener,
    stop: Stop,
) -> Any:  # noqa: ANN401 - a JSON value
    """
    Answer what a job asks.

    Parameters
    ----------
    question
        `PLAN` or one of `QUESTIONS`.
    study
        Checked.
    answer
        Its plan, where there is one already.
    parameters
        By name, what the question is asked with beside that.
    settings
        How long and how hard to search.
    store
        Where the questions keep their searches.
    listener
        Told how far it is.
    stop
        Once requested, what is done is returned.

    Returns
    -------
    value
        The object of plan.json, or the JSON of the question's result.

    Raises
    ------
    SitingError
        As the question raises it.
    """
    if question != PLAN:
        ask = _asked(question)
        found = ask(study, answer, **parameters, settings=settings, store=store, listener=listener, stop=stop)
        return encode(found)
    from siting.plan.audit import AuditReport  # noqa: PLC0415 - the heavy imports wait until they are needed
    from siting.solving.solve import solve  # noqa: PLC0415

    made = solve(study, settings, listener=listener, stop=stop)
    report = AuditReport(passed=True, faults=()) if made.plan else None  # `solve` raises where it fails
    return answer_to_json(made, report)


def result_of(question: str, value: object) -> Any:  # noqa: ANN401 - the type of the question's result
    """
    Return the frozen result of a question from its JSON, or the `Answer` of a plan.

    Raises
    ------
    PlanFileError
        If the value is not what `answer_task` returns.
    """
    if question == PLAN:
        return answer_from_json(value)
    return decode(_result_type(question), value, question)


def _asked(question: str) -> Callable[..., Any]:
    """Return the function of a question."""
    match question:
        case "closing":
            from siting.questions.closing import closing  # noqa: PLC0415 - as above

            return closing
        case "shortlist":
            from siting.questions.shortlist import shortlist  # noqa: PLC0415

            return shortlist
        case "counts":
            from siting.questions.counts import counts  # noqa: PLC0415

            return counts
        case _:
            msg = f"no job asks {question!r}; use one of {', '.join((PLAN, *QUESTIONS))}"
            raise ValueError(msg)


def _result_type(question: str) -> type:
    from siting.questions.closing_result import ClosingTest  # noqa: PLC0415 - the floor of the questions is heavy
    from siting.questions.counts_result import Counts  # noqa: PLC0415
    from siting.questions.shortlist import Shortlist  # noqa: PLC0415

    return {"closing": ClosingTest, "shortlist": Shortlist, "counts": Counts}[question]


class ToldStore:
    """A store in memory that tells of every search put into it, so that it can be kept longer than the process."""

    def __init__(self, tell: Callable[[dict[str, Any]], None]) -> None:
        from siting.questions.store import MemoryStore  # noqa: PLC0415 - as above

        self._memory = MemoryStore()
        self._tell = tell

    def get(self, key: Key) -> Resolved | None:
        """Return the answer asked for at the smallest gap that serves the key."""
        return self._memory.get(key)

    def put(self, key: Key, answer: Resolved) -> None:
        """Keep an answer under its key, and tell."""
        self._memory.put(key, answer)
        self._tell({"key": encode(key), "resolved": encode(answer)})

    def take(self, told: Mapping[str, Any]) -> None:
        """Keep what a store before this one told."""
        from siting.questions.resolved import Resolved  # noqa: PLC0415 - as above
        from siting.questions.store import Key  # noqa: PLC0415

        self._memory.put(decode(Key, told["key"], "key"), decode(Resolved, told["resolved"], "resolved"))


def told_key(told: Mapping[str, Any]) -> str:
    """Return what tells one kept search from another, as text."""
    return json.dumps(told["key"], sort_keys=True)
