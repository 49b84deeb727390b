"""
A bound for every exact number of open sites, and the numbers that can still hold the best plan.

With the multipliers held, the bound is a convex function of the number of sites; so are the best bounds. Numbers are
taken outwards from the one that the relaxation likes, each from its neighbour's multipliers, until the bound reaches
the cutoff; one more bound, on all numbers beyond, then proves that none of those matters either.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from siting.solving.bounding.relaxation import Box, Relaxation, least_count

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.solving.bounding.problem import Problem
    from siting.solving.bounding.relaxation import Ascent

STEPS = 60
"""Subgradient steps for each number of sites."""
FACTOR = 0.3
"""First step factor for each."""
REACH = 8
"""Numbers looked at on each side of the one that the relaxation likes."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Counted:
    """Which numbers of sites matter."""

    bounds: dict[int, float]
    """Bound for each number looked at, money a year without the problem's constant."""
    fewest: int
    most: int


def bound_counts(  # noqa: PLR0913 - what the bounds start from
    problem: Problem,
    relaxation: Relaxation,
    box: Box,
    root: Ascent,
    *,
    target: float,
    cutoff: float,
    halted: Callable[[], bool],
) -> Counted:
    """
    Bound the numbers of sites around the one that the relaxation likes, and narrow their range.

    Parameters
    ----------
    problem, relaxation, box
        What to bound, with what, and what is still open to choice.
    root
        The relaxation of the box itself.
    target, cutoff
        As for `Relaxation.ascend`.
    halted
        Asked often; True ends the work with what is known.

    Returns
    -------
    counted
        The bounds, and the range outside which no plan is better than the cutoff.
    """
    fewest = max(box.fewest, least_count(problem, box))
    most = min(box.most, problem.sites)
    liked = min(max(round(float(root.used.sum())), fewest), most)
    bounds: dict[int, float] = {}

    def bound_range(low: int, high: int, near: Ascent) -> Ascent:
        return relaxation.ascend(
            replace(box, fewest=low, most=high), near.v, steps=STEPS, target=target, cutoff=cutoff, factor=FACTOR,
            mu=near.mu, fix=False, halted=halted,
        )  # fmt: skip

    ends = [fewest, most]
    for side, direction in enumerate((-1, 1)):
        near, last = root, (fewest, most)[side]
        for count in range(liked, last + direction, direction):
            if abs(count - liked) > REACH or halted():
                break
            near = bound_range(count, count, near)
            if not halted():
                bounds[count] = max(bounds.get(count, near.bound), near.bound)
            if near.bound >= cutoff:
                beyond = (fewest, count) if direction < 0 else (count, most)
                if bound_range(*beyond, near).bound >= cutoff:
                    ends[side] = count - direction
                break
    if ends[0] > ends[1]:
        ends = [fewest, most]
    return Counted(bounds=bounds, fewest=ends[0], most=ends[1])
