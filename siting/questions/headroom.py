"""
Charge headroom: how far charges may move before the best plan changes its mind about a site or supplier.

In the plan: how far the yearly charge may rise before the best plan does without it, the best cost without it less the
best cost. Outside: how far the charge must fall before the best plan takes it, the best cost with it (and with
something moving through it) less the best cost. The own ruling is lifted. A change of h in a yearly charge moves the
cost of every plan with the site by h and leaves the others alone, so the difference is exact; where a search stopped
early it is known to lie in [bound - best cost, cost - best bound].
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from siting.plan.proof import PROVED_GAP
from siting.plan.words import headline
from siting.questions.headroom_result import Headroom, HeadroomLine
from siting.questions.names import entries
from siting.questions.resolver import Resolver
from siting.questions.restriction import OPEN, SIGNED, Restriction
from siting.questions.searching import Ask

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.listener import Listener, Stop
    from siting.plan.plan import Answer, Plan, SiteLine, SupplierLine
    from siting.questions.names import Entry
    from siting.questions.resolved import Resolved
    from siting.questions.store import Store
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

INSIDE = OPEN | SIGNED
"""Verdicts of what is in the plan."""


def headroom(  # noqa: PLR0913 - what a question is asked with, all but the first two by name
    study: Study,
    answer: Answer | None = None,
    *,
    sites: Sequence[str] | None = None,
    suppliers: Sequence[str] | None = None,
    gap: float = PROVED_GAP,
    settings: SolveSettings | None = None,
    store: Store | None = None,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> Headroom:
    """
    Return how far the charge of each site and supplier may rise, or must fall, before the best plan changes.

    Parameters
    ----------
    study
        Checked.
    answer
        Its plan, where there is one already; proved to `gap` before anything is measured from it.
    sites, suppliers
        Names to ask about. All where both are None; where one is given, the other is empty.
    gap
        Gap of every search, in [0, 1).
    settings
        Time limit of each search, and engine; the study's own where None.
    store
        Where answers are kept and found again; in memory, for this call only, where None.
    listener
        Told how far it is and how long it may still take.
    stop
        Once requested, what is done is returned.

    Returns
    -------
    headroom
        What is in the plan first, the smallest headroom first; then what is outside, the smallest fall first.

    Raises
    ------
    SettingsError
        If a name is not of a site or supplier of the study.
    PlanFileError
        If the answer is of another study.
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If a plan fails its audit.
    """
    asked = replace(settings or study.settings.solve, gap=gap)
    resolver = Resolver(study, answer=answer, settings=asked, store=store, listener=listener, stop=stop)
    resolver.start(f"headroom of {study.settings.title}".strip())
    named = entries(study, sites, suppliers)
    base = resolver.plan()
    if base.plan is None:
        resolver.end(str(base.proof.outcome))
        return _headroom(study, resolver, base, ())
    asks = {entry: _ask(entry[1], gap, inside=_of(base.plan, entry).verdict in INSIDE) for entry in named}
    found = dict(resolver.resolve(list(asks.values()))) if asks else {}
    lines = [_line(study, base, entry, found.get(ask), resolver) for entry, ask in asks.items()]
    resolver.end("stopped" if resolver.stop.requested else "done")
    return _headroom(study, resolver, base, tuple(sorted(lines, key=_rank)))


def _ask(name: str, gap: float, *, inside: bool) -> Ask:
    """Return the search for the best plan on the other side: without what is in the plan, with what is outside."""
    if inside:
        return Ask(restriction=Restriction(out=frozenset({name})), gap=gap, explained=True)
    return Ask(restriction=Restriction(used=frozenset({name})), gap=gap)


def _of(plan: Plan, entry: Entry) -> SiteLine | SupplierLine:
    """Return the line of a site or supplier in a plan."""
    kind, name = entry
    if kind == "site":
        return next(line for line in plan.sites if line.site == name)
    return next(line for line in plan.suppliers if line.supplier == name)


def _line(study: Study, base: Resolved, entry: Entry, found: Resolved | None, resolver: Resolver) -> HeadroomLine:
    """Return the headroom of one site or supplier."""
    kind, name = entry
    plan, cost, bound = base.plan, base.cost, base.bound
    if plan is None or cost is None:
        msg = "headroom is measured from a plan; there is none"
        raise ValueError(msg)
    line = _of(plan, entry)
    inside = line.verdict in INSIDE
    other = None if found is None or found.plan is None else found.plan
    charge = line.charge if inside else _of(other, entry).charge if other is not None else None
    return HeadroomLine(
        kind=kind,
        name=name,
        verdict=str(line.verdict),
        inside=inside,
        ruling=_ruling(study, name),
        outcome=None if found is None else found.proof.outcome,
        yearly=None if found is None or found.cost is None else found.cost - cost,
        least=None if found is None or found.bound is None else found.bound - cost,
        most=None if found is None or found.cost is None or bound is None else found.cost - bound,
        per_one_off=_annuity(resolver, entry),
        charge=charge,
        tolerance=PROVED_GAP * abs(cost),
        why=() if found is None else tuple(reason.sentence for reason in found.reasons),
    )


def _ruling(study: Study, name: str) -> str:
    rulings = {row.site: str(row.ruling) for row in study.sites}
    return (rulings | {row.supplier: str(row.ruling) for row in study.suppliers})[name]


def _annuity(resolver: Resolver, entry: Entry) -> float | None:
    """Return yearly money per one-off money; None where no opening or signing charge is paid, or nothing is spread."""
    network, (kind, name) = resolver.bench().network, entry
    if kind == "site":
        paid = bool(network.site_running[network.sites.index(name)])
    else:
        paid = bool(network.supplier_signed[network.suppliers.index(name)])
    return None if paid or network.annuity <= 0 else network.annuity


def _rank(line: HeadroomLine) -> tuple[bool, bool, float, str]:
    """Return what sorts the plan first, then what is nearest to changing; without a number last."""
    return not line.inside, line.yearly is None, line.yearly or 0.0, line.name


def _headroom(study: Study, resolver: Resolver, base: Resolved, lines: tuple[HeadroomLine, ...]) -> Headroom:
    settings = study.settings
    return Headroom(
        title=settings.title,
        currency=settings.currency,
        fingerprint=resolver.mark,
        outcome=base.proof.outcome,
        cost=base.cost,
        bound=base.bound,
        gap_asked=resolver.settings.gap,
        lines=lines,
        budgeted=settings.one_off_budget is not None,
        why_none=() if base.plan else (headline(base.as_answer(), currency=settings.currency),),
        seconds=resolver.seconds,
    )
