"""
Which lanes exist, and how long they are.

A leg's lanes come from coordinates (every origin with every destination) and from the `lanes` table, whose rows
override, add and bar. What cannot be used is taken out here, so that nothing later has to ask: goods that are not
offered or not demanded, lanes out of reach, lanes of single-sourced customers from an origin that
cannot hold them whole.

Everything works on one whole number a lane, its *key* = (origin x destinations + destination) x goods + good.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

import numpy as np

from siting.network.distance import geodesic_km

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from siting.arrays import Flags, Floats, Positions
    from siting.study.tables import LaneTable, Leg

    Keys = NDArray[np.int64]

EDGE = 1e-9
"""Relative tolerance on reach and on holding a customer whole, so that a limit met exactly is met."""

NO_ROW = -1
"""In `FoundLanes.row`: coordinates alone give the lane."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Places:
    """The places at one end of a leg; every array of shape (places,) unless said otherwise."""

    names: tuple[str, ...]
    latitude: Floats
    """Degrees; NaN where unknown."""
    longitude: Floats
    takes: Flags
    """(places, goods) True where the good may start (or end) here."""
    country: Positions
    """Position of its country among those of the places at this end."""

    @property
    def located(self) -> Flags:
        """(places,) True where both coordinates are known."""
        known: Flags = np.isfinite(self.latitude) & np.isfinite(self.longitude)
        return known


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LegEnds:
    """Both ends of a leg."""

    leg: Leg
    goods: tuple[str, ...]
    origins: Places
    destinations: Places
    circuity: Floats
    """(origin countries, destination countries) road km per geodesic km where no row gives road_km."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FoundLanes:
    """Lanes of one leg in the order of their keys; every array of shape (lanes,)."""

    origin: Positions
    destination: Positions
    good: Positions
    row: Positions
    """Position in the `lanes` table of the row that sets this lane, or `NO_ROW`."""
    km: Floats
    """Road km; NaN where nothing gives a distance."""
    km_given: Flags
    unit_cost: Floats
    """Freight in money per unit of the good or of load, as the row says; NaN where the rate sets it."""

    def only(self, kept: Flags) -> FoundLanes:
        """Return the lanes where `kept`, of shape (lanes,), is True."""
        if bool(kept.all()):
            return self
        return FoundLanes(**{field.name: getattr(self, field.name)[kept] for field in fields(self)})

    def __len__(self) -> int:
        """Return the number of lanes."""
        return int(self.origin.shape[0])


def find_lanes(ends: LegEnds, table: LaneTable, *, listed_only: bool) -> FoundLanes:
    """
    Return the lanes of one leg that coordinates or the `lanes` table give.

    Parameters
    ----------
    ends
        Who may send what to whom, and how much longer roads are than straight lines.
    table
        A row with a good beats one without, as a whole; a barred row takes its lanes out.
    listed_only
        True where only a row makes a lane (drop shipment).

    Returns
    -------
    lanes
        Sorted by origin, destination and good. Neither barred, nor without both distance and unit cost.
    """
    keys, row = _listed(ends, table)
    if not listed_only:
        listed, setter = keys, row
        keys = _merged(_grid(ends), listed)
        row = np.full(keys.shape[0], NO_ROW, dtype=np.int32)
        row[np.searchsorted(keys, listed)] = setter
    is_barred = np.append(table.barred, False)[row]  # NO_ROW takes the last element, here and below
    keys, row = keys[~is_barred], row[~is_barred]
    pair = keys // len(ends.goods)
    km = np.append(table.road_km, np.nan)[row]
    km_given = ~np.isnan(km)
    km[~km_given] = _pair_km(pair[~km_given], ends)
    origin, destination = np.divmod(pair, max(1, len(ends.destinations.names)))
    lanes = FoundLanes(
        origin=origin.astype(np.int32),
        destination=destination.astype(np.int32),
        good=(keys % len(ends.goods)).astype(np.int32),
        row=row,
        km=km,
        km_given=km_given,
        unit_cost=np.append(table.unit_cost, np.nan)[row],
    )
    return lanes.only(~(np.isnan(lanes.km) & np.isnan(lanes.unit_cost)))


def within_reach(lanes: FoundLanes, reach_km: Floats) -> FoundLanes:
    """
    Return the lanes no longer than the reach of their customer.

    Parameters
    ----------
    lanes
        Outbound or direct lanes.
    reach_km
        Shape (customers,). Greatest road km; inf = any. A lane without a distance is not judged.

    Returns
    -------
    lanes
        A lane longer by a relative `EDGE` is still within reach.
    """
    return lanes.only(~(lanes.km > reach_km[lanes.destination] * (1.0 + EDGE)))


def _merged(some: Keys, others: Keys) -> Keys:
    """Return the sorted keys in either; both are sorted and hold no key twice."""
    if not (some.size and others.size):
        return some if some.size else others
    nearest = np.minimum(np.searchsorted(some, others), some.size - 1)
    return np.sort(np.concatenate([some, others[some[nearest] != others]]), kind="stable")


def _grid(ends: LegEnds) -> Keys:
    """Return the keys of every lane with coordinates at both ends."""
    origins, destinations = ends.origins, ends.destinations
    starts = origins.takes & origins.located[:, None]
    arrives = destinations.takes & destinations.located[:, None]
    if not (starts.any() and arrives.any()):
        return np.zeros(0, dtype=np.int64)
    return np.flatnonzero(starts[:, None, :] & arrives[None, :, :])


def _listed(ends: LegEnds, table: LaneTable) -> tuple[Keys, Positions]:
    """Return the sorted keys that rows of the leg set, and the row (its position in the table) of each."""
    goods, origins, destinations = ends.goods, ends.origins, ends.destinations
    rows = np.flatnonzero(table.leg == table.LEGS.index(ends.leg)).astype(np.int32)
    origin = _positions(table.names, origins.names)[table.origin[rows]]
    destination = _positions(table.names, destinations.names)[table.destination[rows]]
    pair = origin.astype(np.int64) * len(destinations.names) + destination
    known = (origin >= 0) & (destination >= 0)  # a row about a place that is not in the study makes no lane
    named = table.good[rows] >= 0
    good = np.append(_positions(table.names, goods), -1)[table.good[rows]]  # -1, every good, takes the last element
    keys: list[Keys] = []
    setters: list[Positions] = []
    for every_good in (True, False):  # rows that name a good come last, since the last row of a key wins below
        for position in range(len(goods)):
            fits = (
                known
                & (~named if every_good else named & (good == position))
                & (origins.takes[origin, position] & destinations.takes[destination, position])
            )
            keys.append(pair[fits] * len(goods) + position)
            setters.append(rows[fits])
    all_keys, all_setters = np.concatenate(keys), np.concatenate(setters)
    order = np.argsort(all_keys, kind="stable")
    ordered = all_keys[order]
    is_last = np.append(ordered[1:] != ordered[:-1], True)[: ordered.shape[0]]
    return ordered[is_last], all_setters[order][is_last]


def _positions(names: Sequence[str], places: Sequence[str]) -> Positions:
    """Return the position in `places` of each name, -1 where it is none of them; shape (names,)."""
    position = {place: i for i, place in enumerate(places)}
    return np.array([position.get(name, -1) for name in names], dtype=np.int32)


def _pair_km(pair: Keys, ends: LegEnds) -> Floats:
    """Return the estimated road km of ascending pairs, each distance computed once for all its goods."""
    if not pair.size:
        return np.zeros(0)
    is_first = np.append(True, pair[1:] != pair[:-1])
    origin, destination = np.divmod(pair[is_first], len(ends.destinations.names))
    km = geodesic_km(
        ends.origins.latitude[origin],
        ends.origins.longitude[origin],
        ends.destinations.latitude[destination],
        ends.destinations.longitude[destination],
    )
    km *= ends.circuity[ends.origins.country[origin], ends.destinations.country[destination]]
    every: Floats = km[np.cumsum(is_first) - 1]
    return every
