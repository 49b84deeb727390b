"""
How every page of a follow-up question behaves: asked by a button, run beside the page, shown, and stale after an edit.

A question is about a plan, so that a page without one leads to the page Plan.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import streamlit as st

from siting.browse.jobs import JobState, JobView, find_job, question_key, start_job, stop_job, study_mark
from siting.browse.kept import KeptQuestion, kept_question
from siting.browse.shell import headline, notice, page_path
from siting.browse.tasks import NOTHING
from siting.plan.contract import answer_from_json
from siting.plan.words import headline as plan_headline
from siting.study.words import faults_sentence

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

    from streamlit.delta_generator import DeltaGenerator

    from siting.browse.drafts import Draft

    Show = Callable[[KeptQuestion, DeltaGenerator], None]

REFRESH_S = 0.5


def ask(  # noqa: PLR0913 - what is asked, where it is shown, and in what words
    draft: Draft,
    question: str,
    parameters: Mapping[str, Any] = NOTHING,
    *,
    places: tuple[DeltaGenerator, DeltaGenerator],
    button: str,
    what: str,
    show: Show,
) -> None:
    """
    Show a question in whatever state it is in.

    Parameters
    ----------
    draft
        Whose plan it is about.
    question
        One of `siting.browse.tasks.QUESTIONS`.
    parameters
        What it is asked with.
    places
        Where the headline goes, and where the controls go.
    button
        What the button that asks says.
    what
        One sentence on what the answer will say, before there is one.
    show
        Shows the answer.
    """
    top, controls = places
    plan_job = planned(draft)
    before = _asked_before(draft, question)
    if plan_job is None or plan_job.answer is None:
        with top:
            _plan_first(draft, what)
        _stale(before, "", show)
        return
    key = question_key(draft.key, question, parameters)
    job = find_job(key)
    if job is not None:
        draft.questions[question] = key
    if job is not None and job.running:
        _running(job, top, controls)
        return
    again = job is not None and job.state is JobState.FAILED
    if job is None or again:
        if controls.button(button, type="primary", width="stretch"):
            _start(draft, question, parameters, plan_job, before)
        with top:
            if job is not None and again:
                headline("The search failed; nothing you typed is lost")
                notice(job.error, kind="fault")
            else:
                headline(f"Not asked yet: press {button}", second=what)
        _stale(before, key, show)
        return
    kept = kept_question(job)
    if not _whole(kept) and controls.button("Go on where it stopped", type="primary", width="stretch"):
        _start(draft, question, parameters, plan_job, None)
    show(kept, top)


def places(draft: Draft, question: str) -> tuple[DeltaGenerator, DeltaGenerator]:
    """Return where headline and controls go: beside each other, or the headline alone once the answer is whole."""
    job = find_job(question_key(draft.key, question)) if draft.key else None
    if job is not None and job.answer is not None and job.plan is not None and _whole(kept_question(job)):
        return st.container(), st.container()
    top, controls = st.columns([4.4, 1.2], gap="medium")
    return top, controls


def planned(draft: Draft) -> JobView | None:
    """Return the ended job of the plan of the draft as it is, where it found a plan; None otherwise."""
    job = find_job(draft.key) if draft.key else None
    if job is None or job.state is not JobState.DONE or job.answer is None:
        return None
    return job if job.answer.get("cost") is not None else None


def _whole(kept: KeptQuestion) -> bool:
    """Return whether nothing was left out by a stop."""
    found = kept.found
    return not found.not_asked if hasattr(found, "not_asked") else bool(getattr(found, "room", found).complete)


def _asked_before(draft: Draft, question: str) -> JobView | None:
    """Return the job last asked for."""
    key = draft.questions.get(question, "")
    return find_job(key) if key else None


def _start(
    draft: Draft, question: str, parameters: Mapping[str, Any], plan_job: JobView, before: JobView | None
) -> None:
    """Start the question; what was asked before, of other tables or otherwise, ends."""
    if before is not None and before.running:
        stop_job(before.key)
    started = start_job(plan_job.study, question, parameters, plan=plan_job.answer)
    draft.questions[question] = started.key
    st.rerun()


def _plan_first(draft: Draft, what: str) -> None:
    """Say why there is no plan to ask about, and lead to it."""
    study = draft.checked.study
    job = find_job(draft.key) if draft.key else None
    if study is None:
        headline("No plan while the tables have faults", second=faults_sentence(draft.checked.faults, ()) + ".")
        notice("Mend the faults on the page Inputs; everything you typed is kept.", kind="fault")
        return
    if job is not None and job.running:
        headline("The plan is still being searched for", second="This question is about the plan: it comes after it.")
    elif job is not None and job.state is JobState.DONE and job.answer is not None:
        answer = answer_from_json(job.answer)
        headline("There is no plan to ask about", second=plan_headline(answer, currency=study.settings.currency))
    else:
        headline("Plan first: this question is about the plan", second=what)
    if st.button("Go to Plan", type="primary"):
        st.switch_page(page_path("plan"))


def _running(job: JobView, top: DeltaGenerator, controls: DeltaGenerator) -> None:
    stopping = job.state is JobState.STOPPING
    if controls.button("Stop and keep what is done", type="primary", disabled=stopping, width="stretch"):
        stop_job(job.key)
        st.rerun()
    with top:
        _live(job.key)


@st.fragment(run_every=REFRESH_S)
def _live(key: str) -> None:
    """Say twice a second how far it is; when it has ended, draw the page afresh."""
    job = find_job(key)
    if job is None or not job.running:
        st.rerun()
    phase = job.progress.phase or "starting"
    if job.state is JobState.STOPPING:
        headline("Stopping, and keeping what is done", second=f"{job.progress.elapsed_s:,.0f} s.")
    else:
        headline(f"Searching: {phase}", second=f"{job.progress.elapsed_s:,.0f} s so far. Other pages stay in use.")


def _stale(before: JobView | None, key: str, show: Show) -> None:
    """Show, marked as such, the answer to what was asked before."""
    if before is None or before.key == key or before.state is JobState.FAILED:
        return
    with st.container(key="stale"):
        if before.running:
            notice("A search on what was asked before your last change is still running.", kind="stale")
            if st.button("Stop it", disabled=before.state is JobState.STOPPING):
                stop_job(before.key)
                st.rerun()
            _live(before.key)
            return
        same = bool(key) and study_mark(key) == study_mark(before.key)
        what = "this was asked otherwise" if same else "this answers the tables and settings as they were before"
        notice(f"Out of date: {what}. Ask again for what is there now.", kind="stale")
        show(kept_question(before), st.container())
