"""How the bounding engine ends, what it hands on, what it leaves behind, and numbers far apart."""

from __future__ import annotations

import threading
import time
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
import pytest

from siting.listener import Progress, Silent, Stop
from siting.network.network import NetworkRule, build_network
from siting.solving.bounding import compiled
from siting.solving.bounding.engine import bounding
from siting.solving.bounding.problem import handles
from siting.solving.direct import direct
from siting.study.settings import SolveSettings
from siting.study.tables import RuleKind
from tests.published.large_instances import recipe
from tests.solving.solved import best

if TYPE_CHECKING:
    from pathlib import Path

    from siting.network.network import Network
    from tests.solving.conftest import NetworkMaker


class Recorder(Silent):
    """Keeps every update."""

    def __init__(self) -> None:
        self.updates: list[Progress] = []

    def update(self, progress: Progress) -> None:
        """Keep the update."""
        self.updates.append(progress)


@pytest.fixture(scope="module")
def hard() -> Network:
    """Return a network that takes many seconds to prove."""
    return build_network(recipe(400, 400, 10, 5))


def test_the_same_run_gives_the_same_answer() -> None:
    """Two runs that nothing stops agree to the last digit, also where the tree has many nodes."""
    network = build_network(recipe(40, 60, 5, 7))
    first, second = (bounding(network, SolveSettings(gap=1e-6), listener=Silent(), stop=Stop()) for _ in range(2))
    assert first.bound == second.bound
    assert first.site_count_bounds == second.site_count_bounds
    assert first.decisions is not None
    assert second.decisions is not None
    assert (first.decisions.option_open == second.decisions.option_open).all()


def test_compiling_is_said_and_takes_no_time_of_the_search(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """Where no machine code is kept, the user is told, and a time limit far below the compiler's still finds a plan."""
    monkeypatch.setattr(compiled, "_FOLDER", tmp_path)
    heard = Recorder()
    network = build_network(recipe(10, 20, 3, 1))
    result = bounding(network, SolveSettings(gap=1e-4, time_limit_s=5.0), listener=heard, stop=Stop())
    assert heard.updates[0].phase == "compiling the search, once on this machine"
    assert result.decisions is not None
    assert all(update.elapsed_s < 5.0 for update in heard.updates)


def test_a_stop_is_heard_and_leaves_no_thread(hard: Network) -> None:
    """Asked to stop while it branches, the engine answers within a second with a plan, a bound and no thread more."""
    best(build_network(recipe(10, 20, 3, 1)), bounding)  # compiled before the clock starts
    before = threading.active_count()
    stop, heard = Stop(), Recorder()
    asked: list[float] = []

    def ask() -> None:
        asked.append(time.monotonic())
        stop.request()

    timer = threading.Timer(2.0, ask)
    timer.start()
    result = bounding(hard, SolveSettings(gap=0.0, time_limit_s=60.0), listener=heard, stop=stop)
    ended = time.monotonic()
    timer.join()
    assert result.note == "stopped on request"
    assert result.decisions is not None
    assert ended - asked[0] < 1.0
    assert threading.active_count() == before
    costs = [update.cost for update in heard.updates if update.cost is not None]
    bounds = [update.bound for update in heard.updates if update.bound is not None]
    assert max(bounds) < min(costs)
    assert bounds == sorted(bounds)


def test_a_known_plan_is_not_lost(two_sites: Network) -> None:
    """Given decisions to start from, the engine returns as good ones even when stopped at once, with no bound above."""
    known = best(two_sites, direct)
    assert known is not None
    stop = Stop()
    stop.request()
    result = bounding(two_sites, SolveSettings(), listener=Silent(), stop=stop, start=known.decisions)
    assert result.decisions is not None
    assert (result.decisions.option_open == known.decisions.option_open).all()
    assert result.bound is None or result.bound <= known.cost


def test_says_when_nothing_is_possible(two_sites: Network) -> None:
    """Capacity just below demand is impossible; exactly at it, and just above, it is not."""
    for capacity, possible in ((29.999, False), (30.0, True), (30.001, True)):
        network = replace(two_sites, option_capacity=np.array([capacity, capacity]))
        found = best(network, bounding)
        assert (found is not None) == possible


@pytest.mark.parametrize(
    ("changes", "reason"),
    [
        ({"option_least": np.array([1.0, 0.0])}, "it has least throughputs"),
        ({"one_off_budget": 5.0}, "it has a one-off budget"),
        ({"service_share": 0.5, "service_km": 10.0}, "it asks for a service share"),
        ({"single_source": np.array([True, False, False])}, "it has single-sourced customers"),
        (
            {"rules": (NetworkRule(kind=RuleKind.AT_MOST, members=(("site", 0), ("site", 1)), number=1),)},
            "it has rules",
        ),
        ({"load": np.array([0.0])}, "a good uses no capacity"),
    ],
)
def test_what_the_relaxation_cannot_hold_is_named_and_still_solved(
    two_sites: Network, changes: dict[str, Any], reason: str
) -> None:
    """A requirement that the relaxation of the sites does not hold is named; the engine then searches otherwise."""
    assert handles(two_sites) is None
    network = replace(two_sites, **changes)
    assert handles(network) == reason
    found, known = best(network, bounding), best(network, direct)
    assert (found is None) == (known is None)
    if found is not None and known is not None:
        assert found.cost == pytest.approx(known.cost, rel=1e-6)


@pytest.mark.parametrize("most", [1, 2])
@pytest.mark.parametrize("fewest", [0, 1, 2])
def test_limits_on_the_number_of_sites_hold(two_sites: Network, fewest: int, most: int) -> None:
    """The cheapest set within the limits is found, or none where they contradict each other."""
    network = replace(two_sites, fewest_sites=fewest, most_sites=most)
    found = best(network, bounding)
    if fewest > most:
        assert found is None
        return
    assert found is not None
    assert found.cost == pytest.approx(300.0 if fewest == 2 else 290.0)


NUMERICS: dict[str, dict[str, Any]] = {
    "charges of 1e9 beside rates of 1e-4": {"charges": [1e9, 1.1e9, 1.05e9], "scale": 1e-4},
    "demands of 1e-3": {"demand": 1e-3},
    "equal costs everywhere": {"charges": [10.0, 10.0, 10.0], "equal": True},
    "one customer larger than any site": {"demands": [25.0, 5.0, 5.0], "capacities": [15.0, 12.0, 20.0]},
    "capacity exactly equal to demand": {"demands": [10.0, 20.0, 30.0], "capacities": [10.0, 20.0, 30.0]},
    "no charges": {"charges": [0.0, 0.0, 0.0]},
    "no demand": {"demands": [0.0, 0.0, 0.0]},
    "no demand, and sites that pay": {"demands": [0.0, 0.0, 0.0], "charges": [-5.0, 3.0, 0.0]},
    "one site": {"charges": [7.0]},
    "one customer": {"demands": [12.0]},
}


@pytest.mark.parametrize("name", sorted(NUMERICS))
def test_numbers_far_apart_or_on_the_edge(name: str, make_network: NetworkMaker) -> None:
    """The direct engine's cost is reached and the bound stays on its side, whatever the size of the numbers."""
    case = NUMERICS[name]
    demands = case.get("demands", [case.get("demand", 10.0) * (k + 1) for k in range(3)])
    charges = case.get("charges", [40.0, 55.0, 35.0])
    rates = np.random.default_rng(4).uniform(1, 9, (len(charges), len(demands))) * case.get("scale", 1.0)
    if case.get("equal"):
        rates[:] = 2.0
    network = make_network(
        demand=[[amount] for amount in demands],
        charges=charges,
        capacities=case.get("capacities"),
        outbound=[
            (site, customer, float(rates[site, customer]))
            for site in range(len(charges))
            for customer in range(len(demands))
            if demands[customer] > 0
        ],
    )
    found, known = best(network, bounding), best(network, direct)
    assert found is not None
    assert known is not None
    assert found.cost == pytest.approx(known.cost, rel=1e-6, abs=1e-9)
    assert found.bound <= known.cost + 1e-9 * abs(known.cost) + 1e-9
    assert found.bound == pytest.approx(known.cost, rel=2e-6, abs=1e-6)
