"""Sparse rows as flat arrays: gathered block by block, multiplied either way, handed to HiGHS in one piece."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats


@dataclass(frozen=True, kw_only=True, eq=False)
class Rows:
    """Rows `lower <= sum of value x column <= upper`. Shapes: R rows, N columns, E entries."""

    start: NDArray[np.int64]
    """(R + 1,) first entry of each row."""
    column: NDArray[np.int32]
    """(E,) ascending within a row."""
    value: Floats
    """(E,)"""
    lower: Floats
    """(R,)"""
    upper: Floats
    """(R,)"""
    columns: int
    """N."""

    def __len__(self) -> int:
        """Return the number of rows."""
        return int(self.lower.shape[0])

    @cached_property
    def row(self) -> NDArray[np.int64]:
        """Return (E,) the row of each entry."""
        return np.repeat(np.arange(len(self)), np.diff(self.start))

    def times(self, values: Floats) -> Floats:
        """Return (R,) the sum of each row at the values (N,) of the columns."""
        return np.bincount(self.row, self.value * values[self.column], minlength=len(self)).astype(np.float64)

    def weighted(self, weights: Floats) -> Floats:
        """Return (N,) the sum of the rows, each times its weight (R,)."""
        sums = np.bincount(self.column, self.value * weights[self.row], minlength=self.columns)
        return sums.astype(np.float64)

    @cached_property
    def by_column(self) -> tuple[NDArray[np.int64], NDArray[np.int32], Floats]:
        """Return the same entries column by column: first entry of each column (N + 1,), row and value of each."""
        order = np.argsort(self.column, kind="stable")
        start = np.concatenate([[0], np.cumsum(np.bincount(self.column, minlength=self.columns))])
        return start, self.row[order].astype(np.int32), self.value[order]

    def chosen(self, rows: NDArray[np.intp]) -> Rows:
        """Return some of the rows, in the order given."""
        lengths = np.diff(self.start)[rows]
        start = np.concatenate([[0], np.cumsum(lengths)])
        entry = np.arange(start[-1]) - np.repeat(start[:-1] - self.start[rows], lengths)
        return Rows(
            start=start,
            column=self.column[entry],
            value=self.value[entry],
            lower=self.lower[rows],
            upper=self.upper[rows],
            columns=self.columns,
        )

    def within(self, place: NDArray[np.int32], columns: int) -> Rows:
        """Return the same rows over fewer columns: `place` (N,) is where each goes, -1 = it is 0 and left out."""
        there = place[self.column] >= 0
        kept = np.concatenate([[0], np.cumsum(there)])
        return Rows(
            start=kept[self.start],
            column=place[self.column[there]],
            value=self.value[there],
            lower=self.lower,
            upper=self.upper,
            columns=columns,
        )


class Gathering:
    """Gathers rows block by block; entries of the same row and column add up."""

    def __init__(self, columns: int) -> None:
        self._columns = columns
        self._row: list[NDArray[Any]] = []
        self._column: list[NDArray[Any]] = []
        self._value: list[Floats] = []
        self._lower: list[Floats] = []
        self._upper: list[Floats] = []
        self._count = 0

    def add(self, row: NDArray[Any], column: NDArray[Any], value: Floats, lower: Floats, upper: Floats) -> None:
        """
        Add a block of rows.

        Parameters
        ----------
        row, column, value
            Shape (entries,). Row within the block, column and coefficient of each entry.
        lower, upper
            Shape (rows,). Limits of each row; infinite where there is none.
        """
        self._row.append(np.asarray(row, dtype=np.int64) + self._count)
        self._column.append(np.asarray(column, dtype=np.int64))
        self._value.append(np.asarray(value, dtype=np.float64))
        self._lower.append(np.asarray(lower, dtype=np.float64))
        self._upper.append(np.asarray(upper, dtype=np.float64))
        self._count += lower.size

    def rows(self, *, scaled: bool) -> Rows:
        """
        Return everything gathered.

        Parameters
        ----------
        scaled
            True multiplies each row by the power of 2 that brings its largest coefficient into [1, 2), so that a
            solver's tolerance means the same in every unit.

        Returns
        -------
        rows
            In the order gathered; coefficients of 0 are left out.
        """
        none = np.zeros(0)
        key = np.concatenate([np.zeros(0, np.int64), *self._row]) * self._columns
        key += np.concatenate([np.zeros(0, np.int64), *self._column])
        key, at = np.unique(key, return_inverse=True)
        value = np.bincount(at, np.concatenate([none, *self._value]), minlength=key.size)
        lower, upper = np.concatenate([none, *self._lower]), np.concatenate([none, *self._upper])
        key, value = key[value != 0], value[value != 0]
        row, column = np.divmod(key, max(self._columns, 1))
        if scaled:
            largest = np.zeros(self._count)
            np.maximum.at(largest, row, np.abs(value))
            scale = np.ldexp(1.0, 1 - np.frexp(np.where(largest > 0, largest, 1.0))[1])
            value, lower, upper = value * scale[row], lower * scale, upper * scale
        return Rows(
            start=np.concatenate([[0], np.cumsum(np.bincount(row, minlength=self._count))]),
            column=column.astype(np.int32),
            value=value,
            lower=lower,
            upper=upper,
            columns=self._columns,
        )
