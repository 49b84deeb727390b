"""Close a site: what it costs to do without each site and supplier of the plan, re-routed and re-planned."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd
import streamlit as st

from siting.browse.ask_view import ask, places
from siting.browse.closing_view import (
    HOW,
    closing_headline,
    facts,
    facts_table,
    lines_table,
    ranking_table,
)
from siting.browse.shell import MAP_HEIGHT_PX, current_draft, headline, notice, section
from siting.plan.words import percent_up
from siting.sharing.looks import Formats
from siting.sharing.map import draw_differences, draw_map
from siting.sharing.map_facts import load_unit
from siting.sharing.question_charts import extra_chart

if TYPE_CHECKING:
    from streamlit.delta_generator import DeltaGenerator

    from siting.browse.kept import KeptQuestion
    from siting.questions.closing_result import ClosingLine, ClosingTest, Without

BEFORE, CHANGES = "The plan", "Only what changes"


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    ask(
        draft,
        "closing",
        places=places(draft, "closing"),
        button="Test each",
        what="Each site that the plan has open is closed in turn, each supplier dropped: once with the others as they "
        "are, once with everything decided afresh.",
        show=_answer,
    )


def _answer(kept: KeptQuestion, top: DeltaGenerator) -> None:
    test: ClosingTest = kept.found
    with top:
        if test.cost is None or not test.lines:
            headline("The plan has nothing open or signed to do without", second=" ".join(test.why_none))
            return
        first, second = closing_headline(test)
        headline(first, second=second)
    st.html(ranking_table(test))
    st.caption(_how_sure(test))
    if not test.complete:
        notice('Stopped: what reads "not asked" was not begun, what reads "up to" may cost less.', kind="stale")
    names = [line.name for line in test.lines]
    key = f"without-{kept.plan.fingerprint}"
    section("One at a time")
    at_first = next((at for at, line in enumerate(test.lines) if line.kind == "site"), 0)
    chosen = st.selectbox("Without", names, index=at_first, key=key, width=420)
    line = next(line for line in test.lines if line.name == chosen)
    _one(kept, test, line)


def _how_sure(test: ClosingTest) -> str:
    return (
        f"More than the plan's {test.cost or 0.0:,.0f} {test.currency} a year. Others take over: every other verdict "
        "stays, only flows move. Everything re-planned: what opens, closes and is signed is decided afresh. Each "
        f"search came within {percent_up(test.gap_asked)} of the best, but for those that read 'up to'; at least: what "
        "no plan without it can undercut."
    )


def _one(kept: KeptQuestion, test: ClosingTest, line: ClosingLine) -> None:
    formats = Formats(currency=test.currency, unit=load_unit(kept.study))
    both = {"reroute": line.reroute, "replan": line.replan}
    for column, (how, found) in zip(st.columns(2, gap="medium"), both.items(), strict=True):
        column.html(facts_table(facts(line, found, test, formats), HOW[how]))
    there = {HOW[how]: found for how, found in both.items() if found is not None and found.plan is not None}
    _maps(kept, line, there)
    if not there:
        return
    section(f"Where the extra cost without {line.name} comes from")
    table, chart = st.columns([1, 1.25], gap="medium")
    table.html(lines_table(line, test.currency))
    found = there.get(HOW["replan"]) or next(iter(there.values()))
    drawn = extra_chart(found.cost_lines, test.currency)
    if drawn is not None:
        chart.altair_chart(drawn)
        how = next(how for how, each in there.items() if each is found)
        chart.caption(f"{how}: what costs more and what less.")
    section("Who takes over which customers")
    for column, (how, each) in zip(st.columns(max(len(there), 1), gap="medium"), there.items(), strict=False):
        with column:
            _shifts(how, each, formats)


def _maps(kept: KeptQuestion, line: ClosingLine, there: dict[str, Without]) -> None:
    """Show before and after, one map at a time."""
    views = [BEFORE, *there, *(f"{CHANGES}: {how.lower()}" for how in there)]
    section("Before and after")
    key = f"view-{kept.plan.fingerprint}-{line.name}"
    chosen = st.segmented_control("Map", views, default=views[-1], required=True, key=key, label_visibility="collapsed")
    view = str(chosen or views[-1])
    st.iframe(
        kept.map_of(f"{line.name}/{view}", lambda: _drawn(kept, there, view)), height=MAP_HEIGHT_PX, alt=f"Map: {view}"
    )


def _drawn(kept: KeptQuestion, there: dict[str, Without], view: str) -> str:
    if view == BEFORE:
        return draw_map(kept.study, kept.plan, headline="").html
    how = next(how for how in there if view in {how, f"{CHANGES}: {how.lower()}"})
    plan = there[how].plan
    if plan is None:
        msg = f"there is no plan to draw for {view}"
        raise LookupError(msg)
    if view == how:
        return draw_map(kept.study, plan, headline="").html
    return draw_differences(kept.study, kept.plan, plan, names=("the plan", how.lower()), headline="").html


def _shifts(how: str, found: Without, formats: Formats) -> None:
    if not found.shifts:
        st.caption(f"{how}: every customer is served from where it is now.")
        return
    frame = pd.DataFrame(
        {
            "Customer": [shift.customer for shift in found.shifts],
            "From": [shift.before or "nowhere" for shift in found.shifts],
            "To": [shift.after or "nowhere" for shift in found.shifts],
            f"Load, {formats.unit} a year": [shift.load for shift in found.shifts],
        }
    ).sort_values(f"Load, {formats.unit} a year", ascending=False)
    st.caption(f"{how}: {len(set(frame['Customer'])):,} customers, {formats.amount(frame.iloc[:, 3].sum())} a year.")
    load = frame.columns[3]
    st.dataframe(
        frame,
        hide_index=True,
        height=min(320, 38 + 35 * len(frame)),
        column_config={load: st.column_config.NumberColumn(load, format="localized", step=0.01)},
    )


show()
