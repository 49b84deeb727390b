"""`siting rollup`: demand from order lines."""

from __future__ import annotations

import argparse
import datetime as dt
import math
from typing import TYPE_CHECKING

from siting.commands.command import FOUND, say
from siting.commands.new_study import add_out, refuse_taken, write_new

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.commands.command import Commands
    from siting.study.orders import OrderColumns, OrderReading, Rollup

SHOWN_MONTHS = 24
"""The last months of a long period are listed."""
WHOLE_FROM = 1000.0
"""Quantities from which whole numbers do."""


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "rollup",
        help="add order lines up to a year's demand",
        description="Add order lines up to a year's demand by customer, and by good where there are several: CSV or "
        "Parquet of any size. Says what was left out, taken off or far out, how the period became a year, and how the "
        "months differ. Writes a study to be completed: sites or suppliers, coordinates, settings.",
    )
    parser.add_argument("orders", metavar="ORDERS", help="a CSV or Parquet file, or several as 'orders-*.parquet'")
    parser.add_argument(
        "--by", required=True, metavar="CUSTOMER[,GOOD]", help="column of the customer, and of the good if any"
    )
    parser.add_argument("--quantity", required=True, metavar="COLUMN", help="column of the quantity")
    parser.add_argument(
        "--date", default="", metavar="COLUMN", help="column of the date; without, the file is one year"
    )
    parser.add_argument("--from", dest="first", type=_day, metavar="DAY", help="first day that counts, as 2025-01-01")
    parser.add_argument("--to", dest="last", type=_day, metavar="DAY", help="last day that counts")
    parser.add_argument(
        "--factor", type=_factor, default=1.0, help="the study's units in one of the file's, such as 0.001 from kg to t"
    )
    parser.add_argument("--decimal", choices=(".", ","), default="", help="decimal mark, where the file leaves it open")
    parser.add_argument("--date-format", default="", metavar="FORM", help="form of dates, such as %%d.%%m.%%Y")
    parser.add_argument("--without-returns", action="store_true", help="leave negative lines out, not taken off")
    parser.add_argument("--without-far-out", action="store_true", help="leave lines out that are far above the others")
    parser.add_argument(
        "--carry",
        default="",
        metavar="NAME=COLUMN,...",
        help="columns to carry along to customers, such as place=town,country=land",
    )
    parser.add_argument("--currency", default="", help="of the study, such as EUR")
    parser.add_argument("--unit", default="", help="of the study's quantities, such as t")
    add_out(parser)
    parser.add_argument("--quiet", action="store_true", help="show no progress")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Write the study and print how its demand came about; return the exit code.

    Raises
    ------
    DataFileError
        If the order lines cannot be read, or something is in the place to write to.
    """
    from siting.commands.progress import progress_on_stderr
    from siting.study.order_study import study_of_orders
    from siting.study.orders import OrderReading, roll_up

    out = refuse_taken(arguments.out)
    columns = _columns(arguments)
    reading = OrderReading(
        factor=arguments.factor,
        decimal=arguments.decimal,
        date_format=arguments.date_format,
        first=arguments.first,
        last=arguments.last,
        returns=not arguments.without_returns,
        far_out=not arguments.without_far_out,
    )
    rollup = roll_up(arguments.orders, columns, reading, listener=progress_on_stderr(wanted=not arguments.quiet))
    study = study_of_orders(rollup, columns, currency=arguments.currency, unit=arguments.unit)
    write_new(study, out)
    say("\n".join([*rollup_lines(rollup, reading, arguments.unit), *_month_lines(rollup, arguments.unit)]))
    say(f"{out}: add sites or suppliers, what customers lack and the settings, then: siting check {out}")
    return FOUND


def _columns(arguments: argparse.Namespace) -> OrderColumns:
    from siting.errors import DataFileError
    from siting.study.order_study import CARRIED
    from siting.study.orders import OrderColumns

    by = [name.strip() for name in arguments.by.split(",")]
    if len(by) > 2 or not all(by):  # noqa: PLR2004  (customer and good)
        msg = f"--by takes the customer's column and the good's, got {arguments.by!r}. Write --by customer,product"
        raise DataFileError(msg)
    kept = {}
    for pair in filter(None, arguments.carry.split(",")):
        name, _, column = pair.partition("=")
        if name not in CARRIED or not column:
            allowed = ", ".join(CARRIED)
            msg = f"--carry takes NAME=COLUMN with a NAME of {allowed}, got {pair!r}. Write --carry place=town"
            raise DataFileError(msg)
        kept[name] = column
    return OrderColumns(
        customer=by[0], good=by[1] if len(by) > 1 else "", quantity=arguments.quantity, date=arguments.date, kept=kept
    )


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
    from siting.study.words import counted

    def amount(quantity: float) -> str:
        return _amount(quantity, unit)

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
    from siting.study.words import counted

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


def _month_lines(rollup: Rollup, unit: str) -> list[str]:
    shown = list(zip(rollup.months, month_shares(rollup), strict=False))[-SHOWN_MONTHS:]
    return [f"  {month}  {_amount(quantity, unit)}  {share:.0%}" for (month, quantity), (_, share) in shown]


def _amount(quantity: float, unit: str) -> str:
    return f"{quantity:{',.0f' if abs(quantity) >= WHOLE_FROM else ',.6g'}} {unit}".rstrip()


def _day(text: str) -> dt.date:
    try:
        return dt.date.fromisoformat(text)
    except ValueError:
        msg = f"{text!r} is not a day; write one as 2025-01-31"
        raise argparse.ArgumentTypeError(msg) from None


def _factor(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = 0.0
    if not 0.0 < value < math.inf:
        msg = f"{text!r} is not a factor above 0; write 0.001 from kg to t"
        raise argparse.ArgumentTypeError(msg)
    return value
