"""Make studies in memory from short rows, for the tests that check whole answers."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.study.settings import Settings
from siting.study.tables import CustomerRow, LaneTable, Leg, Study

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from siting.study.tables import SiteRow, SupplierRow

MISSING = math.nan
"""In a table of lane costs: the lane does not exist."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LaneRow:
    """One row of `lanes`; blank good = every good, None = blank."""

    leg: Leg
    origin: str
    destination: str
    good: str = ""
    road_km: float | None = None
    unit_cost: float | None = None
    barred: bool = False


def lane_table(rows: Iterable[LaneRow]) -> LaneTable:
    """Return the rows as the columns a study holds; the first row is row 2 of the spreadsheet."""
    rows = tuple(rows)
    names: dict[str, int] = {}
    for row in rows:
        for name in (row.origin, row.destination, *([row.good] if row.good else [])):
            names.setdefault(name, len(names))
    return LaneTable(
        names=tuple(names),
        origin=np.array([names[row.origin] for row in rows], dtype=np.int32),
        destination=np.array([names[row.destination] for row in rows], dtype=np.int32),
        good=np.array([names[row.good] if row.good else -1 for row in rows], dtype=np.int32),
        leg=np.array([LaneTable.LEGS.index(row.leg) for row in rows], dtype=np.int32),
        road_km=np.array([math.nan if row.road_km is None else row.road_km for row in rows], dtype=np.float64),
        unit_cost=np.array([math.nan if row.unit_cost is None else row.unit_cost for row in rows], dtype=np.float64),
        barred=np.array([row.barred for row in rows], dtype=np.bool_),
        row=np.arange(2, len(rows) + 2, dtype=np.int32),
    )


def lane_rows(lanes: LaneTable) -> tuple[LaneRow, ...]:
    """Return the columns of a study's lanes as rows."""

    def number(value: float) -> float | None:
        return None if math.isnan(value) else float(value)

    return tuple(
        LaneRow(
            leg=lanes.LEGS[int(lanes.leg[n])],
            origin=lanes.names[int(lanes.origin[n])],
            destination=lanes.names[int(lanes.destination[n])],
            good=lanes.names[int(lanes.good[n])] if lanes.good[n] >= 0 else "",
            road_km=number(lanes.road_km[n]),
            unit_cost=number(lanes.unit_cost[n]),
            barred=bool(lanes.barred[n]),
        )
        for n in range(len(lanes))
    )


def cost_rows(
    leg: Leg, origins: Sequence[str], destinations: Sequence[str], unit_cost: Sequence[Sequence[float]]
) -> list[LaneRow]:
    """Return one row for each cost of a table (origins x destinations) that is not `MISSING`."""
    return [
        LaneRow(leg=leg, origin=origin, destination=destination, unit_cost=float(cost))
        for origin, costs in zip(origins, unit_cost, strict=True)
        for destination, cost in zip(destinations, costs, strict=True)
        if not math.isnan(cost)
    ]


def customers_of(demand: Mapping[str, float]) -> tuple[CustomerRow, ...]:
    """Return one customer for each name and demand."""
    return tuple(CustomerRow(customer=name, demand=float(amount)) for name, amount in demand.items())


def settings_of(title: str, **values: object) -> Settings:
    """Return settings without a real currency, which published tables seldom name."""
    return Settings(title=title, currency="XXX", unit="unit", **values)  # type: ignore[arg-type]  # values are checked by the dataclass


def one_echelon(
    title: str,
    sites: Sequence[SiteRow],
    demand: Mapping[str, float],
    unit_cost: Sequence[Sequence[float]],
    **settings: object,
) -> Study:
    """Return a study of sites that serve customers at costs given lane by lane (sites x customers)."""
    names = [row.site for row in sites]
    return Study(
        settings=settings_of(title, **settings),
        sites=tuple(sites),
        customers=customers_of(demand),
        lanes=lane_table(cost_rows(Leg.OUTBOUND, names, list(demand), unit_cost)),
    )


def suppliers_alone(
    title: str,
    suppliers: Sequence[SupplierRow],
    demand: Mapping[str, float],
    unit_cost: Sequence[Sequence[float]],
    **settings: object,
) -> Study:
    """Return a study of suppliers that deliver straight to customers (suppliers x customers); it has no sites."""
    names = [row.supplier for row in suppliers]
    return Study(
        settings=settings_of(title, **settings),
        suppliers=tuple(suppliers),
        customers=customers_of(demand),
        lanes=lane_table(cost_rows(Leg.DIRECT, names, list(demand), unit_cost)),
    )
