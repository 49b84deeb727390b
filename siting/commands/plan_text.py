"""What `siting plan` prints for a reader: the verdict first, its reasons next, then how sure it is and the cautions."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from siting.commands.layout import bullets, paragraph, table
from siting.plan.freight_words import tariff_sentence
from siting.plan.plan import CostLine
from siting.plan.words import CAUTIONS, MILLION, delivery_sentence, headline, money_down, payback, percent

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.plan.plan import Answer, Plan, Service, SiteLine, SupplierLine
    from siting.plan.proof import Proof
    from siting.study.tables import Study

ABSENT = "-"
"""What a cell shows where there is nothing to pay, to move or to fill."""
HALF = 0.5
"""Smaller than this rounds to 0."""
SMALL = 1000.0
"""Money below this is shown with decimals."""
MOST_SPLITS = 10
"""Customers listed as split."""


def answer_text(study: Study, answer: Answer) -> str:
    """
    Return an answer as text of at most 100 columns, names aside.

    Parameters
    ----------
    study
        The study that was answered.
    answer
        What was found.

    Returns
    -------
    text
        Headline, verdicts, cost lines, proof, warnings and cautions; without a plan, the reasons.
    """
    parts = [_reasons(answer) or paragraph(headline(answer, currency=study.settings.currency))]
    if answer.plan is not None:
        parts += _plan_parts(study, answer.plan)
    elif answer.today is not None and answer.today.reason:
        parts.append(paragraph(answer.today.reason))
    return "\n\n".join(parts)


def _reasons(answer: Answer) -> str:
    """Return why there can be no plan, a point a reason, where there is more than one; else nothing."""
    if len(answer.reasons) <= 1:
        return ""
    how = "All of these together must be met." if answer.together else "Any one of these repairs it."
    return f"Impossible. {how}\n" + bullets([reason.sentence for reason in answer.reasons])


def _plan_parts(study: Study, plan: Plan) -> Iterator[str]:
    yield paragraph(payback(plan))
    if plan.sites:
        yield _sites(plan)
    if plan.suppliers:
        yield _suppliers(plan)
    yield _costs(plan)
    if said := _said(study, plan):
        yield bullets(said)
    yield _proof(plan.proof, plan.currency)
    notes = [*(str(warning) for warning in study.warnings), *plan.warnings]
    if notes:
        yield "Worth a look:\n" + bullets(notes)
    yield "Cautions:\n" + bullets(CAUTIONS)


def _sites(plan: Plan) -> str:
    sized = any(line.size for line in plan.sites)
    header = ("site", "verdict", *(["size"] if sized else []), "load", "full", "customers", "charge", "once")
    rows = [
        (
            line.site,
            line.verdict,
            *([line.size or ABSENT] if sized else []),
            *_use(line, line.throughput),
            _number(line.customers),
            *_charges(line),
        )
        for line in plan.sites
    ]
    notes = [f"{line.site}: {line.note}" for line in plan.sites if line.note]
    return _captioned("Sites", plan, table(header, rows, words=3 if sized else 2), notes)


def _suppliers(plan: Plan) -> str:
    header = ("supplier", "verdict", "load", "full", "charge", "once")
    rows = [(line.supplier, line.verdict, *_use(line, line.volume), *_charges(line)) for line in plan.suppliers]
    notes = [f"{line.supplier}: {line.note}" for line in plan.suppliers if line.note]
    return _captioned("Suppliers", plan, table(header, rows, words=2), notes)


def _captioned(what: str, plan: Plan, lines: str, notes: list[str]) -> str:
    """Return a table under what its columns mean, notes below it."""
    caption = f"{what}: load a year ({plan.unit}), charge a year ({plan.currency}), one-off money ({plan.currency})"
    return "\n".join([paragraph(caption), lines, *([bullets(notes)] if notes else [])])


def _use(line: SiteLine | SupplierLine, load: float) -> tuple[str, str]:
    """Return what moves through, and how full that makes it."""
    if not load or line.utilisation is None:
        return _number(load), ABSENT
    share = 100 * line.utilisation
    return _number(load), f"{share:.0f} %" if round(share) else "<1 %"


def _charges(line: SiteLine | SupplierLine) -> tuple[str, str]:
    """Return what the verdict costs a year and once."""
    return _number(line.charge), _number(line.one_off)


def _costs(plan: Plan) -> str:
    """Return the cost lines of the plan beside today's, those that are 0 in both left out."""
    before = plan.today.plan if plan.today else None
    was = {line: before.cost_lines[line] if before else 0.0 for line in CostLine}
    amounts = [(str(line), plan.cost_lines[line], was[line]) for line in CostLine if plan.cost_lines[line] or was[line]]
    amounts.append(("cost", plan.cost, sum(was.values())))
    digits = _digits([amount for _, now, then in amounts for amount in (now, then)])
    if before is None:
        rows = [(name, _number(now, digits)) for name, now, _ in amounts]
        return table((f"{plan.currency} a year", "plan"), rows)
    compared = [
        (name, _number(now, digits), _number(then, digits), _signed(now - then, digits)) for name, now, then in amounts
    ]
    return table((f"{plan.currency} a year", "plan", "today", "difference"), compared)


def _digits(amounts: list[float]) -> int:
    """Return how many decimals a column of money needs: two for the small money of a textbook, as in the headline."""
    is_small = all(abs(amount) < SMALL for amount in amounts)
    return 2 if is_small and any(round(amount, 2) != round(amount) for amount in amounts) else 0


def _signed(difference: float, digits: int) -> str:
    return f"{difference:+,.{digits}f}" if abs(difference) >= HALF * 10**-digits else "same"


def _said(study: Study, plan: Plan) -> list[str]:
    """Return what is worth saying about distance, service, emissions and deliveries."""
    said = [
        *_distance(study, plan.service),
        _splits(plan),
        delivery_sentence(study, plan),
        tariff_sentence(study, plan),
    ]
    if plan.tonnes_co2e is None:
        said.append("Emissions are not reported: the study sets no emission_kg_per_tkm.")
    else:
        said.append(f"Emissions: {_number(plan.tonnes_co2e)} t CO2e a year.")
    if plan.today is not None and plan.today.reason:
        said.append(plan.today.reason)
    return [sentence for sentence in said if sentence]


def _splits(plan: Plan) -> str:
    """Return which customers are served from more than one place, with the places, the largest first."""
    split = [f"{line.customer} ({', '.join(line.origins)})" for line in plan.customers if len(line.origins) > 1]
    if not split:
        return ""
    who = "1 customer is" if len(split) == 1 else f"{len(split):,} customers are"
    more = f" and {len(split) - MOST_SPLITS:,} more" if len(split) > MOST_SPLITS else ""
    return f"{who} served from more than one place: {', '.join(split[:MOST_SPLITS])}{more}."


def _distance(study: Study, service: Service) -> Iterator[str]:
    settings = study.settings
    if service.average_km is not None:
        yield f"Customers are {service.average_km:,.0f} road km from what serves them, on average by load."
    if service.share_within is not None:
        asked = "" if settings.service_share is None else f", at least {percent(settings.service_share)} is asked"
        within = f"within {settings.service_km:g} road km{asked}"
        yield f"{percent(service.share_within)} of the weight is delivered {within}."


def _proof(proof: Proof, currency: str) -> str:
    """Return what ran, for how long, and what it proved."""
    bound = f" No plan can cost less than {_floor(proof.bound, currency)} a year." if proof.bound is not None else ""
    bound = " No plan can cost less." if proof.gap == 0 else bound
    why = f" ({proof.reason.rstrip('.')})" if proof.reason else ""
    return paragraph(f"Proof: {proof.outcome}, by the engine {proof.engine}{why} in {proof.seconds:,.1f} s.{bound}")


def _floor(bound: float, currency: str) -> str:
    """Return a bound in full, rounded down so that it stays one."""
    return f"{math.floor(bound):,} {currency}" if abs(bound) >= MILLION else money_down(bound, currency)


def _number(value: float, digits: int = 0) -> str:
    """Return a number with thousands apart, never 0 by rounding; 0 reads as nothing to pay or move."""
    if value == 0:
        return ABSENT
    return f"{value:,.{digits}f}" if abs(value) >= HALF * 10**-digits else f"{value:.2g}"
