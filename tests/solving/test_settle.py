"""A bound and a priced cost are brought together without claiming more than is known."""

from __future__ import annotations

import pytest

from siting.errors import EngineError
from siting.plan.proof import Outcome, gap_of, outcome_of
from siting.solving.settle import settled_bound


@pytest.mark.parametrize("bound", [None, 90.0, 100.0])
def test_a_bound_below_the_cost_stands(bound: float | None) -> None:
    """Nothing is changed where bound and cost do not contradict each other."""
    assert settled_bound(bound, 100.0) == bound


def test_rounding_is_taken_away() -> None:
    """A bound above the cost by a last digit is the cost."""
    assert settled_bound(100.0 + 5e-8, 100.0) == 100.0


def test_tolerances_are_held_against_the_bound() -> None:
    """A bound found 2e-5 too high is trusted only to within 2e-5; the plan is still proved."""
    bound = settled_bound(100.00002, 100.0)
    assert bound == pytest.approx(99.99998, abs=1e-12)
    assert outcome_of(100.0, bound, 0.0) is Outcome.PROVED
    assert gap_of(100.0, bound) == pytest.approx(2e-7)


@pytest.mark.parametrize("cost", [100.0, -100.0])
def test_a_wrong_bound_is_an_error(cost: float) -> None:
    """A bound above the cost by more than a solver's tolerances is refused, on either side of 0."""
    assert settled_bound(cost + 0.99e-4, cost) is not None
    with pytest.raises(EngineError, match=r"the solver's bound, .* is above the cost of its own plan"):
        settled_bound(cost + 1.01e-4, cost)
