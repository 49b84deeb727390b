"""Sheets and files of other names: what table each may be, read as such once the analyst has confirmed it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd
import streamlit as st

from siting.browse.upload import read_upload
from siting.study.columns import TABLES
from siting.study.propose import propose_sources
from siting.study.words import counted

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.browse.drafts import Draft

UNREAD = "unread_files"
"""Name in the session of the files of which something was not read, with their draft and its version then."""


def remember_files(draft: Draft, files: Sequence[tuple[str, bytes]]) -> None:
    """
    Remember the files of a draft while a part of them may be a table under another name.

    Parameters
    ----------
    draft
        As just read from them.
    files
        File names with their content.
    """
    if propose_sources(draft.raw):
        st.session_state[UNREAD] = (draft.token, draft.version, tuple(files))
    else:
        st.session_state.pop(UNREAD, None)


def show_sheets(draft: Draft) -> None:
    """Offer to read sheets or files of other names; once anything was edited, it is too late for that."""
    token, version, files = st.session_state.get(UNREAD, ("", 0, ()))
    proposed = propose_sources(draft.raw) if (token, version) == (draft.token, draft.version) else {}
    if not proposed:
        return
    under = "another name" if len(proposed) == 1 else "other names"
    with st.expander(f"{counted(len(proposed), 'table')} may be there under {under}", expanded=True):
        st.caption("Correct what is wrong, untick what is something else, then confirm. Columns come next.")
        edited = st.data_editor(
            pd.DataFrame({"use": True, "as it is called": list(proposed), "our table": list(proposed.values())}),
            key=f"sheets-{draft.token}",
            hide_index=True,
            disabled=["as it is called"],
            column_config={"our table": st.column_config.SelectboxColumn(options=list(TABLES), required=True)},
        )
        if st.button("Read these tables", type="primary"):
            rows = edited[edited["use"]]
            sources = {str(name): str(table) for name, table in zip(rows.iloc[:, 1], rows.iloc[:, 2], strict=True)}
            st.session_state.pop(UNREAD)
            draft.read_again(read_upload(files, sources))
            st.rerun()
