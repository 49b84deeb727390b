"""Compare: two to six plans side by side, what differs first."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd
import streamlit as st

from siting.browse.compare_view import customers_columns, figures_table, verdicts_table
from siting.browse.remembered import remember_zip
from siting.browse.shell import MAP_HEIGHT_PX, current_draft, headline, notice, page_path, section
from siting.errors import PlanFileError, SitingError
from siting.plan.words import money
from siting.questions.compare import FEWEST, MOST, Named, compare
from siting.questions.words import comparison_headline
from siting.sharing.map import draw_differences
from siting.sharing.map_facts import load_unit

if TYPE_CHECKING:
    from streamlit.delta_generator import DeltaGenerator

    from siting.browse.drafts import Draft
    from siting.browse.remembered import Remembered


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    top, controls = st.columns([4.4, 1.2], gap="medium")
    with controls:
        _more(draft)
    if len(draft.plans) < FEWEST:
        count = "one plan" if draft.plans else "no plan"
        with top:
            headline(
                f"Two plans are needed to compare: there is {count} so far",
                second="Every search that ends with a plan is remembered here. Change something on Inputs, or the gap "
                "on Plan, and run again; or open a plan.zip from Share.",
            )
            if st.button("Go to Plan", type="primary"):
                st.switch_page(page_path("plan"))
        return
    chosen = _choose(draft)
    if not FEWEST <= len(chosen) <= MOST:
        with top:
            headline(f"Tick {FEWEST} to {MOST} plans to compare")
        return
    try:
        named = [Named(name=each.name, study=each.study, plan=each.plan) for each in chosen]
        found = compare(named)
    except PlanFileError as error:
        with top:
            headline("These plans cannot be compared")
            notice(str(error), kind="fault")
        return
    with top:
        different = "" if found.one_study else "The plans are of different tables or settings."
        headline(comparison_headline(found), second=different)
    section("Verdicts that differ")
    if found.differing:
        st.html(verdicts_table(found))
    else:
        notice("Every verdict is the same.")
    section("Cost lines side by side")
    st.html(figures_table(found))
    _map(chosen)
    section("Customers that change")
    if not found.customers:
        notice("Every customer is served from the same places in every plan.")
        return
    unit = load_unit(chosen[0].study)
    frame = pd.DataFrame(customers_columns(found, unit))
    load = frame.columns[1]
    st.dataframe(
        frame,
        hide_index=True,
        height=min(420, 40 + 35 * len(frame)),
        column_config={load: st.column_config.NumberColumn(load, format="localized", step=0.01)},
    )


def _more(draft: Draft) -> None:
    """Offer to add a plan from a file."""
    with st.popover("Add a plan from a file", width="stretch"):
        st.caption("A plan.zip, as the page Share offers it.")
        number = st.session_state.get("plan_files", 0)
        file = st.file_uploader("plan.zip", type=["zip"], key=f"plan-file-{number}")
        if st.button("Add it", type="primary", disabled=file is None, width="stretch") and file is not None:
            try:
                remember_zip(draft, file.name, file.getvalue())
            except SitingError as error:
                notice(str(error), kind="fault")
            else:
                st.session_state["plan_files"] = number + 1
                st.rerun()


def _choose(draft: Draft) -> list[Remembered]:
    """Show the plans of the draft, to be named and ticked; return the ticked ones."""
    ticked = st.session_state.setdefault("compared", {})
    first = max(0, len(draft.plans) - MOST)
    frame = pd.DataFrame(
        {
            "compare": [ticked.get(id(each), at >= first) for at, each in enumerate(draft.plans)],
            "name": [each.name for each in draft.plans],
            "cost a year": [money(each.plan.cost, each.plan.currency) for each in draft.plans],
            "open": [", ".join(line.site for line in each.plan.sites if line.verdict in {"keep", "open"})
                     for each in draft.plans],
            "signed": [", ".join(line.supplier for line in each.plan.suppliers if line.verdict in {"stay", "sign"})
                       for each in draft.plans],
        }
    )  # fmt: skip
    key = f"plans-{draft.token}-{len(draft.plans)}-{st.session_state.get('renamed', 0)}"
    edited = st.data_editor(
        frame,
        key=key,
        hide_index=True,
        height=40 + 35 * len(frame),
        disabled=["cost a year", "open", "signed"],
        column_config={
            "compare": st.column_config.CheckboxColumn("compare", width=105),
            "name": st.column_config.TextColumn("name, to be edited", required=True, width=240, max_chars=60),
            "open": st.column_config.TextColumn("open", width="large"),
        },
    )
    _take_names(draft, [str(name).strip() for name in edited["name"]])
    for each, use in zip(draft.plans, edited["compare"], strict=True):
        ticked[id(each)] = bool(use)
    return [each for each in draft.plans if ticked[id(each)]]


def _take_names(draft: Draft, names: list[str]) -> None:
    """Take edited names; two plans never bear one name."""
    if len(set(names)) < len(names) or "" in names:
        notice("Two plans cannot bear the same name, nor none: the names were left as they were.", kind="fault")
        return
    for each, name in zip(draft.plans, names, strict=True):
        each.name = name


def _map(chosen: list[Remembered]) -> None:
    section("Only what differs, on the map")
    one, other = st.columns(2, gap="medium")
    names = [each.name for each in chosen]
    before = _pick(one, "From", names, 0)
    after = _pick(other, "To", names, len(names) - 1)
    if before == after:
        notice("Choose two different plans to see what differs between them.")
        return
    first, second = (next(each for each in chosen if each.name == name) for name in (before, after))
    key = (id(first), id(second), before, after)
    kept = st.session_state.get("differences_map")
    if kept is None or kept[0] != key:
        drawn = draw_differences(second.study, first.plan, second.plan, names=(before, after), headline="").html
        kept = st.session_state["differences_map"] = (key, drawn)
    st.iframe(kept[1], height=MAP_HEIGHT_PX, alt=f"Map of what differs between {before} and {after}")


def _pick(place: DeltaGenerator, label: str, names: list[str], at: int) -> str:
    chosen = place.selectbox(label, names, index=at)
    return str(chosen)


show()
