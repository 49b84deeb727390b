"""Order lines to demand: a file of order lines added up to a year's demand, looked at, then put into the tables."""

from __future__ import annotations

import html
import math
import tempfile
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import pandas as pd
import streamlit as st

from siting.browse.filling import missing_customers, put_demand
from siting.browse.serve import LARGEST_UPLOAD_MB
from siting.browse.shell import notice, notices
from siting.errors import DataFileError
from siting.study.order_file import DATE_FORMATS
from siting.study.order_study import CARRIED, study_of_orders
from siting.study.order_words import month_shares, rollup_lines
from siting.study.orders import OrderColumns, OrderReading, columns_of, roll_up
from siting.study.propose import fold
from siting.study.synonyms import SYNONYMS
from siting.study.words import counted

if TYPE_CHECKING:
    import datetime as dt
    from collections.abc import Callable, Sequence

    from streamlit.runtime.uploaded_file_manager import UploadedFile

    from siting.browse.drafts import Draft
    from siting.study.orders import Rollup
    from siting.study.tables import Study

_Made = TypeVar("_Made")

ADDED_UP, COLUMNS = "orders_added_up", "orders_columns"
"""Names in the session of what the last file came to, and of its columns."""

FILE_TYPES = ["csv", "txt", "tsv", "parquet", "pq"]
MOST_MONTHS, ROW_PX = 12, 35
"""Months shown at once, and the height of the row of each."""
NONE, FOUND_OUT = "(none)", "found out"
MARKS = {FOUND_OUT: "", "decimal point": ".", "decimal comma": ","}
DATE_WORDS = ("date", "day", "datum", "tag", "order date", "ship date", "delivery date", "lieferdatum", "fecha", "data")
"""What people call the column of dates, as in `SYNONYMS`."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class AddedUp:
    """What a file of order lines came to."""

    file: str
    """Which upload it was."""
    rollup: Rollup
    reading: OrderReading
    made: Study


def show_orders(draft: Draft) -> None:
    """Draw the section."""
    with st.expander("Order lines to demand"):
        st.caption(
            "A file of order lines, such as an export of a year's deliveries, is added up to a year's demand by "
            f"customer. CSV or Parquet up to {LARGEST_UPLOAD_MB} MB; for larger files: siting rollup."
        )
        file = st.file_uploader("File of order lines", type=FILE_TYPES, key=f"orders-{draft.token}")
        if file is None:
            return
        columns = _columns(file)
        if not columns:
            return
        asked = _asked(columns)
        if asked is not None:
            _add_up(draft, file, *asked)
        held: AddedUp | None = st.session_state.get(ADDED_UP)
        if held is not None and held.file == file.file_id:
            _show(draft, held)


def _with_file(file: UploadedFile, do: Callable[[Path], _Made]) -> _Made | None:
    """Return what is made of the upload while it lies on the disk; None, and why, where it cannot be read."""
    is_parquet = file.name.lower().endswith((".parquet", ".pq"))
    with tempfile.TemporaryDirectory(prefix="siting-upload-") as scratch:
        path = Path(scratch) / f"orders.{'parquet' if is_parquet else 'csv'}"
        path.write_bytes(file.getvalue())
        try:
            return do(path)
        except DataFileError as error:
            notice(str(error).replace(str(path), file.name), kind="fault")
    return None


def _columns(file: UploadedFile) -> tuple[str, ...]:
    held = st.session_state.get(COLUMNS)
    if held is None or held[0] != file.file_id:
        held = st.session_state[COLUMNS] = (file.file_id, _with_file(file, columns_of) or ())
    columns: tuple[str, ...] = held[1]
    if not columns:
        notice("This file cannot be read as order lines. Give another one.", kind="fault")
    return columns


def _asked(columns: Sequence[str]) -> tuple[OrderColumns, OrderReading] | None:
    """Show the form; returns what was asked for when its button is pressed and the factor is one."""
    with st.form("orders", border=False):
        row = st.columns(4)
        customer, quantity = (
            row[at].selectbox(title, columns, index=max(0, _guess(columns, name) or 0))
            for at, (title, name) in enumerate((("Customer", "customer"), ("Quantity", "demand")))
        )
        good, date = (
            _optional(row[at], title, columns, name)
            for at, (title, name) in enumerate((("Good", "good"), ("Date", "date")), start=2)
        )
        row = st.columns(4)
        first: dt.date | None = row[0].date_input("First day", value=None, help="Empty: as the lines say")
        last: dt.date | None = row[1].date_input("Last day", value=None, help="Empty: as the lines say")
        factor = row[2].text_input("Units of the study in one of the file", "1", help="Such as 0.001 from kg to t")
        mark = row[3].selectbox("Decimal mark of the quantities", list(MARKS))
        places = st.columns(len(CARRIED))
        kept = {name: _optional(places[at], f"Column of {name}", columns, name) for at, name in enumerate(CARRIED)}
        row = st.columns(4, vertical_alignment="bottom")
        date_format = row[0].selectbox("Form of the dates", [FOUND_OUT, *DATE_FORMATS])
        returns = row[1].checkbox("Take returns off", value=True, help="Negative lines; otherwise they are left out")
        far_out = row[2].checkbox("Keep lines far above others", value=True)
        if not row[3].form_submit_button("Add up", type="primary", width="stretch"):
            return None
    units = _factor(factor)
    if not units:
        notice(f"{factor!r} is not a factor above 0. Write 0.001 from kg to t.", kind="fault")
        return None
    reading = OrderReading(
        factor=units,
        decimal=MARKS[mark],
        date_format="" if date_format == FOUND_OUT else date_format,
        first=first,
        last=last,
        returns=returns,
        far_out=far_out,
    )
    carried = {name: column for name, column in kept.items() if column}
    return OrderColumns(customer=customer, quantity=quantity, good=good, date=date, kept=carried), reading


def _optional(place: Any, title: str, columns: Sequence[str], name: str) -> str:  # noqa: ANN401 - a column of the page
    """Return the column chosen for something that need not be there; empty = none."""
    guess = _guess(columns, name)
    options = [NONE, *columns]
    at = place.selectbox(
        title, range(len(options)), index=0 if guess is None else guess + 1, format_func=options.__getitem__
    )
    return options[at] if at else ""


def _guess(columns: Sequence[str], name: str) -> int | None:
    """Return which column has a name that people give to this."""
    words = {name, *(DATE_WORDS if name == "date" else SYNONYMS.get(name, ()))}
    return next((at for at, column in enumerate(columns) if fold(column) in words), None)


def _factor(text: str) -> float:
    """Return a factor above 0, or 0 where the text is none."""
    try:
        value = float(text.strip().replace(",", "."))
    except ValueError:
        return 0.0
    return value if 0.0 < value < math.inf else 0.0


def _add_up(draft: Draft, file: UploadedFile, columns: OrderColumns, reading: OrderReading) -> None:
    st.session_state.pop(ADDED_UP, None)
    with st.spinner("Adding up"):
        rollup = _with_file(file, lambda path: roll_up(path, columns, reading))
    if rollup is not None:
        made = study_of_orders(rollup, columns, unit=draft.setting_text("unit"))
        st.session_state[ADDED_UP] = AddedUp(file=file.file_id, rollup=rollup, reading=reading, made=made)


def _show(draft: Draft, held: AddedUp) -> None:
    """Show what the lines came to, and offer to put it into the tables."""
    said, season = st.columns([1.6, 1], gap="medium")
    with said:
        lines = rollup_lines(held.rollup, held.reading, draft.setting_text("unit"))
        notices(lines, title="What the lines come to")
        new, without = missing_customers(draft, held.made)
        after = f"{counted(len(held.made.customers), 'customer')} in the lines, {new:,} of them not in the table yet."
        st.html(f'<p class="second">{html.escape(after)}</p>')
        alone = bool(without) and st.checkbox(
            f"Take out {counted(without, 'customer')} of the table that no line names", key="orders-alone"
        )
        if st.button("Put this demand into the tables", type="primary"):
            put_demand(draft, held.made, alone=alone)
            st.session_state.pop(ADDED_UP)
            st.rerun()
    shares = month_shares(held.rollup)
    if shares:
        with season:
            _season(held.rollup, shares)


def _season(rollup: Rollup, shares: Sequence[tuple[str, float]]) -> None:
    frame = pd.DataFrame(
        {
            "month": [month for month, _ in shares],
            "quantity": [quantity for _, quantity in rollup.months],
            "of an average month": [round(100 * share) for _, share in shares],
        }
    )
    most = max(100, int(frame["of an average month"].max()))
    st.dataframe(
        frame,
        hide_index=True,
        height=ROW_PX * (1 + min(len(frame), MOST_MONTHS)) + 3,
        column_config={
            "quantity": st.column_config.NumberColumn(format="localized"),
            "of an average month": st.column_config.ProgressColumn(format="%d %%", min_value=0, max_value=most),
        },
    )
