"""
The linear relaxation of the whole model, with lanes priced in and links added only where they are broken.

One program is kept in HiGHS and re-solved as bounds of the yes-or-no columns change. Whatever state it stops in, its
prices give a bound over ALL lanes and links (`whole_bound`), so every answer is valid at any moment.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from typing import TYPE_CHECKING, Any

import highspy
import numpy as np

from siting.errors import EngineError
from siting.solving.bounding.whole_bound import Pricer, Sides
from siting.solving.highs import TOLERANCE, QuietHighs

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.solving.bounding.whole_bound import Priced
    from siting.solving.bounding.whole_problem import WholeProblem

BROKEN = 1e-7
"""Shares by which a link may be exceeded before it is loaded."""

DUAL_NOISE = 1e-9
"""Reduced costs above minus this (in the problem's money) are rounding: the lane stays out."""

PATIENCE = 40
"""Solves after which a link that had no price in any of them may be forgotten."""

EMPTY = 1e-8
"""By how much rows, scaled to coefficients of 1 to 2 and priced at most 1, must contradict each other."""

ROUNDS = 200
"""Rounds of pricing and linking after which a program that still moves is given up; none of the tests came near."""


DEVEX = 1
"""Steepest edges are found anew at every jump to another node, which costs more than the steps they save."""


class Ending(Enum):
    """How a solve ended."""

    SOLVED = "every lane priced, no link broken"
    NEARLY = "out of rounds"
    CUT = "the bound reached what it had to"
    EMPTY = "nothing satisfies the rows"
    HALTED = "out of time, of steps, or asked to stop"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Relaxed:
    """What a solve gave."""

    ending: Ending
    bound: float
    """In the problem's money; infinite when nothing satisfies the rows."""
    value: float
    """Of the program itself; the bound equals it when solved."""
    values: Floats
    """(N,) of the columns; meaningless unless solved."""
    priced: Priced | None
    """At the best bound; None when nothing was proved."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Spot:
    """Where the simplex stood, to go on from there later."""

    basis: highspy.HighsBasis
    links: NDArray[np.int64]
    """Loaded then."""


class LaneProgram:
    """A program in HiGHS over some lanes and some links of a problem."""

    def __init__(
        self, problem: WholeProblem, columns: NDArray[np.intp], halt: Callable[[], bool], *, linked: bool = True
    ) -> None:
        """
        Load the options, the suppliers and some lanes; pairs are priced in as lanes are.

        Parameters
        ----------
        problem
            What to relax.
        columns
            Lanes to begin with; more are loaded where their prices ask for it.
        halt
            Says when to give up.
        linked
            True loads the links of a lane that is priced in with it. Where all binaries are held, links hardly ever
            bind: they are better left until they are broken.
        """
        self.problem = problem
        self._halt_asked = halt
        self._pricer = Pricer(problem)
        self.halted = False
        self._linked = linked
        self._place = np.full(problem.places.count, -1, dtype=np.int32)
        places = problem.places
        self.columns = np.unique(np.concatenate([places.option, places.supplier, columns])).astype(np.intp)
        self._place[self.columns] = np.arange(self.columns.size)
        self.links: NDArray[np.int64] = np.zeros(0, dtype=np.int64)
        self._link_rows = problem.links.chosen(self.links)
        self._idle = problem.links.chosen(self.links)
        self._idle_links = self.links
        self.at: Sides | None = None
        self.highs = self._start()
        self.iterations = 0
        self._solves = 0
        self._priced_at = np.zeros(len(problem.links), dtype=np.int64)
        self._refresh()

    def _start(self) -> highspy.Highs:
        problem = self.problem
        highs = QuietHighs()  # type: ignore[no-untyped-call] # highspy types only part of its methods
        for name, value in (
            ("presolve", "off"),
            ("solver", "simplex"),
            ("simplex_dual_edge_weight_strategy", DEVEX),
            ("primal_feasibility_tolerance", TOLERANCE),
            ("dual_feasibility_tolerance", TOLERANCE),
        ):
            highs.setOptionValue(name, value)
        highs.cbSimplexInterrupt.subscribe(self._interrupt)
        rows = problem.limits.within(self._place, self.columns.size)
        program = highspy.HighsLp()
        program.num_col_, program.num_row_ = self.columns.size, len(rows)
        program.col_cost_ = problem.cost[self.columns]
        program.col_lower_, program.col_upper_ = problem.lower[self.columns], problem.upper[self.columns]
        program.row_lower_, program.row_upper_ = rows.lower, rows.upper
        program.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
        program.a_matrix_.num_col_, program.a_matrix_.num_row_ = self.columns.size, len(rows)
        program.a_matrix_.start_, program.a_matrix_.index_ = rows.start, rows.column
        program.a_matrix_.value_ = rows.value
        highs.passModel(program)
        return highs

    def halt(self) -> bool:
        """Return whether to give up; once so, always so."""
        self.halted = self.halted or self._halt_asked()
        return self.halted

    def _interrupt(self, event: Any) -> None:  # noqa: ANN401 - highspy's event
        if self.halt():
            event.interrupt()

    def load_lanes(self, columns: NDArray[np.intp]) -> None:
        """
        Load lanes, and their links.

        Parameters
        ----------
        columns
            Not loaded yet.
        """
        start, row, value = self.problem.limits.by_column
        lengths = np.diff(start)[columns]
        first = np.cumsum(lengths) - lengths
        entry = np.arange(int(lengths.sum())) - np.repeat(first - start[columns], lengths)
        bounds = self.problem if self.at is None else self.at
        self.highs.addCols(
            columns.size,
            self.problem.cost[columns],
            bounds.lower[columns],
            bounds.upper[columns],
            entry.size,
            first.astype(np.int32),
            row[entry],
            value[entry],
        )
        self._place[columns] = self.columns.size + np.arange(columns.size)
        self.columns = np.concatenate([self.columns, columns])
        if self._linked:
            self.load_links(self._pricer.links_of(columns))
        self._refresh()

    def load_links(self, links: NDArray[np.int64]) -> None:
        """
        Load links.

        Parameters
        ----------
        links
            Not loaded yet, of lanes that are.
        """
        rows = self.problem.links.chosen(links)
        self.highs.addRows(
            links.size,
            rows.lower,
            rows.upper,
            rows.column.size,
            rows.start[:-1].astype(np.int32),
            self._place[rows.column],
            rows.value,
        )
        self.links = np.concatenate([self.links, links])
        self._priced_at[links] = self._solves
        self._link_rows = self.problem.links.chosen(self.links)
        self._refresh()

    def spot(self) -> Spot:
        """Return where the simplex stands."""
        return Spot(basis=self.highs.getBasis(), links=self.links)

    def return_to(self, spot: Spot) -> None:
        """Go back to where the simplex stood, unless a link that was binding there has been forgotten."""
        limits = len(self.problem.limits)
        rows = np.array(spot.basis.row_status)
        known = dict(zip(spot.links.tolist(), rows[limits:].tolist(), strict=True))
        basic = highspy.HighsBasisStatus.kBasic
        status = [known.pop(link, basic) for link in self.links.tolist()]
        if any(left != basic for left in known.values()):
            return
        columns = list(spot.basis.col_status)
        columns += [highspy.HighsBasisStatus.kLower] * (self.columns.size - len(columns))
        basis = highspy.HighsBasis()
        basis.valid = True
        basis.col_status = columns
        basis.row_status = [*rows[:limits].tolist(), *status]
        self.highs.setBasis(basis)

    def forget(self, most: int) -> None:
        """Take out the links that have had no price for long, once more than `most` are loaded."""
        if self.links.size <= most:
            return
        slack = self._priced_at[self.links] < self._solves - PATIENCE
        slack &= np.array(self.highs.getBasis().row_status)[-self.links.size :] == highspy.HighsBasisStatus.kBasic
        gone = (len(self.problem.limits) + np.flatnonzero(slack)).astype(np.int32)
        if not gone.size:
            return
        self.highs.deleteRows(gone.size, gone)
        self.links = self.links[~slack]
        self._link_rows = self.problem.links.chosen(self.links)
        self._refresh()

    def _refresh(self) -> None:
        """List the links of loaded lanes that are not loaded themselves."""
        out = np.ones(len(self.problem.links), dtype=np.bool_)
        out[self.links] = False
        out &= self._place[self.problem.link_of] >= 0
        self._idle_links = np.flatnonzero(out)
        self._idle = self.problem.links.chosen(self._idle_links)

    def set_sides(self, sides: Sides) -> None:
        """
        Set the bounds of the binaries and the limits of the rows.

        Parameters
        ----------
        sides
            Bounds of columns other than binaries are the problem's own.
        """
        binaries, last = self.problem.places.binaries, self.at
        old = (self.problem.lower, self.problem.upper) if last is None else (last.lower, last.upper)
        changed = (sides.lower != old[0]) | (sides.upper != old[1])
        column = np.flatnonzero(changed[:binaries] & (self._place[:binaries] >= 0))
        if column.size:
            self.highs.changeColsBounds(column.size, self._place[column], sides.lower[column], sides.upper[column])
        limits = self.problem.limits
        old = (limits.lower, limits.upper) if last is None else (last.row_lower, last.row_upper)
        for row in np.flatnonzero((sides.row_lower != old[0]) | (sides.row_upper != old[1])).tolist():
            self.highs.changeRowBounds(row, float(sides.row_lower[row]), float(sides.row_upper[row]))
        self.at = sides
        held = np.flatnonzero((self._place < 0) & (sides.lower > 0))
        if held.size:
            self.load_lanes(held)

    def solve(self, sides: Sides, *, enough: float, rounds: int = ROUNDS) -> Relaxed:
        """
        Solve within bounds until every lane is priced and no link broken, or the bound is enough.

        Parameters
        ----------
        sides
            Bounds of the columns and limits of the rows.
        enough
            Bound at which to end, in the problem's money.
        rounds
            Rounds of pricing and linking at most.

        Returns
        -------
        relaxed
            The best bound of all rounds, and the last solution.

        Raises
        ------
        EngineError
            If HiGHS gives up for a reason of its own.
        """
        self.set_sides(sides)
        self._solves += 1
        best: Priced | None = None
        values, value = np.zeros(self.problem.places.count), -np.inf
        self.highs.setOptionValue("objective_bound", enough - self.problem.constant)
        for _ in range(rounds):
            if self.halt():
                break
            self.highs.run()
            status = self.highs.getModelStatus()
            info = self.highs.getInfo()
            self.iterations += max(info.simplex_iteration_count, 0)
            if status == highspy.HighsModelStatus.kInfeasible:
                if self._is_empty(sides):
                    return self._result(Ending.EMPTY, np.inf, np.inf, values, None)
                continue
            known = status in {highspy.HighsModelStatus.kOptimal, highspy.HighsModelStatus.kObjectiveBound}
            if not known:
                if self.halted or status == highspy.HighsModelStatus.kInterrupt:
                    self.halted = True
                    break
                msg = f"HiGHS could not solve a relaxation: {self.highs.modelStatusToString(status)}."
                raise EngineError(msg)
            solution = self.highs.getSolution()
            priced, lanes = self._priced(np.array(solution.row_dual), sides, costless=False)
            value = info.objective_function_value + self.problem.constant
            if best is None or priced.bound > best.bound:
                best = priced
            if best.bound >= enough:
                return self._result(Ending.CUT, best.bound, value, values, best)
            values = np.zeros(self.problem.places.count)
            values[self.columns] = np.array(solution.col_value)
            optimal = status == highspy.HighsModelStatus.kOptimal
            broken = self._broken(values) if optimal else self._idle_links[:0]
            if lanes.size:
                self.load_lanes(lanes)
            elif not optimal:
                self.highs.setOptionValue("objective_bound", np.inf)  # its prices fell short of proving the cut
            elif not broken.size:
                return self._result(Ending.SOLVED, best.bound, value, values, best)
            if broken.size:
                self.load_links(broken)
        ending = Ending.HALTED if self.halted else Ending.NEARLY
        return self._result(ending, -np.inf if best is None else best.bound, value, values, best)

    def try_sides(self, sides: Sides, basis: highspy.HighsBasis, steps: int) -> float:
        """
        Return how far a few steps of the simplex lift the value within bounds, over loaded lanes and links only.

        Parameters
        ----------
        sides
            Bounds to try.
        basis
            Where to start from; also the basis left behind.
        steps
            Simplex steps at most.

        Returns
        -------
        value
            In the problem's money, an estimate and no bound; NaN where nothing was feasible.
        """
        self.set_sides(sides)
        self.highs.setBasis(basis)
        self.highs.setOptionValue("simplex_iteration_limit", steps)
        self.highs.run()
        status, info = self.highs.getModelStatus(), self.highs.getInfo()
        self.iterations += max(info.simplex_iteration_count, 0)
        self.highs.setOptionValue("simplex_iteration_limit", highspy.kHighsIInf)
        self.highs.setBasis(basis)
        if status == highspy.HighsModelStatus.kInfeasible:
            return np.nan
        return float(info.objective_function_value) + self.problem.constant

    def _result(self, ending: Ending, bound: float, value: float, values: Floats, priced: Priced | None) -> Relaxed:
        return Relaxed(ending=ending, bound=bound, value=value, values=values, priced=priced)

    def _priced(self, duals: Floats, sides: Sides, *, costless: bool) -> tuple[Priced, NDArray[np.intp]]:
        """Return what the duals of the loaded rows prove, and the lanes that would lower the program's value."""
        limits = len(self.problem.limits)
        self._priced_at[self.links[duals[limits:] != 0]] = self._solves
        priced = self._pricer.price(
            duals[:limits], self.links, self._link_rows, duals[limits:], sides, costless=costless
        )
        wanted = (priced.before < -DUAL_NOISE) & (self._place < 0) & self._open_lanes(sides)
        return priced, np.flatnonzero(wanted)

    def _open_lanes(self, sides: Sides) -> NDArray[np.bool_]:
        """Return (N,) which columns may be above 0: not those of sites that are shut or suppliers unsigned."""
        links = self.problem.links
        room = np.where(links.value < 0, -links.value * sides.upper[links.column], 0.0)
        none = np.bincount(links.row, room, minlength=len(links)) <= 0
        usable: NDArray[np.bool_] = sides.upper > 0
        usable[self.problem.link_of[none]] = False
        return usable

    def _broken(self, values: Floats) -> NDArray[np.int64]:
        return self._idle_links[self._idle.times(values) > BROKEN]

    def _is_empty(self, sides: Sides) -> bool:
        """Return whether nothing at all satisfies the rows; where lanes might help, load them and return False."""
        _, there, ray = self.highs.getDualRay()  # type: ignore[attr-defined] # highspy types only part of its methods
        lanes: NDArray[np.intp] = np.zeros(0, dtype=np.intp)
        if there:
            priced, lanes = self._priced(np.array(ray), sides, costless=True)
            if priced.bound > EMPTY and not lanes.size:
                return True
        if not lanes.size:
            lanes = np.flatnonzero((self._place < 0) & self._open_lanes(sides))
        if not lanes.size:
            return True
        self.load_lanes(lanes)
        return False
