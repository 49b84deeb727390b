"""Coordinates against the towns that ship with the program: another country, swapped, or far from any town."""

from __future__ import annotations

from functools import cache
from typing import TYPE_CHECKING

import numpy as np

from siting.errors import Fault
from siting.study.coordinates import rough_km
from siting.study.countries import country_code, country_name
from siting.study.gazetteer import gazetteer
from siting.study.locate import find_place

if TYPE_CHECKING:
    from collections.abc import Iterable

    import shapely

    from siting.arrays import Positions

FAR_FROM_PLACE_KM = 30.0
"""Coordinates this far from the place that is named are worth a look."""

FAR_FROM_TOWNS_KM = 150.0
"""Coordinates this far from any town are most often in the sea."""

ACROSS_KM = 25.0
"""By how much another country's town must be nearer than any of the named country's, for coordinates to be across."""


def placed_oddly(table: str, rows: Iterable[tuple[int, str, str, float, float]]) -> list[Fault]:
    """
    Return a warning for each row whose coordinates do not fit what else it says.

    Parameters
    ----------
    table
        Name of the table.
    rows
        Row number, place, country, latitude and longitude of rows with coordinates in range.

    Returns
    -------
    warnings
        One a row at most, for the worst that is wrong with it.
    """
    warnings = []
    for row, place, country, latitude, longitude in rows:
        said = _odd(place, country_code(country), latitude, longitude)
        if said:
            wrong, repair = said
            value = f"{latitude:g}, {longitude:g}"
            warnings.append(Fault(table=table, row=row, column="latitude", value=value, wrong=wrong, repair=repair))
    return warnings


def _odd(place: str, country: str, latitude: float, longitude: float) -> tuple[str, str] | None:
    near_km = _nearest_km("", latitude, longitude)
    if near_km > FAR_FROM_TOWNS_KM:
        wrong = f"{near_km:.0f} km from the nearest town, perhaps in the sea"
        return wrong, _swap_repair(country, latitude, longitude)
    if country and country in gazetteer().of_country:
        own_km = _nearest_km(country, latitude, longitude)
        if own_km > near_km + ACROSS_KM:
            wrong = f"{own_km:.0f} km from the nearest town of {country_name(country)}, which the row names"
            return wrong, _swap_repair(country, latitude, longitude)
    town = find_place(place, country).town if place else None
    if town is not None:
        off_km = _km(latitude, longitude, town.latitude, town.longitude)
        if off_km > FAR_FROM_PLACE_KM:
            wrong = f"{off_km:.0f} km from {town.name}, which the row names; the coordinates count"
            return wrong, "Correct the place or the coordinates, unless both are right"
    return None


def _swap_repair(country: str, latitude: float, longitude: float) -> str:
    if abs(longitude) <= 90 and _nearest_km(country, longitude, latitude) <= ACROSS_KM:  # noqa: PLR2004  (degrees north)
        return "Swap latitude and longitude, which look exchanged"
    return "Correct the coordinates or the country, unless both are right"


def _km(latitude_a: float, longitude_a: float, latitude_b: float, longitude_b: float) -> float:
    ends = (np.array(degrees) for degrees in (latitude_a, longitude_a, latitude_b, longitude_b))
    return float(rough_km(*ends))


def _nearest_km(country: str, latitude: float, longitude: float) -> float:
    """Return the distance to the nearest town of a country ("" = of any)."""
    towns, (tree, places) = gazetteer(), _tree(country)
    half = 1.0
    while True:  # a box of degrees, ever larger: what is found in it is measured
        wide = half / max(0.05, np.cos(np.radians(min(89.0, abs(latitude)))))
        found = places[tree.query(_box(latitude, longitude, half, wide))]
        if found.size or half > 180.0:  # noqa: PLR2004  (degrees: the whole earth)
            break
        half *= 3
    found = found if found.size else places
    at = np.full(found.shape, latitude), np.full(found.shape, longitude)
    return float(rough_km(towns.latitude[found], towns.longitude[found], *at).min())


def _box(latitude: float, longitude: float, half: float, wide: float) -> shapely.Polygon:
    import shapely  # noqa: PLC0415  (only whoever checks places pays for it)

    return shapely.box(longitude - wide, latitude - half, longitude + wide, latitude + half)


@cache
def _tree(country: str) -> tuple[shapely.STRtree, Positions]:
    """Return the towns of a country ("" = of all) as a tree, and their positions."""
    import shapely  # noqa: PLC0415  (as above)

    towns = gazetteer()
    here = towns.of_country[country] if country else range(len(towns.names))
    places = np.array(here, dtype=np.int32)
    return shapely.STRtree(shapely.points(towns.longitude[places], towns.latitude[places])), places
