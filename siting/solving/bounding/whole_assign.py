"""
Sources of single-sourced customers by hand: read off a relaxation with sites held, made to fit, then improved.

Every customer goes whole to the origin that served most of it. Origins that hold too much pass customers on, singly or
in exchange for smaller ones, at the least cost for each load that is relieved; then whatever passing on or exchange
saves money is done. The result is a plan only once its flows have been solved.

References
----------
Martello & Toth (1990), Knapsack Problems, chapter 7: the generalised assignment problem by greedy steps and shifts.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.solving.bounding.whole_problem import WholeProblem
    from siting.solving.bounding.whole_program import Relaxed

STEPS = 2000
"""Customers passed on or exchanged at most, in making it fit and again in improving."""

ASIDE = 200
"""Customers that are not where they are cheapest, looked at together for an exchange; those it costs most."""

FULL = 1e-9
"""Relative overload that counts as none."""


def assigned(problem: WholeProblem, relaxed: Relaxed, held: Floats) -> Floats | None:
    """
    Return sources that fit, near a relaxation.

    Parameters
    ----------
    problem
        What is to be decided.
    relaxed
        Solved with sites and suppliers held.
    held
        Shape (options + suppliers,). What is open and signed.

    Returns
    -------
    taken
        (pairs,) 1 where the origin is the source; None where it could not be made to fit.
    """
    work = _Assignment(problem, relaxed, held)
    if not work.fit():
        return None
    work.improve()
    taken = np.zeros(problem.places.pair.size)
    taken[work.pair[work.source, np.arange(work.source.size)]] = 1.0
    return taken


class _Assignment:
    """Customers (J) at origins (I) that are open; dense arrays (I, J)."""

    def __init__(self, problem: WholeProblem, relaxed: Relaxed, held: Floats) -> None:
        pairs, network, places = problem.most.pairs, problem.network, problem.places
        capacity = np.concatenate([np.zeros(len(network.sites)), network.supplier_capacity])
        np.add.at(
            capacity, network.option_site[held[: places.option.size] > 0],
            network.option_capacity[held[: places.option.size] > 0],
        )  # fmt: skip
        capacity[len(network.sites) :][held[places.option.size :] <= 0] = 0.0
        split = pairs.of_outbound < 0
        moved = relaxed.values[places.outbound[split]] * problem.most.outbound_demand[split]
        np.subtract.at(capacity, network.outbound.origin[split], moved * network.load[network.outbound.good[split]])
        column = places.pair
        usable = np.flatnonzero((problem.upper[column] > 0) & (capacity[pairs.origin] > 0))
        origins, row = np.unique(pairs.origin[usable], return_inverse=True)
        customers, at = np.unique(pairs.customer, return_inverse=True)
        at = at[usable]
        shape = (origins.size, customers.size)
        cost = problem.cost[column]
        if network.two_echelons and relaxed.priced is not None:
            cost = relaxed.priced.before[column]  # what comes in is in the price of the balance
        self.pair = np.zeros(shape, dtype=np.int64)
        self.pair[row, at] = usable
        self.cost = np.full(shape, np.inf)
        self.cost[row, at] = cost[usable]
        part = np.full(shape, -1.0)
        part[row, at] = relaxed.values[column[usable]]
        self.load = np.zeros(customers.size)
        self.load[at] = pairs.load[usable]
        self._possible = bool(origins.size) and bool(np.isfinite(self.cost).any(axis=0).all())
        self.source = np.argmax(part, axis=0) if origins.size else np.zeros(customers.size, dtype=np.int64)
        self.room = capacity[origins] - np.bincount(self.source, self.load, minlength=origins.size)
        self._noise = FULL * np.maximum(capacity[origins], 0.0)

    def fit(self) -> bool:
        """Pass customers on from origins that hold too much; return whether everything fits in the end."""
        if not self._possible:
            return False
        for _ in range(STEPS):
            over = -self.room - self._noise
            origin = int(np.argmax(over))
            if over[origin] <= 0:
                return True
            if not (self._relieve_by_passing(origin) or self._relieve_by_exchange(origin)):
                return False
        return False

    def _relieve_by_passing(self, origin: int) -> bool:
        mine = np.flatnonzero(self.source == origin)
        extra = self.cost[:, mine] - self.cost[origin, mine]
        extra[self.room[:, None] + self._noise[:, None] < self.load[mine]] = np.inf
        extra[origin] = np.inf
        rate = extra / np.maximum(np.minimum(self.load[mine], -self.room[origin]), 1e-300)
        to, k = np.unravel_index(int(np.argmin(rate)), rate.shape)
        if not np.isfinite(rate[to, k]):
            return False
        self._pass_on(int(mine[k]), int(to))
        return True

    def _relieve_by_exchange(self, origin: int) -> bool:
        mine = np.flatnonzero(self.source == origin)
        extra, relief = self._exchanges(mine)
        rate = np.full(extra.shape, np.inf)
        np.divide(extra, np.minimum(relief, -self.room[origin]), out=rate, where=relief > self._noise[origin])
        if not rate.size or not np.isfinite(rate.min()):
            return False
        k, other = np.unravel_index(int(np.argmin(rate)), rate.shape)
        self._exchange(int(mine[k]), int(other))
        return True

    def _exchanges(self, some: NDArray[np.int64]) -> tuple[Floats, Floats]:
        """Return what exchanging each of some customers with each other costs, and how far its origin is relieved."""
        here, there = self.source[some][:, None], self.source[None, :]
        everyone = np.arange(self.source.size)
        extra = self.cost[there, some[:, None]] - self.cost[here, some[:, None]]
        extra = extra + self.cost[here, everyone[None, :]] - self.cost[there, everyone[None, :]]
        relief = self.load[some][:, None] - self.load[None, :]
        extra[(self.room + self._noise)[there] < relief] = np.inf
        extra[here == there] = np.inf
        return extra, relief

    def improve(self) -> None:
        """Pass on or exchange whatever saves money, the greatest saving first."""
        everyone = np.arange(self.source.size)
        least = -1e-9 * float(np.abs(self.cost[self.source, everyone]).sum())
        for _ in range(STEPS):
            now = self.cost[self.source, everyone]
            extra = self.cost - now
            extra[self.room[:, None] + self._noise[:, None] < self.load] = np.inf
            extra[self.source, everyone] = np.inf
            to, customer = np.unravel_index(int(np.argmin(extra)), extra.shape)
            if extra[to, customer] < least:
                self._pass_on(int(customer), int(to))
            elif not self._exchange_to_save(now - self.cost.min(axis=0), least):
                return

    def _exchange_to_save(self, aside: Floats, least: float) -> bool:
        some = np.argsort(-aside, kind="stable")[: min(ASIDE, int((aside > 0).sum()))]
        if not some.size:
            return False
        extra, relief = self._exchanges(some)
        extra[(self.room + self._noise)[self.source[some]][:, None] < -relief] = np.inf
        k, other = np.unravel_index(int(np.argmin(extra)), extra.shape)
        if not extra[k, other] < least:
            return False
        self._exchange(int(some[k]), int(other))
        return True

    def _pass_on(self, customer: int, to: int) -> None:
        self.room[self.source[customer]] += self.load[customer]
        self.room[to] -= self.load[customer]
        self.source[customer] = to

    def _exchange(self, one: int, other: int) -> None:
        here, there = int(self.source[one]), int(self.source[other])
        self._pass_on(one, there)
        self._pass_on(other, here)
