"""What `siting compare` prints for a reader: the cheapest, figures and cost lines, what differs."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.layout import bullets, paragraph, short, table
from siting.plan.words import percent, percent_up
from siting.questions.words import comparison_headline

if TYPE_CHECKING:
    from siting.questions.compare_result import Comparison, Figures, VerdictRow

HALF = 0.5
"""Smaller than this rounds to 0."""
MOST_CUSTOMERS = 20
"""Customers listed one by one."""
WIDEST = 12
"""Characters of a name above a column of numbers; longer ones are listed under a letter."""


def comparison_text(found: Comparison) -> str:
    """
    Return plans side by side as text, of at most 100 columns for up to six plans, names aside.

    Parameters
    ----------
    found
        What was compared.

    Returns
    -------
    text
        Headline, figures and cost lines, verdicts that differ, customers that change site.
    """
    heads, key = _heads(found)
    parts = [
        paragraph(comparison_headline(found)),
        key,
        _figures(found, heads),
        _costs(found, heads),
        _verdicts(found, heads),
    ]
    parts.append(_customers(found, heads))
    return "\n\n".join(part for part in parts if part)


def _heads(found: Comparison) -> tuple[list[str], str]:
    """Return what stands above each column, and a key where names are too long for that."""
    if all(len(name) <= WIDEST for name in found.names):
        return list(found.names), ""
    letters = [chr(ord("A") + at) for at in range(len(found.names))]
    return letters, "\n".join(f"{letter}  {name}" for letter, name in zip(letters, found.names, strict=True))


def _figures(found: Comparison, heads: list[str]) -> str:
    def row(name: str, cells: list[str]) -> tuple[str, ...]:
        return (name, *cells)

    plans = found.plans
    rows = [
        row("cost", [_number(plan.cost) for plan in plans]),
        row("no plan costs less than", [_number(plan.bound) for plan in plans]),
        row("proof", [_proof(plan) for plan in plans]),
        row("saving against today", [_number(plan.saving) for plan in plans]),
        row("one-off money", [_number(plan.one_off) for plan in plans]),
        row("sites open", [str(plan.open_sites) for plan in plans]),
        row("suppliers signed", [str(plan.signed_suppliers) for plan in plans]),
        row("road km on average", [_number(plan.average_km) for plan in plans]),
        row("weight within service_km", ["-" if p.share_within is None else percent(p.share_within) for p in plans]),
        row("t CO2e a year", [_number(plan.tonnes_co2e) for plan in plans]),
    ]
    shown = [line for line in rows if any(cell not in {"-", "0"} for cell in line[1:])]
    return table((f"{found.currency} a year", *heads), shown)


def _proof(plan: Figures) -> str:
    if plan.outcome == "proved" or plan.gap is None:
        return str(plan.outcome)
    return f"{percent_up(plan.gap)} open"


def _costs(found: Comparison, heads: list[str]) -> str:
    rows = [(row.name, *(_number(amount) for amount in row.amounts)) for row in found.cost_lines]
    return table(("cost line", *heads), rows)


def _verdicts(found: Comparison, heads: list[str]) -> str:
    rows = [(short(row.name), *_cells(row)) for row in found.differing]
    if not rows:
        return "Every verdict is the same."
    return table(("verdicts that differ", *heads), rows, words=1 + len(heads))


def _cells(row: VerdictRow) -> list[str]:
    return [
        f"{verdict} {size}".strip() if verdict else "-" for verdict, size in zip(row.verdicts, row.sizes, strict=True)
    ]


def _customers(found: Comparison, heads: list[str]) -> str:
    if not found.customers:
        return "Every customer is served from the same places."
    rows = [
        (move.customer, *(" + ".join(map(short, origins)) or "-" for origins in move.origins))
        for move in found.customers[:MOST_CUSTOMERS]
    ]
    more = len(found.customers) - len(rows)
    lines = table(("customers that change", *heads), rows, words=1 + len(heads))
    return "\n".join([lines, *([bullets([f"and {more} more customers; --json lists all"])] if more > 0 else [])])


def _number(value: float | None) -> str:
    if value is None:
        return "-"
    return f"{value:,.0f}" if abs(value) >= HALF or value == 0 else f"{value:.2g}"
