"""Groups on the sphere: compact, none empty, the same every time."""

from __future__ import annotations

import numpy as np
import pytest

from siting.study.clusters import degrees_of, k_means, unit_vectors

RNG = np.random.default_rng(7)
LATITUDE, LONGITUDE = RNG.uniform(-80, 80, 400), RNG.uniform(-180, 180, 400)
POINTS = unit_vectors(LATITUDE, LONGITUDE)


def squared_chords(points: np.ndarray, weight: np.ndarray, group: np.ndarray) -> float:
    """Return the weighted sum of squared chords to the groups' centres."""
    total = 0.0
    for number in range(group.max() + 1):
        here = group == number
        centre = weight[here] @ points[here]
        centre /= np.linalg.norm(centre)
        total += float(weight[here] @ ((points[here] - centre) ** 2).sum(axis=1))
    return total


def test_degrees_and_vectors_are_each_others_inverse() -> None:
    """Poles and date line included."""
    latitude, longitude = degrees_of(
        unit_vectors(np.array([90.0, -90.0, 0.0, 12.5]), np.array([0.0, 0.0, 179.9, -3.0]))
    )
    assert latitude == pytest.approx([90.0, -90.0, 0.0, 12.5])
    assert longitude[2:] == pytest.approx([179.9, -3.0])


def test_four_towns_far_apart_are_four_groups() -> None:
    """Points around four corners of the earth, also across the date line, end in the group of their corner."""
    corners = np.array([(0.0, 180.0), (60.0, 0.0), (-45.0, 90.0), (10.0, -80.0)])
    latitude = np.concatenate([RNG.normal(north, 1.0, 50) for north, _ in corners])
    longitude = np.concatenate([(RNG.normal(east, 1.0, 50) + 180) % 360 - 180 for _, east in corners])
    group = k_means(unit_vectors(latitude, longitude), np.ones(200), 4)
    assert [len(set(group[start : start + 50].tolist())) for start in range(0, 200, 50)] == [1, 1, 1, 1]
    assert len(set(group.tolist())) == 4


@pytest.mark.parametrize("count", [1, 2, 37, 399, 400, 500])
def test_as_many_groups_as_asked_for(count: int) -> None:
    """None is empty; with as many as points, or more, each point is alone; twice gives the same."""
    group = k_means(POINTS, np.ones(400), count)
    assert sorted(set(group.tolist())) == list(range(min(count, 400)))
    assert group.tolist() == k_means(POINTS, np.ones(400), count).tolist()


def test_the_groups_are_locally_best_and_no_random_ones() -> None:
    """Each point is nearest to its own centre (but for the last rounds' gain), far better than groups by chance."""
    weight = RNG.lognormal(0, 1, 400)
    group = k_means(POINTS, weight, 20)
    by_chance = RNG.integers(0, 20, 400)
    assert squared_chords(POINTS, weight, group) < 0.15 * squared_chords(POINTS, weight, by_chance)
