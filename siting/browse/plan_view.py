"""How a page shows an answer: verdict list beside the map, costs, service, customers, proof."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import pandas as pd
import streamlit as st

from siting.browse.shell import MAP_HEIGHT_PX, headline, notice, notices, section
from siting.browse.tables import Heading, Line, report_table
from siting.plan.freight_words import tariff_sentence
from siting.plan.plan import CostLine, SiteVerdict, SupplierVerdict, TodayOutcome
from siting.plan.proof import Outcome
from siting.plan.words import CAUTIONS, NOT_FOR_PRICING, delivery_sentence, payback, sureness
from siting.plan.words import headline as plan_headline
from siting.sharing.charts import LINE_NAMES, band_chart, band_names, cost_chart
from siting.sharing.looks import NO_BREAK, SITE_SYMBOLS, SUPPLIER_SYMBOLS, Formats
from siting.sharing.map_facts import load_unit
from siting.sharing.symbols import symbol_svg

if TYPE_CHECKING:
    from collections.abc import Sequence

    from streamlit.delta_generator import DeltaGenerator
    from streamlit.elements.lib.column_types import ColumnConfig

    from siting.browse.kept import Kept
    from siting.plan.plan import Plan
    from siting.study.tables import Study

MOST_NAMED = 120
"""Names that one row of a table lists; what comes after them is counted."""

SITE_ORDER = (SiteVerdict.OPEN, SiteVerdict.KEEP, SiteVerdict.CLOSE, SiteVerdict.LEAVE)
SUPPLIER_ORDER = (SupplierVerdict.SIGN, SupplierVerdict.STAY, SupplierVerdict.DROP, SupplierVerdict.LEAVE)
LEAVE = str(SiteVerdict.LEAVE)
"""The same word for sites and suppliers."""
IN_USE = frozenset({str(SiteVerdict.KEEP), str(SiteVerdict.OPEN), str(SupplierVerdict.STAY), str(SupplierVerdict.SIGN)})


def show_answer(kept: Kept, top: DeltaGenerator) -> None:
    """
    Show an answer from its headline to the cautions.

    Parameters
    ----------
    kept
        The answer, with or without a plan, and the study it answers.
    top
        Where the headline goes; everything else follows where the page is.
    """
    study, plan = kept.study, kept.answer.plan
    if plan is None:
        with top:
            _no_plan(kept)
        return
    with top:
        headline(plan_headline(kept.answer, currency=plan.currency), second=payback(plan))
    formats = Formats(currency=plan.currency, unit=load_unit(study))
    st.iframe(kept.map_on_page, height=MAP_HEIGHT_PX, alt="Map of the plan")
    notices(plan.warnings, kind="stale", title="Worth a second look")
    section("Verdicts one by one")
    tables = [table for table in (site_table(plan, formats), supplier_table(plan, formats)) if table]
    for column, table in zip(st.columns(len(tables), gap="medium"), tables, strict=True):
        column.html(table)
    _costs(study, plan, formats)
    _service(plan, formats)
    _details(plan, formats)
    section("How sure is this?")
    st.html(_proof_table(plan, formats))
    section("Before anyone acts on it")
    notices(CAUTIONS)


def _no_plan(kept: Kept) -> None:
    """Say why there is no plan, and what would help."""
    answer, currency = kept.answer, kept.study.settings.currency
    if len(answer.reasons) > 1:
        headline("No plan can meet everything that is asked")
        title = "All of these together must be met" if answer.together else "Any one of these repairs it"
        notices((reason.sentence for reason in answer.reasons), kind="fault", title=title)
    else:
        headline(plan_headline(answer, currency=currency))
    if answer.proof.outcome is Outcome.IMPOSSIBLE:
        notice("Change it on the page Inputs, then press Run here.")
    else:
        notice("Give the search more time under How hard to search, or ask for a wider gap; then press Run.")


def site_table(plan: Plan, formats: Formats) -> str:
    """Return the sites with their verdicts, what opens first, as an HTML table."""
    rows = [
        _Row(
            verdict=str(line.verdict),
            name=f"{line.site} ({line.size})" if line.size else line.site,
            mark=symbol_svg(SITE_SYMBOLS[line.verdict], fill=line.utilisation),
            moved=line.throughput,
            full=line.utilisation,
            charge=line.charge,
            one_off=line.one_off,
            note=line.note,
        )
        for line in plan.sites
    ]
    return _verdict_table(rows, SITE_ORDER, ("Site", "Throughput"), formats)


def supplier_table(plan: Plan, formats: Formats) -> str:
    """Return the suppliers with their verdicts, what is signed first, as an HTML table."""
    rows = [
        _Row(
            verdict=str(line.verdict),
            name=line.supplier,
            mark=symbol_svg(SUPPLIER_SYMBOLS[line.verdict]),
            moved=line.volume,
            full=line.utilisation,
            charge=line.charge,
            one_off=line.one_off,
            note=line.note,
        )
        for line in plan.suppliers
    ]
    return _verdict_table(rows, SUPPLIER_ORDER, ("Supplier", "Volume"), formats)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Row:
    """A site or a supplier with its verdict."""

    verdict: str
    name: str
    mark: str
    moved: float
    full: float | None
    charge: float
    one_off: float
    note: str


def _verdict_table(
    rows: Sequence[_Row],
    order: Sequence[str],
    words: tuple[str, str],
    formats: Formats,
) -> str:
    """Return rows by verdict, those left alone in one row at the end; empty without any."""
    if not rows:
        return ""
    name, moved = words
    headings = (
        Heading(text="Verdict", verdict=True),
        Heading(text=name, name=True),
        Heading(text=f"{moved}, {formats.unit} a year", number=True),
        Heading(text="Full", number=True),
        Heading(text=f"Charge, {formats.currency} a year", number=True),
        Heading(text=f"One-off, {formats.currency}", number=True),
    )
    left = [row for row in rows if row.verdict == LEAVE and not row.note]
    taken = [row for row in rows if row.verdict != LEAVE or row.note]
    taken.sort(key=lambda row: order.index(row.verdict))
    lines = [*(_line(row, formats) for row in taken), *_left_alone(left)]
    return report_table(headings, lines, caption=f"{name}s")


def _left_alone(rows: Sequence[_Row]) -> list[Line]:
    """Return one row for all that the plan leaves alone, none where there is nothing."""
    if not rows:
        return []
    more = f" and {len(rows) - MOST_NAMED:,} more" if len(rows) > MOST_NAMED else ""
    listed = ", ".join(row.name for row in rows[:MOST_NAMED]) + more
    cells = (f"{LEAVE} {len(rows):,}", listed, "", "", "", "")
    return [Line(mark=rows[0].mark, kind="faint", cells=cells, wide=True)]


def _line(row: _Row, formats: Formats) -> Line:
    """Return the row as the table shows it; what moves is blank where nothing can."""
    in_use = row.verdict in IN_USE
    return Line(
        mark=row.mark,
        kind="faint" if row.verdict == LEAVE else "",
        cells=(
            row.verdict,
            f"{row.name} \N{EN DASH} {row.note}" if row.note else row.name,
            formats.number(row.moved) if in_use else "",
            formats.share(row.full) if in_use and row.full is not None else "",
            formats.number(row.charge) if row.charge else "",
            formats.number(row.one_off) if row.one_off else "",
        ),
    )


def _costs(study: Study, plan: Plan, formats: Formats) -> None:
    section("What it costs", "Every line a year; one-off money is spread over its life. The lines add up to the cost.")
    table, chart = st.columns([1, 1.25], gap="medium")
    with table:
        st.html(cost_table(plan, formats))
        for sentence in filter(None, (delivery_sentence(study, plan), tariff_sentence(study, plan))):
            notice(sentence)
    with chart:
        st.altair_chart(cost_chart(plan))
        if plan.cost_lines[CostLine.GOODS]:
            st.caption("Goods bought are left out of the drawing, so that the other lines can be seen.")
    if plan.today is not None and plan.today.outcome is not TodayOutcome.SERVED:
        notice(plan.today.reason, kind="stale")


def cost_table(plan: Plan, formats: Formats) -> str:
    """Return the cost lines of a plan against today's as an HTML table."""
    before = plan.today.plan if plan.today else None
    headings = [Heading(text="Line"), Heading(text=f"This plan, {formats.currency} a year", number=True)]
    if before:
        headings += [
            Heading(text=f"Today, {formats.currency} a year", number=True),
            Heading(text=f"Difference, {formats.currency} a year", number=True),
        ]
    lines = []
    for line in CostLine:
        now, then = plan.cost_lines[line], before.cost_lines[line] if before else 0.0
        if now or then:
            lines.append(Line(cells=(LINE_NAMES[line], *_money_cells(now, then if before else None))))
    lines.append(Line(cells=("Cost", *_money_cells(plan.cost, before.cost if before else None)), kind="total"))
    return report_table(headings, lines, caption="Cost lines")


def _money_cells(now: float, then: float | None) -> tuple[str, ...]:
    if then is None:
        return (f"{now:,.0f}",)
    return (f"{now:,.0f}", f"{then:,.0f}", f"{now - then:+,.0f}")


def _service(plan: Plan, formats: Formats) -> None:
    service = plan.service
    if service.average_km is None:
        return
    parts = [f"Average distance {formats.distance(service.average_km)} by volume"]
    if service.share_within is not None:
        parts.append(f"{formats.share(service.share_within)} of weight within the service distance")
    if service.estimated_share is not None:
        parts.append(f"{formats.share(service.estimated_share)} of volume moves on estimated distances")
    if plan.tonnes_co2e is not None:
        parts.append(f"{formats.number(plan.tonnes_co2e)}{NO_BREAK}t{NO_BREAK}CO2e a year")
    section("How far customers are", "; ".join(parts) + ".")
    table, chart = st.columns([1, 1.25], gap="medium")
    headings = (
        Heading(text="Road distance"),
        Heading(text=f"Volume, {formats.unit} a year", number=True),
        Heading(text="Share", number=True),
    )
    lines = [
        Line(cells=(name, formats.number(band.load), formats.share(band.share)))
        for name, band in zip(band_names(service), service.bands, strict=True)
    ]
    with table:
        st.html(report_table(headings, lines, caption="Distance bands"))
    with chart:
        st.altair_chart(band_chart(service, formats.unit))


def _details(plan: Plan, formats: Formats) -> None:
    section("Customer by customer", NOT_FOR_PRICING)
    goods = list(dict.fromkeys(good for line in plan.customers for good in line.marginal_cost))
    customers = pd.DataFrame(
        {
            "Customer": [line.customer for line in plan.customers],
            "Served from": ["; ".join(line.origins) for line in plan.customers],
            f"Load, {formats.unit} a year": [line.load for line in plan.customers],
            "Road km": [line.km for line in plan.customers],
            f"Cost to serve, {plan.currency} a year": [line.cost_to_serve for line in plan.customers],
            **{
                f"Marginal cost of {good}, {plan.currency} a unit": [
                    line.marginal_cost.get(good) for line in plan.customers
                ]
                for good in goods
            },
        }
    )
    st.dataframe(customers, hide_index=True, height=360, column_config=_numbers(customers))
    section("Flow by flow")
    flows = pd.DataFrame(
        {
            "Leg": [str(flow.leg) for flow in plan.flows],
            "From": [flow.origin for flow in plan.flows],
            "To": [flow.destination for flow in plan.flows],
            "Good": [flow.good for flow in plan.flows],
            "Units a year": [flow.amount for flow in plan.flows],
            "Road km": [flow.km for flow in plan.flows],
            "Distance": ["given" if flow.km_given else "estimated" for flow in plan.flows],
            f"Cost, {plan.currency} a year": [flow.cost for flow in plan.flows],
        }
    )
    st.dataframe(flows, hide_index=True, height=300, column_config=_numbers(flows))


def _numbers(frame: pd.DataFrame) -> dict[str, ColumnConfig]:
    """Return number columns with thousands separated."""
    numeric: Sequence[str] = [str(name) for name in frame.select_dtypes("number").columns]
    return {name: st.column_config.NumberColumn(name, format="localized", step=0.01) for name in numeric}


def _proof_table(plan: Plan, formats: Formats) -> str:
    proof = plan.proof
    rows = [
        ("In words", sureness(proof, plan.currency)),
        ("Cost", formats.money_a_year(plan.cost)),
        ("No plan is cheaper than", "unknown" if proof.bound is None else formats.money_a_year(proof.bound)),
        ("Asked for", f"a gap of at most {formats.share(proof.gap_asked)}"),
        (
            "Searched",
            f"{proof.seconds:,.1f} s with engine {proof.engine}" + (f": {proof.reason}" if proof.reason else ""),
        ),
        ("Audit", "passed: every amount and charge re-checked from the tables"),
        ("Data", f"fingerprint {plan.fingerprint[:16]}"),
    ]
    return report_table((Heading(text=""), Heading(text="")), (Line(cells=row) for row in rows))
