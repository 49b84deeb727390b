"""
What a plan says in sentences: the headline, what the saving is worth, how sure the plan is, and the cautions.

Used wherever a plan is shown, so that every reader sees the same words and the same rounding. A gap is rounded up,
never to 0.00 %.
"""

from __future__ import annotations

import math
from decimal import ROUND_CEILING, Decimal
from typing import TYPE_CHECKING

import numpy as np

from siting.plan.plan import CostLine, SiteVerdict, SupplierVerdict, TodayOutcome
from siting.plan.proof import Outcome
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Iterable

    from siting.plan.plan import Answer, Plan
    from siting.plan.proof import Proof
    from siting.study.tables import Study

CAUTIONS = (
    (
        "This is decision support, not a decision: before money or jobs move, confirm freight quotes, leases, "
        "capacity, zoning, flood and fire exposure, customs and labour law with the people licensed to judge them."
    ),
    "Straight-line distances times a circuity factor understate short trips.",
    "A proof is about the model, not about the data.",
)
"""What every report says whatever the plan."""

NOT_FOR_PRICING = "Marginal cost leaves every charge out: it is not for pricing."

MILLION = 1e6
SMALLEST_PERCENT = Decimal("0.0001")
"""Gaps below this are stated as it: still true, and readable."""

HALF_CENT = 0.005
"""Money below this would show as 0."""
SAME = 1e-9
"""Relative difference below which two costs are the same."""

ONE_OFF_LINES = (CostLine.OPENING, CostLine.CLOSING, CostLine.SIGNING, CostLine.DROPPING)
"""The annualised lines, which a running saving leaves out."""


def money(amount: float, currency: str, *, like: float | None = None) -> str:
    """
    Return money for a headline.

    Parameters
    ----------
    amount
        Money in the currency.
    currency
        ISO 4217 code.
    like
        Another amount named in the same sentence: in millions where that one is, if two decimals can show it.

    Returns
    -------
    text
        Such as `4.21 M EUR`, `380,000 EUR` or `198.50 EUR`.
    """
    size = abs(amount)
    in_millions = size >= MILLION or (like is not None and abs(like) >= MILLION and size >= MILLION / 100)
    if in_millions:
        return f"{amount / MILLION:,.2f} M {currency}".rstrip()
    if 0 < size < HALF_CENT:
        return f"{'less than 0.01' if amount > 0 else 'more than -0.01'} {currency}".rstrip()
    decimals = 2 if size < 1000 and round(amount, 2) != round(amount) else 0  # noqa: PLR2004  # small textbook money
    return f"{amount:,.{decimals}f} {currency}".rstrip()


def percent_up(share: float) -> str:
    """
    Return a share as per cent with two significant digits, rounded up, so that "within" stays true.

    Parameters
    ----------
    share
        As a fraction, at least 0 and finite.

    Returns
    -------
    text
        Such as `0.01 %`; `0 %` only for exactly 0.
    """
    if share == 0:
        return "0 %"
    percent = max(Decimal(repr(float(share))) * 100, SMALLEST_PERCENT)
    step = Decimal(1).scaleb(percent.adjusted() - 1)
    rounded = (percent / step).to_integral_value(rounding=ROUND_CEILING) * step
    return f"{rounded.normalize():f} %"


def percent(share: float) -> str:
    """
    Return a share as per cent with one decimal, two where one would show nothing.

    Parameters
    ----------
    share
        As a fraction.

    Returns
    -------
    text
        Such as `3.4 %`, `0.04 %` or `less than 0.01 %`; `0 %` only for exactly 0.
    """
    size = abs(share) * 100
    if size == 0:
        return "0 %"
    if size < 0.01:  # noqa: PLR2004  # what two decimals can show
        return "less than 0.01 %"
    text = f"{share * 100:,.1f}" if size >= 0.1 else f"{share * 100:.2f}"  # noqa: PLR2004  # one decimal
    return f"{text.removesuffix('.0')} %"


def headline(answer: Answer, *, currency: str = "") -> str:
    """
    Return the one sentence that says what was found.

    Parameters
    ----------
    answer
        What was found.
    currency
        ISO 4217 code, used where there is no plan to take it from.

    Returns
    -------
    sentence
        Verdict counts, cost, saving and proof; or that no plan was found yet, or can exist.
    """
    plan, proof = answer.plan, answer.proof
    if plan is None or proof.cost is None:
        if proof.outcome is Outcome.IMPOSSIBLE:
            return _impossible(answer)
        floor = (
            f"; no plan can cost less than {money_down(proof.bound, currency)} a year"
            if proof.bound is not None
            else ""
        )
        return f"No plan yet: the search was stopped after {seconds(proof.seconds)} before it found one{floor}."
    does = ", ".join(part for part in (_sites(plan), _suppliers(plan)) if part)
    against = against_today(plan)
    costs = f"{money(proof.cost, plan.currency)} a year" + (f", {against}" if against else "")
    return f"{does}: {costs}; {sureness(proof, plan.currency)}."


def _impossible(answer: Answer) -> str:
    """Return why there can be no plan, in one sentence or with each repair."""
    said = [reason.sentence.rstrip(".") for reason in answer.reasons]
    if not said:
        return "Impossible: no plan can meet everything that is asked."
    if len(said) == 1:
        return f"Impossible: {said[0]}."
    how = "all of these together must be met" if answer.together else "any one of these repairs it"
    return f"Impossible ({how}): {'; '.join(said)}."


def _counted(verdicts: Iterable[str], *, names: tuple[str, ...]) -> str:
    """Return such as `keep 4, open 2, close 1`, without the verdicts nobody has."""
    found = list(verdicts)
    return ", ".join(f"{name} {found.count(name)}" for name in names if name in found)


def _sites(plan: Plan) -> str:
    """Return how many sites run, and what becomes of them."""
    if not plan.sites:
        return ""
    verdicts = [str(line.verdict) for line in plan.sites]
    runs = sum(verdict in {"keep", "open"} for verdict in verdicts)
    counted = _counted(verdicts, names=(SiteVerdict.KEEP, SiteVerdict.OPEN, SiteVerdict.CLOSE))
    return f"Run {runs} of {_things(len(verdicts), 'site')}" + (f" ({counted})" if counted else "")


def _suppliers(plan: Plan) -> str:
    """Return how many suppliers are signed, and what becomes of them."""
    if not plan.suppliers:
        return ""
    verdicts = [str(line.verdict) for line in plan.suppliers]
    used = sum(verdict in {"stay", "sign"} for verdict in verdicts)
    counted = _counted(verdicts, names=(SupplierVerdict.STAY, SupplierVerdict.SIGN, SupplierVerdict.DROP))
    have = "have" if plan.sites else "Have"
    return f"{have} {used} of {_things(len(verdicts), 'supplier')} signed" + (f" ({counted})" if counted else "")


def _things(count: int, name: str) -> str:
    return f"{count} {name}" if count == 1 else f"{count} {name}s"


def against_today(plan: Plan) -> str:
    """
    Return how the cost compares with today's.

    Parameters
    ----------
    plan
        With its plan of today, if there is one.

    Returns
    -------
    text
        Such as `0.38 M EUR less than today (9.0 %, 14.2 % without goods prices)`; empty where there is no today.
    """
    if plan.today is None or plan.today.outcome is TodayOutcome.ABSENT:
        return ""
    if plan.saving is None or plan.today.plan is None:
        return "no saving stated since today cannot serve everything"
    before = plan.today.plan
    if _is_nothing(plan.saving, before.cost):
        return "the same as today"
    text = (
        f"{money(abs(plan.saving), plan.currency, like=plan.cost)} {'less' if plan.saving > 0 else 'more'} than today"
    )
    shares = []
    if before.cost > 0:
        shares.append(percent(abs(plan.saving) / before.cost))
    without_goods = before.cost - before.cost_lines[CostLine.GOODS]
    if before.cost_lines[CostLine.GOODS] > 0 and without_goods > 0:
        shares.append(f"{percent(abs(plan.saving) / without_goods)} without goods prices")
    return text + (f" ({', '.join(shares)})" if shares else "")


def sureness(proof: Proof, currency: str) -> str:
    """
    Return how sure it is that no plan is cheaper.

    Parameters
    ----------
    proof
        Of a plan.
    currency
        ISO 4217 code.

    Returns
    -------
    text
        Such as `proved within 0.01 % (at most 421 EUR a year)` or `not proved: could be up to 1.3 % cheaper`.
    """
    cost, bound, gap = proof.cost, proof.bound, proof.gap
    if cost is None or bound is None or gap is None:
        return "not proved: nothing is known yet about how much cheaper a plan could be"
    room = f"{money_up(max(cost - bound, 0.0), currency)} a year"
    share = percent_up(gap) if math.isfinite(gap) else ""
    if proof.outcome is Outcome.PROVED:
        return "proved: no plan is cheaper" if gap == 0 else f"proved within {share} (at most {room})"
    if proof.outcome is Outcome.WITHIN_GAP:
        return f"proved within {share} (at most {room})"
    return f"not proved: could be up to {f'{share} ({room})' if share else room} cheaper"


def money_up(amount: float, currency: str) -> str:
    """
    Return money rounded up, so that "at most" stays true.

    Parameters
    ----------
    amount
        Money, at least 0.
    currency
        ISO 4217 code.

    Returns
    -------
    text
        Whole money from 100 up, else in hundredths; above a million in hundredths of a million.
    """
    if amount >= MILLION:
        return money(math.ceil(amount / MILLION * 100) / 100 * MILLION, currency)
    if amount >= 100:  # noqa: PLR2004  # hundredths no longer matter
        return money(math.ceil(amount), currency)
    return f"{math.ceil(amount * 100) / 100:,.2f} {currency}".rstrip()


def money_down(amount: float, currency: str) -> str:
    """
    Return money rounded down, so that "no plan can cost less" stays true.

    Parameters
    ----------
    amount
        Money.
    currency
        ISO 4217 code.

    Returns
    -------
    text
        Whole money from 1,000 up or where it is whole, else in hundredths; above a million in hundredths of a million.
    """
    size = abs(amount)
    step = MILLION / 100 if size >= MILLION else 1.0 if size >= 1000 else 0.01  # noqa: PLR2004  # as `money` shows it
    down = math.floor(amount / step + SAME) * step
    return money(down, currency)


def seconds(length: float) -> str:
    """
    Return a length of time, with a decimal below ten seconds.

    Parameters
    ----------
    length
        Seconds.

    Returns
    -------
    text
        Such as `0.3 s` or `120 s`.
    """
    return f"{length:.1f} s" if length < 10 else f"{length:,.0f} s"  # noqa: PLR2004  # tenths no longer matter


def _is_nothing(difference: float, cost: float) -> bool:
    """Return whether a difference of money is rounding alone."""
    return abs(difference) <= HALF_CENT or abs(difference) <= SAME * abs(cost)


def payback(plan: Plan) -> str:
    """
    Return what the plan costs once, what it saves a year in running, and how soon that pays back.

    Parameters
    ----------
    plan
        With its plan of today, if there is one.

    Returns
    -------
    sentence
        The running saving leaves annualised one-off money out, so that payback counts no money twice.
    """

    def shown(amount: float) -> str:
        return money(abs(amount), plan.currency, like=plan.cost)

    once = "No one-off money"
    if plan.one_off:
        once = f"One-off money {shown(plan.one_off)}" if plan.one_off > 0 else f"Brings in {shown(plan.one_off)} once"
    if plan.saving is None:
        return f"{once}."
    saved = plan.saving + sum(plan.cost_lines[line] for line in ONE_OFF_LINES)
    if _is_nothing(saved, plan.cost):
        never = ": it never pays back" if plan.one_off > 0 else ""
        return f"{once}, running cost the same as today{never}."
    if saved <= 0:
        never = ": it never pays back" if plan.one_off > 0 else ""
        return f"{once}, running cost {shown(saved)} a year higher{never}."
    back = f", payback in {plan.one_off / saved:,.1f} years" if plan.one_off > 0 else ""
    return f"{once}, running saving {shown(saved)} a year{back}."


def delivery_sentence(study: Study, plan: Plan) -> str:
    """
    Return why the delivery charge does not sway the plan.

    Parameters
    ----------
    study
        For its settings and lanes.
    plan
        For the money.

    Returns
    -------
    sentence
        Empty where no delivery is charged, or where lanes with a unit_cost of their own or tariffs escape it.
    """
    settings, lanes = study.settings, study.lanes
    charged = plan.cost_lines[CostLine.DELIVERY]
    to_customers = lanes.leg != lanes.LEGS.index(Leg.INBOUND)
    escapes = bool((to_customers & ~np.isnan(lanes.unit_cost)).any())
    if charged == 0 or settings.drop_size is None or escapes or study.tariffs:
        return ""
    size = f"each {settings.drop_size:g} {plan.unit} is one delivery"
    if any(row.drop_size is not None for row in study.customers):
        size = "each customer's drop_size is one delivery"
    return (
        f"Delivery charges ({money(charged, plan.currency)} a year) are the same in every plan: {size}, "
        "wherever it comes from."
    )
