"""Plan: run the search, watch cost and bound, and read the answer."""

from __future__ import annotations

from typing import TYPE_CHECKING

import streamlit as st

from siting.browse.jobs import JobState, JobView, find_job, start_job, stop_job
from siting.browse.kept import kept_answer
from siting.browse.plan_view import show_answer
from siting.browse.shell import current_draft, headline, notice, section, show_given_map
from siting.plan.words import money, percent_up
from siting.sharing.charts import progress_chart
from siting.study.columns import SOLVE_SETTINGS, Column
from siting.study.words import faults_sentence, study_sentence

if TYPE_CHECKING:
    from streamlit.delta_generator import DeltaGenerator

    from siting.browse.drafts import Draft

REFRESH_S = 0.5


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    asked = find_job(draft.asked) if draft.asked else None
    if draft.checked.study is None:
        headline("No plan while the tables have faults", second=faults_sentence(draft.checked.faults, ()) + ".")
        notice("Mend the faults on the page Inputs; everything you typed is kept.", kind="fault")
        _stale(asked)
        return
    job = find_job(draft.key)
    if job is not None:
        draft.asked = job.key
    top, controls = st.columns([4.4, 1.2], gap="medium")
    _controls(controls, draft, job, asked)
    if job is not None and job.running:
        with top:
            _live(job.key)
        _live_chart(job.key)
        section("What there is to decide on", "As given on the page Inputs, before anything is decided.")
        show_given_map(draft)
    elif job is not None and job.state is JobState.DONE:
        _answer(job, top)
    else:
        _not_yet(draft, job, asked, top)


def _controls(place: DeltaGenerator, draft: Draft, job: JobView | None, asked: JobView | None) -> None:
    """Show Run, or Stop while it runs, and how hard to search."""
    running = job is not None and job.running
    if running and job is not None:
        stopping = job.state is JobState.STOPPING
        if place.button("Stop and keep the best plan", type="primary", disabled=stopping, width="stretch"):
            stop_job(job.key)
            st.rerun()
    elif place.button("Run", type="primary", width="stretch"):
        if asked is not None and asked.running:
            stop_job(asked.key)
        draft.asked = start_job(draft.checked.sound()).key
        st.rerun()
    with place.popover("How hard to search", width="stretch", disabled=running):
        for column in SOLVE_SETTINGS:
            _solve_setting(draft, column)


def _solve_setting(draft: Draft, column: Column) -> None:
    name = f"solve.{column.name}"
    text = draft.setting_text(name)
    key = f"{draft.token}-{name}-{text}"
    unit = f", {column.unit}" if column.unit else ""

    def take() -> None:
        draft.put_setting(name, st.session_state[key])

    st.text_input(
        f"{column.name}{unit}",
        value=text,
        help=column.meaning,
        key=key,
        placeholder="default",
        on_change=take,
    )


@st.fragment(run_every=REFRESH_S)
def _live(key: str) -> None:
    """Say twice a second how far the search is; when it has ended, draw the page afresh."""
    job = find_job(key)
    if job is None or not job.running:
        st.rerun()
    progress, currency = job.progress, job.study.settings.currency
    doing = "Stopping, and keeping the best plan" if job.state is JobState.STOPPING else "Searching"
    found = "no plan yet" if progress.cost is None else f"best plan so far {money(progress.cost, currency)} a year"
    gap = progress.gap
    sure = "" if gap is None else f", at most {percent_up(gap)} above the best possible" if gap else ", proved best"
    headline(f"{doing}: {found}{sure}", second=f"{progress.elapsed_s:,.0f} s, {progress.phase or 'starting'}.")


@st.fragment(run_every=4 * REFRESH_S)
def _live_chart(key: str) -> None:
    """Draw the best cost and the bound over time, once there are both."""
    job = find_job(key)
    if job is None or not any(step.cost is not None for step in job.history):
        return
    st.altair_chart(progress_chart((*job.history, job.progress), job.study.settings.currency))


def _answer(job: JobView, top: DeltaGenerator) -> None:
    kept = kept_answer(job)
    show_answer(kept, top)
    if len(job.history) > 1 and any(step.cost is not None for step in job.history):
        section("How the search went")
        st.altair_chart(progress_chart(job.history, job.study.settings.currency))


def _not_yet(draft: Draft, job: JobView | None, asked: JobView | None, top: DeltaGenerator) -> None:
    """Say what to do next where the tables as they are have no answer; the answer they had before stays in sight."""
    study = draft.checked.sound()
    with top:
        if job is not None:
            headline("The search failed; nothing you typed is lost", second=study_sentence(study) + ".")
            notice(job.error, kind="fault")
            notice("Press Run to try again, or choose another engine under How hard to search.")
        elif asked is None:
            headline("No plan yet: press Run", second=study_sentence(study) + ".")
        else:
            headline("Changed since the plan below: press Run", second=study_sentence(study) + ".")
    if asked is None or asked.state is JobState.FAILED:
        section("What there is to decide on", "As given on the page Inputs, before anything is decided.")
        show_given_map(draft)
    else:
        _stale(asked)


def _stale(asked: JobView | None) -> None:
    """Show, marked as such, the answer to the tables before the last edits, or that it is still being looked for."""
    if asked is None or asked.state is JobState.FAILED:
        return
    with st.container(key="stale"):
        if asked.running:
            notice("A search on the tables as they were before your last edits is still running.", kind="stale")
            if st.button("Stop it", disabled=asked.state is JobState.STOPPING):
                stop_job(asked.key)
                st.rerun()
            _live(asked.key)
            return
        notice("Out of date: this answers the tables and settings as they were before your last edits.", kind="stale")
        show_answer(kept_answer(asked), st.container())


show()
