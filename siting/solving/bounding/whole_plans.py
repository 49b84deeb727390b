"""Plans of the whole model: from whole solutions, by diving, and by opening, shutting and swapping what is open."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.whole_assign import assigned
from siting.solving.bounding.whole_finish import finish
from siting.solving.bounding.whole_levers import WHOLE
from siting.solving.bounding.whole_program import Ending

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.arrays import Floats
    from siting.solving.bounding.whole_bound import Sides
    from siting.solving.bounding.whole_levers import Levers
    from siting.solving.bounding.whole_problem import WholeProblem
    from siting.solving.bounding.whole_program import LaneProgram, Relaxed

DIVE_ROUNDS = 3
"""Rounds of pricing and linking at each step of a dive: the way down need not be exact."""

CERTAIN = 0.9
"""Binaries at or above this in a relaxation are opened together when diving."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Tried:
    """What a set of decisions costs, in the problem's money."""

    cost: float
    """Infinite where there is no plan, or none that is of use."""
    bound: float
    """What no plan with these decisions can undercut."""


class Plans:
    """The best plan so far, and ways to find better ones."""

    def __init__(
        self, problem: WholeProblem, program: LaneProgram, levers: Levers, gap: float, tell: Callable[[], None]
    ) -> None:
        self.problem = problem
        self._program = program
        self._tell = tell
        self._gap = gap
        self._tried: dict[bytes, Tried] = {}
        self.levers = levers
        self.cost = math.inf
        """In the problem's money."""
        self.best: Floats | None = None
        """(binaries,)"""
        self.priced: Relaxed | None = None

    def try_binaries(self, held: Floats, enough: float = math.inf, *, quick: bool = False) -> Tried:
        """
        Price decisions on sites and suppliers, and keep their plan if it is the best so far.

        Parameters
        ----------
        held
            Shape (options + suppliers,), whole.
        enough
            Cost from which on it is of no use.
        quick
            True gives up single-sourced customers that cannot be placed without a search.

        Returns
        -------
        tried
            Cost and bound in the problem's money; the cost is infinite where they cannot serve all demand, or only at
            `enough` or more.
        """
        key = np.packbits(held > 0).tobytes()
        known = self._tried.get(key)
        if known is not None and (math.isfinite(known.cost) or known.bound >= enough):
            return known
        sides = self._held(held)
        relaxed = self._program.solve(sides, enough=enough)
        if relaxed.ending is not Ending.SOLVED:
            tried = Tried(cost=math.inf, bound=relaxed.bound)
            if relaxed.ending is not Ending.HALTED:
                self._tried[key] = tried
            return tried
        cost, bound, values = relaxed.value, relaxed.bound, relaxed.values
        if self._is_torn(values[held.size : self.problem.places.binaries]):
            cost, bound, values = self._placed(held, sides, relaxed, enough, quick=quick)
        tried = Tried(cost=cost, bound=bound)
        if not self._program.halted and not quick:
            self._tried[key] = tried
        if cost < self.cost:
            self.cost, self.priced = cost, relaxed
            self.best = np.concatenate([held, np.rint(values[held.size : self.problem.places.binaries])])
            self._tell()
        return tried

    @staticmethod
    def _is_torn(pairs: Floats) -> bool:
        """Return whether a customer that may not be split is."""
        return bool(np.any(np.abs(pairs - np.rint(pairs)) > WHOLE))

    def _placed(
        self, held: Floats, sides: Sides, relaxed: Relaxed, enough: float, *, quick: bool
    ) -> tuple[float, float, Floats]:
        """Return cost, bound and values once single-sourced customers have one source: by hand, then by a search."""
        cost, bound, values = math.inf, relaxed.bound, relaxed.values
        taken = assigned(self.problem, relaxed, held)
        if taken is not None:
            lower, upper = self.levers.whole()
            lower[: held.size] = upper[: held.size] = held
            lower[held.size : held.size + taken.size] = upper[held.size : held.size + taken.size] = taken
            solved = self._program.solve(self.levers.sides(lower, upper), enough=math.inf)
            if solved.ending is Ending.SOLVED:
                cost, values = solved.value, solved.values
        if quick or (self._gap > 0 and cost - bound <= self._gap * abs(cost)):
            return cost, bound, values
        done = finish(self.problem, sides, relaxed, enough=min(enough, cost), gap=self._gap, halt=self._program.halt)
        if done.values is not None and done.cost < cost:
            cost, values = done.cost, done.values
        return cost, done.bound, values

    def _held(self, held: Floats) -> Sides:
        """Return the sides with sites and suppliers held."""
        lower, upper = self.levers.whole()
        lower[: held.size] = upper[: held.size] = held
        return self.levers.sides(lower, upper)

    def dive(self, program: LaneProgram, relaxed: Relaxed) -> None:
        """
        Open what a relaxation nearly opens, most nearly first, until the relaxation is whole; then price it.

        Parameters
        ----------
        program
            Solves the relaxations on the way.
        relaxed
            The relaxation to begin from, with nothing split.
        """
        lower, upper = self.levers.whole()
        split = self.levers.split
        while relaxed.ending in {Ending.SOLVED, Ending.NEARLY}:
            value = relaxed.values[:split]
            free = np.flatnonzero((lower[:split] < upper[:split]) & (np.abs(value - np.rint(value)) > WHOLE))
            if not free.size:
                self.try_binaries(np.rint(value))
                return
            sure = free[value[free] >= CERTAIN]
            if not sure.size:
                suppliers = free[free >= self.problem.places.option.size]
                among = suppliers if suppliers.size else free
                sure = among[[int(np.argmax(value[among]))]]
            lower[sure] = 1.0
            relaxed = program.solve(self.levers.sides(lower, upper), enough=self.cost, rounds=DIVE_ROUNDS)
            if relaxed.ending is Ending.EMPTY:
                lower[sure] = upper[sure] = 0.0
                relaxed = program.solve(self.levers.sides(lower, upper), enough=self.cost, rounds=DIVE_ROUNDS)

    def improve(self, trials: int) -> None:
        """
        Open, shut and swap from the best plan, most promising move first, until no move helps.

        Parameters
        ----------
        trials
            Moves priced at most.
        """
        while trials > 0 and self.best is not None and self.priced is not None and self.priced.priced is not None:
            start = self.cost
            promise, moves = self._moves()
            for k in np.argsort(-promise, kind="stable").tolist():
                if promise[k] <= 0 or trials <= 0 or self._program.halted:
                    return
                changed = self.best[: self.levers.split].copy()
                for place in moves[k]:
                    changed[place] = 1.0 - changed[place]
                key = np.packbits(changed > 0).tobytes()
                if key in self._tried:
                    continue
                trials -= 1
                self.try_binaries(changed, self.cost)
                if self.cost < start:
                    break
            else:
                return

    def _moves(self) -> tuple[Floats, list[tuple[int, ...]]]:
        """Return every single move and swap with what it saves at most by the prices of the best plan."""
        assert self.best is not None  # noqa: S101
        assert self.priced is not None  # noqa: S101
        assert self.priced.priced is not None  # noqa: S101
        split, options = self.levers.split, self.problem.places.option.size
        reduced = self.priced.priced.reduced[:split]
        is_open = self.best[:split] > 0
        promise = np.where(is_open, reduced, -reduced)
        lower, upper = self.levers.whole()
        promise = np.where(lower[:split] < upper[:split], promise, -np.inf)
        moves: list[tuple[int, ...]] = [(k,) for k in range(split)]
        worth = [promise]
        for first, last in ((0, options), (options, split)):
            drop, add = np.flatnonzero(is_open[first:last]) + first, np.flatnonzero(~is_open[first:last]) + first
            both = promise[drop][:, None] + promise[add][None, :]
            worth.append(both.ravel())
            moves += [(a, b) for a in drop.tolist() for b in add.tolist()]
        return np.concatenate(worth), moves
