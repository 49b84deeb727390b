"""What a study says about lanes to single customers, said about lanes to their zones."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.study.tables import Leg

if TYPE_CHECKING:
    from siting.arrays import Floats, Positions
    from siting.study.tables import LaneTable


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ZoneLanes:
    """The lanes of a study of zones."""

    table: LaneTable
    dropped: int
    """Rows to customers that could not be taken over, since not all customers of the zone have one like it."""


def zone_lanes(
    lanes: LaneTable, customers: tuple[str, ...], zone: Positions, weight: Floats, names: tuple[str, ...]
) -> ZoneLanes:
    """
    Return lanes to zones for those to customers; inbound lanes stay as they are.

    Parameters
    ----------
    lanes
        Of the study of customers.
    customers
        Their names, of shape (customers,).
    zone
        Shape (customers,). Which zone each is in; -1 = none.
    weight
        Shape (customers,). Load a year, above 0 where there is a zone.
    names
        Of the zones.

    Returns
    -------
    found
        A zone has a row where every one of its customers has one of the same origin, leg and good: its road_km and
        unit_cost are means by load, each blank unless all have it; barred where all are.
    """
    at = {name: position for position, name in enumerate(customers)}
    customer = np.array([*(at.get(name, -1) for name in lanes.names), -1], dtype=np.int32)[lanes.destination]
    inbound = lanes.leg == lanes.LEGS.index(Leg.INBOUND)
    into = np.where(inbound | (customer < 0), -1, zone[customer])
    used = np.flatnonzero(~inbound & (into >= 0))
    members = np.bincount(zone[zone >= 0], minlength=len(names))
    keys = list(zip(*(part[used].tolist() for part in (lanes.leg, lanes.origin, into, lanes.good)), strict=True))
    found, group = _told_apart(keys)
    sizes = np.bincount(group, minlength=found.shape[1])
    load = weight[customer[used]]

    def mean(values: Floats) -> Floats:
        held = np.bincount(group, weights=load * values[used], minlength=found.shape[1])
        return np.asarray(held / np.bincount(group, weights=load, minlength=found.shape[1]), dtype=np.float64)

    bars = np.bincount(group, weights=lanes.barred[used], minlength=found.shape[1])
    road_km, unit_cost, barred = mean(lanes.road_km), mean(lanes.unit_cost), bars == sizes
    says = (bars == 0) & ~(np.isnan(road_km) & np.isnan(unit_cost))
    kept = (sizes == members[found[2]]) & (barred | says)
    stay = np.flatnonzero(inbound)
    first = len(lanes.names)
    leg, origin, to_zone, good = found[:, kept]
    table = replace(
        lanes,
        names=(*lanes.names, *names),
        origin=np.concatenate([lanes.origin[stay], origin]).astype(np.int32),
        destination=np.concatenate([lanes.destination[stay], first + to_zone]).astype(np.int32),
        good=np.concatenate([lanes.good[stay], good]).astype(np.int32),
        leg=np.concatenate([lanes.leg[stay], leg]).astype(np.int32),
        road_km=np.concatenate([lanes.road_km[stay], road_km[kept]]),
        unit_cost=np.concatenate([lanes.unit_cost[stay], unit_cost[kept]]),
        barred=np.concatenate([lanes.barred[stay], barred[kept]]),
        row=np.arange(2, 2 + stay.size + int(kept.sum()), dtype=np.int32),
        attributes={},
    )
    return ZoneLanes(table=table, dropped=int(np.count_nonzero(~kept[group])))


def _told_apart(keys: list[tuple[int, ...]]) -> tuple[Positions, Positions]:
    """Return (4, different keys) in the order of their first row, and which of them each row has."""
    numbers: dict[tuple[int, ...], int] = {}
    group = np.array([numbers.setdefault(key, len(numbers)) for key in keys], dtype=np.int32)
    return np.array(list(numbers), dtype=np.int32).reshape(-1, 4).T, group
