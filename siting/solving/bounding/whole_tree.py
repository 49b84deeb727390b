"""
Branch and bound on the yes-or-no columns and on the number of sites and suppliers, over a program that prices lanes in.

A *lever* is what a node splits: a binary, the number of open sites, or the number of signed suppliers. Every node keeps
the bound that prices prove over all lanes; what is cut off or fixed keeps the bound it was cut at. The bound of the
whole is the least of them, valid at any moment.

References
----------
Land & Doig (1960), Econometrica 28(3): 497-520; pseudo-costs: Benichou et al. (1971), Mathematical Programming 1:
76-94; reliability branching: Achterberg, Koch & Martin (2005), Operations Research Letters 33(1): 42-54.
"""

from __future__ import annotations

import heapq
import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.whole_bound import SAFE
from siting.solving.bounding.whole_levers import score
from siting.solving.bounding.whole_program import Ending

if TYPE_CHECKING:
    import highspy

    from siting.arrays import Floats
    from siting.solving.bounding.whole_bound import Sides
    from siting.solving.bounding.whole_levers import Levers
    from siting.solving.bounding.whole_plans import Plans
    from siting.solving.bounding.whole_problem import WholeProblem
    from siting.solving.bounding.whole_program import LaneProgram, Relaxed, Spot

SURE = 2
"""Splits of a lever seen, on average of both sides, from which on its record is believed without a trial."""

TRIALS = 8
"""Levers tried at most at a node."""

NODE_ROUNDS = 4
"""Rounds of pricing and linking at a node that is split anyway."""

TRIAL_STEPS = 60
"""Simplex steps of a trial at most."""


@dataclass(order=True, slots=True)
class Node:
    """A part of the search that is still open."""

    bound: float
    number: int
    lower: Floats = field(compare=False)
    """(levers,)"""
    upper: Floats = field(compare=False)
    """(levers,)"""
    depth: int = field(compare=False)
    lever: int = field(compare=False, default=-1)
    """Lever that its parent split, to learn from; -1 at the root."""
    up: bool = field(compare=False, default=False)
    away: float = field(compare=False, default=0.0)
    """How far the lever was moved."""
    spot: Spot | None = field(compare=False, default=None)
    """Where the simplex stood at its parent."""


class Tree:
    """The search; `bound` and `plans` are valid after every step."""

    def __init__(self, problem: WholeProblem, program: LaneProgram, levers: Levers, plans: Plans, gap: float) -> None:
        self._problem = problem
        self._program = program
        self._plans = plans
        self._gap = gap
        self.levers = levers
        lower, upper = self.levers.whole()
        self.open: list[Node] = [Node(bound=-math.inf, number=0, lower=lower, upper=upper, depth=0)]
        self.floor = math.inf
        """Least bound of all that was cut off."""
        self._here: Node | None = None
        self.made = 1
        self.done = 0

    @property
    def bound(self) -> float:
        """Return what no plan can undercut, in the problem's money."""
        least = min(self.floor, self.open[0].bound if self.open else math.inf)
        return least if self._here is None else min(least, self._here.bound)

    @property
    def enough(self) -> float:
        """Return the bound at which a node need not be searched."""
        best = self._plans.cost
        return best - self._gap * abs(best) if math.isfinite(best) else math.inf

    @property
    def closed(self) -> bool:
        """Return whether nothing is left to search."""
        return self._here is None and (not self.open or self.bound >= self.enough)

    def root_sides(self) -> Sides:
        """Return the bounds of columns and rows before anything is split."""
        return self.levers.sides(*self.levers.whole())

    def step(self) -> None:
        """Search one node: the child just made, or the open node of least bound."""
        node = self._here or heapq.heappop(self.open)
        if self._here is None and node.spot is not None and node.bound < self.enough:
            self._program.return_to(node.spot)
        self._here = node
        if node.bound >= self.enough:
            self._close(node)
            return
        relaxed = self._relax(node)
        if relaxed.ending is Ending.HALTED:
            node.bound = max(node.bound, relaxed.bound)
            return
        self.done += 1
        if node.lever >= 0 and math.isfinite(node.bound) and math.isfinite(relaxed.bound):
            self.levers.learn(node.lever, up=node.up, gain=relaxed.bound - node.bound, away=node.away)
        node.bound = max(node.bound, relaxed.bound)
        if relaxed.ending in {Ending.CUT, Ending.EMPTY}:
            self._close(node)
            return
        self._fix(node, relaxed)
        self._branch(node, relaxed)

    def _relax(self, node: Node) -> Relaxed:
        """Solve a node, to the end only where its levers come out whole: a split needs no more than a good idea."""
        sides = self.levers.sides(node.lower, node.upper)
        relaxed = self._program.solve(sides, enough=self.enough, rounds=NODE_ROUNDS)
        if relaxed.ending is Ending.NEARLY and not self.levers.fractional(self.levers.values(relaxed.values)).size:
            relaxed = self._program.solve(sides, enough=self.enough)
        return relaxed

    def _close(self, node: Node) -> None:
        self.floor = min(self.floor, node.bound)
        self._here = None

    def _fix(self, node: Node, relaxed: Relaxed) -> None:
        """Fix the binaries whose other value would lift the bound to where the node is not needed."""
        if relaxed.priced is None or not math.isfinite(self.enough):
            return
        size = self._problem.places.binaries
        reduced = relaxed.priced.reduced[:size]
        slack = self.enough - relaxed.priced.bound + SAFE * abs(self.enough)
        free = node.lower[:size] < node.upper[:size]
        shut, opened = free & (reduced > slack), free & (-reduced > slack)
        if shut.any() or opened.any():
            self.floor = min(self.floor, self.enough)
            node.upper[:size][shut] = 0.0
            node.lower[:size][opened] = 1.0

    def _branch(self, node: Node, relaxed: Relaxed) -> None:
        value = self.levers.values(relaxed.values)
        levers = self.levers.fractional(value)
        levers = levers[node.lower[levers] < node.upper[levers]]
        if not levers.size:
            self._leaf(node, relaxed)
            return
        lever = self._choose(node, relaxed, levers, value)
        if self._program.halted:
            return
        self._split(node, lever, float(value[lever]))

    def _leaf(self, node: Node, relaxed: Relaxed) -> None:
        """Price the plan of levers that are all whole; where it does not reach the bound, keep what differs from it."""
        held = np.rint(relaxed.values[: self.levers.split])
        tried = self._plans.try_binaries(held, self.enough)
        if self._program.halted:
            return
        if tried.bound <= node.bound + SAFE * abs(node.bound) or relaxed.priced is None:
            self._close(node)
            return
        self.floor = min(self.floor, max(tried.bound, node.bound))
        self._but(node, relaxed, held)
        self._here = None

    def _but(self, node: Node, relaxed: Relaxed, held: Floats) -> None:
        """Open a node for each free lever: that one differs from `held`, those before it do not."""
        assert relaxed.priced is not None  # noqa: S101 - asked for by the caller
        free = np.flatnonzero(node.lower[: held.size] < node.upper[: held.size])
        reduced = np.abs(relaxed.priced.reduced[free])
        lower, upper = node.lower.copy(), node.upper.copy()
        for lever, lift in sorted(zip(free.tolist(), reduced.tolist(), strict=True), key=lambda both: -both[1]):
            bound = max(node.bound, relaxed.priced.bound + lift - SAFE * abs(node.bound))
            other = Node(bound, self.made, lower.copy(), upper.copy(), node.depth + 1)
            other.lower[lever] = other.upper[lever] = 1.0 - held[lever]
            lower[lever] = upper[lever] = held[lever]
            self.made += 1
            heapq.heappush(self.open, other)

    def _split(self, node: Node, lever: int, value: float) -> None:
        """Make both children; go on with the one nearer to the relaxation, leave the other open."""
        children = []
        spot = self._program.spot()
        for up in (False, True):
            lower, upper = node.lower.copy(), node.upper.copy()
            (lower if up else upper)[lever] = math.ceil(value) if up else math.floor(value)
            away = math.ceil(value) - value if up else value - math.floor(value)
            children.append(Node(node.bound, self.made + int(up), lower, upper, node.depth + 1, lever, up, away, spot))
        self.made += 2
        first = int(value - math.floor(value) >= 0.5) if lever < self.levers.count - 2 else 1  # noqa: PLR2004
        heapq.heappush(self.open, children[1 - first])
        self._here = children[first] if node.bound <= self._dive_limit() else None
        if self._here is None:
            heapq.heappush(self.open, children[first])

    def _dive_limit(self) -> float:
        """Return the bound up to which a child is searched at once rather than the open node of least bound."""
        if not self.open or not math.isfinite(self.enough):
            return math.inf
        least = min(self.floor, self.open[0].bound)
        return least + 0.3 * max(self.enough - least, 0.0)

    def _choose(self, node: Node, relaxed: Relaxed, levers: np.ndarray, value: Floats) -> int:
        """Return the lever to split: by record where it is known, by trial where not."""
        scores, seen = self.levers.record(levers, value)
        order = np.lexsort((np.abs(value[levers] - np.floor(value[levers]) - 0.5), -scores))
        best, best_score = int(levers[order[0]]), -1.0
        trials = 0
        basis = None
        for k in order.tolist():
            lever = int(levers[k])
            if seen[k] >= SURE or trials >= TRIALS:
                if scores[k] > best_score:
                    best, best_score = lever, float(scores[k])
                continue
            if basis is None:
                basis = self._program.highs.getBasis()
            trials += 1
            found = self._try(node, relaxed, lever, float(value[lever]), basis)
            if found > best_score:
                best, best_score = lever, found
            if self._program.halted:
                break
        return best

    def _try(self, node: Node, relaxed: Relaxed, lever: int, value: float, basis: highspy.HighsBasis) -> float:
        """Return the score of a split by a few steps of the simplex on either side."""
        gains = []
        for up in (False, True):
            lower, upper = node.lower.copy(), node.upper.copy()
            (lower if up else upper)[lever] = math.ceil(value) if up else math.floor(value)
            reached = self._program.try_sides(self.levers.sides(lower, upper), basis, TRIAL_STEPS)
            gain = min(reached, self.enough) - relaxed.value if math.isfinite(reached) else math.nan
            if math.isnan(gain):
                gain = self.enough - relaxed.value if math.isfinite(self.enough) else abs(relaxed.value) * 0.01
            else:
                away = math.ceil(value) - value if up else value - math.floor(value)
                self.levers.learn(lever, up=up, gain=gain, away=away)
            gains.append(gain)
        return float(score(np.array(gains[0]), np.array(gains[1])))
