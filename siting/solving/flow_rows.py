"""Rows of the flows' linear program, gathered as arrays and handed to HiGHS in one piece."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import highspy
import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats


class FlowRows:
    """
    Gathers rows `lower <= sum of coefficient x share <= upper`; shares are at least 0.

    That no share exceeds 1 follows from demand and balance. It must not be stated again: the bound would take part of
    the dual that belongs to the demand row.
    """

    def __init__(self) -> None:
        self._row: list[NDArray[Any]] = []
        self._column: list[NDArray[Any]] = []
        self._value: list[Floats] = []
        self._lower: list[Floats] = []
        self._upper: list[Floats] = []
        self._count = 0

    def add(
        self,
        row: NDArray[Any],
        column: NDArray[Any],
        value: Floats,
        lower: Floats,
        upper: Floats,
    ) -> None:
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
        self._column.append(column)
        self._value.append(value)
        self._lower.append(lower)
        self._upper.append(upper)
        self._count += lower.size

    def hold_without_flow(self, tolerance: float) -> bool:
        """
        Return whether every row holds when nothing moves but what is fixed.

        Parameters
        ----------
        tolerance
            How far outside its limits a row may be, relative to the limit.

        Returns
        -------
        holds
            True where 0 lies within all limits.
        """
        lower, upper = np.concatenate(self._lower), np.concatenate(self._upper)
        return bool(np.all(lower <= tolerance) and np.all(upper >= -tolerance))

    def as_problem(self, cost: Floats) -> highspy.HighsLp:
        """
        Return the linear program of least cost.

        Every row is scaled by the power of 2 that brings its largest coefficient into [1, 2), so that the solver's
        tolerance means the same in every unit.

        Parameters
        ----------
        cost
            Shape (columns,). Cost of each share at 1.

        Returns
        -------
        problem
            Ready for HiGHS.
        """
        row, column = np.concatenate(self._row), np.concatenate(self._column)
        value = np.concatenate(self._value)
        largest = np.zeros(self._count)
        np.maximum.at(largest, row, np.abs(value))
        scale = np.ldexp(1.0, 1 - np.frexp(np.where(largest > 0, largest, 1.0))[1])
        order = np.argsort(row, kind="stable")
        problem = highspy.HighsLp()
        problem.num_col_, problem.num_row_ = cost.size, self._count
        problem.col_cost_ = cost
        problem.col_lower_, problem.col_upper_ = np.zeros(cost.size), np.full(cost.size, np.inf)
        problem.row_lower_ = np.concatenate(self._lower) * scale
        problem.row_upper_ = np.concatenate(self._upper) * scale
        problem.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
        problem.a_matrix_.num_col_, problem.a_matrix_.num_row_ = cost.size, self._count
        problem.a_matrix_.start_ = np.concatenate([[0], np.cumsum(np.bincount(row, minlength=self._count))])
        problem.a_matrix_.index_ = column[order]
        problem.a_matrix_.value_ = value[order] * scale[row[order]]
        return problem
