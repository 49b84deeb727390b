"""
Search many networks that differ in rulings and counts alone: what they share is worked out once.

Each has the lanes of the others and nearly their multipliers, and begins from a plan that serves everything. So its
lanes are not sorted anew, the bound begins near its top, and plans are looked for seldom: those at hand are good.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.listener import Silent, Stop
from siting.solving.bounding.incumbents import Incumbents
from siting.solving.bounding.problem import handles, problem_of, row_lanes
from siting.solving.bounding.relaxation import Relaxation, whole_box
from siting.solving.bounding.run import Run, chosen_of
from siting.solving.bounding.tree import NODE_FACTOR, NODE_PATIENCE

if TYPE_CHECKING:
    from siting.arrays import Floats
    from siting.listener import Listener
    from siting.network.decisions import Decisions
    from siting.network.freight import LegLanes
    from siting.network.network import Network
    from siting.solving.bounding.problem import RowLanes
    from siting.solving.bounding.relaxation import Ascent, Box
    from siting.solving.engine import EngineResult
    from siting.study.settings import SolveSettings

FIRST_STEPS = 400
"""Greatest number of steps for the multipliers that all searches begin from."""
STEPS = 50
"""Greatest number of steps at the root of each search, and of those in which sites are fixed after them."""
TRIALS = 60
"""Moves tried on the plan that a search begins from, and on the first one read off its relaxation."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Begun:
    """What searches of networks with the same lanes and demand begin from."""

    outbound: LegLanes
    demand: Floats
    lanes: RowLanes
    v: Floats
    """(R,) multipliers, money per load: any are valid, these are good."""
    mu: float
    """That of the covering row."""

    def serves(self, network: Network) -> bool:
        """Return whether a network has the lanes and the demand of these, and nothing the search cannot take."""
        return network.outbound is self.outbound and network.demand is self.demand and handles(network) is None


def begin(network: Network, decisions: Decisions) -> Begun | None:
    """
    Return what searches of a network under other rulings and counts begin from.

    Parameters
    ----------
    network
        The one that the others are made from.
    decisions
        Of a plan of it that serves everything.

    Returns
    -------
    begun
        None where the network asks for something that the search by sites cannot take, or for nothing at all.
    """
    if handles(network) is not None:
        return None
    lanes = row_lanes(network)
    problem = problem_of(network, lanes)
    if not problem.rows or not problem.sites:
        return None
    relaxation = Relaxation(problem)
    best = Incumbents(problem, relaxation, lambda: False)
    best.start_from(chosen_of(problem, decisions))
    root = relaxation.ascend(
        whole_box(problem), relaxation.first_multipliers(), steps=FIRST_STEPS, target=best.cost, cutoff=best.cost,
        fix=False,
    )  # fmt: skip
    return Begun(outbound=network.outbound, demand=network.demand, lanes=lanes, v=root.v, mu=root.mu)


def search_again(  # noqa: PLR0913 - an engine's inputs, and what is shared
    network: Network,
    settings: SolveSettings,
    begun: Begun,
    *,
    start: Decisions,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> EngineResult:
    """
    Search a network that `begun` serves, until the gap, the time limit or `stop`.

    Parameters
    ----------
    network
        Like the one `begun` is of but for rulings, counts and options.
    settings
        Gap and time limit.
    begun
        What all these searches begin from.
    start
        A known feasible set of decisions.
    listener, stop
        As for every engine.

    Returns
    -------
    result
        Without bounds for numbers of sites.
    """
    return _Again(network, settings, listener or Silent(), stop or Stop(), begun).solve(start)


class _Again(Run):
    """One of many solves."""

    seldom = 256
    fixing_steps = STEPS

    def __init__(self, network: Network, settings: SolveSettings, listener: Listener, stop: Stop, begun: Begun) -> None:
        super().__init__(network, settings, listener, stop, problem_of(network, begun.lanes))
        self._begun = begun

    def solve(self, start: Decisions | None) -> EngineResult:
        """Return the result of all phases, begun from a plan."""
        if start is None:
            return super().solve(start)
        problem = self._problem
        relaxation = Relaxation(problem)
        best = self._best = Incumbents(problem, relaxation, self._halted)
        first = chosen_of(problem, start)
        best.start_from(first)
        best.improve(first, trials=TRIALS)
        box = whole_box(problem)
        root = self._climb(relaxation, best, box)
        if not self._met(best) and not self._halted():
            self._branch(relaxation, best, box, root)
        return self._result(best)

    def _climb(self, relaxation: Relaxation, best: Incumbents, box: Box) -> Ascent:
        """Raise the bound at the root from the multipliers at hand, and look for a plan once."""
        root = relaxation.ascend(
            box, self._begun.v, steps=STEPS, target=self._target(best), cutoff=self._cutoff(best), factor=NODE_FACTOR,
            mu=self._begun.mu, patience=NODE_PATIENCE, fix=False, halted=self._halted,
        )  # fmt: skip
        self._report(root.bound, "raising the bound")
        if not self._met(best):
            best.search(root.used, trials=TRIALS)
        return root
