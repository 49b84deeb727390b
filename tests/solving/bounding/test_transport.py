"""The flows of a set of sites, from scratch and after changes, against HiGHS."""

from __future__ import annotations

import numpy as np
import pytest

from siting.network.network import build_network
from siting.solving.bounding import transport
from siting.solving.bounding.problem import decisions_of, problem_of
from siting.solving.bounding.relaxation import Relaxation
from siting.solving.bounding.transport import SHUT_SITE, Transport
from siting.solving.flows import flows_for, price
from tests.published.large_instances import recipe


@pytest.mark.parametrize("seed", range(6))
def test_flows_cost_what_highs_says(seed: int) -> None:
    """On random sets of sites, tight in capacity or not, the cost is HiGHS's; too small sets are infinite."""
    network = build_network(recipe(30, 50, 4, seed))
    problem = problem_of(network)
    flows = Transport(problem, Relaxation(problem))
    random = np.random.default_rng(seed)
    sites = np.arange(problem.sites, dtype=np.int32)
    for share in (0.2, 0.3, 0.6, 1.0):
        chosen = np.where(random.random(problem.sites) < share, sites, SHUT_SITE).astype(np.int32)
        decisions = decisions_of(network, problem.option[chosen[chosen >= 0]])
        amounts = flows_for(network, decisions)
        cost = flows.cost_of(chosen)
        if amounts is None:
            assert cost == np.inf
        else:
            assert cost == pytest.approx(price(network, decisions, amounts), rel=1e-9)


def test_moves_end_at_a_set_that_no_single_move_improves() -> None:
    """After the descent, no site shut, opened or exchanged makes the plan cheaper."""
    network = build_network(recipe(12, 20, 3, 5))
    problem = problem_of(network)
    flows = Transport(problem, Relaxation(problem))
    everything = np.arange(problem.sites, dtype=np.int32)
    first = flows.cost_of(everything)
    cost, chosen = flows.descend(
        first, np.zeros(problem.sites, dtype=np.int8), 0, problem.sites, trials=10_000, halted=lambda: False
    )
    assert cost < first
    assert cost == pytest.approx(flows.cost_of(chosen), rel=1e-9)
    for out in (SHUT_SITE, *np.flatnonzero(chosen >= 0)):
        for into in (SHUT_SITE, *np.flatnonzero(chosen < 0)):
            other = chosen.copy()
            if out >= 0:
                other[out] = SHUT_SITE
            if into >= 0:
                other[into] = into
            assert flows.cost_of(other) >= cost * (1 - 1e-8)


def test_a_halt_is_heard_between_pivots(monkeypatch: pytest.MonkeyPatch) -> None:
    """Flows that are halted before they are optimal count as unknown, not as cheap; left alone they end the same."""
    problem = problem_of(build_network(recipe(30, 50, 2, 1)))
    instance = Transport(problem, Relaxation(problem))
    chosen = np.arange(problem.sites, dtype=np.int32)
    chosen[np.argsort(problem.capacity)[:8]] = SHUT_SITE
    cost = instance.cost_of(chosen)
    monkeypatch.setattr(transport, "PIVOTS", 3)
    assert instance.cost_of(chosen, halted=lambda: True) == np.inf
    assert instance.cost_of(chosen) == cost
