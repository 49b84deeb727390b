"""The bounding engine against the direct one on random small networks with every feature it takes."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from siting.solving.bounding.engine import bounding
from siting.solving.bounding.problem import handles
from siting.solving.direct import direct
from tests.solving.conftest import _make as make_network
from tests.solving.solved import best

if TYPE_CHECKING:
    from siting.network.network import Network


@st.composite
def networks(draw: st.DrawFn) -> Network:
    """Draw a network of up to 5 sites with up to 3 sizes, 7 customers and 2 goods, any lane missing."""
    random = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    site_count, customers, goods = draw(st.integers(1, 5)), draw(st.integers(1, 7)), draw(st.integers(1, 2))
    sizes = [int(random.integers(1, 4)) if draw(st.booleans()) else 1 for _ in range(site_count)]
    options = [site for site, count in enumerate(sizes) for _ in range(count)]
    round_numbers = draw(st.booleans())
    demand = random.uniform(0, 20, (customers, goods))
    demand[random.random(demand.shape) < 0.1] = 0.0
    charges = random.uniform(-20, 200, len(options))
    capacities = random.uniform(10, 120, len(options))
    if round_numbers:
        demand, charges, capacities = np.round(demand), np.round(charges, -1), np.round(capacities, -1)
    capacities[random.random(len(options)) < 0.15] = np.inf
    missing = draw(st.sampled_from([0.0, 0.0, 0.3]))
    outbound = [
        (site, customer, float(random.integers(1, 12) if round_numbers else random.uniform(0.5, 12)), good)
        for site in range(site_count)
        for customer in range(customers)
        for good in range(goods)
        if demand[customer, good] > 0 and random.random() >= missing
    ]
    running = random.random(site_count) < 0.4
    pinned = random.random(site_count)
    fewest = draw(st.integers(0, 2))
    return make_network(
        demand=demand.tolist(),
        charges=charges.tolist(),
        capacities=capacities.tolist(),
        sites=options,
        outbound=outbound,
        load=random.uniform(0.5, 2, goods),
        site_running=running,
        site_closing=np.where(running, random.uniform(-30, 60, site_count), 0.0),
        site_pinned_open=pinned < 0.1,
        site_pinned_shut=pinned > 0.9,
        fewest_sites=fewest,
        most_sites=draw(st.integers(max(fewest, 1), site_count + 1)),
    )


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(network=networks())
def test_finds_what_the_direct_engine_finds(network: Network) -> None:
    """Both prove the same cost, or that there is none; the bound is below it."""
    assert handles(network) is None
    one, other = best(network, bounding), best(network, direct)
    assert (one is None) == (other is None)
    if one is not None and other is not None:
        assert one.cost == pytest.approx(other.cost, rel=1e-6, abs=1e-6)
        assert one.bound <= other.cost + 1e-7 * abs(other.cost) + 1e-9
