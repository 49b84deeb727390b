"""
The engine `whole`: every feature of a network, one echelon or two, by branch and bound over priced lanes.

The relaxation (demand, balance, capacities, service, counts, budget, rules, with tight links) is solved over the lanes
and links that matter; its prices bound the cost over all of them. Plans come from diving, from opening, shutting and
swapping, and from the search itself, which splits suppliers, sites, sizes and their numbers; sources of
single-sourced customers are settled by a small program of whole numbers once sites and suppliers are held.

Every budget is in steps, not seconds: a run that neither time nor a request stops gives the same answer always.
"""

from __future__ import annotations

import math
import time
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.listener import Progress, Silent
from siting.solving.bounding.whole_core import Until, begins_with_core, core_of
from siting.solving.bounding.whole_levers import Levers
from siting.solving.bounding.whole_plans import Plans
from siting.solving.bounding.whole_problem import state
from siting.solving.bounding.whole_program import Ending, LaneProgram
from siting.solving.bounding.whole_start import first_lanes
from siting.solving.bounding.whole_tree import Tree
from siting.solving.engine import EngineResult

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.listener import Listener, Stop
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.solving.bounding.whole_core import Core
    from siting.solving.bounding.whole_problem import WholeProblem
    from siting.solving.bounding.whole_program import Relaxed
    from siting.study.settings import SolveSettings

GAP_MARGIN = 0.999
"""Share of the gap asked that the search aims at, so that pricing the plan anew cannot lift the gap above it."""

MOVES = 1000
"""Moves from the first plans priced at most."""

LATER_MOVES = 200
"""Moves from a plan that the search finds, priced at most."""

CORE_GAP = 0.25
"""Share of the gap asked that the search over sites alone aims at: the rest is for what it leaves out."""

CORE_WORK = 100_000_000
"""Reports of the search over sites alone times lanes, at most: a report is 16 nodes, a node looks at every lane."""

KEPT_LINKS = 1.3
"""Times as many links as the first relaxation ended with are loaded before old ones are forgotten."""


def whole(
    network: Network,
    settings: SolveSettings,
    *,
    listener: Listener,
    stop: Stop,
    start: Decisions | None = None,
) -> EngineResult:
    """
    Search over priced lanes until the gap, the time limit or `stop`.

    Parameters
    ----------
    network
        What to decide; any feature.
    settings
        Gap and time limit; stating the problem counts as time.
    listener
        Gets `update` with elapsed seconds, best cost and bound in money a year.
    stop
        Once requested, the best decisions so far are returned, within a second.
    start
        Decisions known to be feasible, to begin from.

    Returns
    -------
    result
        Decisions, bound, and whether the study is impossible.

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    return _Run(network=network, settings=settings, listener=listener, stop=stop).solve(start)


class _Told(Silent):
    """A listener that passes progress to a function."""

    def __init__(self, hear: Callable[[Progress], None]) -> None:
        self._hear = hear

    def update(self, progress: Progress) -> None:
        """Pass it on."""
        self._hear(progress)


@dataclass(slots=True, kw_only=True)
class _Run:
    """One run of the engine."""

    network: Network
    settings: SolveSettings
    listener: Listener
    stop: Stop
    began: float = field(default_factory=time.monotonic)
    phase: str = ""
    root: float = -math.inf
    """Bound of the first relaxation, in the problem's money."""
    plans: Plans | None = None
    tree: Tree | None = None
    core: Core | None = None
    heard: int = 0
    """Reports of the search over sites alone."""
    most_heard: int = 0
    """After so many it is given up."""

    def solve(self, start: Decisions | None) -> EngineResult:
        """Run every phase."""
        self._say("stating the model")
        problem = state(self.network)
        gap = self.settings.gap * GAP_MARGIN
        lanes = first_lanes(problem)
        core = self._core(problem)
        if core is not None and core.bound == math.inf:
            return EngineResult(decisions=None, bound=None, impossible=True)
        if core is not None:
            lanes = np.union1d(lanes, core.lanes)
        program = LaneProgram(problem, lanes, self._halt)
        levers = Levers(problem)
        self.plans = Plans(problem, LaneProgram(problem, lanes, self._halt, linked=False), levers, gap / 2, self._tell)
        self.tree = Tree(problem, program, levers, self.plans, gap)
        if start is not None:
            self.plans.best = problem.binaries(start)
            self.plans.try_binaries(self.plans.best[: levers.split])
        if core is not None:
            self._begin(core)
            if self.tree.closed:
                return self._result()
        self._say("bounding the cost from below")
        relaxed = program.solve(self.tree.root_sides(), enough=math.inf)
        if relaxed.ending is Ending.EMPTY:
            return EngineResult(decisions=None, bound=None, impossible=True)
        self.root = max(self.root, relaxed.bound)
        if relaxed.ending in {Ending.SOLVED, Ending.NEARLY}:
            self._search(program, relaxed)
        return self._result()

    def _core(self, problem: WholeProblem) -> Core | None:
        """Return what the search over sites alone gives, where it pays."""
        if not begins_with_core(problem):
            return None
        from siting.solving.bounding.compiled import is_compiled  # noqa: PLC0415 - loads the compiler

        if not is_compiled():
            self._compile()
        self._say("searching over the sites alone")
        left = self.settings.time_limit_s - (time.monotonic() - self.began)
        asked = replace(self.settings, gap=self.settings.gap * CORE_GAP, time_limit_s=max(left, 0.0))
        return core_of(problem, asked, _Told(self._hear), Until(self.stop, self._is_enough), self._halt)

    def _compile(self) -> None:
        """Compile the loops of the search over sites alone; it does not count as time."""
        from siting.solving.bounding.warm import compile_loops  # noqa: PLC0415 - only once a machine

        self._say("compiling the search, once on this machine")
        began = time.monotonic()
        compile_loops()
        self.began += time.monotonic() - began

    def _hear(self, progress: Progress) -> None:
        """Take a bound of the search over sites alone."""
        self.heard += 1
        if self.core is not None and self.plans is not None and progress.bound is not None:
            self.root = max(self.root, self.core.safe(self.plans.problem, progress.bound))
            self._tell()

    def _is_enough(self) -> bool:
        """Return whether the search over sites alone has done its part: what it can prove, or its share of the work."""
        if self.core is None or self.tree is None:
            return False
        return self._bound() >= self.tree.enough or self.heard > self.most_heard

    def _begin(self, core: Core) -> None:
        """Try the sets of the search over sites alone until two of them serve everything; then prove what it can."""
        assert self.plans is not None  # noqa: S101 - made by the caller
        assert self.tree is not None  # noqa: S101
        problem = self.plans.problem
        self.root = core.bound
        self._say("looking for a first plan")
        found = 0
        for held in core.sets:
            found += math.isfinite(self.plans.try_binaries(held, quick=True).cost)
            if found > 1 or self._halt():
                break
        self._say("bounding the cost over the sites alone")
        self.core, self.heard = core, 0
        self.most_heard = CORE_WORK // len(problem.network.outbound)
        bound, deeper = core.deepen(problem)
        self.root = max(self.root, bound)
        if deeper is not None:
            self.plans.try_binaries(deeper, self.plans.cost, quick=True)
        self.tree.open[0].bound = self.root

    def _search(self, program: LaneProgram, relaxed: Relaxed) -> None:
        """Find plans, then split until the gap is closed."""
        assert self.plans is not None  # noqa: S101 - made by the caller
        assert self.tree is not None  # noqa: S101
        most = int(KEPT_LINKS * program.links.size) + 100
        self.tree.open[0].spot = program.spot()
        self._say("looking for plans")
        self.plans.dive(program, relaxed)
        self._say("improving the plan")
        self.plans.improve(MOVES)
        self._say("splitting what is open")
        known = self.plans.cost
        while not self.tree.closed and not program.halted:
            self.tree.step()
            program.forget(most)
            if self.plans.cost < known:
                self.plans.improve(LATER_MOVES)
                known = self.plans.cost
            self._tell()

    def _result(self) -> EngineResult:
        assert self.plans is not None  # noqa: S101 - made by the caller
        assert self.tree is not None  # noqa: S101
        problem, best = self.plans.problem, self.plans.best
        bound = self._bound()
        if best is None:
            impossible = self.tree.closed and math.isinf(self.tree.bound)
            known = bound * problem.money if math.isfinite(bound) else None
            return EngineResult(
                decisions=None, bound=None if impossible else known, impossible=impossible, note=self._note()
            )
        return EngineResult(
            decisions=problem.decisions(best),
            bound=bound * problem.money if math.isfinite(bound) else None,
            note="" if self.tree.closed else self._note(),
        )

    def _bound(self) -> float:
        """Return what no plan can undercut, in the problem's money."""
        assert self.plans is not None  # noqa: S101 - made by the caller
        assert self.tree is not None  # noqa: S101
        return min(max(self.root, self.tree.bound), self.plans.cost)

    def _halt(self) -> bool:
        return self.stop.requested or time.monotonic() - self.began >= self.settings.time_limit_s

    def _note(self) -> str:
        return "stopped on request" if self.stop.requested else "stopped by the time limit"

    def _say(self, phase: str) -> None:
        self.phase = phase
        self._tell()

    def _tell(self) -> None:
        cost, bound = math.inf, -math.inf
        money = 1.0
        if self.plans is not None and self.tree is not None:
            cost, bound, money = self.plans.cost, self._bound(), self.plans.problem.money
        self.listener.update(
            Progress(
                elapsed_s=time.monotonic() - self.began,
                cost=cost * money if np.isfinite(cost) else None,
                bound=bound * money if np.isfinite(bound) else None,
                phase=self.phase,
            )
        )
