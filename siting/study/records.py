"""Turn records of text, from a CSV file or a sheet, into a table with the row numbers the user sees."""

from __future__ import annotations

import gc
from contextlib import contextmanager
from itertools import compress, islice
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from siting.cells import read_cell
from siting.errors import Fault
from siting.study.gathering import MOST_LISTED
from siting.study.raw import RawTable

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator

    from siting.arrays import Positions

CHUNK_ROWS = 2_048
"""Records turned into Arrow arrays at a time: few enough for their strings to stay in the processor's cache."""


class RecordReader:
    """One pass over the records of a table."""

    def __init__(self, table: str, *, may_be_short: bool) -> None:
        self._table = table
        self._may_be_short = may_be_short
        """Whether cells may be missing at the end of a record: a sheet has no others, a CSV file must have them."""
        self._ragged = 0
        self._chunks: list[list[pa.Array]] = []
        self._rows: list[Positions] = []
        self.header: list[str] = []
        self.record = 0
        """Number of records read so far, blank ones included."""
        self.faults: list[Fault] = []

    def read(self, records: Iterable[list[str]]) -> RawTable | None:
        """
        Return the table, or None where there is not a single record.

        Parameters
        ----------
        records
            Cells of one row each; the first that is not blank is the header. Blank ones are counted but left out.

        Returns
        -------
        table
            Its rows bear the numbers of their records. Ragged records are in `faults`.
        """
        rest = iter(records)
        width = self._read_header(rest)
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

    def _read_header(self, records: Iterator[list[str]]) -> int:
        """Read up to the first record that is not blank, and return how many columns it has; 0 = there is none."""
        for record in records:
            self.record += 1
            if any(record):
                self.header = [read_cell(name) for name in record]
                while not self.header[-1]:
                    self.header.pop()
                break
        return len(self.header)

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
        too_short = len(record) < width and not self._may_be_short
        if too_short or any(record[width:]):
            self._ragged += 1
            if self._ragged <= MOST_LISTED:
                wrong = f"the row has {len(record)} cells, the header has {width}"
                repair = "Put texts that hold a comma in double quotes, and keep the commas of blank cells"
                if self._may_be_short:
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
