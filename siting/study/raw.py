"""
What files, workbooks and pages are first read to: tables of text and loose settings, nothing judged yet.

Text is held in Arrow arrays, so that a table of millions of lanes does not become millions of Python strings.
"""

from __future__ import annotations

import datetime as dt
import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa

from siting.cells import number_text

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from siting.arrays import Positions
    from siting.errors import Fault

FIRST_ROW = 2
"""Row of the first record under a header in row 1."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Form:
    """How a table was written where it was found. The form that the program writes is the default."""

    source: str = ""
    """Name of the file, without its ending, or of the sheet, where it is not that of the table."""
    encoding: str = "utf-8"
    separator: str = ","
    """What stands between the cells of a text file; "" in a sheet."""
    skipped: int = 0
    """Filled rows above the header, such as a title."""
    text_cells: Mapping[str, frozenset[int]] = field(default_factory=dict)
    """In a sheet, by column: rows whose cell is a text that looks like a number. Other numbers there are certain."""
    decimal: str = ""
    """The decimal mark, "." or ",", of columns that do not prove theirs, as the analyst stated it; "" = not stated."""
    hidden: bool = False
    """Whether the sheet, or some of its rows, are hidden."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RawTable:
    """One table as text."""

    header: tuple[str, ...]
    """Column names as typed."""
    columns: tuple[pa.Array, ...]
    """One array of strings a column, in the order of the header; blank is "", never null."""
    rows: Positions
    """(rows,) number of each row as the user's spreadsheet shows it."""
    form: Form = field(default_factory=Form)

    def __len__(self) -> int:
        """Return the number of rows."""
        return int(self.rows.shape[0])

    def column(self, name: str) -> pa.Array | None:
        """Return the cells of a column, or None where the table does not have it."""
        return self.columns[self.header.index(name)] if name in self.header else None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RawStudy:
    """All tables and settings of a study as they were found."""

    tables: Mapping[str, RawTable]
    """Tables by name; only those that are there and could be read."""
    settings: Mapping[str, object] = field(default_factory=dict)
    """As `study.toml` gives them: texts, numbers, booleans, and the mapping `solve`."""
    settings_name: str = "study.toml"
    """What faults call the place of the settings."""
    faults: tuple[Fault, ...] = ()
    """What went wrong while reading: files that cannot be read, ragged rows."""
    warnings: tuple[Fault, ...] = ()
    """What was left unread."""
    strangers: tuple[str, ...] = ()
    """Names of files or sheets beside the tables, which were not read."""
    unreadable: frozenset[str] = frozenset()
    """Tables that are there but could not be read, and `settings_name` where the settings could not."""


def cell_text(value: object) -> str:
    """
    Return the text a table cell holds, from any value a workbook or an editor gives.

    Blank (None, NaN, missing) is ``""``, true and false are ``yes`` and ``no``, whole numbers lose their ``.0``, dates
    become ISO 8601 text.
    """
    if isinstance(value, str):
        return value
    if isinstance(value, bool | np.bool_):
        return "yes" if value else "no"
    if isinstance(value, int | np.integer):
        return str(int(value))
    if isinstance(value, float | np.floating):
        return "" if math.isnan(value) else number_text(float(value))
    if isinstance(value, dt.date | dt.time):
        return value.isoformat()
    return "" if value is None or str(value) in {"<NA>", "NaT"} else str(value)


def table_from_rows(
    header: Sequence[str], records: Iterable[Sequence[object]], rows: Sequence[int] | None = None
) -> RawTable:
    """
    Return a table from records in memory, such as those of an editor on a page.

    Parameters
    ----------
    header
        Column names.
    records
        Cells in the order of the header, of any type; see `cell_text`. Records that are all blank are left out.
    rows
        Number of each record as the user sees it; by default 2, 3, ... as under a header in row 1.

    Returns
    -------
    table
        The table as text.
    """
    texts = [[cell_text(value) for value in record] for record in records]
    numbers = range(FIRST_ROW, FIRST_ROW + len(texts)) if rows is None else rows
    kept = [(number, text) for number, text in zip(numbers, texts, strict=True) if any(text)]
    columns = zip(*(text for _, text in kept), strict=True) if kept else ((),) * len(header)
    return RawTable(
        header=tuple(header),
        columns=tuple(pa.array(column, type=pa.string()) for column in columns),
        rows=np.array([number for number, _ in kept], dtype=np.int32),
    )
