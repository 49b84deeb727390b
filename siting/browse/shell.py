"""The frame around every page: its look, its navigation, and the draft it works on."""

from __future__ import annotations

import html
import os
from pathlib import Path

import streamlit as st

from siting.browse.drafts import Draft, find_draft, keep_draft
from siting.browse.serve import STUDY_VARIABLE
from siting.sharing import looks
from siting.study.demo import demo_folder
from siting.study.read import read_raw

PAGES = (("inputs", "Inputs"), ("plan", "Plan"), ("share", "Share"))
"""File and title of each page, in the order of the navigation."""

DRAFT = "draft"
"""Name of the draft's token in the address and in the session."""

LARGEST_WIDTH_PX = 1760
"""Pages are no wider than this, so that lines stay readable on wide screens."""


def run() -> None:
    """Draw the frame and run the page the address names."""
    st.set_page_config(page_title="siting", layout="wide", initial_sidebar_state="collapsed")
    st.html(f"<style>{looks.css_colours()}{_STYLE}</style>")
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


def current_draft() -> Draft:
    """Return the draft of this session; a reload finds it by the token in the address."""
    for token in (st.session_state.get(DRAFT), st.query_params.get(DRAFT)):
        draft = find_draft(token) if token else None
        if draft is not None:
            break
    else:
        draft = keep_draft(read_raw(_study_given()), _study_given().name)
    use_draft(draft)
    return draft


def use_draft(draft: Draft) -> None:
    """Make this the draft of the session and of its address."""
    st.session_state[DRAFT] = draft.token
    if st.query_params.get(DRAFT) != draft.token:
        st.query_params[DRAFT] = draft.token


def _study_given() -> Path:
    given = os.environ.get(STUDY_VARIABLE)
    return Path(given) if given else demo_folder()


def headline(text: str, *, second: str = "") -> None:
    """Show the sentence a page opens with, and a quieter one under it."""
    st.html(f'<h1 class="headline">{html.escape(text)}</h1>')
    if second:
        st.html(f'<p class="second">{html.escape(second)}</p>')


def section(title: str, lead: str = "") -> None:
    """Open a section with its title and one line that says what it answers."""
    st.html(f'<h2 class="section">{html.escape(title)}</h2>')
    if lead:
        st.html(f'<p class="lead">{html.escape(lead)}</p>')


def notice(text: str, *, kind: str = "note") -> None:
    """Show a framed sentence; `kind` is `note`, `stale` or `fault`."""
    st.html(f'<p class="notice {kind}" role="status">{html.escape(text)}</p>')


_STYLE = f"""
.stMainBlockContainer {{max-width:{LARGEST_WIDTH_PX}px; padding-top:4.2rem; padding-bottom:4rem; margin:0 auto;}}
header[data-testid="stHeader"] {{border-bottom:1px solid var(--rule); background:var(--paper);}}
h1.headline {{font-size:1.36rem; line-height:1.34; font-weight:650; color:var(--ink); margin:.1rem 0 .25rem;
 padding:0; max-width:72rem; letter-spacing:-.005em;}}
p.second {{color:var(--quiet); font-size:1rem; margin:0 0 .4rem; max-width:72rem;}}
h2.section {{font-size:1.08rem; font-weight:650; color:var(--ink); margin:1.1rem 0 .1rem; padding:.7rem 0 0;
 border-top:1px solid var(--rule);}}
p.lead {{color:var(--quiet); font-size:.92rem; margin:0 0 .3rem; max-width:60rem;}}
p.notice {{border-left:4px solid var(--slate); background:var(--panel); padding:.55rem .8rem; margin:.2rem 0 .5rem;
 color:var(--ink); max-width:72rem;}}
p.notice.stale {{border-left-color:var(--ochre);}}
p.notice.fault {{border-left-color:var(--fault);}}
table.report {{border-collapse:collapse; width:100%; font-size:.9rem; color:var(--ink);
 font-variant-numeric:tabular-nums;}}
table.report caption {{text-align:left; color:var(--quiet); font-size:.85rem; padding-bottom:.3rem;}}
table.report th {{text-align:left; font-weight:600; color:var(--quiet); border-bottom:1px solid var(--ink);
 padding:.25rem .55rem .25rem 0; vertical-align:bottom; font-size:.8rem;}}
table.report td {{padding:.26rem .55rem .26rem 0; border-bottom:1px solid var(--rule); vertical-align:top;
 overflow-wrap:anywhere;}}
table.report .n {{text-align:right;}}
table.report td.n {{white-space:nowrap;}}
table.report th, table.report td.verdict {{overflow-wrap:normal;}}
table.report td.name {{min-width:7.5rem;}}
table.report tr.total td {{border-top:1px solid var(--ink); font-weight:650;}}
table.report tr.faint td {{color:var(--quiet);}}
table.report td.verdict {{white-space:nowrap; font-weight:600;}}
table.report img {{vertical-align:-4px; margin-right:.4rem; display:inline;}}
.stIFrame iframe, iframe {{border:1px solid var(--rule);}}
"""
