"""Plan: run the search, watch cost and bound, and read the answer."""

from __future__ import annotations

from typing import TYPE_CHECKING

import streamlit as st

from siting.browse.jobs import JobState, JobView, find_job, job_key, start_job, stop_job
from siting.browse.kept import kept_answer
from siting.browse.plan_view import show_answer
from siting.browse.shell import current_draft, headline, notice, section
from siting.sharing.charts import progress_chart
from siting.study.columns import SOLVE_SETTINGS
from siting.study.words import faults_sentence, study_sentence

if TYPE_CHECKING:
    from siting.browse.drafts import Draft
    from siting.study.tables import Study

REFRESH_S = 0.5


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    study = draft.checked.study
    if study is None:
        headline("No plan while the tables have faults", second=faults_sentence(draft.checked.faults, ()))
        notice("Mend the faults on the page Inputs; everything you typed is kept.", kind="fault")
        return
    key = job_key(study)
    job = find_job(key)
    top = st.container()
    with top:
        _controls(draft, study, job)
    if job is not None and job.running:
        _watch(key, study.settings.currency)
        return
    if job is not None and job.state is JobState.FAILED:
        notice(job.error, kind="fault")
    _answer(draft, study, job)


def _controls(draft: Draft, study: Study, job: JobView | None) -> None:
    run, effort, _ = st.columns([1, 1.4, 5], vertical_alignment="center")
    running = job is not None and job.running
    if run.button("Run", type="primary", disabled=running, width="stretch"):
        draft.asked = start_job(study).key
        st.rerun()
    with effort.popover("How hard to search", width="stretch"):
        for column in SOLVE_SETTINGS:
            name = f"solve.{column.name}"
            typed = st.text_input(
                column.name, value=draft.setting_text(name), help=column.meaning, key=f"{name}-{draft.token}",
                placeholder="default",
            )  # fmt: skip
            if draft.put_setting(name, typed):
                st.rerun()


@st.fragment(run_every=REFRESH_S)
def _watch(key: str, currency: str) -> None:
    """Draw the running solve twice a second; when it has ended, draw the page afresh."""
    job = find_job(key)
    if job is None or not job.running:
        st.rerun()
    progress = job.progress
    found = "no plan yet" if progress.cost is None else f"best plan so far {progress.cost:,.0f} {currency} a year"
    gap = progress.gap
    sure = "" if gap is None else f", at most {100 * gap:.2f} % above the best possible"
    doing = "Stopping: keeping the best plan" if job.state is JobState.STOPPING else "Searching"
    headline(f"{doing}: {found}{sure}", second=f"{progress.elapsed_s:,.0f} s. {progress.phase}")
    if st.button("Stop and keep the best plan", disabled=job.state is JobState.STOPPING):
        stop_job(key)
        st.rerun(scope="fragment")
    if any(step.cost is not None or step.bound is not None for step in job.history):
        st.altair_chart(progress_chart((*job.history, progress), currency))


def _answer(draft: Draft, study: Study, job: JobView | None) -> None:
    done = job if job is not None and job.state is JobState.DONE else None
    if done is not None:
        draft.asked = done.key
        kept = kept_answer(done)
        show_answer(kept.study, kept.answer, kept.map_html)
        if len(done.history) > 1:
            section("How the search went")
            st.altair_chart(progress_chart(done.history, study.settings.currency))
        return
    old = find_job(draft.asked) if draft.asked else None
    if old is not None and old.state is JobState.DONE:
        kept = kept_answer(old)
        notice("The tables or settings have changed since this plan. Press Run for a plan of what is there now.",
               kind="stale")  # fmt: skip
        show_answer(kept.study, kept.answer, kept.map_html)
        return
    headline("No plan yet: press Run", second=study_sentence(study))


show()
