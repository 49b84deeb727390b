"""Distances against published geodesics, and the error of a sphere in place of the ellipsoid."""

from __future__ import annotations

import math

import numpy as np
import pytest

from siting.network.distance import geodesic_km


def dms(degrees: float, minutes: float, seconds: float = 0.0) -> float:
    """Return degrees from degrees, minutes and seconds, all with the sign of the degrees."""
    return math.copysign(abs(degrees) + minutes / 60 + seconds / 3600, degrees)


PUBLISHED = [
    # from, to, metres, tolerance in metres, source
    pytest.param((40.6, -73.8), (51.6, -0.5), 5_551_759.400, 5e-4, id="GeographicLib example code, New York to London"),
    pytest.param((-41.32, 174.81), (40.96, -5.50), 19_959_679.267, 5e-4, id="geographiclib-python documentation"),
    pytest.param((-30, 0), (29.9, 179.8), 19_989_832.827610, 5e-6, id="Karney (2013) J. Geodesy 87, table 5"),
    pytest.param((-30.12345, 0), (-30.12344, 0.00005), 4.944208, 5e-7, id="Karney (2013) J. Geodesy 87, table 3"),
    pytest.param((41.49008, -71.312796), (41.499498, -81.695391), 866_455.433, 5e-4, id="geopy docstrings"),
    pytest.param(
        (dms(42, 15), -dms(71, 7)),
        (dms(45, 31), -dms(123, 41)),
        4_164_074.239,
        5e-4,
        id="PROJ and pyproj, Boston-Portland",
    ),
    pytest.param(
        (dms(-37, 57, 3.72030), dms(144, 25, 29.52440)),
        (dms(-37, 39, 10.15610), dms(143, 55, 35.38390)),
        54_972.271,
        5e-4,
        id="Geoscience Australia, Flinders Peak to Buninyong",
    ),
    pytest.param((50.06632, -5.71475), (58.64402, -3.07009), 969_954.166, 5e-4, id="Land's End to John o'Groats"),
    pytest.param((0, 0), (0.5, 179.5), 19_936_288.579, 5e-4, id="near-antipodal, Vincenty still converges"),
    pytest.param(
        (-41.22777, 122.32875),
        (-7.57291, 130.37946),
        3_812_686.035106,
        5e-6,
        id="geographiclib-python test_geodesic.py",
    ),
]


@pytest.mark.parametrize(("start", "end", "metres", "tolerance"), PUBLISHED)
def test_reaches_published_geodesics(
    start: tuple[float, float], end: tuple[float, float], metres: float, tolerance: float
) -> None:
    """Each pair to the last digit its source prints, in both directions."""
    assert geodesic_km(*start, *end) * 1000 == pytest.approx(metres, abs=tolerance)
    assert geodesic_km(*end, *start) * 1000 == pytest.approx(metres, abs=tolerance)


def test_broadcasts_origins_against_destinations() -> None:
    """A column of origins and a row of destinations give the table of all pairs."""
    latitude, longitude = np.array([48.2, 50.1, 52.5]), np.array([16.4, 14.4, 13.4])
    table = geodesic_km(latitude[:2, None], longitude[:2, None], latitude[None, :], longitude[None, :])
    assert table.shape == (2, 3)
    assert table[0, 0] == 0.0
    assert table[0, 1] == pytest.approx(table[1, 0])
    assert table[0, 2] == pytest.approx(float(geodesic_km(48.2, 16.4, 52.5, 13.4)))


def test_unknown_place_has_no_distance() -> None:
    """A missing coordinate gives NaN for its pair and leaves the others alone."""
    km = geodesic_km(np.array([math.nan, 48.0]), np.array([10.0, 10.0]), 49.0, 10.0)
    assert math.isnan(km[0])
    assert km[1] == pytest.approx(111.2, abs=0.1)


def test_shapes_that_do_not_fit_are_refused() -> None:
    """Two origins cannot pair with three destinations one by one."""
    with pytest.raises(ValueError, match="shape mismatch"):
        geodesic_km(np.zeros(2), np.zeros(2), np.zeros(3), np.zeros(3))


MEAN_RADIUS_KM = 6371.0088


def haversine_km(lat_a: float, lon_a: float, lat_b: float, lon_b: float) -> float:
    """Great-circle distance on a sphere of the mean earth radius: the estimate the program does not use."""
    a, b = math.radians(lat_a), math.radians(lat_b)
    half = math.sin((b - a) / 2) ** 2 + math.cos(a) * math.cos(b) * math.sin(math.radians(lon_b - lon_a) / 2) ** 2
    return 2 * MEAN_RADIUS_KM * math.asin(min(1.0, math.sqrt(half)))


@pytest.mark.parametrize(
    ("pair", "percent"),
    [
        ((0.0, 0.0, 0.001, 0.0), 0.56144),
        ((89.998, 0.0, 89.999, 0.0), -0.44667),
        ((0.0, 0.0, 0.0, 0.001), -0.1118),
        ((40.6, -73.8, 51.6, -0.5), -0.268),
        ((-41.22777, 122.32875, -7.57291, 130.37946), 0.347),
    ],
)
def test_sphere_is_off_by_the_known_amounts(pair: tuple[float, float, float, float], percent: float) -> None:
    """The extremes of the sphere's error (R/(a(1-e^2)) - 1 at the equator) and two published pairs."""
    error = haversine_km(*pair) / float(geodesic_km(*pair)) - 1
    assert error * 100 == pytest.approx(percent, abs=6e-4)


def test_sphere_stays_within_its_bound() -> None:
    """20,000 random pairs, long and short, stay within -0.447 % ... +0.562 % of the ellipsoid."""
    draws = np.random.default_rng(20)
    lat_a, lon_a = draws.uniform(-90, 90, 20_000), draws.uniform(-180, 180, 20_000)
    step = np.where(draws.uniform(size=20_000) < 0.5, 180.0, 0.1)
    lat_b = np.clip(lat_a + step * draws.uniform(-1, 1, 20_000), -90, 90)
    lon_b = lon_a + step * draws.uniform(-1, 1, 20_000)
    exact = geodesic_km(lat_a, lon_a, lat_b, lon_b)
    sphere = np.array([haversine_km(*pair) for pair in zip(lat_a, lon_a, lat_b, lon_b, strict=True)])
    error = sphere / exact - 1
    assert error.max() < 0.00562
    assert error.min() > -0.00447
    assert error.max() > 0.005  # the draws do come near the bound
