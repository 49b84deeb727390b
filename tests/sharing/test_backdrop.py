"""Outlines are cut to any part of the world, in one piece, and small."""

from __future__ import annotations

import json

import numpy as np
import pytest
import shapely

from siting.sharing.backdrop import Box, backdrop, box_around, surroundings

REGIONS = {
    "Central Europe": ((46.0, 52.0), (10.0, 22.0)),
    "one town": ((48.2,), (16.4,)),
    "Fiji, across the antimeridian": ((-20.0, -15.0), (177.0, -178.0)),
    "Chukotka and Alaska": ((62.0, 68.0), (170.0, -160.0)),
    "United States": ((25.0, 48.0), (-124.0, -70.0)),
    "East Africa": ((-5.0, 4.0), (34.0, 41.0)),
    "the world": ((-40.0, 60.0, 35.0), (-120.0, 150.0, 0.0)),
    "far north": ((78.0, 83.9), (10.0, 25.0)),
}


def corners(line: list[int], decimals: int) -> list[tuple[float, float]]:
    """Return the line's corners as longitude and latitude, undoing the steps."""
    points = np.cumsum(np.array(line).reshape(-1, 2), axis=0) / 10**decimals
    return [(float(longitude), float(latitude)) for latitude, longitude in points]


def land_at(latitude: float, longitude: float, box: Box) -> bool:
    """Return whether the outlines of the box have land at the spot."""
    behind = backdrop(box)
    spot = shapely.Point(box.longitude(longitude), latitude)
    rings = [shapely.Polygon(corners(ring, behind.decimals)) for ring in behind.land]
    return bool(sum(ring.contains(spot) for ring in rings) % 2 == 1)


@pytest.mark.parametrize(("latitudes", "longitudes"), REGIONS.values(), ids=REGIONS.keys())
def test_all_points_lie_in_their_box(latitudes: tuple[float, ...], longitudes: tuple[float, ...]) -> None:
    """The box holds every point once its longitude is moved by whole turns, and is at least half a degree wide."""
    box = box_around(latitudes, longitudes)
    assert -180 <= box.west < 180
    assert 0.49 <= box.width <= 360
    for latitude, longitude in zip(latitudes, longitudes, strict=True):
        assert box.south <= latitude <= box.north
        assert box.west <= box.longitude(longitude) <= box.east


@pytest.mark.parametrize(("latitudes", "longitudes"), REGIONS.values(), ids=REGIONS.keys())
def test_outlines_stay_within_the_surroundings(latitudes: tuple[float, ...], longitudes: tuple[float, ...]) -> None:
    """Nothing is drawn outside what the map may show, in at most 700 kB."""
    box = box_around(latitudes, longitudes)
    behind = backdrop(box)
    wide = surroundings(box)
    slack = 10**-behind.decimals
    for line in (*behind.land, *behind.lakes, *behind.borders):
        xs, ys = zip(*corners(line, behind.decimals), strict=True)
        assert wide.west - slack <= min(xs) <= max(xs) <= wide.east + slack
        assert wide.south - slack <= min(ys) <= max(ys) <= wide.north + slack
    assert behind.land
    assert len(json.dumps([behind.land, behind.lakes, behind.borders], separators=(",", ":"))) < 700_000


def test_surroundings_hold_any_window() -> None:
    """Fitted into windows from 0.8 to 2.8 times as wide as high, the map shows nothing beyond the outlines."""
    box = box_around((46.0, 52.0), (10.0, 22.0))
    wide = surroundings(box)

    def heights(part: Box) -> tuple[float, float]:
        low, high = (np.degrees(np.arcsinh(np.tan(np.radians(part_end)))) for part_end in (part.south, part.north))
        return float(low), float(high)

    low, high = heights(box)
    wide_low, wide_high = heights(wide)
    for shape in (0.8, 1.0, 1.6, 2.8):
        scale = max(box.width / shape, high - low)
        assert scale * shape <= wide.width
        assert scale <= wide_high - wide_low


@pytest.mark.parametrize(
    ("latitude", "longitude", "region"),
    [
        (48.2, 16.4, "Central Europe"),
        (48.2, 16.4, "one town"),
        (-17.8, 178.0, "Fiji, across the antimeridian"),
        (-16.5, 179.5, "Fiji, across the antimeridian"),
        (66.0, -178.0, "Chukotka and Alaska"),
        (66.0, 178.0, "Chukotka and Alaska"),
        (40.0, -100.0, "United States"),
        (0.0, 37.0, "East Africa"),
        (-30.0, 140.0, "the world"),
        (48.2, 16.4, "the world"),
    ],
)
def test_known_land_is_land(latitude: float, longitude: float, region: str) -> None:
    """Vienna, both halves of Fiji and Chukotka, Kansas, Kenya and Australia are not in the sea."""
    assert land_at(latitude, longitude, box_around(*REGIONS[region]))


@pytest.mark.parametrize(
    ("latitude", "longitude", "region"),
    [
        (44.5, 13.5, "Central Europe"),
        (-19.0, 179.9, "Fiji, across the antimeridian"),
        (30.0, -120.0, "United States"),
        (0.0, -150.0, "the world"),
    ],
)
def test_known_sea_is_sea(latitude: float, longitude: float, region: str) -> None:
    """The Adriatic and three spots of the Pacific are not land."""
    assert not land_at(latitude, longitude, box_around(*REGIONS[region]))


def test_small_boxes_are_drawn_finer() -> None:
    """Up to 16 degrees the outlines are the 1:10m ones with three decimals, above it the 1:50m ones with two."""
    assert backdrop(Box(west=8.0, south=46.0, east=24.0, north=50.0)).decimals == 3
    assert backdrop(Box(west=8.0, south=46.0, east=24.1, north=50.0)).decimals == 2


def test_towns_of_the_box_come_first_and_largest_first() -> None:
    """Around Vienna and Brno both are named before Budapest, larger than Brno but outside; districts are not."""
    names = [place.name for place in backdrop(box_around((47.8, 49.4), (15.5, 17.8))).places]
    assert names.index("Vienna") < names.index("Brno") < names.index("Budapest")
    assert not {"Favoriten", "Pest"} & set(names)


def test_towns_across_the_antimeridian_are_moved_along() -> None:
    """Towns on both sides of 180 degrees have longitudes in the box's own count."""
    places = {place.name: place.longitude for place in backdrop(box_around((-18.0, -13.0), (178.0, -172.0))).places}
    assert places["Suva"] == pytest.approx(178.44, abs=0.02)
    assert places["Apia"] == pytest.approx(360 - 171.77, abs=0.02)
