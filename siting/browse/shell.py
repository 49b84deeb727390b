"""The frame around every page: its look, its navigation, and the draft it works on."""

from __future__ import annotations

import html
import os
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import streamlit as st

from siting.browse.drafts import Draft, find_draft, keep_draft
from siting.browse.remembered import remember
from siting.browse.serve import STUDY_VARIABLE
from siting.browse.style import STYLE
from siting.sharing import looks
from siting.sharing.map import draw_given
from siting.study.demo import demo_folder
from siting.study.read import read_raw

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from siting.errors import Fault
    from siting.study.raw import RawStudy

PAGES = (
    ("inputs", "Inputs"),
    ("plan", "Plan"),
    ("close_a_site", "Close a site"),
    ("shortlist", "Shortlist"),
    ("how_many", "How many sites?"),
    ("compare", "Compare"),
    ("share", "Share"),
)
"""File and title of each page, in the order of the navigation."""

DRAFT = "draft"
"""Name of the draft's token in the address, and of the draft in the session."""

LOST = "lost"
"""Name in the session of whether the address named a draft that is gone."""

DEMO_SOURCE = "The demo study"

MAP_HEIGHT_PX = 700
"""Height of a map on a page: with the navigation above it, it fills a screen of 768 pixels."""


def run() -> None:
    """Draw the frame and run the page the address names."""
    st.set_page_config(page_title="siting", layout="wide", initial_sidebar_state="collapsed")
    st.html(f"<style>{looks.css_colours()}{STYLE}</style>")
    folder = pages_folder()
    pages = [
        st.Page(folder / f"{name}.py", title=title, url_path=name, default=number == 0)
        for number, (name, title) in enumerate(PAGES)
    ]
    page = st.navigation(pages, position="top")
    if st.session_state.get("page") != page.url_path:
        st.session_state["page"] = page.url_path
        st.session_state["visit"] = st.session_state.get("visit", 0) + 1
    page.run()


def pages_folder() -> Path:
    """Return the folder of the page scripts: inside an installed wheel, or beside the package in a checkout."""
    package = Path(__file__).resolve().parent.parent
    return next(path for path in (package / "pages", package.parent / "pages") if path.is_dir())


def page_path(name: str) -> str:
    """Return the path by which a page is switched to, as `st.switch_page` takes it."""
    return str(pages_folder() / f"{name}.py")


def current_draft() -> Draft:
    """
    Return the draft of this session.

    The session holds on to it, however many drafts others open; a reload or a second tab finds it by the token in the
    address. An address whose draft is gone opens the study afresh, and `LOST` in the session says so.
    """
    draft: Draft | None = st.session_state.get(DRAFT)
    if draft is None:
        token = st.query_params.get(DRAFT, "")
        draft = find_draft(token) or keep_draft(*_study_given())
        st.session_state[LOST] = bool(token) and draft.token != token
    use_draft(draft)
    remember(draft)
    return draft


def use_draft(draft: Draft) -> None:
    """Make this the draft of the session and of its address."""
    st.session_state[DRAFT] = draft
    if st.query_params.get(DRAFT) != draft.token:
        st.query_params[DRAFT] = draft.token


def _study_given() -> tuple[RawStudy, str]:
    given = os.environ.get(STUDY_VARIABLE)
    return (read_raw(Path(given)), Path(given).name) if given else (read_raw(demo_folder()), DEMO_SOURCE)


def show_given_map(draft: Draft, odd: Sequence[Fault] = ()) -> None:
    """
    Show the map of what was given, drawn once per edit; or say why there is none.

    Parameters
    ----------
    draft
        Its tables.
    odd
        What is worth a look about its places, beside what checking warned of.
    """
    study = draft.checked.study
    if study is None:
        notice("The map is drawn once the tables have no fault.")
        return
    key = (draft.token, draft.version, tuple(odd))
    kept = st.session_state.get("given_map")
    if kept is None or kept[0] != key:
        noted = replace(study, warnings=(*study.warnings, *odd))
        kept = st.session_state["given_map"] = (key, draw_given(noted, headline="").html)
    st.iframe(kept[1], height=MAP_HEIGHT_PX, alt="Map of the sites, suppliers and customers as given")


def headline(text: str, *, second: str = "") -> None:
    """Show the sentence a page opens with, and a quieter one under it."""
    under = f'<p class="second">{html.escape(second)}</p>' if second else ""
    st.html(f'<h1 class="headline">{html.escape(text)}</h1>{under}')


def section(title: str, lead: str = "") -> None:
    """Open a section with its title and one line that says what it answers."""
    under = f'<p class="lead">{html.escape(lead)}</p>' if lead else ""
    st.html(f'<h2 class="section">{html.escape(title)}</h2>{under}')


def notice(text: str, *, kind: str = "note") -> None:
    """Show a framed sentence; `kind` is `note`, `stale` or `fault`."""
    notices([text], kind=kind)


def notices(texts: Iterable[str], *, kind: str = "note", title: str = "") -> None:
    """Show framed sentences close together, under a title where there is one; `kind` as for `notice`."""
    head = f'<p class="title">{html.escape(title)}</p>' if title else ""
    body = "".join(f'<p class="notice {kind}">{html.escape(text)}</p>' for text in texts)
    if body:
        st.html(f'<div class="notices" role="status">{head}{body}</div>')
