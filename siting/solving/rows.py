"""Adding rows to the model, each with the family of requirements it belongs to."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, Any

import numpy as np
import pulp

if TYPE_CHECKING:
    from collections.abc import Iterable

    from numpy.typing import NDArray

AT_MOST, EXACTLY, AT_LEAST = pulp.LpConstraintLE, pulp.LpConstraintEQ, pulp.LpConstraintGE


class Family(StrEnum):
    """What a row is about; `Row.place` counts within it."""

    DEMAND = "demand"
    """Every demand met; place = customer x goods + good."""
    BALANCE = "balance"
    """Inflow equals outflow; place = site x goods + good."""
    SIZE = "size"
    """At most one size a site open, one where it is pinned open; place = site."""
    SITE_CAPACITY = "site_capacity"
    """In load; place = site."""
    SITE_LEAST = "site_least"
    """Least throughput in load; place = site."""
    SUPPLIER_CAPACITY = "supplier_capacity"
    """In load; place = supplier."""
    SUPPLIER_LEAST = "supplier_least"
    """Least yearly volume in load; place = supplier."""
    OFFER_CAPACITY = "offer_capacity"
    """In units of the good; place = supplier x goods + good."""
    OFFER_LEAST = "offer_least"
    """In units of the good; place = supplier x goods + good."""
    SERVICE = "service"
    """Weight delivered within the service distance, in tonnes; place = 0."""
    FEWEST = "fewest"
    """Fewest sites; place = 0."""
    MOST = "most"
    """Most sites; place = 0."""
    BUDGET = "budget"
    """One-off money; place = 0."""
    RULE = "rule"
    """Place = position of the rule."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Row:
    """One row of the model other than a link."""

    family: Family
    place: int
    """Which one of its family."""
    constraint: pulp.LpConstraint
    scale: float
    """The row was multiplied by this power of 2: one unit of the family is `scale` in the row."""


class Rows:
    """Adds rows to a problem; terms are (position of a column, coefficient) and add up where a column recurs."""

    def __init__(self, problem: pulp.LpProblem, columns: tuple[pulp.LpVariable, ...]) -> None:
        self._problem = problem
        self._columns = columns
        self.kept: list[Row] = []

    def link(self, name: str, terms: Iterable[tuple[int, float]]) -> None:
        """
        Add a link: the terms sum to at most 0.

        Parameters
        ----------
        name
            Of the row.
        terms
            Position of a column and its coefficient, each column once.
        """
        pairs = [(self._columns[column], coefficient) for column, coefficient in terms]
        row = pulp.LpConstraint(pulp.LpAffineExpression(pairs), AT_MOST, rhs=0.0)
        self._problem.addConstraint(row, name)

    def add(  # noqa: PLR0913 - a row has a name, terms, a sense and a right-hand side
        self,
        family: Family,
        place: int,
        terms: Iterable[tuple[int, float]],
        sense: int,
        right: float,
        *,
        suffix: str = "",
    ) -> None:
        """
        Add one row, scaled so that its largest coefficient lies in [1, 2).

        Parameters
        ----------
        family, place
            What the row is about; they also make its name, together with `suffix`.
        terms
            Position of a column and its coefficient, in the family's unit.
        sense
            `AT_MOST`, `EXACTLY` or `AT_LEAST`.
        right
            Right-hand side in the family's unit.
        suffix
            Tells rows of the same place apart.
        """
        total: dict[int, float] = {}
        for column, coefficient in terms:
            total[column] = total.get(column, 0.0) + coefficient
        scale = power_of_two(max((abs(value) for value in total.values()), default=0.0))
        pairs = [(self._columns[column], value * scale) for column, value in total.items() if value]
        row = pulp.LpConstraint(pulp.LpAffineExpression(pairs), sense, rhs=right * scale)
        self._problem.addConstraint(row, f"{family}_{place}{suffix}")
        self.kept.append(Row(family=family, place=place, constraint=row, scale=scale))


def power_of_two(largest: float) -> float:
    """Return the power of 2 that brings `largest` into [1, 2); 1 for 0. Multiplying by it rounds nothing."""
    return math.ldexp(1.0, 1 - math.frexp(largest)[1]) if largest else 1.0


def grouped(key: NDArray[Any], size: int) -> list[NDArray[np.intp]]:
    """Return, for each value 0..size-1 of `key`, the ascending positions where it stands."""
    order = np.argsort(key, kind="stable")
    return np.split(order, np.searchsorted(key[order], np.arange(1, size)))[:size]
