"""Inputs: the tables and settings of the study, edited in place, with their faults beside them."""

from __future__ import annotations

import html
from collections import Counter
from typing import TYPE_CHECKING

import streamlit as st

from siting.browse.drafts import MOST_EDITED_ROWS, ROW, SETTING, SETTINGS_TABLE, VALUE, Draft, keep_draft
from siting.browse.shell import current_draft, headline, notice, section, use_draft
from siting.browse.upload import UPLOAD_TYPES, read_upload
from siting.sharing.map import draw_given
from siting.study.columns import TABLES, Column
from siting.study.demo import demo_folder
from siting.study.read import read_raw
from siting.study.words import faults_sentence, study_sentence

if TYPE_CHECKING:
    import pandas as pd

    from siting.errors import Fault
    from siting.study.check import Checked

EDITOR_HEIGHT_PX = 460
MAP_HEIGHT_PX = 560


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    checked = draft.checked
    if checked.study is not None:
        headline(study_sentence(checked.study), second=f"{draft.source}. {faults_sentence((), checked.warnings)}")
    else:
        headline(faults_sentence(checked.faults, checked.warnings), second=draft.source)
    _tables(draft, checked)
    section("Where everything is", "What was given, before anything is decided.")
    if checked.study is None:
        notice("The map is drawn once the tables have no fault.")
    else:
        st.iframe(_given_map(draft), height=MAP_HEIGHT_PX)
    _open_another()


def _tables(draft: Draft, checked: Checked) -> None:
    counts = Counter(_place(draft, fault) for fault in checked.faults)
    names = [*TABLES, SETTINGS_TABLE]
    chosen = st.segmented_control(
        "Table",
        names,
        default="sites",
        required=True,
        key="chosen_table",
        label_visibility="collapsed",
        format_func=lambda name: f"{name} ({counts[name]})" if counts[name] else name,
    )
    name = str(chosen or names[0])
    editor, beside = st.columns([2.6, 1], gap="medium")
    with editor:
        if name == SETTINGS_TABLE:
            _edit_settings(draft)
        else:
            _edit_table(draft, name)
    with beside:
        _faults([fault for fault in checked.faults if _place(draft, fault) == name], "fault", name)
        _faults([warning for warning in checked.warnings if _place(draft, warning) == name], "warning", name)


def _place(draft: Draft, fault: Fault) -> str:
    return SETTINGS_TABLE if fault.table in {draft.raw.settings_name, "study"} else fault.table


def _edit_table(draft: Draft, name: str) -> None:
    spec = TABLES[name]
    raw = draft.raw.tables.get(name)
    if raw is not None and len(raw) > MOST_EDITED_ROWS:
        notice(f"{len(raw):,} rows: too many to edit here. Edit them where they came from and open the study again.")
        return
    st.caption(f"{spec.meaning}. Row numbers count the header as row 1.")
    base = _base(draft, name)
    edited = st.data_editor(
        base,
        key=_editor_key(name),
        num_rows="dynamic",
        hide_index=True,
        height=EDITOR_HEIGHT_PX,
        column_config={
            ROW: st.column_config.NumberColumn(ROW, disabled=True, pinned=True, width=48, format="%d"),
            **{column.name: st.column_config.TextColumn(column.name, help=_help(column)) for column in spec.columns},
        },
    )
    if draft.put_table(name, edited):
        st.rerun()


def _edit_settings(draft: Draft) -> None:
    st.caption("An empty value is the default. `solve.` settings say how long and how hard to search.")
    base = _base(draft, SETTINGS_TABLE)
    edited = st.data_editor(
        base,
        key=_editor_key(SETTINGS_TABLE),
        hide_index=True,
        height=EDITOR_HEIGHT_PX,
        disabled=[column for column in base.columns if column != VALUE],
        column_config={VALUE: st.column_config.TextColumn(VALUE, pinned=True), "meaning": {"width": "large"}},
    )
    changed = [draft.put_setting(row[SETTING], row[VALUE] or "") for row in edited.fillna("").to_dict("records")]
    if any(changed):
        st.rerun()


def _editor_key(name: str) -> str:
    return f"edit-{name}-{st.session_state['edit_visit']}"


def _base(draft: Draft, name: str) -> pd.DataFrame:
    """Return what the editor starts from: the draft as it was when this table came into view, kept while it stays."""
    view = (st.session_state["visit"], draft.token, name)
    if st.session_state.get("edit_view") != view:
        st.session_state["edit_view"] = view
        st.session_state["edit_visit"] = st.session_state.get("edit_visit", 0) + 1
        st.session_state["edit_base"] = draft.settings_frame() if name == SETTINGS_TABLE else draft.table(name)
    base: pd.DataFrame = st.session_state["edit_base"]
    return base


def _help(column: Column) -> str:
    parts = [column.meaning, f"Unit: {column.unit}" if column.unit else ""]
    if column.choices:
        parts.append("One of " + ", ".join(column.choices))
    if column.required:
        parts.append("Must be filled in")
    return ". ".join(part for part in parts if part) + "."


def _faults(faults: list[Fault], word: str, name: str) -> None:
    if not faults:
        if word == "fault":
            st.html(f'<p class="second">No fault in {html.escape(name)}.</p>')
        return
    items = "".join(f"<li>{html.escape(_said(fault))}</li>" for fault in faults)
    kind = "fault" if word == "fault" else "stale"
    title = f"{len(faults)} {word}{'s' if len(faults) != 1 else ''} in {name}"
    st.html(
        f'<div class="faults {kind}"><p class="notice {kind}">{html.escape(title)}</p><ul>{items}</ul></div>',
        width="stretch",
    )


def _said(fault: Fault) -> str:
    place = [f"row {fault.row}" if fault.row is not None else "", fault.column]
    where = ", ".join(part for part in place if part)
    value = f" {fault.value!r}" if fault.value else ""
    start = f"{where}{value}: " if where or value else ""
    return f"{start}{fault.wrong}. {fault.repair}."


def _given_map(draft: Draft) -> str:
    study = draft.checked.study
    key = ("given_map", draft.token, draft.version)
    if st.session_state.get("given_map_key") != key and study is not None:
        st.session_state["given_map_key"] = key
        st.session_state["given_map_html"] = draw_given(study).html
    return str(st.session_state["given_map_html"])


def _open_another() -> None:
    section("Open another study", "One .xlsx workbook, or study.toml together with the CSV tables. Or start afresh.")
    files = st.file_uploader("Files of a study", type=UPLOAD_TYPES, accept_multiple_files=True, key="study_files")
    if files and st.session_state.get("taken_files") != (taken := [file.file_id for file in files]):
        st.session_state["taken_files"] = taken
        raw = read_upload({file.name: file.getvalue() for file in files})
        use_draft(keep_draft(raw, ", ".join(file.name for file in files)))
        st.rerun()
    demo, fresh, _ = st.columns([1, 1, 4])
    if demo.button("Open the demo study"):
        use_draft(keep_draft(read_raw(demo_folder()), "demo"))
        st.rerun()
    if fresh.button("Start with empty tables"):
        use_draft(keep_draft(read_upload({}), "new study"))
        st.rerun()


show()
