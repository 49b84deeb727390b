"""Which rules contradict each other: the smallest sets of rules that cannot hold together."""

from __future__ import annotations

import time
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from siting.network.network import build_network
from siting.solving.softening import softened
from siting.study.tables import no_lanes

if TYPE_CHECKING:
    from siting.listener import Stop
    from siting.solving.elastic import Repair
    from siting.study.tables import RuleRow, Study


@dataclass(frozen=True, slots=True, kw_only=True)
class Conflict:
    """A set of rules that cannot hold together, none of which can be spared."""

    rules: tuple[RuleRow, ...]
    among_themselves: bool
    """True where they contradict each other whatever else is asked; False where the rest of the study is needed."""


def find_conflicts(study: Study, repair: Repair, seconds: float, stop: Stop | None) -> tuple[Conflict, ...]:
    """
    Return, for each rule that a repair lifts, the smallest set of rules it stands in conflict with.

    Parameters
    ----------
    study
        Impossible as it is.
    repair
        Of the family of rules; lifting its rules makes the study possible.
    seconds, stop
        Limits of the search; sets not found by then are left out.

    Returns
    -------
    conflicts
        One for each lifted rule, smallest in the sense that no rule of it can be taken out.

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    end = time.monotonic() + seconds
    lifted = [int(place) for (place,), _ in repair.parts]
    kept = [rule for place, rule in enumerate(study.rules) if place not in lifted]
    return tuple(
        conflict
        for place in lifted
        for conflict in [_conflict(study, study.rules[place], kept, end, stop)]
        if conflict is not None
    )


def _conflict(study: Study, lifted: RuleRow, kept: list[RuleRow], end: float, stop: Stop | None) -> Conflict | None:
    """Take kept rules out one by one for as long as the lifted rule still cannot be met."""
    for base, among_themselves in ((_bare(study), True), (study, False)):
        rules = [*kept, lifted]
        if _possible(base, rules, end, stop):
            continue
        for rule in kept:
            fewer = [other for other in rules if other is not rule]
            if not _possible(base, fewer, end, stop):
                rules = fewer
        if time.monotonic() >= end or (stop is not None and stop.requested):
            return None
        return Conflict(rules=tuple(rules), among_themselves=among_themselves)
    return None


def _bare(study: Study) -> Study:
    """Return the study with its sites and suppliers but nothing asked of them."""
    settings = replace(study.settings, service_share=None, fewest_sites=None, most_sites=None, one_off_budget=None)
    return replace(
        study,
        settings=settings,
        customers=(),
        demands=(),
        lanes=no_lanes(),
        sites=tuple(replace(row, least_throughput=0.0) for row in study.sites),
        sizes=tuple(replace(row, least_throughput=0.0) for row in study.sizes),
        suppliers=tuple(replace(row, least_yearly=0.0) for row in study.suppliers),
        offers=tuple(replace(row, least_yearly=0.0) for row in study.offers),
    )


def _possible(study: Study, rules: list[RuleRow], end: float, stop: Stop | None) -> bool:
    ruled = replace(study, rules=tuple(rules))
    return softened(ruled, build_network(ruled), set()).possible(end - time.monotonic(), stop)
