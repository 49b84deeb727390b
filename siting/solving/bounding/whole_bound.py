"""
A bound on the whole model from any prices of its rows.

For prices y of the limits (money per unit of the row) and l of the links, every solution costs at least

    sum over limits of y x (the side of the row that y presses on) + sum over columns of min over [lower, upper] of
    (cost - y A - l L) x column.

So the bound is valid whatever the prices are, and whatever lanes and links the program that gave them had loaded.
Prices of links that were not loaded are chosen here: a lane whose reduced cost is negative passes it on to what must be
open or signed for it, which is the best price of its link with the others held. This is the Lagrangean bound with
demand, balance and capacities relaxed; sites and suppliers then separate.

References
----------
Geoffrion (1974), Mathematical Programming Study 2: 82-114; Balinski (1965), Management Science 12(3): 253-313.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.solving.bounding.matrix import Rows
    from siting.solving.bounding.whole_problem import WholeProblem

NO_LINK = -1
"""In an array of links: the column has none."""

SAFE = 1e-9
"""Relative margin by which a fixing must clear the cost to beat, so that rounding fixes nothing wrongly."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Priced:
    """What prices prove."""

    bound: float
    """In the problem's money, its constant included; minus infinity where the prices prove nothing."""
    reduced: Floats
    """(N,) reduced cost of each column, links priced."""
    before: Floats
    """(N,) reduced cost of each column before the links that were not loaded took their share."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sides:
    """Limits of rows and bounds of columns within which a bound is to hold."""

    lower: Floats
    """(N,)"""
    upper: Floats
    """(N,)"""
    row_lower: Floats
    """(limits,)"""
    row_upper: Floats
    """(limits,)"""


class Pricer:
    """Turns prices into bounds; knows which links each column has."""

    def __init__(self, problem: WholeProblem) -> None:
        self._problem = problem
        links = problem.link_of
        self._links_of = np.full((2, problem.places.count), NO_LINK, dtype=np.int64)
        backwards = np.arange(links.size)[::-1]
        self._links_of[0, links[::-1]] = backwards
        self._links_of[1, links] = backwards[::-1]
        self._links_of[1, self._links_of[1] == self._links_of[0]] = NO_LINK

    def links_of(self, columns: NDArray[np.intp]) -> NDArray[np.int64]:
        """Return the links about some columns."""
        links = self._links_of[:, columns].ravel()
        return np.unique(links[links != NO_LINK])

    def price(  # noqa: PLR0913 - prices of limits and of links, and where the bound is to hold
        self,
        prices: Floats,
        loaded: NDArray[np.intp],
        loaded_rows: Rows,
        loaded_prices: Floats,
        sides: Sides,
        *,
        costless: bool = False,
    ) -> Priced:
        """
        Return what prices prove.

        Parameters
        ----------
        prices
            Shape (limits,). Any numbers; those of the wrong sign for a one-sided row count as 0.
        loaded, loaded_rows, loaded_prices
            The links that have a price of their own: their positions, rows and prices.
        sides
            Where the bound is to hold.
        costless
            True leaves the costs out: a bound above 0 then proves that nothing satisfies rows and bounds.

        Returns
        -------
        priced
            Bound and reduced costs.
        """
        problem = self._problem
        prices = np.where(np.isfinite(sides.row_lower), prices, np.minimum(prices, 0.0))
        prices = np.where(np.isfinite(sides.row_upper), prices, np.maximum(prices, 0.0))
        pressed = np.where(prices > 0, sides.row_lower, sides.row_upper)
        fixed = float(prices @ np.where(prices == 0, 0.0, pressed))
        before = (0.0 if costless else problem.cost) - problem.limits.weighted(prices)
        unpriced = np.ones(len(problem.links), dtype=np.bool_)
        if loaded.size:
            before -= loaded_rows.weighted(np.minimum(loaded_prices, 0.0))
            unpriced[loaded] = False
        reduced = before.copy()
        for links in self._links_of:
            open_to = (reduced < 0) & (links != NO_LINK) & (sides.upper > 0)
            column = np.flatnonzero(open_to)
            column = column[unpriced[links[column]]]
            chosen = problem.links.chosen(links[column])
            reduced -= chosen.weighted(reduced[column])
        least = np.where(reduced > 0, sides.lower, sides.upper) * reduced
        bound = fixed + float(least.sum()) + (0.0 if costless else problem.constant)
        return Priced(bound=bound, reduced=reduced, before=before)
