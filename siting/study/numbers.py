"""
Turn numbers as other programs and countries write them into plain ones, where that can be done in one way only.

Each column is judged as a whole. A cell such as ``1.250,5`` or ``12,5`` proves which mark is the decimal one;
``1.250`` does not, since it may be 1250 or 1.25. What a column does not prove itself, the other columns of its table
may, coordinates aside, because they often come from elsewhere. Where nothing proves it the cell is refused, except for
points in a file with commas between its cells: that is how the program itself writes numbers. Nothing is turned
without a warning that shows an example. Everything is done on whole columns, since there may be millions of rows.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from siting.errors import Fault
from siting.study.columns import TABLES, Column, Kind
from siting.study.gathering import MOST_LISTED
from siting.study.raw import Form

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.arrays import Flags
    from siting.study.raw import RawStudy, RawTable

_PLAIN = r"^(-?[0-9]+(\.[0-9]+)?([eE][+-]?[0-9]+)?|unlimited)?$"
"""What needs no turning, blank cells included. All expressions here are Arrow's."""

_SPACERS = "'\u2019\\s\u00a0\u2009\u202f"
"""Apostrophes and blanks, narrow ones too, that stand between thousands."""

_THOUSANDS = 1000.0
"""Least number with a separator of thousands: a column that ends below has none."""

_OTHER = {".": ",", ",": "."}
_OTHER_WAYS = "blanks, signs or separators of thousands"


def _proves(mark: str) -> str:
    """Return the expression of numbers in which a mark can only be the decimal one."""
    dot, other = f"[{mark}]", f"[{_OTHER[mark]}]"
    shapes = (
        rf"0[0-9]*{dot}[0-9]+",
        rf"[1-9][0-9]{{3,}}{dot}[0-9]+",
        rf"[1-9][0-9]{{0,2}}{dot}([0-9]{{1,2}}|[0-9]{{4,}})",
        rf"[0-9]+{dot}[0-9]+[eE][-+]?[0-9]+",
        rf"[1-9][0-9]{{0,2}}({other}[0-9]{{3}})+{dot}[0-9]+",
        rf"[1-9][0-9]{{0,2}}({other}[0-9]{{3}}){{2,}}",
        rf"[1-9][0-9]{{0,2}}([{_SPACERS}][0-9]{{3}})+{dot}[0-9]+",
    )
    return f"^[-+]?({'|'.join(shapes)})$"


def _doubtful(mark: str) -> str:
    """Return the expression of numbers in which a mark may be decimal or between thousands."""
    return f"^[-+]?[1-9][0-9]{{0,2}}[{mark}][0-9]{{3}}$"


_NEUTRAL = rf"^[-+]?([0-9]+([eE][-+]?[0-9]+)?|[1-9][0-9]{{0,2}}([{_SPACERS}][0-9]{{3}})+)$"

_Masks = dict[str, "Flags"]
"""Flags of rows by decimal mark."""


@dataclass(frozen=True, slots=True, kw_only=True)
class _Numbers:
    """A column of numbers before it is turned."""

    column: Column
    cells: pa.Array
    tidy: pa.Array
    """The cells without blanks around them, with plain minus signs."""
    looked: Flags
    """(rows,) False where a sheet holds a number, not a text."""
    proven: _Masks
    doubtful: _Masks
    neutral: Flags

    @property
    def says(self) -> frozenset[str]:
        """Decimal marks that the cells prove."""
        return frozenset(mark for mark, rows in self.proven.items() if rows.any())


def with_plain_numbers(raw: RawStudy) -> RawStudy:
    """
    Turn every number that can be read in one way only into a plain one.

    Parameters
    ----------
    raw
        Tables of text as they were found.

    Returns
    -------
    raw
        The same object where there was nothing to turn and nothing to say. Otherwise with plain numbers, a warning for
        each table that says how it was read, and a fault for each number that can be read in two ways.
    """
    done = {name: _turn(name, table) for name, table in raw.tables.items() if name in TABLES and len(table)}
    changed = {name: turned for name, turned in done.items() if turned is not None}
    if not changed:
        return raw
    return replace(
        raw,
        tables={**raw.tables, **{name: turned.table for name, turned in changed.items()}},
        faults=(*raw.faults, *(fault for turned in changed.values() for fault in turned.faults)),
        warnings=(*raw.warnings, *(turned.note for turned in changed.values() if turned.note)),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Turned:
    """A table with plain numbers, how it was read, and what is wrong."""

    table: RawTable
    note: Fault | None
    faults: tuple[Fault, ...]


def _turn(name: str, table: RawTable) -> _Turned | None:
    """Return a table with plain numbers; None where it is of the program's own form throughout."""
    known = [
        column
        for column in TABLES[name].columns
        if column.kind in {Kind.NUMBER, Kind.WHOLE} and table.header.count(column.name) == 1
    ]
    cells = {column.name: table.columns[table.header.index(column.name)] for column in known}
    if table.form == Form() and all(map(_is_plain, cells.values())):
        return None
    columns = [_look(column, cells[column.name], table) for column in known]
    of_all = frozenset(mark for each in columns if not each.column.pair for mark in each.says)
    said = list(_form_words(table))
    faults: list[Fault] = []
    for each in columns:
        decimal = _only(each.says) or table.form.decimal or (_only(of_all) if not each.says else "")
        turned = _plain(each, decimal)
        cells[each.column.name] = turned
        said += _example(each, turned, decimal, table)
        if not decimal and not (table.form.separator == "," and "," not in each.says | of_all):
            faults += _doubts(name, each, table)
    replaced = tuple(
        cells[header] if table.header.count(header) == 1 and header in cells else column
        for header, column in zip(table.header, table.columns, strict=True)
    )
    repair = "Nothing to do if that is right; otherwise save the file as CSV UTF-8 with commas and decimal points"
    if not table.form.separator:
        repair = "Nothing to do if that is right; otherwise correct the sheet"
    note = Fault(table=name, wrong=f"read {'; '.join(said)}", repair=repair) if said else None
    return _Turned(table=replace(table, columns=replaced), note=note, faults=tuple(faults))


def _is_plain(cells: pa.Array) -> bool:
    return bool(pc.all(pc.match_substring_regex(cells, _PLAIN)).as_py())


def _only(marks: frozenset[str]) -> str:
    """Return the one mark of a set; empty where there is none, or more than one."""
    return next(iter(marks)) if len(marks) == 1 else ""


def _look(column: Column, cells: pa.Array, table: RawTable) -> _Numbers:
    looked = np.ones(len(table), dtype=np.bool_)
    if not table.form.separator:
        looked = np.isin(table.rows, list(table.form.text_cells.get(column.name, ())))
    tidy = pc.utf8_trim_whitespace(pc.replace_substring(cells, "\u2212", "-"))
    proven = {mark: _matches(tidy, _proves(mark)) & looked for mark in _OTHER}
    doubtful = {mark: _matches(tidy, _doubtful(mark)) & looked for mark in _OTHER}
    if column.high is not None and column.high < _THOUSANDS:
        proven = {mark: proven[mark] | doubtful[mark] for mark in _OTHER}
        doubtful = {mark: np.zeros_like(looked) for mark in _OTHER}
    neutral = _matches(tidy, _NEUTRAL) & looked
    return _Numbers(
        column=column, cells=cells, tidy=tidy, looked=looked, proven=proven, doubtful=doubtful, neutral=neutral
    )


def _matches(cells: pa.Array, expression: str) -> Flags:
    found: Flags = pc.match_substring_regex(cells, expression).to_numpy(zero_copy_only=False)
    return found


def _plain(numbers: _Numbers, decimal: str) -> pa.Array:
    """Return a column with plain numbers; those that the decimal mark does not fit stay as typed, to be refused."""
    rows = numbers.neutral.copy()
    between = _SPACERS
    if decimal:
        between += _OTHER[decimal]
        rows |= numbers.proven[decimal] | numbers.doubtful["."] | numbers.doubtful[","]
    if not rows.any():
        return numbers.cells
    plain = pc.replace_substring_regex(numbers.tidy, f"[{between}]|^[+]", "")
    if decimal == ",":
        plain = pc.replace_substring(plain, ",", ".")
    return pc.if_else(pa.array(rows), plain, numbers.cells)


def _form_words(table: RawTable) -> Iterator[str]:
    """Yield how a table was written, as far as the program would not have written it so."""
    form = table.form
    if form.source:
        yield f"from {form.source!r}"
    if form.encoding.startswith("utf-16"):
        yield "as UTF-16"
    elif form.encoding != "utf-8":
        yield f"as Windows-1252{_accented(table)}"
    if form.separator in {";", "\t"}:
        yield f"with {'semicolons' if form.separator == ';' else 'tabs'} between cells"
    if form.skipped:
        yield f"without {form.skipped} {'row' if form.skipped == 1 else 'rows'} above the header"
    if form.hidden:
        yield "although the sheet or some of its rows are hidden"


def _accented(table: RawTable) -> str:
    """Return an example of a text that depends on the encoding, to be looked at."""
    for cells in (pa.array(table.header), *table.columns):
        found = cells.filter(pc.match_substring_regex(cells, r"[^\x00-\x7f]"))
        if len(found):
            return f", which gives {found[0].as_py()!r}"
    return ""


def _example(numbers: _Numbers, turned: pa.Array, decimal: str, table: RawTable) -> Iterator[str]:
    """Yield how a column was read, with the first cell that was turned."""
    name = numbers.column.name
    changed = pc.not_equal(numbers.cells, turned).to_numpy(zero_copy_only=False)
    if not changed.any():
        if not table.form.separator and (is_text := numbers.looked & (turned != "")).any():
            yield f"{name} from texts that hold numbers, the first in row {int(table.rows[np.argmax(is_text)])}"
        return
    marked = numbers.proven["."] | numbers.proven[","] | numbers.doubtful["."] | numbers.doubtful[","]
    telling = changed & marked if (changed & marked).any() else changed
    first = int(np.argmax(telling))
    way = "decimal commas" if decimal == "," and (changed & marked).any() else _OTHER_WAYS
    before, after = numbers.cells[first].as_py(), turned[first].as_py()
    yield f"{name} with {way}, such as {before!r} in row {int(table.rows[first])} as {after}"


def _doubts(name: str, numbers: _Numbers, table: RawTable) -> Iterator[Fault]:
    """Yield a fault for each number with a point that may be 1250 or 1.25; with a comma, checking refuses it anyway."""
    places = np.flatnonzero(numbers.doubtful["."])
    column = numbers.column.name
    for place in places[:MOST_LISTED].tolist():
        text = numbers.cells[place].as_py()
        thousands, decimals = text.replace(".", ""), text.rstrip("0").rstrip(".")
        yield Fault(
            table=name,
            row=int(table.rows[place]),
            column=column,
            value=text,
            wrong=f"{text} could be {thousands} or {decimals}, and nothing in the column says which",
            repair=f"Write {thousands}, or {decimals}0 if the point is decimal, or state the decimal mark in a mapping",
        )
    if places.size > MOST_LISTED:
        more = places.size - MOST_LISTED
        wrong = f"{more} more numbers of column {column} could be read in two ways"
        yield Fault(table=name, wrong=wrong, repair="State the decimal mark in a mapping")
