"""How many sites?: the best cost for each number of open sites, and where adding one stops paying."""

from __future__ import annotations

from typing import TYPE_CHECKING

import streamlit as st

from siting.browse.ask_view import ask, places
from siting.browse.counts_view import counts_notes, counts_table
from siting.browse.shell import current_draft, headline, notices, section
from siting.questions.words import counts_headline
from siting.sharing.question_charts import counts_chart, distance_chart, service_chart, split_chart

if TYPE_CHECKING:
    from streamlit.delta_generator import DeltaGenerator

    from siting.browse.kept import KeptQuestion
    from siting.questions.counts_result import Counts


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    study = draft.checked.study
    if study is not None and not study.sites:
        headline(
            "There are no sites to count: this study is a choice of suppliers",
            second="The page Shortlist says which of them stand.",
        )
        return
    ask(
        draft,
        "counts",
        places=places(draft, "counts"),
        button="Try each number",
        what="The best plan is found for each number of open sites, from the fewest possible to where one more only "
        "costs more.",
        show=_answer,
    )


def _answer(kept: KeptQuestion, top: DeltaGenerator) -> None:
    found: Counts = kept.found
    with top:
        headline(counts_headline(found), second=" ".join((*found.why_none, *counts_notes(found))))
    if found.best is None:
        return
    curve, beside = st.columns([1.7, 1], gap="medium")
    with curve:
        st.altair_chart(counts_chart(found))
        st.caption(
            "Line: best cost with so many sites. Band below it: down to what is proved that no plan with so many "
            "sites can undercut; where it cannot be seen, the cost is proved. Cross: ruled out by the study itself."
        )
    with beside:
        for drawn in (distance_chart(found), service_chart(found)):
            if drawn is not None:
                st.altair_chart(drawn)
        if found.service_km is None:
            st.caption("No service distance is set, so that no share within it is shown.")
    section("Where the money goes", "Fixed: charges of sites and suppliers. Rest: goods, handling and carbon.")
    table, split = st.columns([1.5, 1], gap="medium")
    table.html(counts_table(found))
    split.altair_chart(split_chart(found))
    if found.not_asked:
        notices([f"Stopped before {', '.join(map(str, found.not_asked))} sites were tried."], kind="stale")


show()
