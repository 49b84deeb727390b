"""
Add order lines up to demand: CSV or Parquet files of any size, read by DuckDB and never held in memory.

The first reading finds out how numbers and dates are written, the period, and which lines are far out; the second adds
up by customer, good and month; a third is needed only for columns to carry along. Nothing is dropped silently: whatever
is not in the sums is counted with its reason.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from siting.errors import DataFileError
from siting.study.order_file import OrderFile

if TYPE_CHECKING:
    from collections.abc import Mapping
    from pathlib import Path

    from siting.listener import Listener

YEAR_DAYS = 365
WHOLE_MONTH_DAYS = 7
"""A period that begins or ends within this many days of the end of a month is taken to that end."""


@dataclass(frozen=True, slots=True, kw_only=True)
class OrderColumns:
    """Which columns of a file of order lines say what."""

    customer: str
    quantity: str
    good: str = ""
    """"" = one good."""
    date: str = ""
    """"" = the lines are one year's."""
    kept: Mapping[str, str] = field(default_factory=dict)
    """Columns of `customers` to carry along, such as place, and the columns of the file they come from."""


@dataclass(frozen=True, slots=True, kw_only=True)
class OrderReading:
    """How order lines are to be read and added up."""

    factor: float = 1.0
    """Units of the study per unit of the file, such as 0.001 from kg to t."""
    decimal: str = ""
    """`.` or `,`; "" = found out, refused where both fit."""
    date_format: str = ""
    """As of strptime, such as %d.%m.%Y; "" = found out, refused where several fit."""
    first: dt.date | None = None
    last: dt.date | None = None
    """The period, both days in it; None = as the lines say, to whole months."""
    returns: bool = True
    """Whether negative lines are taken off; otherwise they are left out."""
    far_out: bool = True
    """Whether lines that are far out are kept; otherwise they are left out."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LineCount:
    """Some lines and what they add up to, in the study's unit."""

    lines: int
    quantity: float


@dataclass(frozen=True, slots=True, kw_only=True)
class FarOutLine:
    """A line that is far above the others of its good."""

    customer: str
    good: str
    quantity: float
    limit: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Rollup:
    """Demand added up from order lines. Quantities in the study's unit."""

    demand: Mapping[tuple[str, str], float]
    """Units a year of each customer and good ("" = the one good), above 0."""
    kept: Mapping[str, tuple[str, ...]]
    """What was carried along of each customer, in the order of `OrderColumns.kept`."""
    differing: Mapping[str, int]
    """Customers whose lines say different things, by what was carried along; the first in order is kept."""
    lines: int
    """In the file."""
    skipped: Mapping[str, int]
    """Lines left out, by reason."""
    used: LineCount
    returned: LineCount
    """Negative lines of the period, whether taken off or left out."""
    far_out: LineCount
    """Far-out lines of the period, whether kept or left out."""
    largest: tuple[FarOutLine, ...]
    """The largest of them."""
    emptied: int
    """Customers and goods whose returns eat up all their orders: no demand."""
    first: dt.date | None
    last: dt.date | None
    """The period; None where there are no dates."""
    months: tuple[tuple[str, float], ...]
    """Quantity by month, such as 2025-03, within the period; not annualised."""

    @property
    def days(self) -> int:
        """Days of the period, a year without dates."""
        return YEAR_DAYS if self.first is None or self.last is None else (self.last - self.first).days + 1

    @property
    def yearly(self) -> float:
        """What quantities of the period were multiplied with to be a year's; 1 for a period of 365 or 366 days."""
        return yearly_factor(self.days)


def yearly_factor(days: int) -> float:
    """
    Return what quantities of a period are multiplied with to be a year's.

    Parameters
    ----------
    days
        Of the period, at least 1.

    Returns
    -------
    factor
        1 for 365 and 366 days.
    """
    return 1.0 if days in {YEAR_DAYS, YEAR_DAYS + 1} else YEAR_DAYS / days


def columns_of(path: Path | str) -> tuple[str, ...]:
    """
    Return the columns of a file of order lines.

    Parameters
    ----------
    path
        As for `roll_up`.

    Returns
    -------
    columns
        As the file calls them, in its order.

    Raises
    ------
    DataFileError
        If the file is not there or cannot be read.
    """
    return OrderFile(path, OrderColumns(customer="", quantity=""), OrderReading(), None).header()


def roll_up(
    path: Path | str, columns: OrderColumns, reading: OrderReading | None = None, *, listener: Listener | None = None
) -> Rollup:
    """
    Add order lines up to demand.

    Parameters
    ----------
    path
        A CSV or Parquet file; several as a pattern such as `orders-*.parquet`.
    columns
        Which columns say what.
    reading
        How to read and add up; by default everything is found out, returns are taken off and far-out lines kept.
    listener
        Told how much of each reading is done.

    Returns
    -------
    rollup
        Demand a year and everything that was done to get it. A line is far out where its quantity is above the upper
        quartile of its good by more than three interquartile ranges, both of logarithms, and at least eight times it.

    Raises
    ------
    DataFileError
        If the file cannot be read or has no such column, no line can be used, or numbers or dates can be read in more
        than one way; the message says what to add.

    References
    ----------
    Tukey (1977), Exploratory Data Analysis: fences at 1.5 and 3 interquartile ranges (from memory); taking logarithms
    first is common practice for quantities.
    """
    reading = reading or OrderReading()
    with OrderFile(path, columns, reading, listener) as file:
        survey = file.survey()
        first, last = _period(survey.first, survey.last, reading)
        sums = file.sums(first, last)
        demand, emptied = _demand(sums.by_customer, first, last)
        if not demand:
            msg = f"{path}: no line can be used ({_reasons(sums.skipped)}). Check the columns and the period."
            raise DataFileError(msg)
        kept, differing = file.carried()
        return Rollup(
            demand=demand,
            kept=kept,
            differing=differing,
            lines=survey.lines,
            skipped=sums.skipped,
            used=LineCount(lines=sums.used[0], quantity=sums.used[1]),
            returned=LineCount(lines=sums.returned[0], quantity=sums.returned[1]),
            far_out=LineCount(lines=sums.far_out[0], quantity=sums.far_out[1]),
            largest=tuple(
                FarOutLine(customer=customer, good=good, quantity=quantity, limit=limit)
                for customer, good, quantity, limit in sums.largest
            ),
            emptied=emptied,
            first=first,
            last=last,
            months=_every_month(dict(sums.months), first, last),
        )


def _every_month(
    sums: Mapping[str, float], first: dt.date | None, last: dt.date | None
) -> tuple[tuple[str, float], ...]:
    """Return the quantity of each month of the period, also of those without a line."""
    months, month = [], None if first is None else first.replace(day=1)
    while month is not None and last is not None and month <= last:
        months.append((f"{month:%Y-%m}", sums.get(f"{month:%Y-%m}", 0.0)))
        month = (month + dt.timedelta(days=31)).replace(day=1)
    return tuple(months)


def _reasons(skipped: Mapping[str, int]) -> str:
    return ", ".join(f"{count:,} {reason}" for reason, count in skipped.items() if count) or "no line is there"


def _period(
    first: dt.date | None, last: dt.date | None, reading: OrderReading
) -> tuple[dt.date | None, dt.date | None]:
    """Return the period: as asked for, else from the first to the last line, to whole months where those are near."""
    if first is None or last is None:
        return reading.first, reading.last
    if first.day <= WHOLE_MONTH_DAYS:
        first = first.replace(day=1)
    month_end = (last.replace(day=1) + dt.timedelta(days=31)).replace(day=1) - dt.timedelta(days=1)
    if (month_end - last).days < WHOLE_MONTH_DAYS:
        last = month_end
    first, last = reading.first or first, reading.last or last
    if last < first:
        msg = f"the period from {first} to {last} ends before it begins. Correct its first or last day."
        raise DataFileError(msg)
    return first, last


def _demand(
    sums: Mapping[tuple[str, str], float], first: dt.date | None, last: dt.date | None
) -> tuple[dict[tuple[str, str], float], int]:
    """Return units a year above 0, and how many customers and goods have none left."""
    days = YEAR_DAYS if first is None or last is None else (last - first).days + 1
    yearly = yearly_factor(days)
    demand = {key: quantity * yearly for key, quantity in sums.items() if quantity > 0}
    return demand, len(sums) - len(demand)
