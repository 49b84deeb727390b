"""
The closing test: what it costs to do without a site or a supplier of the plan.

Two answers side by side. Re-route: the others keep verdict and size, open sites may take volume whether used before or
not. Re-plan: everything else is decided afresh. The ruling of what is tested is lifted, all other rulings hold.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.errors import SettingsError
from siting.plan.words import headline
from siting.questions.closing_result import ClosingLine, ClosingTest, Without
from siting.questions.differences import fillings, line_differences, shifts, verdict_changes
from siting.questions.names import entries
from siting.questions.resolver import Resolver
from siting.questions.restriction import OPEN, SIGNED, Restriction, parts_of
from siting.questions.searching import Ask
from siting.questions.shortage import sentences_of

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence
    from collections.abc import Set as AbstractSet

    from siting.listener import Listener, Stop
    from siting.network.network import Network
    from siting.plan.plan import Answer, Plan
    from siting.questions.names import Entry
    from siting.questions.resolved import Resolved
    from siting.questions.store import Store
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

HOW = ("reroute", "replan")
"""The two answers, in the order in which they are sought: re-routing is quick, and kept when stopped."""


def closing(  # noqa: PLR0913 - what a question is asked with, all but the first two by name
    study: Study,
    answer: Answer | None = None,
    *,
    sites: Sequence[str] | None = None,
    suppliers: Sequence[str] | None = None,
    settings: SolveSettings | None = None,
    store: Store | None = None,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> ClosingTest:
    """
    Return what it costs to close each site and to drop each supplier of the plan, one at a time.

    Parameters
    ----------
    study
        Checked.
    answer
        Its plan, as `solve` returned it; solved (or found in the store) where None.
    sites, suppliers
        Names to test. Where both are None, all that the plan keeps, opens, stays with or signs; where one is given,
        the other is empty.
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
    test
        The cheapest to do without first. Every cost has its own bound and gap.

    Raises
    ------
    SettingsError
        If a name is not of a site or supplier that the plan has open or signed.
    PlanFileError
        If the answer is of another study.
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If a plan fails its audit.
    """
    resolver = Resolver(study, answer=answer, settings=settings, store=store, listener=listener, stop=stop)
    resolver.start(f"closing test of {study.settings.title}".strip())
    base = resolver.plan()
    if base.plan is None:
        resolver.end(str(base.proof.outcome))
        return _test(study, resolver, base, ())
    tested = _tested(study, base.plan, sites, suppliers)
    asks = {name: asks_for(base.plan, name, resolver.settings.gap) for _, name, _ in tested}
    found = dict(resolver.resolve([both[how] for how in HOW for both in asks.values()])) if asks else {}
    network = resolver.bench().network if asks else None
    lines = []
    for kind, name, verdict in tested:
        both = {how: _without(study, network, base, found.get(asks[name][how]), name, how) for how in HOW}
        lines.append(ClosingLine(kind=kind, name=name, verdict=verdict, reroute=both["reroute"], replan=both["replan"]))
    resolver.end("stopped" if resolver.stop.requested else "done")
    return _test(study, resolver, base, tuple(sorted(lines, key=_rank)))


def asks_for(plan: Plan, name: str, gap: float) -> dict[str, Ask]:
    """
    Return the two searches of a closing test.

    Parameters
    ----------
    plan
        The plan tested.
    name
        Site or supplier done without.
    gap
        Asked of both.

    Returns
    -------
    asks
        `reroute` and `replan`.
    """
    others = frozenset(part for part in parts_of(plan) if part[0] != name)
    out = frozenset({name})
    return {
        "reroute": Ask(restriction=Restriction(out=out, held=others), gap=gap, explained=True),
        "replan": Ask(restriction=Restriction(out=out), gap=gap, explained=True),
    }


def _tested(
    study: Study, plan: Plan, sites: Sequence[str] | None, suppliers: Sequence[str] | None
) -> tuple[tuple[str, str, str], ...]:
    """Return kind, name and verdict of what is tested, in the order of the tables."""
    verdicts = {("site", line.site): str(line.verdict) for line in plan.sites}
    verdicts |= {("supplier", line.supplier): str(line.verdict) for line in plan.suppliers}
    inside = {*OPEN, *SIGNED}
    asked = entries(study, sites, suppliers)
    if sites is not None or suppliers is not None:
        for entry in asked:
            if verdicts[entry] not in inside:
                raise SettingsError(_refusal(*entry, verdicts[entry], verdicts, inside))
    return tuple((*entry, verdicts[entry]) for entry in asked if verdicts[entry] in inside)


def _refusal(kind: str, name: str, verdict: str, verdicts: Mapping[Entry, str], inside: AbstractSet[str]) -> str:
    """Return why a name cannot be tested."""
    there = [other for (of, other), held in verdicts.items() if of == kind and held in inside]
    choose = f"Choose one of {', '.join(there)}." if there else f"The plan has no {kind} to do without."
    return f"the {kind} {name} is not in the plan (verdict: {verdict}), so it cannot be done without. {choose}"


def _without(  # noqa: PLR0913, PLR0917 - a plan and one without, and what was asked
    study: Study, network: Network | None, base: Resolved, found: Resolved | None, name: str, how: str
) -> Without | None:
    """Return what is different without a site or supplier."""
    before = base.plan
    if found is None or before is None or network is None:
        return None
    proof, plan = found.proof, found.plan
    if plan is None or proof.cost is None:
        load = {row.good: row.load or 1.0 for row in study.all_goods}
        return Without(
            outcome=proof.outcome,
            bound=proof.bound,
            unserved=found.unserved,
            unserved_load=sum(short.amount * load[short.good] for short in found.unserved),
            why=sentences_of(study, network, before, name, found, rerouted=how == "reroute")
            if found.impossible
            else (),
            reasons=found.reasons,
            together=found.together,
            seconds=proof.seconds,
        )
    was, now = before.service, plan.service
    return Without(
        outcome=proof.outcome,
        cost=proof.cost,
        bound=proof.bound,
        extra_cost=proof.cost - before.cost,
        extra_least=None if proof.bound is None else proof.bound - before.cost,
        extra_most=None if base.bound is None else proof.cost - base.bound,
        extra_one_off=plan.one_off - before.one_off,
        cost_lines=line_differences(before, plan),
        changes=verdict_changes(before, plan),
        shifts=shifts(before, plan, {row.good: row.load for row in study.all_goods}),
        fillings=fillings(before, plan),
        average_km=now.average_km,
        extra_km=_difference(was.average_km, now.average_km),
        share_within=now.share_within,
        extra_share=_difference(was.share_within, now.share_within),
        seconds=proof.seconds,
        plan=plan,
    )


def _difference(before: float | None, after: float | None) -> float | None:
    return None if before is None or after is None else after - before


def _rank(line: ClosingLine) -> tuple[int, float, float, str]:
    """Return what sorts the cheapest to do without first."""
    replan, reroute = line.replan, line.reroute
    extra = replan.extra_cost if replan is not None else None
    rerouted = reroute.extra_cost if reroute is not None else None
    never = replan is not None and replan.possible is False
    place = 0 if extra is not None else 2 if never else 1
    return place, extra or 0.0, float("inf") if rerouted is None else rerouted, line.name


def _test(study: Study, resolver: Resolver, base: Resolved, lines: tuple[ClosingLine, ...]) -> ClosingTest:
    settings = study.settings
    return ClosingTest(
        title=settings.title,
        currency=settings.currency,
        unit=settings.unit,
        fingerprint=resolver.mark,
        outcome=base.proof.outcome,
        cost=base.cost,
        bound=base.bound,
        gap_asked=resolver.settings.gap,
        lines=lines,
        why_none=() if base.plan else (headline(base.as_answer(), currency=settings.currency),),
        seconds=resolver.seconds,
    )
