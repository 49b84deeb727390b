"""
Branch and bound on the sites, with the Lagrangean bound in each node.

Nodes are taken best bound first, a pair at a time: two threads work on two nodes, and what they find is taken in the
order of the nodes, so that the result does not depend on which thread is faster. A node starts from its parent's
multipliers, fixes sites on the way, and splits on the site whose use in the averaged solution is least clear; where
every site is decided, its flows are solved exactly. The least bound of the nodes left is valid at any moment.
"""

from __future__ import annotations

import heapq
import itertools
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np

from siting.solving.bounding.incumbents import Incumbents
from siting.solving.bounding.relaxation import FREE, OPEN, SHUT, Box, Relaxation, least_count, site_use
from siting.solving.bounding.transport import SHUT_SITE

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from siting.arrays import Floats, Positions
    from siting.solving.bounding.problem import Problem
    from siting.solving.bounding.relaxation import Ascent

THREADS = 2
"""Nodes worked on at a time, also where there is one core: the answer must not depend on the machine."""
NODE_STEPS = 50
"""Greatest number of subgradient steps in a node."""
NODE_FACTOR = 0.3
"""First step factor in a node."""
NODE_PATIENCE = 8
"""Idle steps in a node after which the step factor is halved."""
PRICE_EVERY = 4
"""Every so many nodes of a thread, the rounded set is priced exactly."""
NEAR, NEAR_TRIALS = 0.002, 60
"""If it costs at most this much more than the best plan (relative), it is improved by so many moves."""
DIVE_EVERY = 32
"""Every so many nodes of a thread, sites are decided one by one down to a plan, which is then improved by moves."""
DIVE_STEPS = 25
"""Greatest number of steps after each decision of a dive."""
DIVE_TRIALS = 150
"""Moves tried at its end."""
FEWEST_TRIALS, MANY_ROWS = 4, 1000
"""With more rows than this the numbers of moves fall in proportion, but not below the first figure."""
CLEARLY_OPEN, CLEARLY_SHUT = 0.9, 0.02
"""Use in the averaged solution from which, and up to which, a dive decides a site without more steps."""
REPORT_EVERY = 8
"""Pairs of nodes between two reports."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Node:
    """A box with what its parent knew."""

    box: Box
    bound: float
    v: NDArray[np.float32]
    """(R,) multipliers to start from; halved in size, since any are valid."""
    mu: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Goal:
    """When a search may end."""

    gap: float
    """Distance between cost and bound, relative to the cost."""
    constant: float
    """Money a year that no decision changes: part of the cost that the gap is relative to."""

    def cutoff(self, cost: float) -> float:
        """Return the bound from which nothing matters, given the best cost; a safe margin above it for rounding."""
        return cost - (self.gap - SAFE) * abs(cost + self.constant) if np.isfinite(cost) else float("inf")


SAFE = 1e-9
"""Relative margin on the safe side by which a bound must clear the cost before a box is dropped or a site fixed."""


class Worker:
    """What one thread needs: a relaxation and a search for plans of its own."""

    def __init__(self, problem: Problem, halted: Callable[[], bool], seldom: int) -> None:
        self.relaxation = Relaxation(problem)
        self.incumbents = Incumbents(problem, self.relaxation, halted)
        self._problem = problem
        self._halted = halted
        self._seldom = seldom
        self._nodes = 0

    def work(self, node: Node, cutoff: float, cost: float) -> tuple[float, list[Node]]:
        """
        Bound a node and split it.

        Parameters
        ----------
        node
            What to bound.
        cutoff, cost
            Money a year from which the node does not matter, and of the best plan so far.

        Returns
        -------
        bound, children
            No children where the bound reaches the cutoff or the node's flows were solved exactly. Halted in between,
            the node itself is the only child.
        """
        problem, box = self._problem, node.box
        box = replace(box, fewest=max(box.fewest, least_count(problem, box)))
        free = int((box.state == FREE).sum())
        held = int((box.state == OPEN).sum())
        if held > box.most or box.fewest > min(box.most, held + free):
            return float("inf"), []
        if _decided(problem, box):
            priced = self.incumbents.price(_only_set(problem, box))
            return (node.bound, [node]) if self._halted() else (max(priced, node.bound), [])
        goal = cost if np.isfinite(cost) else node.bound + 0.05 * abs(node.bound)
        ascent = self.relaxation.ascend(
            box,
            node.v.astype(np.float64),
            steps=NODE_STEPS,
            target=goal + 5e-4 * abs(goal),
            cutoff=cutoff,
            factor=NODE_FACTOR,
            mu=node.mu,
            patience=NODE_PATIENCE,
            fix=np.isfinite(cutoff),
            halted=self._halted,
        )
        bound = max(node.bound, ascent.bound)
        if bound >= cutoff:
            return bound, []
        if self._halted():
            return bound, [replace(node, bound=bound)]
        self._look_for_plans(box, ascent, cutoff, goal)
        left = Node(box=replace(box, state=ascent.state), bound=bound, v=ascent.v.astype(np.float32), mu=ascent.mu)
        return bound, split(problem, left, ascent.used)

    def _look_for_plans(self, box: Box, ascent: Ascent, cutoff: float, goal: float) -> None:
        self._nodes += 1
        if self._nodes % (PRICE_EVERY * self._seldom) == self._seldom:
            self.incumbents.search(ascent.used, trials=self._trials(NEAR_TRIALS), near=NEAR)
        if self._nodes % (DIVE_EVERY * self._seldom) == self._seldom:
            self.incumbents.search(self._dive(box, ascent, cutoff, goal), trials=self._trials(DIVE_TRIALS))

    def _trials(self, most: int) -> int:
        """Return how many moves to try: fewer where there are so many rows that a move costs more than a node."""
        return max(FEWEST_TRIALS, min(most, most * MANY_ROWS // max(self._problem.rows, 1)))

    def _dive(self, box: Box, ascent: Ascent, cutoff: float, goal: float) -> Floats:
        """Decide clear sites, and at least one, in turns with a few steps; return what the last solution uses."""
        while not self._halted():
            state = ascent.state.copy()
            free = np.flatnonzero(state == FREE)
            if not free.size:
                break
            use = site_use(self._problem, ascent.used)[free]
            state[free[use <= CLEARLY_SHUT]] = SHUT
            clear = use >= CLEARLY_OPEN
            clear[np.argmax(use)] = True
            state[free[clear]] = OPEN
            box = replace(box, state=state)
            if int((state == OPEN).sum()) > box.most or least_count(self._problem, box) > box.most:
                break
            ascent = self.relaxation.ascend(
                box, ascent.v, steps=DIVE_STEPS, target=goal, cutoff=cutoff, factor=NODE_FACTOR, mu=ascent.mu,
                fix=False, halted=self._halted,
            )  # fmt: skip
        return ascent.used


def split(problem: Problem, node: Node, used: Floats) -> list[Node]:
    """
    Return the two halves of a node: a site open or shut, or the sizes of an open site, large or small.

    Parameters
    ----------
    problem
        Sites and options.
    node
        With the sites fixed so far.
    used
        (O,) how far the averaged solution opens each option.

    Returns
    -------
    halves
        Both, or the node itself where everything is decided.
    """
    box = node.box
    free = np.flatnonzero(box.state == FREE)
    if free.size:
        use = site_use(problem, used)[free]
        weight = np.sqrt(np.abs(problem.charge[problem.site_option[:-1]][free]) + 1e-12)
        site = free[int(np.argmax((np.minimum(use, 1.0 - use) + 1e-6) * weight))]
        boxes = [replace(box, state=_with(box.state, site, state)) for state in (OPEN, SHUT)]
    else:
        sized = _undecided_sizes(problem, box)
        if not sized.size:
            return [node]
        site = sized[0]
        allowed = _allowed(problem, box, site)
        share = used[allowed]
        edge = 1 + int(np.argmax(np.cumsum(share)[:-1] >= share.sum() / 2)) if share.sum() > 0 else allowed.size // 2
        boxes = [replace(box, charge=_without(box.charge, part)) for part in (allowed[:edge], allowed[edge:])]
    return [replace(node, box=half) for half in boxes]


def _with(state: NDArray[np.int8], site: np.integer[Any], value: int) -> NDArray[np.int8]:
    changed = state.copy()
    changed[site] = value
    return changed


def _without(charge: Floats, options: NDArray[np.int64]) -> Floats:
    changed = charge.copy()
    changed[options] = np.inf
    return changed


def _allowed(problem: Problem, box: Box, site: np.integer[Any]) -> NDArray[np.int64]:
    first, end = problem.site_option[site : site + 2]
    options: NDArray[np.int64] = first + np.flatnonzero(np.isfinite(box.charge[first:end]))
    return options


def _undecided_sizes(problem: Problem, box: Box) -> NDArray[np.int64]:
    """Return the open sites that may still have more than one size."""
    if problem.one_option_each:
        return np.zeros(0, dtype=np.int64)
    allowed = np.add.reduceat(np.isfinite(box.charge).astype(np.int64), problem.site_option[:-1])
    return np.flatnonzero((box.state == OPEN) & (allowed > 1))


def _decided(problem: Problem, box: Box) -> bool:
    return not bool((box.state == FREE).any()) and not _undecided_sizes(problem, box).size


def _only_set(problem: Problem, box: Box) -> Positions:
    """Return the one set of open options that a decided box allows."""
    chosen = np.full(problem.sites, SHUT_SITE, dtype=np.int32)
    for site in np.flatnonzero(box.state == OPEN):
        chosen[site] = _allowed(problem, box, site)[0]
    return chosen


def search_tree(  # noqa: PLR0913 - what a search starts from and reports to
    problem: Problem,
    root: Node,
    best: Incumbents,
    goal: Goal,
    *,
    halted: Callable[[], bool],
    report: Callable[[float], None],
    seldom: int = 1,
) -> float:
    """
    Search until the goal is met, nothing is left or the search is halted.

    Parameters
    ----------
    problem
        What to solve.
    root
        The first node, with its bound and multipliers.
    best
        Holds the best plan so far; gets better ones.
    goal
        When to stop.
    halted
        Asked often; True ends the search.
    report
        Told the bound now and then.
    seldom
        How many times as rarely as usual to look for plans on the way: more than 1 where the best one is good already.

    Returns
    -------
    bound
        Money a year without the problem's constant that no plan can undercut; at least the goal's cutoff when nothing
        is left, infinite when no plan exists.
    """
    workers = [Worker(problem, halted, seldom) for _ in range(THREADS)]
    order = itertools.count()
    heap: list[tuple[float, int, Node]] = [(root.bound, next(order), root)]
    least_dropped, turns = float("inf"), 0
    with ThreadPoolExecutor(THREADS) as pool:
        while heap and heap[0][0] < goal.cutoff(best.cost) and not halted():
            batch = [heapq.heappop(heap)[2] for _ in range(min(THREADS, len(heap)))]
            for worker in workers:
                worker.incumbents.offer(best.cost, best.chosen)
            cutoff, cost = goal.cutoff(best.cost), best.cost
            done = [pool.submit(worker.work, node, cutoff, cost) for worker, node in zip(workers, batch, strict=False)]
            for bound, children in (future.result() for future in done):
                if not children:
                    least_dropped = min(least_dropped, bound)
                for child in children:
                    heapq.heappush(heap, (bound, next(order), child))
            for worker in workers:
                best.offer(worker.incumbents.cost, worker.incumbents.chosen)
            turns += 1
            if turns % REPORT_EVERY == 0:
                report(min(heap[0][0] if heap else least_dropped, least_dropped))
    return min(least_dropped, heap[0][0] if heap else float("inf"))
