"""The start of the engine `whole` from the search over sites alone, and sources of single-sourced customers by hand."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings

from siting.listener import Silent, Stop
from siting.network.network import NetworkRule, build_network
from siting.solving.bounding import whole_core
from siting.solving.bounding.whole import whole
from siting.solving.bounding.whole_assign import assigned
from siting.solving.bounding.whole_core import Until, begins_with_core, core_of
from siting.solving.bounding.whole_levers import Levers
from siting.solving.bounding.whole_problem import state
from siting.solving.bounding.whole_program import LaneProgram
from siting.solving.bounding.whole_start import first_lanes
from siting.solving.direct import direct
from siting.solving.flows import flows_for, price
from siting.study.settings import SolveSettings
from siting.study.tables import RuleKind
from tests.published.large_instances import recipe
from tests.whole.generator import studies

if TYPE_CHECKING:
    from siting.listener import Progress
    from siting.network.network import Network
    from siting.solving.bounding.whole_problem import WholeProblem
    from siting.study.tables import Study

EXACT = SolveSettings(gap=0.0, time_limit_s=60.0)
ASKED = SolveSettings(gap=0.02, time_limit_s=60.0)

SAME = settings(
    max_examples=40, deadline=None, derandomize=True, database=None, suppress_health_check=tuple(HealthCheck)
)

SITE_FEATURES = ("rules", "budget", "counts", "service", "single sourcing", "least volumes", "sizes", "goods", "pins")


class Kept(Silent):
    """A listener that keeps what it is told."""

    def __init__(self) -> None:
        self.told: list[Progress] = []

    def update(self, progress: Progress) -> None:
        """Keep it."""
        self.told.append(progress)


@pytest.fixture(autouse=True)
def any_size(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let small problems begin with the search over sites alone as well."""
    monkeypatch.setattr(whole_core, "LARGE", 0)


def cost_of(network: Network, result_of: object) -> float:
    """Return what decisions cost, flows found anew; they must be able to serve all demand."""
    amounts = flows_for(network, result_of)  # type: ignore[arg-type]  # None fails here
    assert amounts is not None
    return price(network, result_of, amounts)  # type: ignore[arg-type]


def hard(name: str) -> Network:
    """Return 30 sites and 120 customers with one requirement that the sites alone do not state."""
    network = build_network(recipe(30, 120, 5, 1))
    customers, sites = len(network.customers), len(network.sites)
    everyone = tuple(("site", n) for n in range(sites))
    rules = (
        NetworkRule(kind=RuleKind.AT_LEAST, members=everyone[:10], number=5),
        NetworkRule(kind=RuleKind.NOT_TOGETHER, members=everyone[10:14], number=None),
    )
    charge = network.option_charge
    changed: dict[str, dict[str, object]] = {
        "single": {"single_source": np.ones(customers, np.bool_)},
        "rules": {"rules": rules},
        "budget": {"option_one_off": charge, "one_off_budget": float(charge.mean()) * 8},
        "least": {"option_least": 0.9 * network.option_capacity},
        "service": {
            "outbound": replace(network.outbound, km=network.outbound.cost),
            "service_km": 1.5,
            "service_share": 0.8,
        },
    }
    return replace(network, **changed[name])  # type: ignore[arg-type]  # fields by name


@pytest.mark.parametrize("name", ["single", "rules", "budget", "least", "service"])
def test_has_a_plan_before_the_relaxation_over_lanes(name: str) -> None:
    """The first plan is told before the lanes are relaxed, and what is proved agrees with the other engine."""
    network, kept = hard(name), Kept()
    found = whole(network, ASKED, listener=kept, stop=Stop())
    first = next(told for told in kept.told if told.cost is not None)
    assert first.phase == "looking for a first plan"
    expected = direct(network, replace(ASKED, gap=1e-4), listener=Silent(), stop=Stop())
    assert found.bound is not None
    assert expected.bound is not None
    assert found.bound <= cost_of(network, expected.decisions) * (1 + 1e-9)
    assert cost_of(network, found.decisions) >= expected.bound * (1 - 1e-9)
    assert found.note == ""
    assert cost_of(network, found.decisions) - found.bound <= 0.02 * cost_of(network, found.decisions)


@pytest.mark.parametrize("feature", SITE_FEATURES)
def test_agrees_with_the_other_engine(feature: str) -> None:
    """Whatever is left out at first, the proved cost is the other engine's, or both say impossible."""

    @SAME
    @given(study=studies(on=(feature,)))
    def agree(study: Study) -> None:
        network = build_network(study)
        assume(begins_with_core(state(network)))
        expected = direct(network, EXACT, listener=Silent(), stop=Stop())
        found = whole(network, EXACT, listener=Silent(), stop=Stop())
        assert found.impossible == expected.impossible
        if not found.impossible:
            optimum = cost_of(network, expected.decisions)
            assert cost_of(network, found.decisions) == pytest.approx(optimum, rel=1e-6, abs=1e-6)
            assert found.bound == pytest.approx(optimum, rel=1e-6, abs=1e-6)

    agree()


@SAME
@given(study=studies(on=("rules", "service", "single sourcing")))
def test_bounds_and_sets_hold(study: Study) -> None:
    """The bound is not above the optimum, and every set keeps the rows that speak of sites alone."""
    network = build_network(study)
    problem = state(network)
    assume(begins_with_core(problem))
    expected = direct(network, EXACT, listener=Silent(), stop=Stop())
    core = core_of(problem, EXACT, Silent(), Stop(), lambda: False)
    assume(core is not None and not expected.impossible)
    assert core is not None
    optimum = cost_of(network, expected.decisions)
    assert core.bound * problem.money <= optimum + 1e-9 * max(1.0, abs(optimum))
    for opened in core.sets:
        assert keeps_rows_of_sites(problem, opened)
    deeper, _ = core.deepen(problem)
    assert deeper * problem.money <= optimum + 1e-9 * max(1.0, abs(optimum))


def keeps_rows_of_sites(problem: WholeProblem, opened: np.ndarray) -> bool:
    """Return whether limits that have entries of options only hold, row by row."""
    limits = problem.limits
    for row in range(len(limits)):
        entries = slice(int(limits.start[row]), int(limits.start[row + 1]))
        column = limits.column[entries]
        if column.size and bool((column < opened.size).all()):
            total = float(limits.value[entries] @ opened[column])
            if not limits.lower[row] - 1e-7 <= total <= limits.upper[row] + 1e-7:
                return False
    return True


def test_says_impossible_where_sites_alone_are() -> None:
    """Sites that must be nearly full cannot share a demand between their sizes; a demand that fits is no matter."""
    network = build_network(recipe(30, 120, 5, 1))
    room = np.full(30, network.demand.sum() / 1.5)
    tight = replace(network, option_capacity=room, option_least=0.99 * room)
    kept = Kept()
    assert whole(tight, ASKED, listener=kept, stop=Stop()).impossible is True
    assert kept.told[-1].phase == "searching over the sites alone"
    assert whole(replace(tight, option_least=0.5 * room), ASKED, listener=Silent(), stop=Stop()).impossible is False


@pytest.mark.parametrize(("lanes", "begins"), [(3599, True), (3600, True), (3601, False)])
def test_begins_so_only_where_it_is_large(lanes: int, begins: bool, monkeypatch: pytest.MonkeyPatch) -> None:  # noqa: FBT001 - a parameter of the test
    """A network of 3,600 lanes begins with the search over sites from exactly that size on."""
    monkeypatch.setattr(whole_core, "LARGE", lanes)
    assert begins_with_core(state(hard("single"))) is begins


def test_places_customers_whole_where_they_fit() -> None:
    """Sources found by hand exist, are open, hold what they take, and cost at least what splitting customers costs."""
    problem = state(hard("single"))
    levers = Levers(problem)
    program = LaneProgram(problem, first_lanes(problem), lambda: False, linked=False)
    held = (problem.network.option_capacity > np.median(problem.network.option_capacity)).astype(np.float64)
    lower, upper = levers.whole()
    lower[: held.size] = upper[: held.size] = held
    relaxed = program.solve(levers.sides(lower, upper), enough=np.inf)
    taken = assigned(problem, relaxed, held)
    assert taken is not None
    pairs = problem.most.pairs
    assert np.array_equal(np.bincount(pairs.customer[taken > 0]), np.ones(120))
    load = np.bincount(pairs.origin[taken > 0], pairs.load[taken > 0], minlength=30)
    assert np.all(load <= problem.network.option_capacity * held * (1 + 1e-8))
    cost = float(problem.cost[problem.places.pair] @ taken + problem.cost[: held.size] @ held) + problem.constant
    assert relaxed.value - 1e-9 <= cost <= relaxed.value * 1.05


def test_says_so_where_customers_do_not_fit_whole() -> None:
    """Three customers of 60 do not fit whole into two sites of 90, though all of them would fit in parts."""
    network = build_network(recipe(2, 3, 5, 1))
    network = replace(
        network,
        demand=np.full((3, 1), 60.0),
        option_capacity=np.full(2, 90.0),
        single_source=np.ones(3, np.bool_),
    )
    problem = state(network)
    levers = Levers(problem)
    program = LaneProgram(problem, first_lanes(problem), lambda: False, linked=False)
    held = np.ones(2)
    relaxed = program.solve(levers.sides(*levers.whole()), enough=np.inf)
    assert assigned(problem, relaxed, held) is None
    roomy = state(replace(network, option_capacity=np.array([90.0, 120.0])))
    program = LaneProgram(roomy, first_lanes(roomy), lambda: False, linked=False)
    relaxed = program.solve(Levers(roomy).sides(*Levers(roomy).whole()), enough=np.inf)
    assert assigned(roomy, relaxed, held) is not None


def test_a_request_stands_once_something_is_so() -> None:
    """The request stands when asked for, and when the condition holds, not before."""
    stop, done = Stop(), [False]
    until = Until(stop, lambda: done[0])
    assert not until.requested
    done[0] = True
    assert until.requested
    done[0] = False
    stop.request()
    assert until.requested
