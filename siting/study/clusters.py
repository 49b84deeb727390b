"""
Put points on the sphere into compact groups: weighted k-means on unit vectors.

The centre of a group is the weighted mean of its points, brought back to the sphere: among all points of the sphere the
one with the least weighted sum of squared chords. Starts are drawn as in k-means++ from a fixed seed, so that the same
points give the same groups.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from siting.arrays import Floats, Positions

SEED = 1
MOST_ROUNDS = 40
SMALLEST_GAIN = 1e-3
"""Rounds end once the weighted sum of squared chords falls by less than this share of itself."""

_CHUNK = 8192


def unit_vectors(latitude: Floats, longitude: Floats) -> Floats:
    """
    Return points on the unit sphere.

    Parameters
    ----------
    latitude, longitude
        Shape (points,). Degrees.

    Returns
    -------
    vectors
        Shape (points, 3).
    """
    north, east = np.radians(latitude), np.radians(longitude)
    return np.stack([np.cos(north) * np.cos(east), np.cos(north) * np.sin(east), np.sin(north)], axis=1)


def degrees_of(vectors: Floats) -> tuple[Floats, Floats]:
    """
    Return latitude and longitude of points.

    Parameters
    ----------
    vectors
        Shape (points, 3), of any length above 0.

    Returns
    -------
    latitude, longitude
        Shape (points,). Degrees.
    """
    x, y, z = vectors.T
    return np.degrees(np.arctan2(z, np.hypot(x, y))), np.degrees(np.arctan2(y, x))


def k_means(points: Floats, weight: Floats, count: int) -> Positions:
    """
    Return which of at most `count` groups each point belongs to.

    Parameters
    ----------
    points
        Shape (points, 3), unit vectors, no two the same.
    weight
        Shape (points,), above 0.
    count
        Groups wanted, at least 1.

    Returns
    -------
    group
        Shape (points,), from 0; exactly min(count, points) groups, none of them empty.

    References
    ----------
    Lloyd (1982), Least squares quantization in PCM, IEEE Transactions on Information Theory 28(2): 129-137; starts of
    Arthur & Vassilvitskii (2007), k-means++: the advantages of careful seeding, SODA: 1027-1035 (both from memory).
    """
    if count >= points.shape[0]:
        return np.arange(points.shape[0], dtype=np.int32)
    centres = _starts(points, weight, count)
    before = np.inf
    for _ in range(MOST_ROUNDS):
        group, chord = _nearest(points, centres)
        total = float(weight @ chord)
        if before - total <= SMALLEST_GAIN * before:
            break
        before = total
        centres = _means(points, weight, group, chord, count)
    group, chord = _nearest(points, centres)
    return _filled(group, weight * chord, count)


def _starts(points: Floats, weight: Floats, count: int) -> Floats:
    """Return `count` different points, each drawn by its weighted squared chord to those drawn before."""
    draw = np.random.default_rng(SEED)
    chosen = [int(draw.choice(points.shape[0], p=weight / weight.sum()))]
    chord = _chords(points, points[chosen[0]])
    while len(chosen) < count:
        mass = np.cumsum(weight * chord)
        nxt = int(np.searchsorted(mass, draw.random() * mass[-1], side="right"))
        chosen.append(min(nxt, points.shape[0] - 1))
        chord = np.minimum(chord, _chords(points, points[chosen[-1]]))
    return points[chosen]


def _chords(points: Floats, centre: Floats) -> Floats:
    chords: Floats = np.maximum(1.0 - points @ centre, 0.0)
    return chords


def _nearest(points: Floats, centres: Floats) -> tuple[Positions, Floats]:
    """Return the nearest centre of each point and half its squared chord."""
    group = np.empty(points.shape[0], dtype=np.int32)
    chord = np.empty(points.shape[0])
    for start in range(0, points.shape[0], _CHUNK):
        part = slice(start, start + _CHUNK)
        near = points[part] @ centres.T
        group[part] = near.argmax(axis=1)
        chord[part] = 1.0 - near[np.arange(near.shape[0]), group[part]]
    return group, np.maximum(chord, 0.0)


def _means(points: Floats, weight: Floats, group: Positions, chord: Floats, count: int) -> Floats:
    """Return the centre of each group; an empty one takes the point that costs most where it is."""
    group = _filled(group, weight * chord, count)
    sums = np.stack([np.bincount(group, weights=weight * axis, minlength=count) for axis in points.T], axis=1)
    means: Floats = sums / np.maximum(np.linalg.norm(sums, axis=1, keepdims=True), np.finfo(np.float64).tiny)
    return means


def _filled(group: Positions, cost: Floats, count: int) -> Positions:
    """Return the groups with every empty one given a point of its own, the dearest first."""
    sizes = np.bincount(group, minlength=count)
    empty = np.flatnonzero(sizes == 0)
    group = group.copy()
    for at in np.argsort(-cost, kind="stable") if empty.size else ():
        if not empty.size:
            break
        if sizes[group[at]] > 1:
            sizes[group[at]] -= 1
            group[at], empty = empty[0], empty[1:]
    return group
