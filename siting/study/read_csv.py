"""Read one CSV table as text: RFC 4180, UTF-8 with or without a byte order mark, commas."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.errors import Fault
from siting.study.records import RecordReader

if TYPE_CHECKING:
    from pathlib import Path

    from siting.study.raw import RawTable

_NOT_UTF_8 = "the file is not text in UTF-8"
_SAVE_AS = "Save the file as CSV UTF-8 (comma delimited)"


@dataclass(frozen=True, slots=True, kw_only=True)
class CsvResult:
    """A table, or None where the file cannot be read, and what is wrong with it."""

    table: RawTable | None
    faults: tuple[Fault, ...]


def read_csv(path: Path, name: str) -> CsvResult:
    """
    Read a CSV file as text.

    Parameters
    ----------
    path
        The file.
    name
        Name of its table, for faults.

    Returns
    -------
    result
        The table; a record counts as one row however many lines it has, and blank records are counted but left out.
    """
    reader = RecordReader(name, may_be_short=False)
    try:
        table = _read(path, reader)
    except UnicodeDecodeError:
        return _refused(name, _NOT_UTF_8, _SAVE_AS)
    except csv.Error as error:
        row = reader.record + 1
        wrong = f"the row cannot be read ({error})"
        return _refused(name, wrong, "Double each quote inside a quoted cell, and close every quote", row)
    except OSError as error:
        return _refused(name, f"the file cannot be read ({error.strerror})", "Check that you may read it")
    if table is None:
        return _refused(name, "the file is empty", "Write the column names in its first row, or delete the file")
    wrong = _wrong_form(reader.header)
    if wrong:
        return _refused(name, wrong, _SAVE_AS)
    return CsvResult(table=table, faults=tuple(reader.faults))


def _read(path: Path, reader: RecordReader) -> RawTable | None:
    with path.open(encoding="utf-8-sig", newline="") as text:
        return reader.read(csv.reader(text, strict=True))


def _wrong_form(header: list[str]) -> str:
    """Return what makes the file no CSV of the one form that is read; empty where nothing does."""
    if any("\0" in name for name in header):
        return _NOT_UTF_8
    if len(header) == 1 and any(mark in header[0] for mark in ";\t|"):
        return "the columns are not separated by commas"
    return ""


def _refused(name: str, wrong: str, repair: str, row: int | None = None) -> CsvResult:
    return CsvResult(table=None, faults=(Fault(table=name, row=row, wrong=wrong, repair=repair),))
