"""Distances on the ground: geodesics on the WGS84 ellipsoid, all pairs in one call."""

from __future__ import annotations

from functools import cache
from typing import TYPE_CHECKING

import numpy as np
from pyproj import Geod

if TYPE_CHECKING:
    from numpy.typing import ArrayLike

    from siting.arrays import Floats

METRES_PER_KM = 1000.0


@cache
def _wgs84() -> Geod:
    return Geod(ellps="WGS84")


def geodesic_km(latitude_a: ArrayLike, longitude_a: ArrayLike, latitude_b: ArrayLike, longitude_b: ArrayLike) -> Floats:
    """
    Return the length of the shortest line on the WGS84 ellipsoid, in km.

    Parameters
    ----------
    latitude_a, longitude_a, latitude_b, longitude_b
        Degrees, of shapes that broadcast with each other. NaN where unknown.

    Returns
    -------
    km
        Of the broadcast shape; NaN where any coordinate is NaN.

    Raises
    ------
    ValueError
        If the shapes do not broadcast (from NumPy).

    References
    ----------
    Karney, C. F. F. (2013), Algorithms for geodesics, Journal of Geodesy 87: 43-55,
    https://doi.org/10.1007/s00190-012-0578-z
    """
    ends = (np.asarray(degrees, dtype=np.float64) for degrees in (longitude_a, latitude_a, longitude_b, latitude_b))
    lon_a, lat_a, lon_b, lat_b = np.broadcast_arrays(*ends)
    metres = _wgs84().inv(lon_a.ravel(), lat_a.ravel(), lon_b.ravel(), lat_b.ravel())[2]
    km: Floats = np.asarray(metres, dtype=np.float64).reshape(lon_a.shape) / METRES_PER_KM
    return km
