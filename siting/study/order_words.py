"""How demand came about from order lines, in sentences and shares of months."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from siting.study.words import counted

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.study.orders import OrderReading, Rollup

WHOLE_FROM = 1000.0
"""Quantities from which whole numbers do."""


def rollup_lines(rollup: Rollup, reading: OrderReading, unit: str) -> list[str]:
    """
    Return how demand came about.

    Parameters
    ----------
    rollup
        What was added up.
    reading
        How it was asked for.
    unit
        Of the quantities; may be "".

    Returns
    -------
    lines
        Sentences, one each.
    """

    def amount(quantity: float) -> str:
        return quantity_text(quantity, unit)

    total = sum(rollup.demand.values())
    customers = len({customer for customer, _ in rollup.demand})
    used = f"{counted(rollup.lines, 'line')}, {rollup.used.lines:,} of them added up"
    lines = [f"{used}: {amount(total)} a year for {counted(customers, 'customer')}."]
    lines += [f"Left out: {counted(count, 'line')} {reason}." for reason, count in rollup.skipped.items() if count]
    if rollup.returned.lines:
        how = "taken off" if reading.returns else "left out"
        negative = counted(rollup.returned.lines, "negative line")
        lines.append(f"Returns: {negative}, {amount(-rollup.returned.quantity)}, {how}.")
    if rollup.emptied:
        emptied = counted(rollup.emptied, "pair")
        lines.append(f"No demand is left of {emptied} of customer and good, whose returns reach their orders.")
    lines += _far_out_lines(rollup, reading, amount)
    lines += [f"{name} differs between lines of {counted(count, 'customer')}: the first in order is kept."
              for name, count in rollup.differing.items()]  # fmt: skip
    return [*lines, *_period_lines(rollup)]


def _far_out_lines(rollup: Rollup, reading: OrderReading, amount: Callable[[float], str]) -> list[str]:
    if not rollup.far_out.lines:
        return []
    how = "kept" if reading.far_out else "left out"
    shown = "; ".join(
        f"{line.customer}{f' {line.good}' if line.good else ''} {amount(line.quantity)} (above {amount(line.limit)})"
        for line in rollup.largest
    )
    what = f"{counted(rollup.far_out.lines, 'line')}, {amount(rollup.far_out.quantity)}, {how}"
    return [f"Far above the other lines of their good: {what}. The largest: {shown}."]


def _period_lines(rollup: Rollup) -> list[str]:
    """Return how the period became a year, and which of its months is the strongest."""
    if rollup.first is None:
        return ["No dates: the lines are taken as one year's."]
    how = "a year" if math.isclose(rollup.yearly, 1.0) else f"made a year by x {rollup.yearly:.4g}"
    lines = [f"Period: {rollup.first} to {rollup.last}, {rollup.days:,} days, {how}."]
    shares = month_shares(rollup)
    if shares:
        most, share = max(shares, key=lambda month: month[1])
        lines.append(
            f"Season: the strongest month, {most}, moves {share:.0%} of an average month; capacities are yearly, so "
            "check that a site can move it."
        )
    if rollup.yearly > 1:
        lines.append("Less than a year: what the missing months would move is not in these lines.")
    return lines


def month_shares(rollup: Rollup) -> tuple[tuple[str, float], ...]:
    """
    Return how the months of the period differ.

    Parameters
    ----------
    rollup
        What was added up.

    Returns
    -------
    shares
        Each month, and its quantity over that of an average month; empty with one month or none.
    """
    mean = sum(quantity for _, quantity in rollup.months) / max(1, len(rollup.months))
    if len(rollup.months) <= 1 or mean <= 0:
        return ()
    return tuple((month, quantity / mean) for month, quantity in rollup.months)


def quantity_text(quantity: float, unit: str) -> str:
    """Return a quantity with its unit: whole from 1000 up."""
    return f"{quantity:{',.0f' if abs(quantity) >= WHOLE_FROM else ',.6g'}} {unit}".rstrip()
