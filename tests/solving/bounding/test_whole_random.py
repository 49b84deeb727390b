"""The engine `whole` on random small studies with every feature: bounds, plans and verdicts against other engines."""

from __future__ import annotations

from typing import TYPE_CHECKING

import highspy
import numpy as np
import pulp
import pytest
from hypothesis import HealthCheck, given, settings

from siting.listener import Silent, Stop
from siting.network.network import build_network
from siting.solving.bounding.whole import whole
from siting.solving.bounding.whole_levers import Levers
from siting.solving.bounding.whole_problem import state
from siting.solving.bounding.whole_program import Ending, LaneProgram
from siting.solving.direct import direct
from siting.solving.flows import flows_for, price
from siting.solving.model import build_model
from siting.study.settings import SolveSettings
from tests.whole.generator import FEATURES, studies

if TYPE_CHECKING:
    from siting.network.network import Network
    from siting.solving.engine import EngineResult
    from siting.study.tables import Study

NO_CHECKS = tuple(HealthCheck)
"""A study takes a hundred draws and more, and solving it takes longer than Hypothesis likes."""

SAME = settings(max_examples=150, deadline=None, derandomize=True, database=None, suppress_health_check=NO_CHECKS)
FEW = settings(SAME, max_examples=15)

EXACT = SolveSettings(gap=0.0, time_limit_s=60.0)


def run(network: Network, asked: SolveSettings = EXACT) -> EngineResult:
    """Run the engine without a listener."""
    return whole(network, asked, listener=Silent(), stop=Stop())


def cost_of(network: Network, result: EngineResult) -> float:
    """Return what the decisions of a result cost, flows found anew; they must be able to serve all demand."""
    assert result.decisions is not None
    amounts = flows_for(network, result.decisions)
    assert amounts is not None
    return price(network, result.decisions, amounts)


def money(value: float) -> object:
    """Return what equals an amount of money."""
    return pytest.approx(value, rel=1e-6, abs=1e-6)


def check(study: Study) -> None:
    """Assert that both engines agree on the cost of the proved plan, or that there is none."""
    network = build_network(study)
    expected = direct(network, EXACT, listener=Silent(), stop=Stop())
    found = run(network)
    assert found.impossible == expected.impossible
    if found.impossible:
        assert found.decisions is None
        return
    best = cost_of(network, expected)
    assert cost_of(network, found) == money(best)
    assert found.bound == money(best)


@SAME
@given(study=studies())
def test_agrees_with_the_other_engine(study: Study) -> None:
    """With features on by chance, the cost is the same and proved, or both say impossible."""
    check(study)


@pytest.mark.parametrize("feature", FEATURES)
def test_agrees_with_each_feature_on(feature: str) -> None:
    """With one feature surely on and the others by chance, the engines agree."""

    @FEW
    @given(study=studies(on=(feature,)))
    def agree(study: Study) -> None:
        check(study)

    agree()


@pytest.mark.parametrize("relaxed", [True, False])
def test_states_the_same_problem(relaxed: bool) -> None:  # noqa: FBT001 - a parameter of the test
    """The arrays have the optimum of the model in PuLP, with and without whole numbers."""

    @SAME
    @given(study=studies())
    def same(study: Study) -> None:
        network = build_network(study)
        model = build_model(network, relaxed=relaxed)
        model.problem.solve(pulp.HiGHS(msg=False, gapRel=0.0))
        problem = state(network)
        if relaxed:
            levers = Levers(problem)
            program = LaneProgram(problem, np.zeros(0, dtype=np.intp), lambda: False)
            solved = program.solve(levers.sides(*levers.whole()), enough=np.inf)
            empty, value = solved.ending is Ending.EMPTY, solved.bound * problem.money
        else:
            found = run(network)
            empty, value = found.impossible, found.bound or 0.0
        status = model.problem.solverModel.getModelStatus()
        assert empty == (status == highspy.HighsModelStatus.kInfeasible)
        if not empty:
            assert value == money(float(pulp.value(model.problem.objective)) * model.money)

    same()
