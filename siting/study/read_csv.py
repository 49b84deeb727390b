"""
Read one table from a text file: RFC 4180 as the program writes it, or what other programs make of it.

UTF-8, UTF-16 or Windows-1252; commas, semicolons or tabs; what was found out is kept in the table's form and shown.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import pyarrow.compute as pc

from siting.errors import Fault
from siting.study.columns import TABLES
from siting.study.csv_form import NOT_TEXT, STRANGE_INSIDE, find_separator, read_start
from siting.study.raw import Form
from siting.study.records import RecordReader

if TYPE_CHECKING:
    from pathlib import Path

    from siting.study.csv_form import Separation
    from siting.study.raw import RawTable

_SAVE_AS = "Save the file as CSV UTF-8 (comma delimited)"


@dataclass(frozen=True, slots=True, kw_only=True)
class CsvResult:
    """A table, or None where the file cannot be read, and what is wrong with it."""

    table: RawTable | None
    faults: tuple[Fault, ...]


def read_csv(path: Path, name: str) -> CsvResult:
    """
    Read a text file as a table of text.

    Parameters
    ----------
    path
        The file.
    name
        Name of its table, for its columns and for faults.

    Returns
    -------
    result
        The table; a record counts as one row however many lines it has, and blank records are counted but left out.
    """
    try:
        start = read_start(path)
        for encoding in start.encodings:
            separation = find_separator(start, encoding, TABLES[name])
            if not separation.separator:
                return _refused(name, "the columns are separated in more ways than one", _SAVE_AS)
            try:
                return _read(path, name, encoding, separation)
            except UnicodeDecodeError:
                continue
    except OSError as error:
        return _refused(name, f"the file cannot be read ({error.strerror})", "Check that you may read it")
    if start.content.startswith(b"PK"):
        return _refused(name, "the file is a workbook or an archive, not CSV", _SAVE_AS)
    return _refused(name, NOT_TEXT, _SAVE_AS)


def _read(path: Path, name: str, encoding: str, separation: Separation) -> CsvResult:
    reader = RecordReader(name, TABLES[name].names, separator=separation.separator)
    try:
        with path.open(encoding=encoding, newline="") as text:
            if separation.hinted:
                text.readline()
            table = reader.read(csv.reader(text, strict=True, delimiter=separation.separator))
    except csv.Error as error:
        row = reader.record + 1
        wrong = f"the row cannot be read ({error})"
        return _refused(name, wrong, "Double each quote inside a quoted cell, and close every quote", row)
    if table is None:
        return _refused(name, "the file is empty", "Write the column names in its first row, or delete the file")
    wrong = _wrong_form(reader.header) or (_garbled(table) if encoding == "cp1252" else "")
    if wrong:
        return _refused(name, wrong, _SAVE_AS)
    plain = encoding in {"utf-8", "utf-8-sig"}
    form = Form(encoding="utf-8" if plain else encoding, separator=separation.separator, skipped=reader.skipped)
    return CsvResult(table=replace(table, form=form), faults=tuple(reader.faults))


def _wrong_form(header: list[str]) -> str:
    """Return what makes the file no table; empty where nothing does."""
    if any("\0" in name for name in header):
        return NOT_TEXT
    if len(header) == 1 and "|" in header[0]:
        return "the columns are not separated by commas, semicolons or tabs"
    return ""


def _garbled(table: RawTable) -> str:
    """Return what shows that a file is not in Windows-1252 either; empty where nothing does."""
    for cells in table.columns:
        found = pc.match_substring_regex(cells, STRANGE_INSIDE)
        if pc.any(found).as_py():
            shown = cells.filter(found)[0].as_py()
            return f"the file is neither UTF-8 nor Windows-1252, by which a cell would read {shown!r}"
    return ""


def _refused(name: str, wrong: str, repair: str, row: int | None = None) -> CsvResult:
    return CsvResult(table=None, faults=(Fault(table=name, row=row, wrong=wrong, repair=repair),))
