"""Turn records of text, from a CSV file or a sheet, into a table with the row numbers the user sees."""

from __future__ import annotations

import gc
from contextlib import contextmanager
from itertools import chain, compress, islice
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from siting.cells import read_cell
from siting.errors import Fault
from siting.study.gathering import MOST_LISTED
from siting.study.raw import RawTable

if TYPE_CHECKING:
    from collections.abc import Collection, Iterable, Iterator

    from siting.arrays import Positions

CHUNK_ROWS = 2_048
"""Records turned into Arrow arrays at a time: few enough for their strings to stay in the processor's cache."""


MOST_ABOVE = 20
"""Records above a header, such as a title and the date of an export, that are looked through for it."""

LEAST_KNOWN = 2
"""Known column names that make a record below the first one the header."""

SEPARATOR_WORDS = {",": "comma", ";": "semicolon", "\t": "tab"}


class RecordReader:
    """One pass over the records of a table."""

    def __init__(self, table: str, known: Collection[str], *, separator: str) -> None:
        self._table = table
        self._known = frozenset(known)
        """Column names that a header is known by."""
        self._separator = separator
        """What stands between cells; "" in a sheet."""
        self._ragged = 0
        self._chunks: list[list[pa.Array]] = []
        self._rows: list[Positions] = []
        self.header: list[str] = []
        self.skipped = 0
        """Filled records above the header."""
        self.record = 0
        """Number of records read so far, blank ones included."""
        self.faults: list[Fault] = []

    def read(self, records: Iterable[list[str]]) -> RawTable | None:
        """
        Return the table, or None where there is not a single record.

        Parameters
        ----------
        records
            Cells of one row each. The first that is not blank is the header, unless it has no known name and one soon
            after has several: then what stands above is a title. Blank records are counted but left out.

        Returns
        -------
        table
            Its rows bear the numbers of their records. Ragged records are in `faults`.
        """
        rest = self._read_header(iter(records))
        width = len(self.header)
        if not width:
            return None
        with _no_collections():
            while self._read_chunk(rest, width):
                pass
        if self._ragged > MOST_LISTED:
            wrong = f"{self._ragged - MOST_LISTED} more rows have too few or too many cells"
            self.faults.append(Fault(table=self._table, wrong=wrong, repair="Repair them too"))
        columns = [_cleaned(pa.concat_arrays(arrays)) for arrays in zip(*self._chunks, strict=True)]
        used = [at for at, name in enumerate(self.header) if name or pc.any(pc.not_equal(columns[at], "")).as_py()]
        return RawTable(
            header=tuple(self.header[at] for at in used),
            columns=tuple(columns[at] for at in used),
            rows=np.concatenate(self._rows),
        )

    def _read_header(self, records: Iterator[list[str]]) -> Iterator[list[str]]:
        """Read up to the header, which stays empty where there is none, and return the records below it."""
        first = self._next_filled(records)
        if first is None or self._count_known(first):
            self._take_header(first or [])
            return records
        above = self.record
        peeked: list[list[str]] = []
        try:
            peeked.extend(islice(records, MOST_ABOVE))
        except Exception:
            self.record += len(peeked)  # the fault of the source tells in which record it broke off
            raise
        for at, record in enumerate(peeked):
            if self._count_known(record) >= LEAST_KNOWN:
                self.skipped = 1 + sum(map(any, peeked[:at]))
                self.record = above + at + 1
                self._take_header(record)
                return chain(peeked[at + 1 :], records)
        self._take_header(first)
        return chain(peeked, records)

    def _next_filled(self, records: Iterator[list[str]]) -> list[str] | None:
        for record in records:
            self.record += 1
            if any(record):
                return record
        return None

    def _take_header(self, record: list[str]) -> None:
        self.header = [read_cell(name) for name in record]
        while self.header and not self.header[-1]:
            self.header.pop()

    def _count_known(self, record: list[str]) -> int:
        return len(self._known.intersection(record))

    def _read_chunk(self, records: Iterator[list[str]], width: int) -> bool:
        """Keep the next records that are not blank, and return whether there were any records at all."""
        chunk: list[list[str]] = []
        try:
            chunk.extend(islice(records, CHUNK_ROWS))
        finally:  # where the source breaks off, its fault tells in which record
            first = self.record + 1
            self.record += len(chunk)
        rows = np.arange(first, self.record + 1, dtype=np.int32)
        if not all(map(any, chunk)):
            filled = [any(record) for record in chunk]
            rows, chunk = rows[filled], list(compress(chunk, filled))
        if any(len(record) != width for record in chunk):
            chunk = [
                record if len(record) == width else self._evened(record, width, row)
                for record, row in zip(chunk, rows.tolist(), strict=True)
            ]
        columns = zip(*chunk, strict=True) if chunk else ((),) * width
        self._chunks.append([pa.array(column, type=pa.string()) for column in columns])
        self._rows.append(rows)
        return self.record >= first

    def _evened(self, record: list[str], width: int, row: int) -> list[str]:
        """Return a record of the width of the header; note a fault unless it lacks or exceeds it by blank cells."""
        too_short = len(record) < width and self._separator != ""
        if too_short or any(record[width:]):
            self._ragged += 1
            if self._ragged <= MOST_LISTED:
                wrong = f"the row has {len(record)} cells, the header has {width}"
                mark = SEPARATOR_WORDS.get(self._separator, "")
                repair = f"Put texts that hold a {mark} in double quotes, and keep the {mark}s of blank cells"
                if not self._separator:
                    wrong, repair = "a cell has no column name above it", "Name its column or clear it"
                self.faults.append(Fault(table=self._table, row=row, wrong=wrong, repair=repair))
        return (record + [""] * width)[:width]


@contextmanager
def _no_collections() -> Iterator[None]:
    """
    Keep the garbage collector from running.

    Records make no cycles, but their lists are so many that the collector would take longer than the reading.
    """
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def _cleaned(cells: pa.Array) -> pa.Array:
    """Return cells with every line break as LF, and without what `siting.cells.safe_cell` added to them."""
    if pc.any(pc.match_substring(cells, "\r")).as_py():
        cells = pc.replace_substring_regex(cells, "\r\n?", "\n")
    if pc.any(pc.starts_with(cells, "'")).as_py():
        return pa.array([read_cell(cell) for cell in cells.to_pylist()], type=pa.string())
    return cells
