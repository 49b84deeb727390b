"""What the page Compare shows of plans side by side, as tables in HTML. Knows no Streamlit."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.browse.closing_view import signed
from siting.browse.tables import Heading, Line, report_table
from siting.plan.plan import CostLine, SiteVerdict, SupplierVerdict
from siting.plan.words import percent, percent_up
from siting.sharing.charts import LINE_NAMES
from siting.sharing.looks import SITE_SYMBOLS, SUPPLIER_SYMBOLS
from siting.sharing.map_facts import name_shown
from siting.sharing.symbols import symbol_svg

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from siting.questions.compare_result import Comparison, Figures, VerdictRow

HALF = 0.5
"""Smaller than this rounds to 0."""


def figures_table(found: Comparison) -> str:
    """Return what each plan amounts to, a plan a column, the cost lines below, as an HTML table."""
    two = len(found.plans) == 2  # noqa: PLR2004 - of two plans there is one difference
    headings = [
        Heading(text=f"{found.currency} a year"),
        *(Heading(text=name_shown(name), number=True) for name in found.names),
        *([Heading(text="Difference", number=True)] if two else []),
    ]

    def money_cells(amounts: Sequence[float]) -> tuple[str, ...]:
        cells = tuple(map(_number, amounts))
        return (*cells, signed(amounts[1] - amounts[0])) if two else cells

    blank = ("",) if two else ()
    lines = [Line(cells=("Cost", *money_cells([plan.cost for plan in found.plans])), kind="total")]
    lines += [
        Line(cells=(label, *cells, *blank))
        for label, cells in _figures(found)
        if any(cell not in {"", "0"} for cell in cells)
    ]
    lines.append(Line(cells=("Cost lines", *("" for _ in found.plans), *blank), kind="total"))
    differ = [row for row in found.cost_lines if max(row.amounts) - min(row.amounts) >= HALF]
    same = [row for row in found.cost_lines if row not in differ]
    lines += [Line(cells=(LINE_NAMES[CostLine(row.name)], *money_cells(row.amounts))) for row in differ]
    lines += [Line(cells=(LINE_NAMES[CostLine(row.name)], *money_cells(row.amounts)), kind="faint") for row in same]
    return report_table(headings, lines)


def _figures(found: Comparison) -> list[tuple[str, list[str]]]:
    first = found.plans[0].cost

    def each(value: Callable[[Figures], str]) -> list[str]:
        return [value(plan) for plan in found.plans]

    more = f"More than {name_shown(found.names[0])}"
    several = [] if len(found.plans) == 2 else [  # noqa: PLR2004 - as above
        (more, each(lambda plan: f"{plan.cost - first:+,.0f}" if abs(plan.cost - first) >= HALF else ""))
    ]  # fmt: skip
    return [
        *several,
        ("No plan costs less than", each(lambda plan: _number(plan.bound))),
        ("Proof", each(_proof)),
        ("Saving against today", each(lambda plan: _number(plan.saving))),
        (f"One-off money, {found.currency}", each(lambda plan: _number(plan.one_off))),
        ("Sites open", each(lambda plan: str(plan.open_sites))),
        ("Suppliers signed", each(lambda plan: str(plan.signed_suppliers))),
        ("Road km on average", each(lambda plan: _number(plan.average_km))),
        (
            "Weight within the service distance",
            each(lambda plan: "" if plan.share_within is None else percent(plan.share_within)),
        ),
        ("t CO2e a year", each(lambda plan: _number(plan.tonnes_co2e))),
    ]


def _proof(plan: Figures) -> str:
    if plan.outcome == "proved" or plan.gap is None:
        return str(plan.outcome)
    return f"within {percent_up(plan.gap)}"


def verdicts_table(found: Comparison) -> str:
    """Return the sites and suppliers of another verdict or size, then a row for all others, as an HTML table."""
    headings = [Heading(text="Site or supplier", name=True), *(Heading(text=name_shown(name), verdict=True)
                                                               for name in found.names)]  # fmt: skip
    lines = [Line(mark=_mark(row), cells=(row.name, *_verdicts(row))) for row in found.differing]
    same = [row for row in found.verdicts if not row.differs]
    if same:
        cells = (f"{len(same)} the same", ", ".join(f"{row.name} ({row.verdicts[0]})" for row in same))
        lines.append(Line(cells=(*cells, *[""] * (len(found.names) - 1)), kind="faint", wide=True))
    return report_table(headings, lines)


def _mark(row: VerdictRow) -> str:
    verdict = next(word for word in row.verdicts[::-1] if word)
    if row.kind == "site":
        return symbol_svg(SITE_SYMBOLS[SiteVerdict(verdict)], fill=0.6)
    return symbol_svg(SUPPLIER_SYMBOLS[SupplierVerdict(verdict)])


def _verdicts(row: VerdictRow) -> list[str]:
    return [
        f"{verdict} {size}".strip() if verdict else "not there"
        for verdict, size in zip(row.verdicts, row.sizes, strict=True)
    ]


def customers_columns(found: Comparison, unit: str) -> dict[str, Sequence[object]]:
    """Return the customers that change, column by column, for a data frame."""
    origins: dict[str, Sequence[object]] = {
        name_shown(name): [" + ".join(move.origins[at]) or "nowhere" for move in found.customers]
        for at, name in enumerate(found.names)
    }
    return {
        "Customer": [move.customer for move in found.customers],
        f"Load, {unit} a year": [max(move.loads) for move in found.customers],
        **{f"From, in {name}": cells for name, cells in origins.items()},
    }


def _number(value: float | None) -> str:
    if value is None:
        return ""
    return f"{value:,.0f}" if abs(value) >= HALF or value == 0 else f"{value:.2g}"
