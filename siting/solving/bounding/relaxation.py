"""
The Lagrangean relaxation of a problem: multipliers, the bound they prove, and what the averaged solution opens.

The loops are compiled (`kernels`); here is their working space, so that each thread has its own, and the portions in
which they run, so that a stop is heard within a fraction of a second. The portions change nothing in the result.
"""

from __future__ import annotations

import time
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.kernels import BEST, FACTOR, MU, STEPS, ascend
from siting.solving.bounding.knapsack import FREE, OPEN, SHUT

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.solving.bounding.problem import Problem

States = "NDArray[np.int8]"

PORTION_S = 0.05
"""Seconds a portion of steps aims at."""
WHOLE_SITES = 400
"""With more free sites the covering problem's whole solution is hardly dearer than its continuous one: not sought."""
WHOLE_TRIES = 300
"""Items tried for the whole covering problem in each step."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Box:
    """What is still open to choice: one node of the search."""

    state: NDArray[np.int8]
    """(S,) `FREE`, `OPEN` or `SHUT`."""
    charge: Floats
    """(O,) money a year; infinite for options not allowed."""
    fewest: int
    most: int


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Ascent:
    """Where a run of steps ended."""

    bound: float
    """Money a year without the problem's constant."""
    v: Floats
    """(R,) the multipliers that prove it, money per load."""
    mu: float
    """Multiplier of the covering row, a warm start."""
    factor: float
    """Step factor reached."""
    used: Floats
    """(O,) how far the averaged solution opens each option."""
    state: NDArray[np.int8]
    """(S,) with the sites fixed on the way."""
    steps: int


class Relaxation:
    """The relaxation of one problem, with working space for one thread."""

    def __init__(self, problem: Problem) -> None:
        sites, rows, options, lanes = problem.sites, problem.rows, problem.charge.size, problem.lane_site.size
        self.problem = problem
        self._arrays = problem.arrays
        per_site = np.bincount(problem.lane_site, minlength=sites)
        self._site_start = np.concatenate([[0], np.cumsum(per_site)]).astype(np.int64)
        self.pricing = (
            self._site_start,
            np.zeros(sites, dtype=np.int64),
            np.empty(lanes),
            np.empty(lanes),
            np.empty(lanes, dtype=np.int32),
            np.zeros(options),
            np.zeros(options, dtype=np.int64),
            np.zeros(options),
            np.zeros(options),
        )
        self._picking = (
            np.zeros(sites),
            np.empty(sites, dtype=np.int32),
            np.empty(sites, dtype=np.int32),
            np.empty(sites, dtype=np.int32),
        )
        self._rows = tuple(np.zeros(rows) for _ in range(4))
        self._options = (np.zeros(options), np.zeros(options))

    def first_multipliers(self) -> Floats:
        """
        Return multipliers at which each site can just about fill itself, so that few lanes have a positive margin.

        With all open sites full, a constant moves freely between the multipliers and that of the covering row; the
        low end keeps every step cheap.
        """
        problem = self.problem
        ratio = problem.greatest.sum() / max(problem.demand.sum(), 1e-300)
        counts = np.diff(problem.row_start)
        depth = np.minimum(np.ceil(1.5 * ratio), counts - 1).astype(np.int64)
        first: Floats = problem.lane_cost[problem.row_start[:-1] + np.maximum(depth, 0)]
        return first

    def ascend(  # noqa: PLR0913 - a run of steps has these settings
        self,
        box: Box,
        v: Floats,
        *,
        steps: int,
        target: float,
        cutoff: float,
        factor: float = 1.0,
        mu: float = 0.0,
        patience: int = 10,
        fix: bool = True,
        halted: Callable[[], bool] = lambda: False,
    ) -> Ascent:
        """
        Raise the bound of a box from given multipliers.

        Parameters
        ----------
        box
            What is still open to choice.
        v
            (R,) multipliers to start from; any are valid.
        steps
            Greatest number of steps.
        target
            Money a year that steps aim at, somewhat above the best bound there can be.
        cutoff
            Money a year at which the box is of no more interest; also what fixing goes by.
        factor, mu, patience
            First step factor, first multiplier of the covering row, and idle steps after which the factor is halved.
        fix
            Whether to fix sites on the way.
        halted
            Asked between portions; True ends the run.

        Returns
        -------
        ascent
            The best bound and what goes with it; infinite where the box is impossible.
        """
        covered, way, current, best_v = self._rows
        opened, used = self._options
        current[:], best_v[:], way[:], used[:] = v, v, 0.0, 0.0
        space = (*self.pricing, *self._picking, covered, opened, way, current, best_v, used)
        numbers = np.array([-np.inf, factor, mu, 0.0, 0.0])
        state = box.state.copy()
        free = int((state == FREE).sum())
        whole = WHOLE_TRIES if self.problem.one_option_each and free <= WHOLE_SITES else 0
        portion, left = 1, steps
        while left > 0 and not halted():
            began = time.perf_counter()
            count = min(portion, left)
            done = ascend(
                self._arrays, space, state, box.charge, box.fewest, box.most, numbers, count, target, cutoff, patience,
                fix, whole,
            )  # fmt: skip
            left -= count
            if done:
                break
            if time.perf_counter() - began < PORTION_S:
                portion *= 2
        return Ascent(
            bound=float(numbers[BEST]),
            v=best_v.copy(),
            mu=float(numbers[MU]),
            factor=float(numbers[FACTOR]),
            used=used.copy(),
            state=state,
            steps=int(numbers[STEPS]),
        )


def least_count(problem: Problem, box: Box) -> int:
    """
    Return the smallest number of open sites whose capacity can hold all demand; more than there are where none can.

    Parameters
    ----------
    problem
        Demand and capacities.
    box
        Sites already open count first, then the greatest of the free ones.
    """
    capacity = np.where(np.isfinite(box.charge), problem.capacity, 0.0)
    greatest = np.maximum.reduceat(capacity, problem.site_option[:-1])
    is_open = box.state == OPEN
    need = problem.demand.sum() * (1 - 1e-12) - greatest[is_open].sum()
    if need <= 0:
        return int(is_open.sum())
    held = np.cumsum(np.sort(greatest[box.state == FREE])[::-1])
    return int(is_open.sum() + np.searchsorted(held, need) + 1) if held.size and held[-1] >= need else problem.sites + 1


def whole_box(problem: Problem) -> Box:
    """Return the box of all that the problem allows."""
    state = np.where(problem.must_open, OPEN, FREE).astype(np.int8)
    return Box(state=state, charge=problem.charge, fewest=problem.fewest, most=problem.most)


def site_use(problem: Problem, used: Floats) -> Floats:
    """Return (S,) how far an averaged solution opens each site."""
    return np.add.reduceat(used, problem.site_option[:-1])


__all__ = ["FREE", "OPEN", "SHUT", "Ascent", "Box", "Relaxation", "least_count", "site_use", "whole_box"]
