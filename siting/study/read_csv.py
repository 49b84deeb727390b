"""Read one CSV table as text: RFC 4180, UTF-8 with or without a byte order mark, commas."""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from siting.cells import read_cell
from siting.errors import Fault
from siting.study.gathering import MOST_LISTED
from siting.study.raw import RawTable

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path

CHUNK_ROWS = 65_536
"""Records turned into Arrow arrays at a time, so that few Python strings live at once."""

_OTHER_MARKS = (b"\xff\xfe", b"\xfe\xff")
_SAVE_AS = "Save the file as CSV UTF-8 (comma delimited)"


@dataclass(slots=True, kw_only=True)
class CsvResult:
    """A table, or None where the file cannot be read, and what is wrong with it."""

    table: RawTable | None = None
    faults: list[Fault] = field(default_factory=list)


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
    result = CsvResult()

    def refused(wrong: str, repair: str, row: int | None = None) -> CsvResult:
        result.table = None
        result.faults.append(Fault(table=name, row=row, wrong=wrong, repair=repair))
        return result

    reading = _Reading(name)
    try:
        with path.open("rb") as file:
            start = file.read(4096)
            if start.startswith(_OTHER_MARKS) or b"\0" in start:
                return refused("the file is not text in UTF-8", _SAVE_AS)
            file.seek(0)
            with io.TextIOWrapper(file, encoding="utf-8-sig", newline="") as text:
                result.table = reading.read(text)
    except UnicodeDecodeError:
        return refused("the file is not text in UTF-8", _SAVE_AS)
    except csv.Error as error:
        wrong = f"the file breaks off or has a stray quote in row {reading.record + 1} ({error})"
        return refused(wrong, "Double each quote inside a quoted cell and close every quote", reading.record + 1)
    except OSError as error:
        return refused(f"the file cannot be read ({error.strerror})", "Check that it is there and that you may read it")
    result.faults += reading.faults
    if result.table is None:
        return refused("the file is empty", "Write the column names in its first row, or delete the file")
    header = result.table.header
    if len(header) == 1 and any(mark in header[0] for mark in ";\t|"):
        result.faults.clear()
        return refused("the columns are not separated by commas", _SAVE_AS, 1)
    return result


class _Reading:
    """One pass over the records of a file."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.record = 0
        self.faults: list[Fault] = []
        self._ragged = 0
        self._header: list[str] = []
        self._chunks: list[list[pa.Array]] = []
        self._rows: list[int] = []

    def read(self, text: io.TextIOWrapper) -> RawTable | None:
        records = self._records(text)
        header = next(records, None)
        if header is None:
            return None
        while header and not header[-1]:
            header.pop()
        self._header = [read_cell(name) for name in header]
        chunk: list[list[str]] = []
        for record in records:
            chunk.append(record)
            if len(chunk) == CHUNK_ROWS:
                self._keep(chunk)
                chunk = []
        self._keep(chunk)
        if self._ragged > MOST_LISTED:
            self._fault(
                None, f"{self._ragged - MOST_LISTED} more rows have too few or too many cells", "Repair them too"
            )
        return RawTable(
            header=tuple(self._header),
            columns=tuple(_joined(arrays) for arrays in zip(*self._chunks, strict=True)),
            rows=np.array(self._rows, dtype=np.int32),
        )

    def _records(self, text: io.TextIOWrapper) -> Iterator[list[str]]:
        """Yield the records that are not blank, after noting the number of each data row."""
        width = 0
        for record in csv.reader(text, strict=True):
            self.record += 1
            if not any(record):
                continue
            if width:
                if len(record) != width:
                    record = self._evened(record, width)
                self._rows.append(self.record)
            yield record
            width = width or len(self._header)

    def _evened(self, record: list[str], width: int) -> list[str]:
        """Return a record of the width of the header; note a fault unless only blank cells were too many."""
        if len(record) < width or any(record[width:]):
            self._ragged += 1
            if self._ragged <= MOST_LISTED:
                self._fault(
                    self.record,
                    f"the row has {len(record)} cells, the header has {width}",
                    "Put texts that hold a comma in double quotes, and keep the commas of blank cells",
                )
        return (record + [""] * width)[:width]

    def _fault(self, row: int | None, wrong: str, repair: str) -> None:
        self.faults.append(Fault(table=self.name, row=row, wrong=wrong, repair=repair))

    def _keep(self, chunk: list[list[str]]) -> None:
        columns = zip(*chunk, strict=True) if chunk else ((),) * len(self._header)
        self._chunks.append([pa.array(column, type=pa.string()) for column in columns])


def _joined(arrays: tuple[pa.Array, ...]) -> pa.Array:
    """Return one array, with what `siting.cells.safe_cell` added to its cells taken off again."""
    whole = pa.concat_arrays(arrays)
    quoted = pc.starts_with(whole, "'")
    if not pc.any(quoted).as_py():
        return whole
    return pa.array([read_cell(cell) for cell in whole.to_pylist()], type=pa.string())
