"""The covering problem of the sites against enumeration, and the continuous knapsack against sorting."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from siting.solving.bounding.knapsack import OPEN, SHUT, fill
from siting.solving.bounding.master import price_cover, whole_cover


@pytest.mark.parametrize("seed", range(40))
def test_whole_cover_is_the_cheapest_one(seed: int) -> None:
    """With open and shut sites, the value and the set are those of enumeration."""
    random = np.random.default_rng(seed)
    count = int(random.integers(1, 11))
    cost, capacity = random.uniform(-1, 5, count), random.uniform(0.5, 5, count)
    need = random.uniform(0, 0.9) * capacity.sum()
    state = random.choice(np.array([0, 0, 0, OPEN, SHUT], dtype=np.int8), count)
    allowed = [
        np.array(taken, dtype=bool)
        for taken in itertools.product([False, True], repeat=count)
        if capacity[np.array(taken, dtype=bool)].sum() >= need
        and all(state[k] == 0 or taken[k] == (state[k] == OPEN) for k in range(count))
    ]
    pick = np.empty(count, dtype=np.int32)
    value, found = whole_cover(cost, capacity, state, need, 0.0, 0, 0.0, 10**6, pick)
    if not allowed:
        assert value == np.inf
        return
    least = min(cost[taken].sum() for taken in allowed)
    assert value == pytest.approx(least, abs=1e-9)
    assert found == pytest.approx(least, abs=1e-9)
    assert capacity[pick >= 0].sum() >= need - 1e-9


@pytest.mark.parametrize("tries", [0, 1, 5, 50])
def test_whole_cover_is_a_bound_when_cut_short(tries: int) -> None:
    """With few items tried, the value is at most the minimum, and at least the continuous one."""
    random = np.random.default_rng(3)
    cost, capacity = random.uniform(1, 5, 40), random.uniform(0.5, 5, 40)
    state, need, pick = np.zeros(40, dtype=np.int8), 0.37 * capacity.sum(), np.empty(40, dtype=np.int32)
    least, _ = whole_cover(cost, capacity, state, need, 0.0, 0, 0.0, 10**8, pick)
    value, found = whole_cover(cost, capacity, state, need, 0.0, 0, 0.0, tries, pick)
    starts, spare = np.arange(41), np.empty(40)
    continuous, *_ = price_cover(cost, capacity, starts, state, need, 0, 40, 0.0, spare, pick, pick.copy())
    assert continuous - 1e-9 <= value <= least + 1e-9
    assert found >= least - 1e-9


@pytest.mark.parametrize("seed", range(20))
def test_continuous_cover_keeps_the_counts(seed: int) -> None:
    """The value is never above the cheapest set with a number of sites within the limits, one size each."""
    random = np.random.default_rng(seed)
    starts = np.concatenate([[0], np.cumsum(random.integers(1, 3, 6))])
    options = int(starts[-1])
    cost, capacity = random.uniform(-1, 5, options), random.uniform(0.5, 5, options)
    for first, last in itertools.pairwise(starts):
        capacity[first:last] = np.sort(capacity[first:last])[::-1]
    need, state = 0.5 * capacity[starts[:-1]].sum(), np.zeros(6, dtype=np.int8)
    for fewest, most in ((0, 6), (5, 6), (4, 4), (0, 4)):
        ways = itertools.product(*([-1, *range(starts[k], starts[k + 1])] for k in range(6)))
        sets = [np.array([option for option in way if option >= 0], dtype=int) for way in ways]
        fitting = [
            cost[chosen].sum() for chosen in sets if fewest <= chosen.size <= most and capacity[chosen].sum() >= need
        ]
        spare, pick = np.empty(6), np.empty(6, dtype=np.int32)
        value, *_ = price_cover(cost, capacity, starts, state, need, fewest, most, 0.0, spare, pick, pick.copy())
        if fitting:
            assert value <= min(fitting) + 1e-9


@pytest.mark.parametrize("guess", [0.0, 0.1, 2.5, 99.0])
@pytest.mark.parametrize("seed", range(10))
def test_fill_takes_the_best_lanes(seed: int, guess: float) -> None:
    """Whatever the guess, the profit is that of filling from the greatest margin down."""
    random = np.random.default_rng(seed)
    count = int(random.integers(1, 30))
    margin, load = np.round(random.uniform(0.1, 5, count), 1), random.uniform(0.5, 3, count)
    room = random.uniform(0, 0.99) * load.sum()
    order = np.argsort(-margin, kind="stable")
    before = np.concatenate([[0.0], np.cumsum(load[order])[:-1]])
    best = float((margin[order] * np.clip(room - before, 0.0, load[order])).sum())
    row = np.arange(count, dtype=np.int32)
    end, rest = fill(margin, load, row, 0, count, room, guess)
    profit = float((margin[:end] * load[:end]).sum()) + (rest * margin[end] if rest > 0 else 0.0)
    assert profit == pytest.approx(best)
    assert load[:end].sum() + rest == pytest.approx(room)
    assert sorted(row.tolist()) == list(range(count))
