"""Turn records of text, from a CSV file or a sheet, into a table with the row numbers the user sees."""

from __future__ import annotations

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

CHUNK_ROWS = 65_536
"""Records turned into Arrow arrays at a time, so that few Python strings live at once."""


class RecordReader:
    """One pass over the records of a table."""

    def __init__(self, table: str, *, may_be_short: bool) -> None:
        self._table = table
        self._may_be_short = may_be_short
        """Whether cells may be missing at the end of a record: a sheet has no others, a CSV file must have them."""
        self._ragged = 0
        self._chunks: list[list[pa.Array]] = []
        self._rows: list[int] = []
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
        numbered = self._numbered(records)
        self.header = next(numbered, [])
        if not self.header:
            return None
        chunk: list[list[str]] = []
        for record in numbered:
            chunk.append(record)
            if len(chunk) == CHUNK_ROWS:
                self._keep(chunk)
                chunk = []
        self._keep(chunk)
        if self._ragged > MOST_LISTED:
            wrong = f"{self._ragged - MOST_LISTED} more rows have too few or too many cells"
            self.faults.append(Fault(table=self._table, wrong=wrong, repair="Repair them too"))
        columns = [_cleaned(pa.concat_arrays(arrays)) for arrays in zip(*self._chunks, strict=True)]
        used = [at for at, name in enumerate(self.header) if name or pc.any(pc.not_equal(columns[at], "")).as_py()]
        return RawTable(
            header=tuple(self.header[at] for at in used),
            columns=tuple(columns[at] for at in used),
            rows=np.array(self._rows, dtype=np.int32),
        )

    def _numbered(self, records: Iterable[list[str]]) -> Iterator[list[str]]:
        """Yield the header, then the records that are not blank, all as wide as the header."""
        width = 0
        for record in records:
            self.record += 1
            if not any(record):
                continue
            if not width:
                header = [read_cell(name) for name in record]
                while not header[-1]:
                    header.pop()
                width = len(header)
                yield header
                continue
            self._rows.append(self.record)
            yield record if len(record) == width else self._evened(record, width)

    def _evened(self, record: list[str], width: int) -> list[str]:
        """Return a record of the width of the header; note a fault unless it lacks or exceeds it by blank cells."""
        too_short = len(record) < width and not self._may_be_short
        if too_short or any(record[width:]):
            self._ragged += 1
            if self._ragged <= MOST_LISTED:
                wrong = f"the row has {len(record)} cells, the header has {width}"
                repair = "Put texts that hold a comma in double quotes, and keep the commas of blank cells"
                if self._may_be_short:
                    wrong, repair = "a cell has no column name above it", "Name its column or clear it"
                self.faults.append(Fault(table=self._table, row=self.record, wrong=wrong, repair=repair))
        return (record + [""] * width)[:width]

    def _keep(self, chunk: list[list[str]]) -> None:
        columns = zip(*chunk, strict=True) if chunk else ((),) * len(self.header)
        self._chunks.append([pa.array(column, type=pa.string()) for column in columns])


def _cleaned(cells: pa.Array) -> pa.Array:
    """Return cells with every line break as LF, and without what `siting.cells.safe_cell` added to them."""
    if pc.any(pc.match_substring(cells, "\r")).as_py():
        cells = pc.replace_substring_regex(cells, "\r\n?", "\n")
    if pc.any(pc.starts_with(cells, "'")).as_py():
        return pa.array([read_cell(cell) for cell in cells.to_pylist()], type=pa.string())
    return cells
