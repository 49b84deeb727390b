"""The engine `whole`: stopping, repeating, extremes of numbers, and bounds from any prices."""

from __future__ import annotations

import threading
import time
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from siting.listener import Silent, Stop
from siting.network.network import build_network
from siting.solving.bounding.whole import whole
from siting.solving.bounding.whole_bound import Pricer
from siting.solving.bounding.whole_levers import Levers
from siting.solving.bounding.whole_problem import state
from siting.solving.direct import direct
from siting.solving.flows import flows_for, price
from siting.study.demo import demo_folder
from siting.study.read import read_study
from siting.study.settings import SolveSettings
from siting.study.tables import CustomerRow, SiteRow, SizeRow, Study, SupplierRow
from tests.benchmarks.two_echelons import two_echelons
from tests.building import one_echelon, settings_of
from tests.whole.full_size import full_size
from tests.whole.generator import studies

if TYPE_CHECKING:
    from siting.listener import Progress
    from siting.network.network import Network
    from siting.solving.engine import EngineResult

EXACT = SolveSettings(gap=0.0, time_limit_s=120.0)

SAME = settings(
    max_examples=60,
    deadline=None,
    derandomize=True,
    database=None,
    suppress_health_check=tuple(HealthCheck),
)


class Kept(Silent):
    """A listener that keeps what it is told, and asks for a stop once the phase has been told so many times."""

    def __init__(self, stop: Stop | None = None, after: int = 0) -> None:
        self.told: list[Progress] = []
        self._stop = stop
        self._after = after

    def update(self, progress: Progress) -> None:
        """Keep it."""
        self.told.append(progress)
        if self._stop is not None and len(self.told) >= self._after:
            self._stop.request()


def run(network: Network, asked: SolveSettings = EXACT) -> EngineResult:
    """Run the engine without a listener."""
    return whole(network, asked, listener=Silent(), stop=Stop())


def cost_of(network: Network, result: EngineResult) -> float:
    """Return what the decisions of a result cost, flows found anew; they must be able to serve all demand."""
    assert result.decisions is not None
    amounts = flows_for(network, result.decisions)
    assert amounts is not None
    return price(network, result.decisions, amounts)


def agrees(study: Study) -> None:
    """Assert that the proved cost is that of the other engine."""
    network = build_network(study)
    expected = cost_of(network, direct(network, EXACT, listener=Silent(), stop=Stop()))
    found = run(network)
    assert cost_of(network, found) == pytest.approx(expected, rel=1e-6, abs=1e-9)
    assert found.bound == pytest.approx(expected, rel=1e-6, abs=1e-9)


@pytest.fixture(scope="module")
def medium() -> tuple[Network, float]:
    """Return a network of 5 suppliers, 20 sites and 100 customers, and its optimum by the other engine."""
    network = build_network(two_echelons(5, 20, 100, seed=3))
    return network, cost_of(network, direct(network, EXACT, listener=Silent(), stop=Stop()))


def test_proves_two_echelons(medium: tuple[Network, float]) -> None:
    """A seeded problem of two echelons is proved at the other engine's optimum."""
    network, optimum = medium
    found = run(network)
    assert cost_of(network, found) == pytest.approx(optimum, rel=1e-7)
    assert found.bound == pytest.approx(optimum, rel=1e-6)
    assert found.note == ""


@pytest.mark.parametrize("after", [1, 2, 3, 4, 5, 6, 8, 10, 15, 20])
def test_is_valid_whenever_it_stops(medium: tuple[Network, float], after: int) -> None:
    """Stopped after so many reports, the bound is not above and the cost not below the optimum, and it says so."""
    network, optimum = medium
    stop = Stop()
    found = whole(network, EXACT, listener=Kept(stop, after), stop=stop)
    assert found.bound is None or found.bound <= optimum * (1 + 1e-9)
    if found.decisions is not None:
        assert cost_of(network, found) >= optimum * (1 - 1e-9)
    assert found.note == "stopped on request"
    assert not found.impossible


@pytest.mark.parametrize("seconds", [0.001, 0.05, 0.2, 0.5])
def test_keeps_its_time_limit(seconds: float) -> None:
    """With little time it ends within a second of it, with a bound below the cost of its plan."""
    network = build_network(two_echelons(10, 50, 400, seed=1))
    began = time.monotonic()
    found = run(network, replace(EXACT, time_limit_s=seconds))
    assert time.monotonic() - began < seconds + 1.5
    assert found.note == "stopped by the time limit"
    if found.decisions is not None and found.bound is not None:
        assert found.bound <= cost_of(network, found) * (1 + 1e-9)


def test_stops_within_a_second_from_another_thread() -> None:
    """A request made while it searches is answered within a second, and leaves no thread behind."""
    network = build_network(two_echelons(10, 50, 400, seed=1))
    stop = Stop()
    asked: list[float] = []

    def ask() -> None:
        asked.append(time.monotonic())
        stop.request()

    timer = threading.Timer(2.0, ask)
    timer.start()
    whole(network, EXACT, listener=Silent(), stop=stop)
    ended = time.monotonic()
    timer.join()
    assert ended - asked[0] < 1.0
    assert threading.active_count() == 1


def test_repeats_itself(medium: tuple[Network, float]) -> None:
    """Two runs that neither time nor a request stops give the same decisions and the same bound, to the last digit."""
    first, second = run(medium[0]), run(medium[0])
    assert first.decisions is not None
    assert second.decisions is not None
    assert np.array_equal(first.decisions.option_open, second.decisions.option_open)
    assert np.array_equal(first.decisions.supplier_signed, second.decisions.supplier_signed)
    assert first.bound == second.bound


def test_reports_only_improvements(medium: tuple[Network, float], capfd: pytest.CaptureFixture[str]) -> None:
    """Reported costs never rise, bounds never fall, each phase is named, and nothing is printed."""
    kept = Kept()
    whole(medium[0], EXACT, listener=kept, stop=Stop())
    costs = [told.cost for told in kept.told if told.cost is not None]
    bounds = [told.bound for told in kept.told if told.bound is not None]
    assert costs == sorted(costs, reverse=True)
    assert bounds == sorted(bounds)
    assert all(told.phase for told in kept.told)
    assert capfd.readouterr().out == ""


def test_begins_from_a_known_plan(medium: tuple[Network, float]) -> None:
    """Decisions it is given are kept where there is no time to find better ones."""
    network, optimum = medium
    known = run(network).decisions
    assert known is not None
    stop = Stop()
    found = whole(network, EXACT, listener=Kept(stop, 2), stop=stop, start=known)
    assert cost_of(network, found) == pytest.approx(optimum, rel=1e-7)


def test_meets_the_gap_asked(medium: tuple[Network, float]) -> None:
    """At a gap of 2 % it ends with a gap of at most 2 %."""
    network, optimum = medium
    found = run(network, replace(EXACT, gap=0.02))
    assert found.bound is not None
    assert found.bound <= optimum
    assert (cost_of(network, found) - found.bound) / cost_of(network, found) <= 0.02


@pytest.mark.parametrize("single", [False, True])
def test_proves_an_invented_study_of_full_size(single: bool) -> None:  # noqa: FBT001 - a parameter of the test
    """Two goods, sizes, rules, service, counts and carbon on 20 sites: the other engine's optimum within the gap."""
    study = full_size(8)
    if single:
        study = replace(study, settings=replace(study.settings, single_source=True))
    network = build_network(study)
    asked = SolveSettings(gap=1e-4, time_limit_s=300.0)
    expected = direct(network, asked, listener=Silent(), stop=Stop())
    found = run(network, asked)
    assert found.bound is not None
    assert expected.bound is not None
    assert cost_of(network, found) == pytest.approx(cost_of(network, expected), rel=1.1e-4)
    assert found.bound <= cost_of(network, expected) * (1 + 1e-9)
    assert expected.bound <= cost_of(network, found) * (1 + 1e-9)


def test_proves_the_demo_study() -> None:
    """The demo study has the same optimum as with the other engine."""
    network = build_network(read_study(demo_folder()))
    asked = SolveSettings(gap=1e-4, time_limit_s=120.0)
    found = run(network, asked)
    expected = direct(network, asked, listener=Silent(), stop=Stop())
    assert cost_of(network, found) == pytest.approx(cost_of(network, expected), rel=1.1e-4)
    assert found.bound is not None
    assert found.bound <= cost_of(network, expected)


def sites(count: int, **values: float) -> list[SiteRow]:
    """Return sites that are all alike."""
    return [SiteRow(site=f"S{n}", **values) for n in range(count)]  # type: ignore[arg-type]  # numbers only


@pytest.mark.parametrize(
    ("rows", "demand", "unit_cost"),
    [
        (
            sites(3, yearly_charge=1e9, capacity=70.0),
            {"A": 60.0, "B": 50.0},
            [[1e-4, 3e-4], [2e-4, 2e-4], [3e-4, 1e-4]],
        ),
        (sites(3, yearly_charge=1e-3, capacity=2e-3), {"A": 1e-3, "B": 2e-3}, [[1.0, 2.0], [2.0, 1.0], [1.5, 1.5]]),
        (sites(4, yearly_charge=10.0, capacity=50.0), {"A": 40.0, "B": 40.0}, [[5.0, 5.0]] * 4),
        (sites(3, yearly_charge=10.0, capacity=50.0), {"A": 120.0}, [[1.0], [2.0], [3.0]]),
        (sites(2, yearly_charge=10.0, capacity=50.0), {"A": 60.0, "B": 40.0}, [[1.0, 2.0], [3.0, 1.0]]),
        (sites(2, capacity=50.0), {"A": 30.0, "B": 40.0}, [[0.0, 0.0], [0.0, 0.0]]),
        (sites(2, yearly_charge=5.0), {"A": 0.0, "B": 4.0}, [[1.0, 1.0], [2.0, 2.0]]),
        (sites(1, yearly_charge=7.0), {"A": 3.0}, [[2.0]]),
    ],
    ids=[
        "huge charges",
        "tiny amounts",
        "equal costs",
        "large customer",
        "exact fit",
        "no charges",
        "no demand",
        "one",
    ],
)
def test_takes_extremes_of_numbers(rows: list[SiteRow], demand: dict[str, float], unit_cost: list[list[float]]) -> None:
    """Numbers at the edge of what a study may hold give the other engine's optimum."""
    agrees(one_echelon("extremes", rows, demand, unit_cost))


def test_says_impossible_only_when_proved() -> None:
    """One unit more than all sites hold is impossible; exactly as much is not."""
    rows = sites(2, yearly_charge=1.0, capacity=50.0)
    assert run(build_network(one_echelon("full", rows, {"A": 100.0}, [[1.0], [1.0]]))).impossible is False
    assert run(build_network(one_echelon("over", rows, {"A": 101.0}, [[1.0], [1.0]]))).impossible is True


def test_proves_a_study_that_has_nothing_to_decide() -> None:
    """Customers who need nothing cost nothing; what must be paid anyway is in cost and bound."""
    study = Study(
        settings=one_echelon("x", [], {}, []).settings,
        sites=(SiteRow(site="S"),),
        suppliers=(SupplierRow(supplier="K"),),
        customers=(CustomerRow(customer="C", demand=0.0),),
    )
    network = build_network(study)
    found = run(network)
    assert found.bound == 0.0
    assert cost_of(network, found) == 0.0


@SAME
@given(study=studies(), seed=st.integers(0, 2**32 - 1), scale=st.sampled_from((0.0, 1.0, 30.0)))
def test_any_prices_give_a_bound(study: Study, seed: int, scale: float) -> None:
    """Whatever the prices of rows and links are, the bound they give is not above the optimum."""
    network = build_network(study)
    expected = direct(network, EXACT, listener=Silent(), stop=Stop())
    problem = state(network)
    levers = Levers(problem)
    random = np.random.default_rng(seed)
    priced = np.flatnonzero(random.random(len(problem.links)) < 0.5)
    bound = Pricer(problem).price(
        random.normal(0.0, scale, len(problem.limits)),
        priced,
        problem.links.chosen(priced),
        random.normal(0.0, scale, priced.size),
        levers.sides(*levers.whole()),
    )
    if not expected.impossible:
        optimum = cost_of(network, expected)
        assert bound.bound * problem.money <= optimum + 1e-9 * max(1.0, abs(optimum))


def test_a_share_of_a_lane_costs_but_a_share_of_its_reduced_cost() -> None:
    """A lane that a split customer needs but a sliver of stays in the program that settles a single-sourced one."""
    study = Study(
        settings=settings_of("sliver", circuity=1.0, outbound_rate=0.0078125),
        sites=(
            SiteRow(site="S1", latitude=46.0, longitude=10.0),
            SiteRow(site="S2", latitude=46.0, longitude=11.5),
            SiteRow(site="S3", latitude=46.0, longitude=10.0, capacity=13.0),
        ),
        sizes=(SizeRow(site="S1", size="only", yearly_charge=1.0, capacity=4.0),),
        customers=(
            CustomerRow(customer="C1", latitude=46.0, longitude=10.0, demand=5.0),
            CustomerRow(customer="C2", latitude=46.0, longitude=10.5, demand=9.0, single_source=True),
        ),
    )
    network = build_network(study)
    result = whole(network, SolveSettings(gap=0.0), listener=Silent(), stop=Stop())
    expected = direct(network, SolveSettings(gap=0.0), listener=Silent(), stop=Stop())
    assert result.decisions is not None
    assert expected.decisions is not None
    assert (result.decisions.option_open == expected.decisions.option_open).all()
    assert result.bound == pytest.approx(expected.bound, rel=1e-9)
