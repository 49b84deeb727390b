"""
The cheapest flows of a set of open options, exact, kept so that the next set starts from the last one's flows.

The pivots are compiled (`simplex`, `moves`); here is the state they work on and the portions in which they run.
"""

from __future__ import annotations

import time
from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.moves import descend, plan_cost
from siting.solving.bounding.simplex import begin, improve

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from siting.arrays import Positions
    from siting.solving.bounding.problem import Problem
    from siting.solving.bounding.relaxation import Relaxation

SHUT_SITE = -1
"""In an array of chosen options: the site is shut."""
PIVOTS = 2000
"""Pivots between two looks at the clock."""
PORTION_S = 0.05
"""Seconds a portion of trials aims at."""


class Transport:
    """Flows of one problem, with working space for one thread."""

    def __init__(self, problem: Problem, relaxation: Relaxation) -> None:
        sites, rows = problem.sites, problem.rows
        nodes = sites + 2 + rows
        self.problem = problem
        self._arrays = problem.arrays
        self._pricing = relaxation.pricing
        self._tree = np.empty((5, nodes), dtype=np.int32)
        self._value = np.empty((3, nodes))
        self._limits = np.full(sites + 1, np.inf)
        self._at_top = np.zeros(sites + 1, dtype=np.bool_)
        self._root_cost = np.zeros(sites + 1)
        self._is_open = np.zeros(sites, dtype=np.bool_)
        self._turn = np.zeros(1, dtype=np.int64)
        self._saved = (self._tree.copy(), self._value.copy(), self._at_top.copy())
        self._chosen = np.full(sites, SHUT_SITE, dtype=np.int64)
        self._numbers = np.zeros(2)
        spread = float(np.ptp(problem.lane_cost)) if problem.lane_cost.size else 0.0
        size = float(np.abs(problem.lane_cost).max()) if problem.lane_cost.size else 0.0
        # A way round between two sites passes each site once, so this is more than any of them can cost.
        self._far = (sites + 2) * (spread + size) + 1.0
        # Prices carry the rounding of `far`; anything below it is noise.
        self._tolerance = 1e-14 * self._far + 1e-11 * size

    @property
    def _flows(self) -> tuple[NDArray[np.generic], ...]:
        return (self._tree, self._value, self._limits, self._at_top, self._root_cost, self._is_open, self._turn)

    def cost_of(self, chosen: Positions, *, halted: Callable[[], bool] = lambda: False) -> float:
        """
        Return what a set of open options costs with its cheapest flows.

        Parameters
        ----------
        chosen
            (S,) the option of each open site, `SHUT_SITE` elsewhere.
        halted
            Asked between portions of pivots.

        Returns
        -------
        cost
            Money a year without the problem's constant; infinite where the options cannot serve all demand, or halted.
        """
        problem = self.problem
        self._chosen[:] = chosen
        self._is_open[:] = chosen >= 0
        self._limits[:-1] = np.where(chosen >= 0, problem.capacity[np.maximum(chosen, 0)], 0.0)
        row_start, lane_site, lane_cost = self._arrays[:3]
        begin(
            self._tree, self._value, self._limits, self._at_top, self._root_cost, self._is_open, row_start, lane_site,
            lane_cost, problem.demand, self._far,
        )  # fmt: skip
        while not improve(
            self._tree, self._value, self._limits, self._at_top, self._root_cost, self._is_open, row_start, lane_site,
            lane_cost, self._turn, PIVOTS, self._tolerance,
        ):  # fmt: skip
            if halted():
                return float("inf")
        return float(plan_cost(self._flows, self._chosen, problem.charge))

    def descend(  # noqa: PLR0913 - a descent has these limits
        self,
        cost: float,
        fixed: NDArray[np.int8],
        fewest: int,
        most: int,
        *,
        trials: int,
        halted: Callable[[], bool],
    ) -> tuple[float, Positions]:
        """
        Improve the present set by single moves: shut, open or exchange a site.

        Parameters
        ----------
        cost
            What the present set costs, as `cost_of` returned it.
        fixed
            (S,) other than 0 where a site is to stay as it is.
        fewest, most
            Limits on the number of open sites.
        trials
            Greatest number of moves tried.
        halted
            Asked between portions of trials.

        Returns
        -------
        cost, chosen
            The best set found; `chosen` as for `cost_of`.
        """
        self._numbers[:] = cost, 0.0
        portion = 1
        while trials > 0 and not halted():
            began = time.perf_counter()
            count = min(portion, trials)
            done = descend(
                self._arrays, self._flows, self._saved, self._chosen, fixed, self._pricing, fewest, most, self._far,
                self._tolerance, self._numbers, count,
            )  # fmt: skip
            trials -= count
            if done:
                break
            if time.perf_counter() - began < PORTION_S:
                portion *= 2
        chosen = np.where(self._is_open, self._chosen, SHUT_SITE).astype(np.int32)
        return float(self._numbers[0]), chosen
