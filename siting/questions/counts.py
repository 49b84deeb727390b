"""
Counts: the best cost for each number of open sites, from the fewest possible to where adding stops paying.

The numbers are not held to the study's own fewest_sites and most_sites, which are what the question is about; those
outside them are marked. The best plan whatever its number says where adding stops paying, and its bound holds for
every number: those far above it cannot win and are not searched.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from siting.errors import SettingsError
from siting.plan.words import headline
from siting.questions.counts_result import CountLine, Counts, Pruned
from siting.questions.resolver import Resolver
from siting.questions.restriction import OPEN, Restriction
from siting.questions.searching import Ask
from siting.study.fingerprint import fingerprint

if TYPE_CHECKING:
    from siting.listener import Listener, Stop
    from siting.network.network import Network
    from siting.plan.plan import Answer, Plan
    from siting.questions.resolved import Resolved
    from siting.questions.store import Store
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

BEYOND = 2
"""Numbers of sites searched above the best, to show how the cost rises."""

SLACK = 1e-9
"""Relative: a capacity that misses the demand by less than this holds it."""


def counts(  # noqa: PLR0913 - what a question is asked with, all but the first two by name
    study: Study,
    answer: Answer | None = None,
    *,
    least: int | None = None,
    most: int | None = None,
    settings: SolveSettings | None = None,
    store: Store | None = None,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> Counts:
    """
    Return the best cost for each number of open sites.

    Parameters
    ----------
    study
        Checked, with sites.
    answer
        Its plan, where there is one already.
    least, most
        Numbers to search from and to; from the fewest possible, and to `BEYOND` above the best, where None.
    settings
        Gap, time limit of each search, and engine; the study's own where None.
    store
        Where answers are kept and found again; in memory, for this call only, where None.
    listener
        Told how far it is and how long it may still take.
    stop
        Once requested, what is done is returned.

    Returns
    -------
    found
        One line a number, impossible ones between the possible ones too.

    Raises
    ------
    SettingsError
        If the study has no sites, or `least` and `most` are no numbers of them.
    PlanFileError
        If the answer is of another study.
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If a plan fails its audit.
    """
    _refuse(study, least, most)
    asked = settings or study.settings.solve
    free = replace(study, settings=replace(study.settings, fewest_sites=None, most_sites=None))
    same = study.settings == free.settings
    if answer is not None and not same:
        Resolver(study, answer=answer)  # refuses the plan of another study
    given = answer if same else None
    resolver = Resolver(free, answer=given, settings=asked, store=store, listener=listener, stop=stop)
    resolver.start(f"counts of {study.settings.title}".strip())
    base = resolver.plan()
    lines: list[CountLine] = []
    pruned: tuple[Pruned, ...] = ()
    not_asked: tuple[int, ...] = ()
    if base.plan is not None:
        best = open_count(base.plan)
        low, high = _range(resolver.bench().network, best, least, most)
        asks = {
            count: Ask(restriction=Restriction(sites_exactly=count), gap=asked.gap)
            for count in range(low, high + 1)
            if count != best
        }
        found = dict(resolver.resolve(list(asks.values()))) if asks else {}
        resolved = {count: found[ask] for count, ask in asks.items() if ask in found}
        if low <= best <= high:
            resolved[best] = base
        lines = [_line(study, base, count, resolved[count]) for count in sorted(resolved)]
        lines = lines if least is not None else _from_first_possible(lines)
        not_asked = tuple(count for count, ask in asks.items() if ask not in found)
        pruned = _pruned(base, high, len(study.sites))
    resolver.end("stopped" if resolver.stop.requested else "done")
    return Counts(
        title=study.settings.title,
        currency=study.settings.currency,
        fingerprint=fingerprint(study),
        outcome=base.proof.outcome,
        gap_asked=asked.gap,
        lines=tuple(lines),
        pruned=pruned,
        not_asked=not_asked,
        service_km=study.settings.service_km,
        why_none=() if base.plan else (headline(base.as_answer(), currency=study.settings.currency),),
        seconds=resolver.seconds,
    )


def open_count(plan: Plan) -> int:
    """Return the number of sites a plan has open."""
    return sum(line.verdict in OPEN for line in plan.sites)


def fewest_that_may_do(network: Network) -> int:
    """
    Return a number of open sites below which there surely is no plan.

    Parameters
    ----------
    network
        Its pins, capacities and demand.

    Returns
    -------
    count
        The pinned ones; more where, without direct lanes, the largest sites together hold less than the demand.
    """
    pinned = int(network.site_pinned_open.sum())
    load = float((network.demand @ network.load).sum())
    if len(network.direct) or load <= 0:
        return pinned
    largest = np.zeros(len(network.sites))
    np.maximum.at(largest, network.option_site, network.option_capacity)
    held = np.cumsum(np.sort(largest[~network.site_pinned_shut])[::-1])
    return max(pinned, 1, 1 + int(np.searchsorted(held, load * (1.0 - SLACK))))


def _refuse(study: Study, least: int | None, most: int | None) -> None:
    """Refuse a study without sites, and numbers that it does not have."""
    if not study.sites:
        msg = "the study has no sites to count. Ask for runners-up to compare sets of suppliers."
        raise SettingsError(msg)
    low, high = least if least is not None else 0, most if most is not None else len(study.sites)
    if not 0 <= low <= high <= len(study.sites):
        msg = f"numbers of sites go from 0 to {len(study.sites)}, got from {low} to {high}. Ask for some of these."
        raise SettingsError(msg)


def _range(network: Network, best: int, least: int | None, most: int | None) -> tuple[int, int]:
    """Return the first and last number to search."""
    high = min(best + BEYOND, int((~network.site_pinned_shut).sum()))
    low = min(fewest_that_may_do(network), best)
    high = high if most is None else most
    return (low if least is None else least), high


def _line(study: Study, base: Resolved, count: int, resolved: Resolved) -> CountLine:
    kept = base.proof.site_count_bounds.get(count)
    known = [bound for bound in (resolved.bound, base.bound, kept) if bound is not None]
    fewest, most = study.settings.fewest_sites or 0, study.settings.most_sites
    bound = None if resolved.impossible else max(known, default=None)
    if bound is not None and resolved.cost is not None:
        bound = min(bound, resolved.cost)
    return CountLine(
        count=count,
        outcome=resolved.proof.outcome,
        plan=resolved.plan,
        bound=bound,
        allowed=fewest <= count and (most is None or count <= most),
    )


def _from_first_possible(lines: list[CountLine]) -> list[CountLine]:
    """Return the lines without the impossible ones before the first that is not."""
    first = next((at for at, line in enumerate(lines) if line.outcome != "impossible"), len(lines))
    return lines[first:]


def _pruned(base: Resolved, high: int, sites: int) -> tuple[Pruned, ...]:
    """Return what lies above the numbers searched: none of it can undercut the best plan's bound."""
    if high >= sites or base.bound is None:
        return ()
    kept = [base.proof.site_count_bounds.get(count, base.bound) for count in range(high + 1, sites + 1)]
    return (Pruned(least=high + 1, most=sites, bound=max(base.bound, min(kept))),)
