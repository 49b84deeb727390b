"""
Re-price and re-check a plan from the tables, independently of how it was found.

Imports no solver and no model, and of the network only the geodesic: a shared mistake would cancel out. Every formula
is derived here a second time.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.plan.audit_books import RELATIVE, Books, exceeds, shown
from siting.plan.audit_limits import check_limits
from siting.plan.audit_money import check_money, check_service
from siting.plan.audit_verdicts import check_rules, check_verdicts
from siting.plan.plan import TodayOutcome
from siting.study.fingerprint import fingerprint

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.plan.plan import Plan, Today
    from siting.plan.proof import Proof
    from siting.study.tables import Study


@dataclass(frozen=True, slots=True, kw_only=True)
class AuditReport:
    """What the audit of a plan found."""

    passed: bool
    """True where there is no fault."""
    faults: tuple[str, ...]
    """Each names the site, supplier, customer or line, the amounts and their unit."""


def audit(study: Study, plan: Plan, *, of_today: bool = False) -> AuditReport:
    """
    Re-derive money, balance and limits of a plan from the study's tables.

    Parameters
    ----------
    study
        The study the plan answers.
    plan
        The plan, with its plan of today where there is one (audited too).
    of_today
        True for a plan of today: running sites and signed suppliers as they are; rulings, rules, counts, budget,
        service share and least volumes are ignored.

    Returns
    -------
    report
        Every fault found; amounts are compared to 1e-6 relative.
    """
    faults = list(_all_faults(study, plan, fingerprint(study), of_today=of_today))
    return AuditReport(passed=not faults, faults=tuple(faults))


def _all_faults(study: Study, plan: Plan, mark: str, *, of_today: bool) -> Iterator[str]:
    """Yield every fault of a plan and of its plan of today; `mark` is the study's fingerprint."""
    books = Books(study, plan, of_today=of_today)
    yield from _header(study, plan, mark)
    yield from check_verdicts(books)
    yield from check_rules(books)
    yield from check_limits(books)
    yield from check_money(books)
    yield from check_service(books)
    yield from _proof(books, plan.proof)
    if of_today and plan.today is not None:
        yield "the plan of today has a today of its own"
    if not of_today:
        yield from _today(books, plan.today)
        if plan.today is not None and plan.today.plan is not None:
            for fault in _all_faults(study, plan.today.plan, mark, of_today=True):
                yield f"today: {fault}"


def _header(study: Study, plan: Plan, mark: str) -> Iterator[str]:
    """Yield a plan that is of another study."""
    settings = study.settings
    if plan.fingerprint != mark:
        yield "the plan is of another study: its fingerprint does not match the tables"
    for what, stated, right in (
        ("title", plan.title, settings.title),
        ("currency", plan.currency, settings.currency),
        ("unit", plan.unit, settings.unit),
    ):
        if stated != right:
            yield f"{what} is stated as {stated!r}, the settings say {right!r}"


def _proof(books: Books, proof: Proof) -> Iterator[str]:
    """Yield a proof that its own numbers do not bear out."""
    cost, bound, currency = proof.cost, proof.bound, books.study.settings.currency
    if not 0.0 <= proof.gap_asked < 1.0:
        yield f"the gap asked is {proof.gap_asked}, which is not in [0, 1)"
    if cost is None or not math.isfinite(cost) or (bound is not None and not math.isfinite(bound)):
        yield f"cost {cost} and bound {bound} are not both numbers"
        return
    bounds = {} if bound is None else {"the bound": bound}
    count = sum(books.is_open(site) for site in books.sites)
    if count in proof.site_count_bounds:
        bounds[f"the bound for {count} sites"] = proof.site_count_bounds[count]
    for what, value in bounds.items():
        if exceeds(value, cost, 0.0):
            yield f"{what}, {shown(value)} {currency} a year, is above the cost, {shown(cost)}"
    earned = _earned(cost, bound, proof.gap_asked)
    if proof.outcome != earned:
        yield f"the outcome is stated as {proof.outcome}; cost, bound and gap asked earn {earned}"


def _earned(cost: float, bound: float | None, gap_asked: float) -> str:
    """Return the outcome that the numbers of a plan earn."""
    if bound is None:
        return "stopped"
    gap = 0.0 if cost <= bound else math.inf if cost == 0.0 else (cost - bound) / abs(cost)
    if gap <= RELATIVE:
        return "proved"
    return "within-gap" if gap <= gap_asked else "stopped"


def _today(books: Books, today: Today | None) -> Iterator[str]:
    """Yield what is wrong with the plan of today, from which the saving is measured."""
    if today is None:
        yield "the plan does not say what today costs, or why there is no today"
        return
    exists = bool(books.running or not books.sites) and bool(books.signed or not books.suppliers)
    if exists is (today.outcome is TodayOutcome.ABSENT):
        yield f"today is stated as {today.outcome}, the standings say that there is {'a' if exists else 'no'} today"
    if (today.outcome is TodayOutcome.SERVED) is not (today.plan is not None):
        yield f"today is {today.outcome} {'without' if today.plan is None else 'with'} a plan"
    if (today.outcome is TodayOutcome.SHORT) is not bool(today.unserved):
        yield f"today is {today.outcome} {'with' if today.unserved else 'without'} unserved demand"
    for short in today.unserved:
        need = books.demand.get((short.customer, short.good), 0.0)
        if exceeds(short.amount, need, need) or not short.amount > 0:
            yield (
                f"today: {shown(short.amount)} {books.study.settings.unit} of {short.good} unserved at "
                f"customer {short.customer}, who needs {shown(need)}"
            )
