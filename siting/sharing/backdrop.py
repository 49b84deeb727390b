"""
The outlines and place names behind a map, cut to the part of the world that a study covers.

Longitudes may exceed 180 in a box that crosses the antimeridian, so that everything in it stays in one piece.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache
from importlib.resources import files
from typing import TYPE_CHECKING, Any

import numpy as np
import shapely

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from siting.arrays import Flags, Floats

ATTRIBUTION = "Made with Natural Earth; places: GeoNames, CC BY 4.0"
"""What the licences ask every map to say."""

FILE_DECIMALS = 1000
"""Outline files keep coordinates in 1/1000 degree (`outlines/make_outlines.py`)."""
PLACE_DECIMALS = 100
"""The file of places keeps coordinates in 1/100 degree."""
FINE_WIDTH = 16.0
"""Degrees of longitude up to which a box is drawn from the 1:10m outlines."""
WIDEST_VIEW, TALLEST_VIEW = 2.8, 0.8
"""Width over height of the map windows for which the cut edge of the outlines stays out of sight."""
LEAST_SPAN = 0.5
"""Degrees that a box spans at least, so that a single place has surroundings."""
MOST_LATITUDE = 84.0
"""Beyond it the Mercator projection is of no use."""
WORLD_WIDTH = 360.0
MOST_PLACES = 120
"""Towns to name in the box at most; half as many around it."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Box:
    """A part of the world in degrees; `west` is in [-180, 180), `east` is above `west` and may exceed 180."""

    west: float
    south: float
    east: float
    north: float

    @property
    def width(self) -> float:
        """Degrees of longitude."""
        return self.east - self.west

    def longitude(self, degrees: float) -> float:
        """Return the longitude moved by whole turns to lie in the box, or next to it."""
        middle = (self.west + self.east) / 2
        return degrees + WORLD_WIDTH * round((middle - degrees) / WORLD_WIDTH)


@dataclass(frozen=True, slots=True, kw_only=True)
class PlaceName:
    """A town to name on the map."""

    name: str
    latitude: float
    longitude: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Backdrop:
    """
    Outlines cut to a box.

    A line is a flat list of whole numbers in 1/10^`decimals` degree: latitude, longitude, then steps. Each land and
    lake shape is a list of closed lines, filled where an odd number of them surrounds a spot.
    """

    box: Box
    """What the outlines cover; a map must not show more."""
    decimals: int
    land: list[list[int]]
    lakes: list[list[int]]
    borders: list[list[int]]
    places: tuple[PlaceName, ...]
    """Those in the box first, the largest of them before the others."""


def box_around(latitudes: Sequence[float], longitudes: Sequence[float]) -> Box:
    """
    Return the smallest box around the points, across the antimeridian where that is smaller, with a little margin.

    Parameters
    ----------
    latitudes, longitudes
        Degrees, of equal length, at least one.

    Returns
    -------
    box
        At least `LEAST_SPAN` degrees each way.
    """
    turn = np.unique(np.mod(np.asarray(longitudes, dtype=float) + 180.0, WORLD_WIDTH) - 180.0)
    gaps = np.diff(turn, append=turn[0] + WORLD_WIDTH)
    widest = int(gaps.argmax())
    west = float(turn[(widest + 1) % len(turn)])
    span = WORLD_WIDTH - float(gaps[widest])
    south, north = float(np.min(latitudes)), float(np.max(latitudes))
    margin_x = max(0.06 * span, (LEAST_SPAN - span) / 2, 0.0)
    margin_y = max(0.08 * (north - south), (LEAST_SPAN - (north - south)) / 2, 0.0)
    south, north = max(south - margin_y, -MOST_LATITUDE), min(north + margin_y, MOST_LATITUDE)
    if span + 2 * margin_x >= WORLD_WIDTH:
        return Box(west=-180.0, south=south, east=180.0, north=north)
    west = float(np.mod(west - margin_x + 180.0, WORLD_WIDTH) - 180.0)
    return Box(west=west, south=south, east=west + span + 2 * margin_x, north=north)


def _mercator(latitude: float) -> float:
    return math.degrees(math.asinh(math.tan(math.radians(latitude))))


def _latitude(mercator: float) -> float:
    return math.degrees(math.atan(math.sinh(math.radians(mercator))))


def surroundings(box: Box) -> Box:
    """Return the box grown so far that a window of any usual shape, fitted to it, shows nothing outside."""
    low, high = _mercator(box.south), _mercator(box.north)
    width, height = box.width, high - low
    grown_width = min(1.15 * max(width, WIDEST_VIEW * height), WORLD_WIDTH)
    grown_height = 1.15 * max(height, width / TALLEST_VIEW)
    centre_x, centre_y = (box.west + box.east) / 2, (low + high) / 2
    west = centre_x - grown_width / 2 if grown_width < WORLD_WIDTH else centre_x - 180.0
    return Box(
        west=west,
        south=max(_latitude(centre_y - grown_height / 2), -MOST_LATITUDE),
        east=west + grown_width,
        north=min(_latitude(centre_y + grown_height / 2), MOST_LATITUDE),
    )


@lru_cache(maxsize=2)
def _shapes(scale: str) -> Mapping[str, Any]:
    """Return the arrays of shapely geometries land, borders and lakes of one outline file."""
    kinds = {
        "land": shapely.GeometryType.POLYGON,
        "borders": shapely.GeometryType.LINESTRING,
        "lakes": shapely.GeometryType.POLYGON,
    }
    with files("siting.sharing").joinpath("outlines", f"outlines_{scale}.npz").open("rb") as file:
        stored = np.load(file, allow_pickle=False)
        shapes = {}
        for name, kind in kinds.items():
            corners = np.cumsum(stored[f"{name}_steps"], axis=0) / FILE_DECIMALS
            levels = 2 if kind is shapely.GeometryType.POLYGON else 1
            offsets = tuple(stored[f"{name}_{level}"].astype(np.int64) for level in range(levels))
            shapes[name] = shapely.from_ragged_array(kind, corners, offsets)
    return shapes


@lru_cache(maxsize=1)
def _towns() -> tuple[list[str], Floats]:
    """Return the names of all towns, largest first, and their latitude and longitude, shape (towns, 2)."""
    with files("siting.sharing").joinpath("outlines", "places.npz").open("rb") as file:
        stored = np.load(file, allow_pickle=False)
        names = stored["names"].tobytes().decode("utf-8").split("\n")
        return names, stored["position"].astype(float) / PLACE_DECIMALS


def _clipped(shapes: Any, box: Box) -> list[Any]:  # noqa: ANN401 - arrays of geometries have no type of their own
    """Return the parts of the shapes inside the box, moved by whole turns so that longitudes are the box's own."""
    parts: list[Any] = []
    for turn in (-WORLD_WIDTH, 0.0, WORLD_WIDTH):
        west, east = max(box.west - turn, -180.0), min(box.east - turn, 180.0)
        if west >= east:
            continue
        bounds = shapely.bounds(shapes)
        near = (bounds[:, 0] < east) & (bounds[:, 2] > west) & (bounds[:, 1] < box.north) & (bounds[:, 3] > box.south)
        cut = shapely.get_parts(shapely.clip_by_rect(shapes[near], west, box.south, east, box.north))
        step = np.array([turn, 0.0])
        moved = shapely.transform(cut, lambda corners, step=step: corners + step) if turn else cut
        parts += [part for part in moved if not part.is_empty]
    return parts


def _line(corners: Floats, decimals: int) -> list[int]:
    """Return corners (n, 2) of longitude and latitude as the flat list that `Backdrop` describes."""
    whole = np.round(corners[:, ::-1] * 10**decimals).astype(np.int64)
    moves = np.ones(len(whole), dtype=bool)
    moves[1:] = (np.diff(whole, axis=0) != 0).any(axis=1)
    return [int(step) for step in np.diff(whole[moves], axis=0, prepend=np.zeros((1, 2), np.int64)).ravel()]


def _rings(polygons: Iterable[Any], decimals: int) -> list[list[int]]:
    rings = [ring for polygon in polygons if polygon.geom_type == "Polygon" for ring in shapely.get_rings(polygon)]
    lines = (_line(shapely.get_coordinates(ring), decimals) for ring in rings)
    return [line for line in lines if len(line) >= 8]  # noqa: PLR2004 - four corners of two numbers close a ring


def _named(box: Box, wide: Box) -> tuple[PlaceName, ...]:
    """Return the largest towns in the box, then the largest around it."""
    names, spots = _towns()
    longitudes = np.array([wide.longitude(degrees) for degrees in spots[:, 1]])

    def inside(part: Box) -> Flags:
        """Tell which towns lie in the part."""
        rows = (spots[:, 0] >= part.south) & (spots[:, 0] <= part.north)
        return rows & (longitudes >= part.west) & (longitudes <= part.east)

    first = inside(box)
    chosen = [*np.flatnonzero(first)[:MOST_PLACES], *np.flatnonzero(inside(wide) & ~first)[: MOST_PLACES // 2]]
    return tuple(
        PlaceName(name=names[i], latitude=float(spots[i, 0]), longitude=round(float(longitudes[i]), 2)) for i in chosen
    )


def backdrop(box: Box) -> Backdrop:
    """
    Return what to draw behind a map of the box.

    Parameters
    ----------
    box
        What the map shows at first, as `box_around` gives it.

    Returns
    -------
    backdrop
        Outlines and towns of the box and its surroundings; 1:10m where the box is small, else 1:50m.
    """
    wide = surroundings(box)
    fine = box.width <= FINE_WIDTH
    decimals = 3 if fine else 2
    shapes = _shapes("10m" if fine else "50m")
    parts = {name: _clipped(shapes[name], wide) for name in ("land", "borders", "lakes")}
    return Backdrop(
        box=wide,
        decimals=decimals,
        land=_rings(parts["land"], decimals),
        lakes=_rings(parts["lakes"], decimals),
        borders=[_line(shapely.get_coordinates(part), decimals) for part in parts["borders"]],
        places=_named(box, wide),
    )
