"""Share: what leaves the tool, as files that open without it."""

from __future__ import annotations

import logging
from typing import TYPE_CHECKING

import streamlit as st

from siting.browse.jobs import JobState, find_job, job_key
from siting.browse.kept import kept_answer
from siting.browse.parcels import map_file, plan_json_file, plan_zip, study_workbook
from siting.browse.shell import current_draft, headline, notice, section
from siting.plan.words import CAUTIONS
from siting.plan.words import headline as plan_headline
from siting.study.words import study_sentence

if TYPE_CHECKING:
    from collections.abc import Callable

logger = logging.getLogger(__name__)


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    study = draft.checked.study
    job = find_job(job_key(study)) if study is not None else None
    if job is None and draft.asked:
        job = find_job(draft.asked)
    if job is None or job.state is not JobState.DONE or (kept := kept_answer(job)).answer.plan is None:
        headline("Nothing to share yet: there is no plan", second=study_sentence(study) if study else draft.source)
        notice("Press Run on the page Plan first. The tables can be taken along already.")
        if study is not None:
            _file("The study as a workbook", "study.xlsx", lambda: study_workbook(study))
        return
    headline(plan_headline(kept.answer), second="Every file opens without this program and without a network.")
    if study is None or job.key != job_key(study):
        notice("The tables have changed since this plan: the files hold the plan and the tables it was made from.",
               kind="stale")  # fmt: skip
    section("For those who decide")
    _file("Map, one HTML file", "map.html", lambda: map_file(kept), "Opens from an e-mail; no network needed.")
    section("For those who check")
    _file("Everything: the PLAN folder, zipped", "plan.zip", lambda: plan_zip(kept),
          "plan.json, the tables as read, result tables as CSV, the map.")  # fmt: skip
    _file("plan.json", "plan.json", lambda: plan_json_file(kept), "Verdicts, flows, cost lines and proof, unrounded.")
    _file("The study as a workbook", "study.xlsx", lambda: study_workbook(kept.study), "Reads back as a study.")
    section("Before anyone acts on it")
    for caution in CAUTIONS:
        notice(caution)


def _file(label: str, name: str, make: Callable[[], bytes], lead: str = "") -> None:
    """Offer a file that is made when it is asked for; a failure is logged, and told by an empty download."""

    def made() -> bytes:
        try:
            return make()
        except Exception:
            logger.exception("could not make %s", name)
            raise

    button, said = st.columns([1.2, 3], vertical_alignment="center")
    button.download_button(label, data=made, file_name=name, on_click="ignore", width="stretch")
    said.caption(lead)


show()
