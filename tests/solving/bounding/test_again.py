"""Searches that share what they begin from, against searches from scratch."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings

from siting.listener import Stop
from siting.network.decisions import NO_SOURCE, Decisions
from siting.network.network import build_network
from siting.questions.allowed import allowed
from siting.solving.bounding.again import begin, search_again
from siting.solving.bounding.engine import bounding
from siting.solving.bounding.problem import problem_of, row_lanes
from siting.solving.direct import direct
from siting.solving.flows import flows_for, price
from tests.published.large_instances import recipe
from tests.solving.bounding.test_random import networks
from tests.solving.solved import EXACT, best

if TYPE_CHECKING:
    from siting.network.network import Network


def without(network: Network, site: int) -> Network:
    """Return the network with a site pinned shut, whatever its ruling was."""
    shut, pinned = network.site_pinned_shut.copy(), network.site_pinned_open.copy()
    shut[site], pinned[site] = True, False
    return replace(network, site_pinned_shut=shut, site_pinned_open=pinned)


def all_open(network: Network) -> Decisions:
    """Return the decisions that open every site not pinned shut at its first size."""
    _, first = np.unique(network.option_site, return_index=True)
    option_open = np.zeros(network.option_site.size, dtype=np.bool_)
    option_open[first] = True
    option_open &= ~network.site_pinned_shut[network.option_site]
    source = np.full(len(network.customers), NO_SOURCE, dtype=np.int32)
    return Decisions(option_open=option_open, supplier_signed=np.zeros(0, dtype=np.bool_), source=source)


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(network=networks())
def test_without_each_site_it_finds_what_the_direct_engine_finds(network: Network) -> None:
    """Begun from any plan that serves everything, the optimum without each site is found and proved."""
    plan = best(network, direct)
    begun = None if plan is None else begin(network, plan.decisions)
    if begun is None:
        return
    for site in range(len(network.sites)):
        other = without(network, site)
        assert begun.serves(other)
        optimum, start = best(other, direct), all_open(other)
        if optimum is None:
            continue
        if not allowed(other, start) or flows_for(other, start) is None:
            start = optimum.decisions
        result = search_again(other, EXACT, begun, start=start)
        assert result.decisions is not None
        assert result.bound is not None
        amounts = flows_for(other, result.decisions)
        assert amounts is not None
        assert price(other, result.decisions, amounts) == pytest.approx(optimum.cost, rel=1e-6, abs=1e-6)
        assert result.bound <= optimum.cost + 1e-7 * abs(optimum.cost) + 1e-9


def test_the_lanes_at_hand_make_the_same_problem() -> None:
    """A problem from lanes sorted before is the one from the network, with sites shut or not."""
    network = build_network(recipe(12, 20, 3, 5))
    for other in (network, without(network, 0), without(without(network, 4), 11)):
        one, same = problem_of(other), problem_of(other, row_lanes(network))
        for name in ("demand", "row_start", "lane_site", "lane_cost", "site_option", "charge", "capacity", "option"):
            np.testing.assert_array_equal(getattr(one, name), getattr(same, name))


def test_a_network_with_other_lanes_or_requirements_is_not_served() -> None:
    """What was begun serves rulings, counts and options; other lanes, demand or requirements are another matter."""
    network = build_network(recipe(12, 20, 3, 5))
    begun = begin(network, all_open(network))
    assert begun is not None
    assert begun.serves(replace(network, most_sites=3))
    assert not begun.serves(replace(network, demand=network.demand * 2))
    assert not begun.serves(replace(network, outbound=replace(network.outbound)))
    least = replace(network, option_least=network.option_least + 1)
    assert not begun.serves(least)
    assert begin(least, all_open(least)) is None


def test_a_stop_keeps_what_is_no_dearer_than_the_plan_begun_from() -> None:
    """Stopped before it began, a search returns a plan no dearer than the one given, and says so."""
    network = build_network(recipe(12, 20, 3, 5))
    start = all_open(network)
    begun = begin(network, start)
    assert begun is not None
    stop = Stop()
    stop.request()
    result = search_again(network, EXACT, begun, start=start, stop=stop)
    assert result.decisions is not None
    kept, begun_with = flows_for(network, result.decisions), flows_for(network, start)
    assert kept is not None
    assert begun_with is not None
    assert price(network, result.decisions, kept) <= price(network, start, begun_with) * (1 + 1e-9)
    assert result.note == "stopped on request"


def test_two_runs_agree() -> None:
    """The same search gives the same decisions and the same bound, to the last bit."""
    network = build_network(recipe(30, 50, 4, 2))
    begun = begin(network, all_open(network))
    assert begun is not None
    other = without(network, 3)
    one, two = (search_again(other, EXACT, begun, start=all_open(other)) for _ in range(2))
    assert one.bound == two.bound
    assert one.decisions is not None
    assert two.decisions is not None
    np.testing.assert_array_equal(one.decisions.option_open, two.decisions.option_open)
    scratch = best(other, bounding)
    assert scratch is not None
    assert one.bound == pytest.approx(scratch.bound, rel=1e-6)
