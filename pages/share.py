"""Share: what leaves the tool, as files that open without it."""

from __future__ import annotations

import logging
from typing import TYPE_CHECKING

import streamlit as st

from siting.browse.jobs import JobState, find_job
from siting.browse.kept import kept_answer
from siting.browse.parcels import map_file, plan_json_file, plan_zip, study_workbook, table_file, tables_zip
from siting.browse.shell import current_draft, headline, notice, notices, section
from siting.plan.result_tables import ResultTable, result_tables
from siting.plan.words import CAUTIONS
from siting.plan.words import headline as plan_headline
from siting.study.words import study_sentence

if TYPE_CHECKING:
    from collections.abc import Callable

TABLE_MEANINGS = {
    "site_verdicts": "Every site: verdict, throughput, how full, charges.",
    "supplier_verdicts": "Every supplier: verdict, volume, how full, charges.",
    "flows": "Every flow: from, to, good, amount, distance, cost.",
    "customers": "Every customer: served from, load, distance, cost to serve.",
    "marginal_costs": "What one unit more would cost, charges left out: not for pricing.",
    "cost_lines": "Every line of the yearly cost, and today's beside it.",
    "distance_bands": "Volume by road distance.",
    "unserved_today": "What the running sites and signed suppliers could not serve.",
}
"""One line on each result table."""

logger = logging.getLogger(__name__)


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    study = draft.checked.study
    job = find_job(draft.key) if draft.key else None
    if (job is None or job.state is not JobState.DONE) and draft.asked:
        job = find_job(draft.asked)
    if job is None or job.state is not JobState.DONE or (kept := kept_answer(job)).answer.plan is None:
        headline(
            "Nothing to share yet: there is no plan", second=(study_sentence(study) if study else draft.source) + "."
        )
        notice("Press Run on the page Plan first. The tables can be taken along already.")
        if study is not None:
            _file("The study as a workbook", "study.xlsx", lambda: study_workbook(study), "Reads back as a study.")
        raw = draft.raw
        _file("The tables as typed, zipped", "study.zip", lambda: tables_zip(raw), "CSV tables and study.toml.")
        return
    headline(plan_headline(kept.answer), second="Every file opens without this program and without a network.")
    if job.key != draft.key:
        notice(
            "Out of date: the tables have changed since. The files hold this plan and the tables it was made from.",
            kind="stale",
        )
    section("For those who decide")
    _file("The map", "map.html", lambda: map_file(kept),
          "One HTML file: verdicts, flows, legend, numbers, cautions. Opens from an e-mail.")  # fmt: skip
    section("For those who check")
    _file("The plan, whole", "plan.zip", lambda: plan_zip(kept),
          "A folder, zipped: plan.json, the tables as read, result tables as CSV, the map.")  # fmt: skip
    _file("plan.json", "plan.json", lambda: plan_json_file(kept), "Verdicts, flows, cost lines and proof, unrounded.")
    _file("The study as a workbook", "study.xlsx", lambda: study_workbook(kept.study), "Reads back as a study.")
    section("Result tables", "CSV, in UTF-8, safe to open in a spreadsheet.")
    for table in result_tables(kept.answer):
        _file(f"{table.name}.csv", f"{table.name}.csv", _maker(table), TABLE_MEANINGS[table.name])
    section("Before anyone acts on it")
    notices(CAUTIONS)


def _maker(table: ResultTable) -> Callable[[], bytes]:
    return lambda: table_file(table)


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
