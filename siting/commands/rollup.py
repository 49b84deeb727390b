"""`siting rollup`: demand from order lines."""

from __future__ import annotations

import argparse
import datetime as dt
import math
from typing import TYPE_CHECKING

from siting.commands.command import FOUND, say
from siting.commands.new_study import add_out, refuse_taken, write_new

if TYPE_CHECKING:
    from siting.commands.command import Commands
    from siting.study.orders import OrderColumns, Rollup

SHOWN_MONTHS = 24
"""The last months of a long period are listed."""


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
    from siting.study.order_words import rollup_lines
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


def _month_lines(rollup: Rollup, unit: str) -> list[str]:
    from siting.study.order_words import month_shares, quantity_text

    shown = list(zip(rollup.months, month_shares(rollup), strict=False))[-SHOWN_MONTHS:]
    return [f"  {month}  {quantity_text(quantity, unit)}  {share:.0%}" for (month, quantity), (_, share) in shown]


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
