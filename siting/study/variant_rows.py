"""A table of a study, lanes aside, as text while variants are applied to it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.study.columns import TABLES
from siting.study.raw import FIRST_ROW, cell_text
from siting.study.write import header_to_write, rows_to_write

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from siting.study.tables import Study


class RowsAtWork:
    """The rows of one table with what variants have done to them so far."""

    def __init__(self, study: Study, table: str) -> None:
        self._study = study
        self._table = table
        rows = getattr(study, table)
        self.header: list[str] = list(header_to_write(study, table)) if rows else []
        self.records: list[list[str]] = self._texts(self.header) if rows else []
        numbers = [row.row for row in rows]
        told_apart = len(set(numbers)) == len(numbers)
        self.numbers: list[int] = numbers if told_apart else list(range(FIRST_ROW, FIRST_ROW + len(numbers)))
        """Row of each record as the user's spreadsheet shows it; added ones follow the last."""
        self._source: list[int | None] = list(range(len(rows)))
        """Position of each record in the study; None where it was added."""
        self._last = max(self.numbers, default=FIRST_ROW - 1)

    def find(self, key: Mapping[str, str]) -> list[int]:
        """Return the positions of the records that have all these cells."""
        columns = [self.column(name) for name in key]
        wanted = tuple(key.values())
        return [at for at, cells in enumerate(zip(*columns, strict=True)) if cells == wanted] if columns else []

    def column(self, name: str) -> list[str]:
        """Return the cells of a column, blank where the table does not have it."""
        if name not in self.header:
            return [""] * len(self.records)
        at = self.header.index(name)
        return [record[at] for record in self.records]

    def cell(self, at: int, column: str) -> str:
        """Return the text of a cell."""
        self._widen([column])
        return self.records[at][self.header.index(column)]

    def row(self, at: int) -> int:
        """Return the number of a row as the user's spreadsheet shows it."""
        return self.numbers[at]

    def set(self, at: int, column: str, text: str) -> None:
        """Change a cell."""
        self._widen([column])
        self.records[at][self.header.index(column)] = text

    def add(self, row: Mapping[str, str]) -> int:
        """Add a row and return its number."""
        spec = TABLES[self._table]
        compulsory = [column.name for column in spec.columns if column.required]
        self._widen([*compulsory, *row])
        self.records.append([row.get(name, "") for name in self.header])
        self._last += 1
        self.numbers.append(self._last)
        self._source.append(None)
        return self._last

    def remove(self, at: int) -> None:
        """Take a row away."""
        del self.records[at], self.numbers[at], self._source[at]

    def remove_where(self, column: str, text: str) -> int:
        """Take away the rows with this cell, and return how many there were."""
        gone = self.find({column: text})
        for at in reversed(gone):
            self.remove(at)
        return len(gone)

    def _widen(self, columns: Iterable[str]) -> None:
        """Add columns that are not there yet, filled with what their absence means."""
        new = [name for name in dict.fromkeys(columns) if name not in self.header]
        if not new:
            return
        filled = self._texts(new)
        for record, source in zip(self.records, self._source, strict=True):
            record.extend(filled[source] if source is not None else [""] * len(new))
        self.header += new

    def _texts(self, columns: list[str]) -> list[list[str]]:
        return [[cell_text(value) for value in row] for row in rows_to_write(self._study, self._table, tuple(columns))]
