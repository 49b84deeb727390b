"""
Plans found on the way: sets read off the averaged solution, improved by moves, and the best one kept.

Sizes: a move opens a site in its most promising size; after the moves each open site is tried in its other sizes.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.relaxation import site_use
from siting.solving.bounding.transport import SHUT_SITE, Transport

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.arrays import Flags, Floats, Positions
    from siting.solving.bounding.problem import Problem
    from siting.solving.bounding.relaxation import Relaxation


class Incumbents:
    """The best plan of a problem so far, and how to look for better ones."""

    def __init__(self, problem: Problem, relaxation: Relaxation, halted: Callable[[], bool]) -> None:
        self.problem = problem
        self.cost = float("inf")
        """Money a year without the problem's constant; infinite before the first plan."""
        self.chosen = np.full(problem.sites, SHUT_SITE, dtype=np.int32)
        """(S,) the option of each open site of the best plan."""
        self._transport = Transport(problem, relaxation)
        self._halted = halted
        self._seen: set[bytes] = set()

    def offer(self, cost: float, chosen: Positions) -> bool:
        """Keep a plan if it is the best so far; return whether it is."""
        if not cost < self.cost:
            return False
        self.cost, self.chosen = cost, chosen.copy()
        return True

    def start_from(self, chosen: Positions) -> None:
        """Take a set of open options that is known to serve everything, whatever was asked in the meantime."""
        self.offer(self._transport.cost_of(chosen), chosen)

    def try_all(self) -> bool:
        """Open as much as the limit on the number of sites allows; return whether that serves everything."""
        problem = self.problem
        order = np.lexsort((-problem.greatest, ~problem.must_open))
        chosen = np.full(problem.sites, SHUT_SITE, dtype=np.int32)
        taken = order[: problem.most]
        chosen[taken] = problem.site_option[:-1][taken]
        cost = self._transport.cost_of(chosen, halted=self._halted)
        self.offer(cost, chosen)
        return cost < float("inf")

    def round_up(self, used: Floats) -> Positions:
        """
        Return a set of open options read off an averaged solution: the most used, until they can hold all demand.

        Parameters
        ----------
        used
            (O,) how far the averaged solution opens each option.

        Returns
        -------
        chosen
            (S,) as for `Transport.cost_of`.
        """
        problem = self.problem
        use = site_use(problem, used) + problem.must_open
        order = np.lexsort((np.arange(problem.sites), -use))
        chosen = np.full(problem.sites, SHUT_SITE, dtype=np.int32)
        left = problem.demand.sum()
        for count, site in enumerate(order):
            enough = left <= 0 and count >= problem.fewest
            if count >= problem.most or (enough and use[site] < 1 / 2):
                break
            first, end = problem.site_option[site], problem.site_option[site + 1]
            chosen[site] = first + int(np.argmax(used[first:end]))
            left -= problem.capacity[chosen[site]]
        return chosen

    def search(self, used: Floats, *, trials: int, near: float = np.inf) -> bool:
        """
        Round an averaged solution, improve it by moves and keep it if best.

        Parameters
        ----------
        used
            (O,) how far the averaged solution opens each option.
        trials
            Greatest number of moves tried.
        near
            Moves are tried only on a set that costs at most this much more than the best plan (relative).

        Returns
        -------
        found
            Whether the best plan got better.
        """
        return self.improve(self.round_up(used), trials=trials, near=near)

    def improve(self, chosen: Positions, *, trials: int, near: float = np.inf) -> bool:
        """Improve a set of open options by moves, as `search` does; return whether the best plan got better."""
        mark = chosen.tobytes()
        if mark in self._seen:
            return False
        self._seen.add(mark)  # a set is tried once
        cost = self._transport.cost_of(chosen, halted=self._halted)
        if not np.isfinite(cost):
            cost, chosen = self._mended(chosen)
        if not np.isfinite(cost):
            return False
        problem = self.problem
        found = self.offer(cost, chosen)
        if cost > self.cost + near * abs(self.cost):
            return found
        fixed = problem.must_open.astype(np.int8)
        cost, chosen = self._transport.descend(
            cost, fixed, problem.fewest, problem.most, trials=trials, halted=self._halted
        )
        found |= self.offer(cost, chosen)
        if not problem.one_option_each:
            found |= self._resize(cost, chosen)
        return found

    def _mended(self, chosen: Positions) -> tuple[float, Positions]:
        """Return a set that cannot serve everything with its sizes at their greatest and, if need be, more sites."""
        problem = self.problem
        mended = np.where(chosen >= 0, problem.site_option[:-1], SHUT_SITE).astype(np.int32)
        cost = self._transport.cost_of(mended, halted=self._halted)
        order = np.argsort(-problem.greatest, kind="stable")
        for site in order[mended[order] < 0]:
            if np.isfinite(cost) or int((mended >= 0).sum()) >= problem.most or self._halted():
                break
            mended[site] = problem.site_option[site]
            cost = self._transport.cost_of(mended, halted=self._halted)
        return cost, mended

    def _resize(self, cost: float, chosen: Positions) -> bool:
        """Try each open site in its other sizes until none saves; return whether the best plan got better."""
        problem = self.problem
        found, better = False, True
        while better and not self._halted():
            better = False
            for site in np.flatnonzero(chosen >= 0):
                for option in range(problem.site_option[site], problem.site_option[site + 1]):
                    other = chosen.copy()
                    other[site] = option
                    price = self._transport.cost_of(other, halted=self._halted)
                    if price < cost - 1e-9 * abs(cost):
                        cost, chosen, better = price, other, True
            found |= self.offer(cost, chosen)
        return found

    def descend(self, chosen: Positions, stays: Flags, *, trials: int) -> tuple[float, Positions]:
        """
        Return what moves make of a set while some sites stay as they are; the best plan is left alone.

        Parameters
        ----------
        chosen
            (S,) the option of each open site, `SHUT_SITE` elsewhere.
        stays
            (S,) True for sites that no move may touch.
        trials
            Greatest number of moves tried.

        Returns
        -------
        cost, chosen
            Money a year without the problem's constant, infinite where the set cannot serve everything; and the set.
        """
        problem = self.problem
        cost = self._transport.cost_of(chosen, halted=self._halted)
        if not np.isfinite(cost):
            return cost, chosen
        fixed = (problem.must_open | stays).astype(np.int8)
        return self._transport.descend(cost, fixed, problem.fewest, problem.most, trials=trials, halted=self._halted)

    def price(self, chosen: Positions) -> float:
        """Return the exact cost of a set of open options, keeping it if best."""
        cost = self._transport.cost_of(chosen, halted=self._halted)
        self.offer(cost, chosen)
        return cost
