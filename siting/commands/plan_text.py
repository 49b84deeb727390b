"""What `siting plan` prints for a reader: the verdict first, its reasons next, then how sure it is and the cautions."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.layout import bullets, paragraph, table
from siting.plan.plan import CostLine
from siting.plan.words import CAUTIONS, delivery_sentence, headline, payback

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.plan.plan import Answer, Plan, Service, SiteLine, SupplierLine
    from siting.plan.proof import Proof
    from siting.study.tables import Study

ABSENT = "-"
"""What a cell shows where there is nothing to show: no capacity, no today."""


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
    parts = [paragraph(headline(answer, currency=study.settings.currency))]
    if answer.plan is not None:
        parts += _plan_parts(study, answer.plan)
    elif answer.today is not None and answer.today.reason:
        parts.append(paragraph(f"Today: {answer.today.reason}"))
    return "\n\n".join(parts)


def _plan_parts(study: Study, plan: Plan) -> Iterator[str]:
    yield paragraph(payback(plan))
    if plan.sites:
        yield _sites(plan)
    if plan.suppliers:
        yield _suppliers(plan)
    yield _costs(plan)
    if said := _said(study, plan):
        yield bullets(said)
    yield _proof(plan.proof)
    notes = [*(str(warning) for warning in study.warnings), *plan.warnings]
    if notes:
        yield "Worth a look:\n" + bullets(notes)
    yield "Cautions:\n" + bullets(CAUTIONS)


def _sites(plan: Plan) -> str:
    header = ("site", "verdict", "size", f"{plan.unit} a year", "full", "customers", "charge a year", "once", "note")
    rows = [
        (
            line.site,
            line.verdict,
            line.size or ABSENT,
            *_use(line, line.throughput),
            f"{line.customers}",
            *_charges(line),
            line.note,
        )
        for line in plan.sites
    ]
    return table(header, rows)


def _suppliers(plan: Plan) -> str:
    header = ("supplier", "verdict", f"{plan.unit} a year", "full", "charge a year", "once", "note")
    rows = [
        (line.supplier, line.verdict, *_use(line, line.volume), *_charges(line), line.note) for line in plan.suppliers
    ]
    return table(header, rows)


def _use(line: SiteLine | SupplierLine, load: float) -> tuple[str, str]:
    """Return what moves through, and how full that makes it."""
    return _number(load), ABSENT if line.utilisation is None else f"{line.utilisation:.0%}"


def _charges(line: SiteLine | SupplierLine) -> tuple[str, str]:
    """Return what the verdict costs a year and once."""
    return _number(line.charge), _number(line.one_off)


def _costs(plan: Plan) -> str:
    """Return the cost lines of the plan beside today's, those that are 0 in both left out."""
    before = plan.today.plan if plan.today else None
    rows = []
    for line in CostLine:
        now, was = plan.cost_lines[line], before.cost_lines[line] if before else 0.0
        if now or was:
            rows.append((str(line), _number(now), *_against(now, was, there=before is not None)))
    was_all = before.cost if before else 0.0
    rows.append(("all", _number(plan.cost), *_against(plan.cost, was_all, there=before is not None)))
    return table((f"{plan.currency} a year", "plan", "today", "difference", ""), rows)


def _against(now: float, was: float, *, there: bool) -> tuple[str, str, str]:
    return (_number(was), f"{now - was:+,.0f}", "") if there else (ABSENT, ABSENT, "")


def _said(study: Study, plan: Plan) -> list[str]:
    """Return what is worth saying about distance, service, emissions and deliveries."""
    said = [*_distance(study, plan.service), delivery_sentence(study, plan)]
    if plan.tonnes_co2e is None:
        said.append("Emissions are not reported: the study sets no emission_kg_per_tkm.")
    else:
        said.append(f"Emissions: {_number(plan.tonnes_co2e)} t CO2e a year.")
    if plan.today is not None and plan.today.reason:
        said.append(f"Today: {plan.today.reason}")
    return [sentence for sentence in said if sentence]


def _distance(study: Study, service: Service) -> Iterator[str]:
    settings = study.settings
    if service.average_km is not None:
        yield f"Customers are {service.average_km:,.0f} road km from what serves them, on average by load."
    if service.share_within is not None:
        asked = "" if settings.service_share is None else f", at least {settings.service_share:.0%} is asked"
        yield f"{service.share_within:.1%} of the weight is delivered within {settings.service_km:g} road km{asked}."


def _proof(proof: Proof) -> str:
    """Return what ran, for how long, and what it proved."""
    bound = f" No plan can cost less than {proof.bound:,.0f} a year." if proof.bound is not None else ""
    why = f" ({proof.reason.rstrip('.')})" if proof.reason else ""
    return paragraph(f"Proof: {proof.outcome}, by the engine {proof.engine}{why} in {proof.seconds:,.1f} s.{bound}")


def _number(value: float) -> str:
    """Return whole numbers with thousands apart; 0 reads as nothing to pay or move."""
    return f"{value:,.0f}" if abs(value) >= 0.5 else ABSENT if value == 0 else f"{value:,.2g}"  # noqa: PLR2004  # rounds to 0
