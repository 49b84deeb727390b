"""Shortlist: which sites and suppliers stand whatever else is decided; pin them and plan again."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd
import streamlit as st

from siting.browse.ask_view import ask
from siting.browse.jobs import start_job
from siting.browse.pins import FREE, IN, OUT, pins_of, put_pins
from siting.browse.shell import current_draft, headline, notice, page_path, section
from siting.browse.shortlist_view import answers_table, rule_table, shortlist_headline
from siting.plan.words import percent
from siting.questions.runners_up import MOST
from siting.sharing.question_charts import headroom_chart, stays_chart

if TYPE_CHECKING:
    from streamlit.delta_generator import DeltaGenerator

    from siting.browse.drafts import Draft
    from siting.browse.kept import KeptQuestion
    from siting.questions.shortlist import Shortlist

PERCENTAGES = (0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0)
USUAL_PERCENTAGE = 0.5
PIN_IN, PIN_OUT = "pin in", "pin out"
EDITOR_HEIGHT_PX = 420


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    top, controls = st.columns([4.4, 1.2], gap="medium")
    with controls:
        within = st.select_slider(
            "Near-best: within",
            PERCENTAGES,
            value=USUAL_PERCENTAGE,
            format_func=lambda value: f"{value:g} %",
            key=f"within-{draft.token}",
            help="A plan counts as near-best if it costs at most this much more than the best.",
        )
    ask(
        draft,
        "shortlist",
        {"within": float(within) / 100, "most": MOST},
        places=(top, controls),
        button="Make the shortlist",
        what="It says which sites and suppliers every near-best plan uses, which can be replaced, and which are never "
        "worth having.",
        show=lambda kept, place: _answer(draft, kept, place),
    )


def _answer(draft: Draft, kept: KeptQuestion, top: DeltaGenerator) -> None:
    found: Shortlist = kept.found
    with top:
        first, second = shortlist_headline(found)
        headline(first, second=second)
    if not found.lines:
        return
    near, lines = found.near, found.lines
    limit = near.within * abs(found.room.cost or 0.0)
    stays, room = st.columns([1.25, 1], gap="small")
    stays.altair_chart(stays_chart(lines, found.count))
    room.altair_chart(headroom_chart(lines, near.currency, limit))
    st.caption(
        f"Left: in how many of the near-best plans listed below each is used. Right: how far its yearly "
        f"charge may rise (in the plan) or must fall (outside) before the best plan changes its mind; the broken rule "
        f"marks {percent(near.within)} of the best cost."
    )
    section("What the words mean", "The rule is the same for every site and supplier, and rests on proved costs.")
    st.html(rule_table(found))
    section("Pin and plan again", "A tick writes the ruling into the tables; nothing else in them changes.")
    _pins(draft, found)
    section(f"The {found.count} near-best plans" if found.count > 1 else "The near-best plans")
    st.html(answers_table(found))


def _pins(draft: Draft, found: Shortlist) -> None:
    now = pins_of(draft)
    if not now:
        notice("Mend the faults on the page Inputs first.", kind="fault")
        return
    lines = [line for line in found.lines if (line.kind, line.name) in now]
    frame = pd.DataFrame(
        {
            "name": [line.name for line in lines],
            "kind": [line.kind for line in lines],
            "in a word": [str(line.firmness) for line in lines],
            "best plan": [line.verdict for line in lines],
            "used in": [f"{line.used_in} of {found.count}" for line in lines],
            f"headroom, {found.near.currency} a year": [_money(line.headroom.yearly) for line in lines],
            f"headroom, {found.near.currency} once": [_money(line.headroom.one_off) for line in lines],
            PIN_IN: [now[line.kind, line.name] == IN for line in lines],
            PIN_OUT: [now[line.kind, line.name] == OUT for line in lines],
        }
    )
    numbers = {
        name: st.column_config.TextColumn(name, alignment="right")
        for name in frame.columns
        if name.startswith("headroom")
    }
    ticks = {
        PIN_IN: st.column_config.CheckboxColumn(PIN_IN, help="Always open, or always signed"),
        PIN_OUT: st.column_config.CheckboxColumn(PIN_OUT, help="Never open, or never signed"),
    }
    edited = st.data_editor(
        frame,
        key=f"pins-{draft.token}-{draft.version}-{found.near.within}",
        hide_index=True,
        height=min(EDITOR_HEIGHT_PX, 40 + 35 * len(frame)),
        disabled=[name for name in frame.columns if name not in ticks],
        column_config={**numbers, **ticks},
    )
    both = edited[edited[PIN_IN] & edited[PIN_OUT]]
    if len(both):
        notice(f"Pinned in and out at once: {', '.join(both['name'])}. Take one tick away.", kind="fault")
    if st.button("Pin these and plan again", type="primary", disabled=bool(len(both))):
        wanted = {
            (line.kind, line.name): IN if pinned else OUT if shut else FREE
            for line, pinned, shut in zip(lines, edited[PIN_IN], edited[PIN_OUT], strict=True)
        }
        if put_pins(draft, wanted) and draft.checked.study is not None:
            draft.asked = start_job(draft.checked.study).key
        st.switch_page(page_path("plan"))


def _money(amount: float | None) -> str:
    return "" if amount is None else f"{amount:,.0f}"


show()
