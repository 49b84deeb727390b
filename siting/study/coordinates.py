"""Check coordinates by themselves: missing halves, ranges, the point (0, 0), latitude and longitude swapped."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from siting.study.columns import TABLES, Column
from siting.study.parse import range_words

if TYPE_CHECKING:
    from siting.arrays import Flags, Floats
    from siting.study.draft import Draft

PLACED = {"sites": "site", "suppliers": "supplier", "customers": "customer"}
"""Tables whose rows have a place, and what one is called."""

EARTH_RADIUS_KM = 6371.0088
"""Mean radius of the earth (IUGG); good enough to find distances that are far out."""

SWAP_KM = 1000.0
"""A place this far from the middle of all others may have latitude and longitude swapped."""

SWAP_GAIN = 10.0
"""How many times nearer the middle the swapped place must be."""

LEAST_OTHERS = 2
"""Places needed to say where the others are."""

NORTH, EAST = TABLES["sites"].column("latitude"), TABLES["sites"].column("longitude")
"""How every table declares its coordinates."""


def check_coordinates(draft: Draft) -> bool:
    """
    Note every fault of coordinates: half a pair, out of range, both 0, apparently swapped.

    Parameters
    ----------
    draft
        The tables.

    Returns
    -------
    are_sound
        Whether no row has a fault in its coordinates.
    """
    pairs = [pair for pair in _pairs(draft) if _check_whole(draft, pair)]
    if pairs:
        _check_ranges_and_swaps(draft, pairs)
    return not any(
        draft.gathering.hurt(table, row.row, "latitude", "longitude")
        for table in PLACED
        for row in draft.tables[table].rows
    )


def _check_ranges_and_swaps(draft: Draft, pairs: list[_Pair]) -> None:
    """Note pairs out of range, and those that lie far off but would lie amid the others if swapped."""
    here = np.array([(pair.latitude, pair.longitude) for pair in pairs]).T
    within = _within(NORTH, here[0]) & _within(EAST, here[1])
    middle = np.median(here[:, within], axis=1) if within.any() else np.full(2, np.nan)
    as_given = rough_km(here[0], here[1], middle[0], middle[1])
    swapped = rough_km(here[1], here[0], middle[0], middle[1])
    suspect = within & (as_given > SWAP_KM) & (swapped * SWAP_GAIN < as_given)
    others = as_given[within & ~suspect]
    amid = swapped <= others.max() if others.size >= LEAST_OTHERS else np.zeros(len(pairs), dtype=np.bool_)
    for at in np.flatnonzero(suspect).tolist():
        _note_swap(draft, pairs[at], float(as_given[at]), float(swapped[at]), amid=bool(amid[at]))
    for at in np.flatnonzero(~within).tolist():
        _note_range(draft, pairs[at], looks_swapped=bool(amid[at]) or others.size < LEAST_OTHERS)


def rough_km(latitude_a: Floats, longitude_a: Floats, latitude_b: Floats, longitude_b: Floats) -> Floats:
    """
    Return distances on a sphere, to screen distances that are typed, never to cost anything.

    Parameters
    ----------
    latitude_a, longitude_a, latitude_b, longitude_b
        Degrees, of shapes that broadcast; NaN where unknown.

    Returns
    -------
    km
        Within 0.6 % of the geodesic on the WGS84 ellipsoid; NaN where any coordinate is.

    References
    ----------
    Haversine formula: Sinnott, R. W. (1984), Virtues of the haversine, Sky and Telescope 68(2): 159 (from memory).
    """
    up, down = np.radians(latitude_a), np.radians(latitude_b)
    half_chord = np.sin((down - up) / 2) ** 2
    half_chord += np.cos(up) * np.cos(down) * np.sin(np.radians(longitude_b - longitude_a) / 2) ** 2
    km: Floats = 2 * EARTH_RADIUS_KM * np.arcsin(np.sqrt(np.clip(half_chord, 0.0, 1.0)))
    return km


@dataclass(frozen=True, slots=True, kw_only=True)
class _Pair:
    """Both coordinates of a row."""

    table: str
    row: int
    latitude: float
    longitude: float
    typed: dict[str, str]
    """Both cells as typed, by column."""


def _pairs(draft: Draft) -> list[_Pair]:
    """Return the rows with both coordinates, after noting those with one."""
    pairs = []
    for table in PLACED:
        parsed = draft.tables[table]
        for index, row in enumerate(parsed.rows):
            if draft.gathering.hurt(table, row.row, "latitude", "longitude"):
                continue
            if (row.latitude is None) != (row.longitude is None):
                _note_half(draft, table, row)
            elif row.latitude is not None:
                typed = {column: parsed.typed(index, column) for column in ("latitude", "longitude")}
                pairs.append(
                    _Pair(table=table, row=row.row, latitude=row.latitude, longitude=row.longitude, typed=typed)
                )
    return pairs


def _note_half(draft: Draft, table: str, row: Any) -> None:  # noqa: ANN401  (a row of any of three tables)
    column, other = ("latitude", "longitude") if row.latitude is None else ("longitude", "latitude")
    wrong = f"blank, although {other} is given"
    draft.gathering.fault(table, row.row, column, "", wrong, f"Write the {column}, or clear the {other}")


def _check_whole(draft: Draft, pair: _Pair) -> bool:
    """Return whether a pair is a place at all, after noting the point (0, 0)."""
    if pair.latitude or pair.longitude:
        return True
    wrong = "latitude and longitude are both 0, a point in the sea off Africa"
    repair = "Write the true coordinates, or clear both cells"
    draft.gathering.fault(pair.table, pair.row, "latitude", pair.typed["latitude"], wrong, repair)
    return False


def _note_swap(draft: Draft, pair: _Pair, as_given: float, swapped: float, *, amid: bool) -> None:
    """Note a place far from all others that would be near them if swapped: a fault where it would be amid them."""
    wrong = (
        f"{as_given:.0f} km from the middle of the study, {swapped:.0f} km if swapped with longitude "
        f"({pair.typed['longitude']})"
    )
    note, repair = draft.gathering.warn, "Swap the two, unless the place is right"
    if amid:
        note = draft.gathering.fault
        repair = "Swap the two; if the place is right, clear both and give its lanes road_km or unit_cost"
    note(pair.table, pair.row, "latitude", pair.typed["latitude"], wrong, repair)


def _note_range(draft: Draft, pair: _Pair, *, looks_swapped: bool) -> None:
    """Note coordinates out of range; that they look swapped only where they would then be amid the others."""
    typed = pair.typed
    if looks_swapped and _within(NORTH, pair.longitude) and _within(EAST, pair.latitude):
        wrong = f"out of range; latitude and longitude ({typed['longitude']}) look swapped"
        draft.gathering.fault(pair.table, pair.row, "latitude", typed["latitude"], wrong, "Swap the two")
        return
    for column in (NORTH, EAST):
        if not _within(column, getattr(pair, column.name)):
            wrong = f"out of range (degrees {range_words(column)})"
            repair = "Write decimal degrees such as 48.2085"
            draft.gathering.fault(pair.table, pair.row, column.name, typed[column.name], wrong, repair)


def _within(column: Column, value: Floats | float) -> Flags:
    """Return whether each value is in the range of its column."""
    flags: Flags = (np.asarray(value) >= column.low) & (np.asarray(value) <= column.high)
    return flags
