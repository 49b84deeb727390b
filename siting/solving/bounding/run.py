"""
One run of the bounding engine: the phases, the clock and what is known.

The bound is raised and plans are looked for in turns; the numbers of sites are bounded; sites are fixed, and the tree
of what is left is searched. Every phase is budgeted in steps.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.listener import Progress
from siting.solving.bounding.counts import bound_counts
from siting.solving.bounding.incumbents import Incumbents
from siting.solving.bounding.problem import decisions_of, problem_of
from siting.solving.bounding.relaxation import SHUT, Relaxation, whole_box
from siting.solving.bounding.transport import SHUT_SITE
from siting.solving.bounding.tree import Goal, Node, search_tree
from siting.solving.engine import EngineResult

if TYPE_CHECKING:
    from siting.arrays import Flags, Floats, Positions
    from siting.listener import Listener, Stop
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.solving.bounding.problem import Problem
    from siting.solving.bounding.relaxation import Ascent, Box
    from siting.study.settings import SolveSettings

GAP_MARGIN = 0.999
"""Share of the gap asked that the search aims at, so that pricing its plan anew cannot lift the gap above it."""
LEAST_GAP = 1e-7
"""The search aims at no less: a plan this close to its bound counts as proved."""
FIRST_STEPS = 300
"""Steps before the first plan is looked for."""
MORE_STEPS = 1000
"""Greatest number of steps after it."""
ROUNDS = 3
"""Rounds of steps and moves at the root."""
ROUND_STEPS = 100
"""Steps in each later round."""
ROOT_TRIALS = 3000
"""Moves tried in each round."""
WORST_TARGET = 0.05
"""While there is no plan, steps aim this far above the bound (relative)."""


@dataclass(slots=True)
class _Known:
    """What is proved so far, without the problem's constant."""

    bound: float
    counts: dict[int, float]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Root:
    """What the relaxation at the root gives, nothing split yet."""

    problem: Problem
    bound: float
    """Money a year without the problem's constant."""
    v: Floats
    """(R,) the multipliers that prove it, money per load."""
    used: Floats
    """(O,) how far the averaged solution opens each of the problem's options."""
    plans: Incumbents
    """The best plan found on the way, and the moves that improve others."""

    @property
    def open_options(self) -> Positions:
        """Return the options open in the best plan, by position in the network; empty where none was found."""
        chosen = self.plans.chosen
        return self.problem.option[chosen[chosen >= 0]]

    def descend(self, options: Positions, stays: Flags, *, trials: int) -> tuple[float, Positions]:
        """
        Return what moves make of a set of open options while some sites stay as they are.

        Parameters
        ----------
        options
            Positions in the network.
        stays
            (S,) True for sites of the problem that no move may touch.
        trials
            Greatest number of moves tried.

        Returns
        -------
        cost, options
            Money a year without the problem's constant, infinite where the set cannot serve everything; and the set.
        """
        chosen = np.full(self.problem.sites, SHUT_SITE, dtype=np.int32)
        place = np.flatnonzero(np.isin(self.problem.option, options))
        chosen[self.problem.option_site[place]] = place
        cost, chosen = self.plans.descend(chosen, stays, trials=trials)
        return cost, self.problem.option[chosen[chosen >= 0]]


class Run:
    """One solve: the problem, the clock and what is known."""

    seldom = 1
    """How many times as rarely as usual the tree looks for plans."""
    fixing_steps = ROUND_STEPS
    """Steps in which sites are fixed before the tree."""

    def __init__(
        self,
        network: Network,
        settings: SolveSettings,
        listener: Listener,
        stop: Stop,
        problem: Problem | None = None,
    ) -> None:
        self._began = time.monotonic()
        self._network = network
        self._listener = listener
        self._stop = stop
        self._limit_s = settings.time_limit_s
        self._problem = problem_of(network) if problem is None else problem
        self._goal = Goal(gap=max(settings.gap * GAP_MARGIN, LEAST_GAP), constant=self._problem.constant)
        self._known = _Known(bound=-float("inf"), counts={})
        self._best: Incumbents | None = None
        self._from_root: tuple[Relaxation, Incumbents, Box, Ascent] | None = None

    def _halted(self) -> bool:
        return self._stop.requested or time.monotonic() - self._began > self._limit_s

    def _report(self, bound: float, phase: str) -> None:
        self._known.bound = max(self._known.bound, bound)
        constant = self._problem.constant
        cost = self._best.cost if self._best is not None else float("inf")
        self._listener.update(
            Progress(
                elapsed_s=time.monotonic() - self._began,
                cost=cost + constant if np.isfinite(cost) else None,
                bound=self._known.bound + constant if np.isfinite(self._known.bound) else None,
                phase=phase,
            )
        )

    def solve(self, start: Decisions | None) -> EngineResult:
        """Return the result of all phases."""
        problem = self._problem
        unreachable = bool((np.diff(problem.row_start) == 0).any())
        if unreachable or problem.fewest > problem.most or int(problem.must_open.sum()) > problem.most:
            return EngineResult(decisions=None, bound=None, impossible=True)
        relaxation = Relaxation(problem)
        best = self._best = Incumbents(problem, relaxation, self._halted)
        if start is not None:
            best.start_from(chosen_of(problem, start))
        serves_all = best.try_all()
        if not serves_all and not self._halted() and problem.most >= problem.sites:
            return EngineResult(decisions=None, bound=None, impossible=True)
        box = whole_box(problem)
        root = self._climb(relaxation, best, box)
        self._deepen(relaxation, best, box, root)
        return self._result(best)

    def root(self) -> Root | None:
        """
        Return what the relaxation at the root gives; None where something makes the problem impossible at sight.

        A requirement of the network that the problem does not state is left out: the bound holds all the same.
        """
        problem = self._problem
        if bool((np.diff(problem.row_start) == 0).any()) or not problem.rows or not problem.sites:
            return None
        relaxation = Relaxation(problem)
        best = self._best = Incumbents(problem, relaxation, self._halted)
        best.try_all()
        box = whole_box(problem)
        found = self._climb(relaxation, best, box)
        if not np.isfinite(found.bound):
            return None
        self._from_root = (relaxation, best, box, found)
        return Root(problem=problem, bound=found.bound, v=found.v, used=found.used, plans=best)

    def deepen(self) -> float:
        """Go on from `root` to the end of the search; return the bound, money a year with the problem's constant."""
        if self._from_root is not None:
            self._deepen(*self._from_root)
        return self._known.bound + self._problem.constant

    def _deepen(self, relaxation: Relaxation, best: Incumbents, box: Box, root: Ascent) -> None:
        """Bound the numbers of sites, then branch."""
        problem = self._problem
        if not self._met(best):
            counted = bound_counts(
                problem,
                relaxation,
                box,
                root,
                target=self._target(best),
                cutoff=self._cutoff(best),
                halted=self._halted,
            )
            self._known.counts = counted.bounds
            box = replace(box, fewest=counted.fewest, most=counted.most)
        if not self._met(best) and not self._halted():
            self._branch(relaxation, best, box, root)

    def _cutoff(self, best: Incumbents) -> float:
        return self._goal.cutoff(best.cost)

    def _target(self, best: Incumbents) -> float:
        bound = self._known.bound
        return best.cost if np.isfinite(best.cost) else bound + WORST_TARGET * abs(bound)

    def _met(self, best: Incumbents) -> bool:
        return self._known.bound >= self._cutoff(best)

    def _climb(self, relaxation: Relaxation, best: Incumbents, box: Box) -> Ascent:
        """Raise the bound at the root and look for plans, in turns; return the best multipliers."""
        v = relaxation.first_multipliers()
        root = relaxation.ascend(
            box, v, steps=FIRST_STEPS, target=self._first_target(relaxation, best, box), cutoff=float("inf"), fix=False,
            halted=self._halted,
        )  # fmt: skip
        self._report(root.bound, "raising the bound")
        for turn in range(ROUNDS):
            if self._met(best) or self._halted():
                break
            best.search(root.used, trials=ROOT_TRIALS)
            self._report(root.bound, "improving the plan")
            if self._met(best):
                break
            later = relaxation.ascend(
                box, root.v, steps=MORE_STEPS if turn == 0 else ROUND_STEPS, target=self._target(best),
                cutoff=self._cutoff(best), factor=1.0 if turn == 0 else 0.1, mu=root.mu, patience=20, fix=False,
                halted=self._halted,
            )  # fmt: skip
            root = later if later.bound >= root.bound else replace(root, used=later.used)
            self._report(root.bound, "raising the bound")
        return root

    def _first_target(self, relaxation: Relaxation, best: Incumbents, box: Box) -> float:
        if np.isfinite(best.cost):
            return best.cost
        first = relaxation.ascend(
            box,
            relaxation.first_multipliers(),
            steps=1,
            target=0.0,
            cutoff=float("inf"),
            fix=False,
            halted=self._halted,
        )
        return first.bound + abs(first.bound)

    def _branch(self, relaxation: Relaxation, best: Incumbents, box: Box, root: Ascent) -> None:
        """Fix sites, leave out those that are shut for good, and search the tree of what is left."""
        cutoff = self._cutoff(best)
        fixed = relaxation.ascend(
            box, root.v, steps=self.fixing_steps, target=self._target(best), cutoff=cutoff, factor=0.1, mu=root.mu,
            patience=20, fix=cutoff < float("inf"), halted=self._halted,
        )  # fmt: skip
        self._report(min(fixed.bound, cutoff), "branching")
        if fixed.bound >= cutoff or self._halted():
            return
        keep = (fixed.state != SHUT) | (best.chosen >= 0)
        problem = self._problem.restricted(keep)
        options = keep[self._problem.option_site]
        inner = Incumbents(problem, Relaxation(problem), self._halted)
        if best.cost < float("inf"):
            inner.offer(best.cost, chosen_of(problem, decisions_of(self._network, self._open_options(best))))
        node = Node(
            box=replace(box, state=fixed.state[keep], charge=box.charge[options]),
            bound=max(self._known.bound, fixed.bound),
            v=fixed.v.astype(np.float32),
            mu=fixed.mu,
        )

        def report(bound: float) -> None:
            if inner.cost < best.cost:
                best.offer(inner.cost, self._widened(problem, inner.chosen))
            self._report(min(bound, self._cutoff(best)), "branching")

        bound = search_tree(
            problem, node, inner, self._goal, halted=self._halted, report=report, seldom=self.seldom
        )  # fmt: skip
        report(bound)

    def _widened(self, problem: Problem, chosen: Positions) -> Positions:
        """Return a set of a restricted problem as one of the whole problem."""
        return chosen_of(self._problem, decisions_of(self._network, problem.option[chosen[chosen >= 0]]))

    def _open_options(self, best: Incumbents) -> Positions:
        return self._problem.option[best.chosen[best.chosen >= 0]]

    def _result(self, best: Incumbents) -> EngineResult:
        constant, bound = self._problem.constant, self._known.bound
        halted = self._halted()
        if not np.isfinite(best.cost):
            impossible = bound == float("inf") and not halted
            return EngineResult(
                decisions=None,
                bound=bound + constant if np.isfinite(bound) else None,
                impossible=impossible,
                note=self._note(),
            )
        bound = min(bound, best.cost)
        safe = bound + constant - 1e-10 * (abs(bound) + abs(constant))
        return EngineResult(
            decisions=decisions_of(self._network, self._open_options(best)),
            bound=safe if np.isfinite(bound) else None,
            site_count_bounds={
                count: value + constant for count, value in sorted(self._known.counts.items()) if np.isfinite(value)
            },
            note="" if self._met(best) else self._note(),
        )

    def _note(self) -> str:
        if self._stop.requested:
            return "stopped on request"
        return "stopped by the time limit" if self._halted() else ""


def chosen_of(problem: Problem, decisions: Decisions) -> Positions:
    """Return (S,) the option of each open site of the problem in given decisions."""
    chosen = np.full(problem.sites, SHUT_SITE, dtype=np.int32)
    is_open = decisions.option_open[problem.option]
    chosen[problem.option_site[is_open]] = np.flatnonzero(is_open)
    return chosen
