"""
Why a study is impossible, and the smallest repair, in words.

One family of requirements at a time is made elastic while all others hold. Every family that alone repairs the study is
reported with the least it has to give, in its own unit. Only where none does, the smallest combination is sought: the
fewest families, each then giving the least it can, one after the other.
"""

from __future__ import annotations

import time
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from siting.network.network import build_network
from siting.plan.plan import Reason
from siting.solving.conflicts import find_conflicts
from siting.solving.elastic import Repair
from siting.solving.repair_words import Words
from siting.solving.requirements import Requirement, asked, lifted
from siting.solving.softening import softened

if TYPE_CHECKING:
    from siting.arrays import Flags
    from siting.listener import Stop
    from siting.network.network import Network
    from siting.study.tables import Study

EXPLAIN_SECONDS = 60.0
"""Time an explanation may take in all; what was not found by then is not reported."""


def explain(
    study: Study, network: Network, *, time_limit_s: float = EXPLAIN_SECONDS, stop: Stop | None = None
) -> tuple[tuple[Reason, ...], bool]:
    """
    Return why a study is impossible: which requirements cannot be met, and by how much.

    Parameters
    ----------
    study
        Checked.
    network
        Its numbers.
    time_limit_s
        Seconds for the whole explanation.
    stop
        Once requested, what was found so far is returned.

    Returns
    -------
    reasons, together
        Each reason alone repairs the study; or, `together`, only all of them do. Empty where the study is possible;
        one reason of the family `not-found` where time ran out before any repair was found.

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    clock = _Clock(time_limit_s, stop)
    repairs, together = _repairs(study, network, clock)
    if not repairs and not clock.left(1):
        return (_not_found(study),), False
    words = Words(study, network)
    rules = () if together else tuple(repair for repair in repairs if repair.requirement is Requirement.RULES)
    conflicts = [conflict for repair in rules for conflict in find_conflicts(study, repair, clock.left(1), stop)]
    return tuple(words.reason(repair, conflicts, together=together) for repair in repairs), together


def find_repairs(
    study: Study, network: Network, *, time_limit_s: float = EXPLAIN_SECONDS, stop: Stop | None = None
) -> tuple[tuple[Repair, ...], bool]:
    """
    Return the smallest repairs of an impossible study, limit by limit, in numbers and names.

    Parameters
    ----------
    study, network, time_limit_s, stop
        As for `explain`.

    Returns
    -------
    repairs, together
        As for `explain`.

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    return _repairs(study, network, _Clock(time_limit_s, stop))


def _not_found(study: Study) -> Reason:
    families = ", ".join(asked(study))
    return Reason(
        family="not-found",
        sentence=f"Time ran out before any repair was found. The study asks for {families}: lift one and plan again.",
        amount=None,
        unit="",
    )


class _Clock:
    """The time an explanation has left."""

    def __init__(self, seconds: float, stop: Stop | None) -> None:
        self._end = time.monotonic() + seconds
        self.stop = stop

    def left(self, parts: int) -> float:
        """Return the seconds for the next of so many parts that are still to do; 0 once stopped."""
        if self.stop is not None and self.stop.requested:
            return 0.0
        return max(self._end - time.monotonic(), 0.0) / parts


def _repairs(study: Study, network: Network, clock: _Clock) -> tuple[tuple[Repair, ...], bool]:
    stuck = unreachable(study)
    if stuck.any():
        return _beside_stuck(study, stuck, clock)
    families = asked(study)
    alone: list[Repair] = []
    for done, family in enumerate(families):
        if not clock.left(1):
            break
        elastic = softened(study, network, {family})
        repair = elastic.minimise(family, clock.left(len(families) - done), clock.stop)
        if repair is not None and not repair.parts:
            return (), False  # nothing has to give: the study is possible
        if repair is not None:
            alone.append(repair)
    if alone or not families or not clock.left(1):
        return tuple(alone), False
    repairs = _smallest_combination(study, network, families, clock)
    return repairs, len(repairs) > 1  # one family is enough where its search alone ran out of time


def _beside_stuck(study: Study, stuck: Flags, clock: _Clock) -> tuple[tuple[Repair, ...], bool]:
    """Return the customers that nothing can serve, and what else is wrong without them."""
    names = [row.customer for row, is_stuck in zip(study.customers, stuck, strict=True) if is_stuck]
    lanes = Repair(
        requirement=Requirement.LANES,
        amount=float(len(names)),
        parts=tuple(((name,), 1.0) for name in names),
        smallest=True,
    )
    served = replace(
        study,
        customers=tuple(
            replace(row, demand=0.0) if row.customer in names and row.demand is not None else row
            for row in study.customers
        ),
        demands=tuple(row for row in study.demands if row.customer not in names),
    )
    others, together = _repairs(served, build_network(served), clock)
    return (lanes, *(others if together else others[:1])), bool(others)


def _smallest_combination(
    study: Study, network: Network, families: tuple[Requirement, ...], clock: _Clock
) -> tuple[Repair, ...]:
    """Return the repairs of the fewest families that repair the study together; earlier families win a tie."""
    weights = {family: len(families) ** 2 + place for place, family in enumerate(families)}
    every = softened(study, network, set(families))
    while clock.left(1) > 0:
        chosen = every.fewest_families(weights, clock.left(2), clock.stop)
        if chosen is None:
            break
        repairs = _in_turn(study, network, tuple(family for family in families if family in chosen), clock)
        if repairs:
            return repairs
        every.exclude(chosen)
    return ()


def _in_turn(study: Study, network: Network, families: tuple[Requirement, ...], clock: _Clock) -> tuple[Repair, ...]:
    """Return the least each family gives, one after the other, each holding what the ones before give."""
    elastic = softened(study, network, set(families))
    smallest: list[bool] = []
    for done, family in enumerate(families):
        repair = elastic.minimise(family, clock.left(len(families) - done), clock.stop)
        if repair is None:
            return ()
        elastic.hold(repair)
        smallest.append(repair.smallest)
    return tuple(elastic.given(family, smallest=proved) for family, proved in zip(families, smallest, strict=True))


def unreachable(study: Study) -> Flags:
    """
    Return the customers that nothing can serve, whatever is lifted.

    Parameters
    ----------
    study
        Checked.

    Returns
    -------
    stuck
        Shape (customers,). True where some good the customer needs has no lane to it from any site that can get the
        good, nor straight from a supplier.
    """
    network = build_network(lifted(study, set(Requirement)))
    shape = (len(network.sites), len(network.goods))
    holds = np.full(shape, not network.suppliers)
    holds[network.inbound.destination, network.inbound.good] = True
    reached = np.zeros(network.demand.shape, dtype=np.bool_)
    lanes = network.outbound
    usable = holds[lanes.origin, lanes.good]
    reached[lanes.destination[usable], lanes.good[usable]] = True
    reached[network.direct.destination, network.direct.good] = True
    stuck: Flags = np.any((network.demand > 0) & ~reached, axis=1)
    return stuck
