"""Inputs: the tables and settings of the study, edited in place, with their faults beside them."""

from __future__ import annotations

import copy
import html
import io
from collections import Counter
from dataclasses import replace
from typing import TYPE_CHECKING

import pandas as pd
import streamlit as st

from siting.browse.drafts import (
    MOST_EDITED_ROWS,
    ROW,
    SETTING,
    SETTINGS_TABLE,
    VALUE,
    Draft,
    find_draft,
    keep_draft,
)
from siting.browse.orders_view import show_orders
from siting.browse.parcels import tables_zip
from siting.browse.places_view import odd_places, show_places
from siting.browse.sheets_view import remember_files, show_sheets
from siting.browse.shell import (
    DEMO_SOURCE,
    LOST,
    current_draft,
    headline,
    notice,
    notices,
    section,
    show_given_map,
    use_draft,
)
from siting.browse.upload import UPLOAD_TYPES, read_upload
from siting.browse.work_view import work_list_html
from siting.errors import StudyError
from siting.study.columns import SETTINGS, SOLVE_SETTINGS, TABLES, Column
from siting.study.demo import demo_folder
from siting.study.propose import propose_mapping
from siting.study.raw import RawStudy
from siting.study.read import read_raw
from siting.study.template import write_template
from siting.study.words import counted, faults_sentence, study_sentence
from siting.study.work_list import work_list, work_sentence

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.errors import Fault
    from siting.study.check import Checked

EDITOR_HEIGHT_PX = 470
MOST_LISTED = 200
"""Faults and warnings of one table that are listed; what comes after them is counted."""
MOST_ODD = 5
"""Odd places that are named above the map; it names them all."""
NEW_SETTINGS = {"currency": "EUR", "unit": "t"}
"""What a new study starts with, in sight on the page, to be changed."""
LEAST_TICKED = 0.75
"""Confidence from which a proposed name of a column is ticked at first."""
TAKE_OUT = "take it out, with its cells"


def show() -> None:
    """Draw the page."""
    draft = current_draft()
    top, controls = st.columns([4.4, 1.2], gap="medium")
    with top:
        _opening(draft)
    with controls:
        _studies(draft)
    if st.session_state.get(LOST):
        notice(
            "This address led to tables that the server no longer keeps (it was started again, or they lay untouched "
            "behind many others). The study was opened afresh.",
            kind="stale",
        )
    show_sheets(draft)
    _proposals(draft)
    _work(draft.checked)
    places = st.container()
    _tables(draft, draft.checked)
    with places:  # above the tables, yet after them: they need not wait for the towns
        show_places(draft)
    show_orders(draft)
    section("Where everything is", "What was given, before anything is decided.")
    _map(draft)


def _map(draft: Draft) -> None:
    """Show the map, with coordinates that do not fit their place or country named above it and on it."""
    odd = odd_places(draft)
    said = [str(each) for each in odd[:MOST_ODD]]
    more = [f"And {len(odd) - MOST_ODD:,} more, on the map under Worth knowing."] if len(odd) > MOST_ODD else []
    notices([*said, *more], kind="stale", title=f"{counted(len(odd), 'place')} worth a look")
    show_given_map(draft, odd)


def _opening(draft: Draft) -> None:
    checked = draft.checked
    if not draft.raw.tables:
        headline(
            "Empty tables: fill in sites or suppliers, then customers and settings",
            second="Type, or paste from a spreadsheet: click the first cell of an empty row and press Ctrl+V. "
            "Whatever is still missing or wrong is listed beside the table.",
        )
    elif checked.study is not None:
        headline(study_sentence(checked.study), second=f"{draft.source}. {work_sentence(checked)}.")
    else:
        what = work_sentence(checked)
        headline(f"To mend before a plan can be made: {what}", second=f"{draft.source}. Everything typed is kept.")


def _proposals(draft: Draft) -> None:
    """Propose what columns of other names are; nothing is renamed before it is confirmed."""
    proposals = propose_mapping(draft.raw)
    if not proposals:
        return
    with st.expander(f"{counted(len(proposals), 'column')} may be ours under other names", expanded=True):
        st.caption("Correct what is wrong, untick what should stay as it is, then confirm.")
        table = pd.DataFrame(
            {
                "use": [each.confidence >= LEAST_TICKED for each in proposals],
                "table": [each.table for each in proposals],
                "as typed": [each.typed for each in proposals],
                "our column": [each.column for each in proposals],
                "why": [f"{each.confidence:.0%}: {'; '.join(each.reasons)}" for each in proposals],
            }
        )
        ours = sorted({column for each in proposals for column in TABLES[each.table].names})
        edited = st.data_editor(
            table,
            key=f"proposals-{draft.token}-{draft.version}",
            hide_index=True,
            disabled=["table", "as typed", "why"],
            column_config={
                "our column": st.column_config.SelectboxColumn(options=ours, required=True),
                "why": st.column_config.TextColumn(width="large"),
            },
        )
        if st.button("Use these names", type="primary"):
            rows = zip(proposals, edited["use"], edited["our column"], strict=True)
            draft.confirm([replace(each, column=str(column)) for each, use, column in rows if use])
            st.rerun()


def _work(checked: Checked) -> None:
    """List what is left to do in all tables; each table's button leads to it."""
    groups = work_list(checked)
    if not groups:
        return
    with st.expander("All that is left to do, table by table"):
        for group in groups:
            place = group.table if group.table in TABLES else SETTINGS_TABLE
            title, go = st.columns([5, 1])
            title.html(work_list_html([group], opened="" if group.faults else SETTINGS_TABLE))
            go.button(f"Go to {place}", key=f"go-{group.table}", on_click=_choose, args=(place,), width="stretch")


def _choose(table: str) -> None:
    st.session_state["chosen_table"] = table


def _tables(draft: Draft, checked: Checked) -> None:
    counts = Counter(_place(fault) for fault in checked.faults)
    names = [*TABLES, SETTINGS_TABLE]
    chosen = st.segmented_control(
        "Table",
        names,
        default="sites",
        required=True,
        key="chosen_table",
        label_visibility="collapsed",
        format_func=lambda name: f"{name}: {counted(counts[name], 'fault')}" if counts[name] else name,
    )
    name = str(chosen or names[0])
    editor, beside = st.columns([2.7, 1], gap="medium")
    with editor:
        _edit(draft, name)
    with beside, st.container(height=EDITOR_HEIGHT_PX + 34, border=False):
        _beside(draft, checked, name)


def _place(fault: Fault) -> str:
    return fault.table if fault.table in TABLES else SETTINGS_TABLE


def _edit(draft: Draft, name: str) -> None:
    """Show the table to edit and take what was changed since this session last saw it."""
    raw = draft.raw.tables.get(name)
    if raw is not None and len(raw) > MOST_EDITED_ROWS:
        notice(
            f"{len(raw):,} rows: too many to edit here. Edit them where they came from and open the study again; "
            "they are checked and planned with all the same."
        )
        return
    key, base, moved_on = _base(draft, name)
    edited = _edit_settings(key, base) if name == SETTINGS_TABLE else _edit_table(key, base, name)
    change = copy.deepcopy(st.session_state.get(key))
    if change == st.session_state["edit_change"]:
        return
    st.session_state["edit_change"] = change
    if moved_on:
        return
    changed = _put_settings(draft, edited) if name == SETTINGS_TABLE else draft.put_table(name, edited)
    st.session_state["edit_version"] = draft.version
    if changed:
        st.rerun()


def _edit_table(key: str, base: pd.DataFrame, name: str) -> pd.DataFrame:
    st.caption(f"{TABLES[name].meaning}. Rows count the header as row 1; Ctrl+F in the table finds a row.")
    ours = TABLES[name].columns
    columns = {column.name: st.column_config.TextColumn(column.name, help=_help(column)) for column in ours}
    number = st.column_config.NumberColumn(ROW, disabled=True, pinned=True, width=48, format="%d")
    return st.data_editor(
        base,
        key=key,
        num_rows="dynamic",
        hide_index=True,
        height=EDITOR_HEIGHT_PX,
        column_config={ROW: number, **columns},
    )


def _edit_settings(key: str, base: pd.DataFrame) -> pd.DataFrame:
    st.caption("An empty value is the default. Those that begin with solve say how long and how hard to search.")
    return st.data_editor(
        base,
        key=key,
        hide_index=True,
        height=EDITOR_HEIGHT_PX,
        disabled=[column for column in base.columns if column != VALUE],
        column_config={
            SETTING: st.column_config.TextColumn(SETTING, pinned=True, width=150),
            VALUE: st.column_config.TextColumn(VALUE, width=140),
            "unit": st.column_config.TextColumn("unit", width=170),
            "meaning": st.column_config.TextColumn("meaning", width="large"),
        },
    )


def _put_settings(draft: Draft, edited: pd.DataFrame) -> bool:
    rows = edited.fillna("").to_dict("records")
    changed = [draft.put_setting(str(row[SETTING]), str(row[VALUE])) for row in rows]
    return any(changed)


def _base(draft: Draft, name: str) -> tuple[str, pd.DataFrame, bool]:
    """
    Return the editor's key, what it starts from, and whether the draft has moved on elsewhere.

    The start is the draft as it was when this table came into view, kept while it stays, so that scrolling and
    selection stay too. Where another tab has edited the draft since, the editor starts again from what is there now.
    """
    view = (st.session_state["visit"], draft.token, name)
    same_view = st.session_state.get("edit_view") == view
    moved_on = same_view and st.session_state["edit_version"] != draft.version
    if moved_on and st.session_state.get(_key()) != st.session_state["edit_change"]:
        notice("Another tab has edited this study: what you just typed was not taken. Type it again.", kind="stale")
    if not same_view or moved_on:
        st.session_state["edit_view"] = view
        st.session_state["edit_number"] = st.session_state.get("edit_number", 0) + 1
        st.session_state["edit_base"] = draft.settings_frame() if name == SETTINGS_TABLE else draft.table(name)
        st.session_state["edit_version"] = draft.version
        st.session_state["edit_change"] = dict(UNCHANGED)
    base: pd.DataFrame = st.session_state["edit_base"]
    return _key(), base, moved_on


UNCHANGED: dict[str, object] = {"edited_rows": {}, "added_rows": [], "deleted_rows": []}
"""State of an editor that nobody has touched."""


def _key() -> str:
    return f"edit-{st.session_state.get('edit_number', 0)}"


def _help(column: Column) -> str:
    parts = [column.meaning, f"Unit: {column.unit}" if column.unit else "", *_allowed(column)]
    return ". ".join(part for part in parts if part) + "."


def _allowed(column: Column) -> list[str]:
    choices = ["One of " + ", ".join(column.choices)] if column.choices else []
    return choices + (["Must be filled in"] if column.required else [])


def _beside(draft: Draft, checked: Checked, name: str) -> None:
    faults = [fault for fault in checked.faults if _place(fault) == name]
    warnings = [warning for warning in checked.warnings if _place(warning) == name]
    _listed(faults, "fault", name)
    _listed(warnings, "warning", name)
    if not faults and not warnings:
        elsewhere = faults_sentence(checked.faults, checked.warnings)
        said = f"No fault in {name}." + (f" Elsewhere: {elsewhere}." if checked.faults else "")
        st.html(f'<p class="second">{html.escape(said)}</p>')
    if name in TABLES and draft.strangers(name):
        _rename(draft, name)
    columns = (*SETTINGS, *SOLVE_SETTINGS) if name == SETTINGS_TABLE else TABLES[name].columns
    if name != SETTINGS_TABLE:
        st.html(_columns_explained(columns))


def _listed(found: Sequence[Fault], word: str, name: str) -> None:
    said = [_said(fault) for fault in found[:MOST_LISTED]]
    if len(found) > MOST_LISTED:
        said.append(f"And {len(found) - MOST_LISTED:,} more.")
    notices(said, kind="fault" if word == "fault" else "stale", title=f"{counted(len(found), word)} in {name}")


def _said(fault: Fault) -> str:
    place = [f"row {fault.row}" if fault.row is not None else "", fault.column]
    where = ", ".join(part for part in place if part)
    value = f" {fault.value!r}" if fault.value else ""
    start = f"{where}{value}: " if where or value else ""
    return f"{start}{fault.wrong}. {fault.repair}."


def _rename(draft: Draft, name: str) -> None:
    """Offer to rename or take out the columns that are not ours: the editor itself cannot."""
    with st.popover("Rename or take out a column", width="stretch"):
        label = st.selectbox("Column as typed", draft.strangers(name))
        absent = [column for column in TABLES[name].names if column not in draft.labels(name)]
        new = st.selectbox("What becomes of it", [TAKE_OUT, *absent])
        if st.button("Do it"):
            draft.rename_column(name, label, None if new == TAKE_OUT else new)
            st.rerun()


def _columns_explained(columns: Sequence[Column]) -> str:
    """Return what each column means, as HTML."""
    items = []
    for column in columns:
        notes = ", ".join(part for part in (column.unit, "required" if column.required else "") if part)
        unit = f" <span>{html.escape(notes)}</span>" if notes else ""
        said = ". ".join(
            [column.meaning.replace("`", ""), *(["One of " + ", ".join(column.choices)] if column.choices else [])]
        )
        items.append(f"<dt>{html.escape(column.name)}{unit}</dt><dd>{html.escape(said)}.</dd>")
    return f'<dl class="columns">{"".join(items)}</dl>'


def _studies(draft: Draft) -> None:
    """Offer to keep the tables as typed, and to open others in their place."""
    raw = draft.raw
    st.download_button(
        "Save these tables (zip)",
        data=lambda: tables_zip(raw),
        file_name="study.zip",
        on_click="ignore",
        width="stretch",
    )
    st.download_button(
        "Template to fill in (xlsx)",
        data=_template,
        file_name="template.xlsx",
        on_click="ignore",
        width="stretch",
    )
    with st.popover("Open another study", width="stretch", key=f"open-{draft.token}"):
        st.caption("It takes the place of the tables here; you can go back to them.")
        files = st.file_uploader(
            "One .xlsx workbook, or study.toml together with the CSV tables",
            type=UPLOAD_TYPES,
            accept_multiple_files=True,
            key=f"files-{draft.token}",
        )
        if st.button("Open these files", type="primary", disabled=not files, width="stretch"):
            _open_files(draft, [(file.name, file.getvalue()) for file in files])
        if st.button("Open the demo study", width="stretch"):
            _open(draft, read_raw(demo_folder()), DEMO_SOURCE)
        if st.button("Start with empty tables", width="stretch"):
            _open(draft, RawStudy(tables={}, settings=NEW_SETTINGS), "A new study")
        before = find_draft(draft.before) if draft.before else None
        if st.button("Back to the study before", disabled=before is None, width="stretch") and before is not None:
            use_draft(before)
            st.rerun()


def _template() -> bytes:
    held = io.BytesIO()
    write_template(held)
    return held.getvalue()


def _open_files(draft: Draft, files: Sequence[tuple[str, bytes]]) -> None:
    try:
        raw = read_upload(files)
    except StudyError as error:
        notices((str(fault) for fault in error.faults), kind="fault", title="These files were not opened")
        return
    _open(draft, raw, ", ".join(name for name, _ in files), files)


def _open(draft: Draft, raw: RawStudy, source: str, files: Sequence[tuple[str, bytes]] = ()) -> None:
    st.session_state[LOST] = False
    opened = keep_draft(raw, source, before=draft.token)
    remember_files(opened, files)
    use_draft(opened)
    st.rerun()


show()
