"""
The finishing program: sources of single-sourced customers, found by HiGHS with sites and suppliers held.

Only columns that can be part of a plan below `enough` are given to it: by the prices of the relaxation, any solution in
which a yes-or-no column is 1 costs at least the bound plus that column's reduced cost. What is left out therefore costs
`enough` or more, and min(bound of HiGHS, `enough`) is a bound on everything. Shares are never left out: a small share
costs but that share of the reduced cost.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import highspy
import numpy as np

from siting.errors import EngineError
from siting.solving.bounding.whole_bound import SAFE
from siting.solving.highs import TOLERANCE, QuietHighs, has_solution, is_impossible

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.arrays import Floats
    from siting.solving.bounding.whole_bound import Sides
    from siting.solving.bounding.whole_problem import WholeProblem
    from siting.solving.bounding.whole_program import Relaxed


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Finished:
    """What the finishing program found, in the problem's money."""

    values: Floats | None
    """(N,) of the best solution; None without one below `enough`."""
    cost: float
    """Infinite without one."""
    bound: float
    """Of everything within the sides, also of what was left out."""


def finish(  # noqa: PLR0913 - what a run needs, each named
    problem: WholeProblem,
    sides: Sides,
    relaxed: Relaxed,
    *,
    enough: float,
    gap: float,
    halt: Callable[[], bool],
) -> Finished:
    """
    Solve within sides to whole numbers.

    Parameters
    ----------
    problem, sides
        What to solve, and the bounds of columns and rows within which.
    relaxed
        The relaxation solved within the same sides.
    enough
        Cost from which on a solution is of no use, in the problem's money; infinite = any will do.
    gap
        Relative gap at which to end.
    halt
        Says when to give up.

    Returns
    -------
    finished
        Valid also when given up.

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    columns, left_out = _columns(problem, sides, relaxed, enough)
    highs = _highs(problem, sides, columns, enough, gap)
    halted = False

    def interrupt(event: Any) -> None:  # noqa: ANN401 - highspy's event
        nonlocal halted
        if halt():
            halted = True
            event.interrupt()

    highs.cbMipInterrupt.subscribe(interrupt)
    highs.cbSimplexInterrupt.subscribe(interrupt)
    highs.run()
    limit = enough if left_out or math.isfinite(enough) else math.inf
    if is_impossible(highs):
        return Finished(values=None, cost=math.inf, bound=max(relaxed.bound, limit))
    status, info = highs.getModelStatus(), highs.getInfo()
    if not halted and status not in {highspy.HighsModelStatus.kOptimal, highspy.HighsModelStatus.kObjectiveBound}:
        msg = f"HiGHS could not finish a plan: {highs.modelStatusToString(status)}."
        raise EngineError(msg)
    bound = info.mip_dual_bound + problem.constant
    bound = max(relaxed.bound, min(bound, limit) if math.isfinite(bound) else relaxed.bound)
    if not has_solution(highs):
        return Finished(values=None, cost=math.inf, bound=bound)
    values = np.zeros(problem.places.count)
    values[columns] = np.array(highs.getSolution().col_value)
    return Finished(values=values, cost=info.objective_function_value + problem.constant, bound=bound)


def _columns(problem: WholeProblem, sides: Sides, relaxed: Relaxed, enough: float) -> tuple[np.ndarray, bool]:
    """Return the columns that a solution below `enough` may use, and whether any was left out."""
    usable = sides.upper > 0
    if relaxed.priced is None or not math.isfinite(enough):
        return np.flatnonzero(usable), False
    slack = enough - relaxed.priced.bound + SAFE * abs(enough)
    is_share = np.arange(problem.places.count) >= problem.places.binaries
    kept = usable & (is_share | (relaxed.priced.reduced <= slack) | (sides.lower > 0))
    return np.flatnonzero(kept), bool(np.any(usable & ~kept))


def _highs(problem: WholeProblem, sides: Sides, columns: np.ndarray, enough: float, gap: float) -> highspy.Highs:
    """Return HiGHS with the program over some of the columns."""
    place = np.full(problem.places.count, -1, dtype=np.int32)
    place[columns] = np.arange(columns.size)
    limits = problem.limits.within(place, columns.size)
    links = problem.links.chosen(np.flatnonzero(place[problem.link_of] >= 0)).within(place, columns.size)
    program = highspy.HighsLp()
    program.num_col_, program.num_row_ = columns.size, len(limits) + len(links)
    program.col_cost_ = problem.cost[columns]
    program.col_lower_, program.col_upper_ = sides.lower[columns], sides.upper[columns]
    program.row_lower_ = np.concatenate([sides.row_lower, links.lower])
    program.row_upper_ = np.concatenate([sides.row_upper, links.upper])
    program.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
    program.a_matrix_.num_col_, program.a_matrix_.num_row_ = columns.size, len(limits) + len(links)
    program.a_matrix_.start_ = np.concatenate([limits.start, limits.start[-1] + links.start[1:]])
    program.a_matrix_.index_ = np.concatenate([limits.column, links.column])
    program.a_matrix_.value_ = np.concatenate([limits.value, links.value])
    whole = int((columns < problem.places.binaries).sum())
    kinds = [highspy.HighsVarType.kInteger] * whole + [highspy.HighsVarType.kContinuous] * (columns.size - whole)
    program.integrality_ = kinds
    highs = QuietHighs()  # type: ignore[no-untyped-call] # highspy types only part of its methods
    options: dict[str, float | int] = {
        "mip_rel_gap": gap,
        "mip_abs_gap": 0.0,
        "mip_feasibility_tolerance": TOLERANCE,
        "primal_feasibility_tolerance": TOLERANCE,
    }
    for name, value in options.items():
        highs.setOptionValue(name, value)
    if math.isfinite(enough):
        highs.setOptionValue("objective_bound", enough - problem.constant)
    highs.passModel(program)
    return highs
