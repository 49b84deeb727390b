"""A study to be completed, from demand that order lines add up to."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from siting.study.settings import Settings
from siting.study.tables import CustomerRow, DemandRow, GoodRow, Study

if TYPE_CHECKING:
    from siting.study.orders import OrderColumns, Rollup

CARRIED = ("place", "country", "latitude", "longitude", "postcode")
"""Columns of `customers` that order lines may fill."""


def study_of_orders(rollup: Rollup, columns: OrderColumns, *, currency: str = "", unit: str = "") -> Study:
    """
    Return a study of the customers of order lines.

    Parameters
    ----------
    rollup
        What the lines add up to.
    columns
        Which columns of the lines were used.
    currency, unit
        Settings, as far as they are known.

    Returns
    -------
    study
        Not checked: it has no sites and no suppliers. Goods and demands by good where the lines have goods; a
        coordinate that is no number is left blank.
    """
    names = sorted({customer for customer, _ in rollup.demand})
    goods = sorted({good for _, good in rollup.demand})
    kept = list(columns.kept)
    customers = []
    for row, name in enumerate(names, start=2):
        held = dict(zip(kept, rollup.kept.get(name, ()), strict=False))
        customers.append(
            CustomerRow(
                customer=name,
                place=held.get("place", ""),
                country=held.get("country", ""),
                latitude=_degrees(held.get("latitude", "")),
                longitude=_degrees(held.get("longitude", "")),
                demand=None if columns.good else rollup.demand[name, ""],
                attributes={"postcode": held["postcode"]} if held.get("postcode") else {},
                row=row,
            )
        )
    demands = [
        DemandRow(customer=customer, good=good, demand=demand, row=row)
        for row, ((customer, good), demand) in enumerate(sorted(rollup.demand.items()), start=2)
    ]
    return Study(
        settings=Settings(currency=currency, unit=unit),
        customers=tuple(customers),
        goods=tuple(GoodRow(good=good, row=row) for row, good in enumerate(goods, start=2)) if columns.good else (),
        demands=tuple(demands) if columns.good else (),
    )


def _degrees(text: str) -> float | None:
    try:
        value = float(text.replace(",", "."))
    except ValueError:
        return None
    return value if math.isfinite(value) else None
