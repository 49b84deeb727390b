"""
Random small studies with every feature on and off: the plan equals the best of every set of verdicts.

The witness is `enumeration.py`, which derives costs from the tables itself and solves flows without HiGHS.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest
from hypothesis import HealthCheck, assume, given, settings

from siting.plan.plan import SiteVerdict, SupplierVerdict, TodayOutcome
from siting.plan.proof import Outcome
from siting.study.tables import SiteRuling, SiteStanding, SupplierRuling, SupplierStanding
from tests.answers import EXACT, audited, open_sites, signed_suppliers
from tests.whole.enumeration import Enumeration
from tests.whole.generator import FEATURES, studies

if TYPE_CHECKING:
    from siting.plan.plan import Answer
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

MONEY = 1e-6
"""Relative (absolute below 1): costs are at most a few thousand and their parts are quarters."""

NO_CHECKS = tuple(HealthCheck)
"""A study takes a hundred draws and more, and solving it takes longer than Hypothesis likes."""

SAME = settings(max_examples=200, deadline=None, derandomize=True, database=None, suppress_health_check=NO_CHECKS)
FEW = settings(SAME, max_examples=15)
MANY = settings(max_examples=4000, deadline=None, suppress_health_check=NO_CHECKS, print_blob=True)


TOGETHER = (
    ("suppliers", "sizes", "goods", "offers", "rules", "running", "opening charges", "closing charges"),
    ("suppliers", "least volumes"),
    ("suppliers", "goods", "offers", "least volumes"),
    ("suppliers", "closing charges"),
    ("suppliers", "pins", "rules"),
    ("suppliers", "goods", "single sourcing", "direct lanes"),
    ("suppliers only", "single sourcing", "offers"),
    ("sizes", "closing charges", "opening charges", "residual values"),
    ("sizes", "least volumes"),
    ("sizes", "counts"),
    ("closing charges", "opening charges", "budget"),
    ("coordinates", "carbon", "deliveries", "direct lanes"),
    ("coordinates", "goods", "overrides", "reach"),
    ("service", "goods", "fractions"),
)
"""Features that meet in one constraint or one charge."""


def money(value: float) -> object:
    """Return what equals an amount of money."""
    return pytest.approx(value, rel=MONEY, abs=MONEY)


def check_against_enumeration(study: Study, engine: SolveSettings = EXACT) -> Answer:
    """Assert that the proved plan, or the verdict that there is none, is what enumeration finds."""
    search = Enumeration(study=study)
    best = search.best()
    answer = audited(study, engine)
    if best is None:
        assert answer.proof.outcome is Outcome.IMPOSSIBLE
        assert answer.plan is None
        assert answer.reasons
        return answer
    plan = answer.plan
    assert plan is not None
    assert answer.proof.outcome is Outcome.PROVED
    assert answer.proof.bound is not None
    assert plan.proof.cost == money(best.cost)
    assert answer.proof.bound <= best.cost + MONEY * max(1.0, abs(best.cost))
    sizes = {line.site: line.size for line in plan.sites if line.site in open_sites(plan)}
    assert search.cost_of(sizes, frozenset(signed_suppliers(plan))) == money(best.cost)
    return answer


@SAME
@given(study=studies())
def test_plan_is_the_enumerated_best(study: Study) -> None:
    """With features on by chance, the proved plan is the best of every set of verdicts, or both say impossible."""
    check_against_enumeration(study)


@pytest.mark.parametrize("feature", FEATURES)
def test_each_feature_switched_on(feature: str) -> None:
    """With one feature surely on and the others by chance, the plan is the enumerated best."""

    @FEW
    @given(study=studies(on=(feature,)))
    def check(study: Study) -> None:
        check_against_enumeration(study)

    check()


@pytest.mark.parametrize("features", TOGETHER, ids=" + ".join)
def test_features_that_meet(features: tuple[str, ...]) -> None:
    """With features that share a constraint or a charge surely on, the plan is the enumerated best."""

    @FEW
    @given(study=studies(on=features))
    def check(study: Study) -> None:
        check_against_enumeration(study)

    check()


@pytest.mark.long
@MANY
@given(study=studies())
def test_plan_is_the_enumerated_best_of_thousands(study: Study) -> None:
    """The same on thousands of studies that differ from run to run."""
    check_against_enumeration(study)


@FEW
@given(study=studies())
def test_the_second_engine_agrees(study: Study) -> None:
    """CBC on the same model finds the enumerated best too."""
    check_against_enumeration(study, replace(EXACT, engine="cbc"))


@SAME
@given(study=studies(on=("running",)))
def test_today_is_priced_as_enumerated(study: Study) -> None:
    """Today's cost is that of what runs and is signed, with nothing decided; it is short where that cannot serve."""
    runs = [row.site for row in study.sites if row.standing is SiteStanding.RUNNING]
    signed = [row.supplier for row in study.suppliers if row.standing is SupplierStanding.SIGNED]
    today = audited(study).today
    assert today is not None
    if (study.sites and not runs) or (study.suppliers and not signed):
        assert today.outcome is TodayOutcome.ABSENT
        return
    best = Enumeration(study=as_it_is(study)).best()
    assert today.outcome is (TodayOutcome.SHORT if best is None else TodayOutcome.SERVED)
    if best is not None:
        assert today.cost == money(best.cost)
        assert today.plan is not None
        assert {line.verdict for line in today.plan.sites} <= {SiteVerdict.KEEP, SiteVerdict.LEAVE}
        assert {line.verdict for line in today.plan.suppliers} <= {SupplierVerdict.STAY, SupplierVerdict.LEAVE}


def as_it_is(study: Study) -> Study:
    """Return the study of what runs and is signed today, all in use, with everything that can be decided taken out."""
    free = replace(
        study.settings, fewest_sites=None, most_sites=None, one_off_budget=None, service_km=None, service_share=None
    )
    return replace(
        study,
        settings=free,
        sites=tuple(
            replace(row, ruling=SiteRuling.PINNED_OPEN, least_throughput=0.0, residual_value=0.0)
            for row in study.sites
            if row.standing is SiteStanding.RUNNING
        ),
        sizes=tuple(replace(row, least_throughput=0.0) for row in study.sizes if row.standing is SiteStanding.RUNNING),
        suppliers=tuple(
            replace(row, ruling=SupplierRuling.PINNED_SIGNED, least_yearly=0.0)
            for row in study.suppliers
            if row.standing is SupplierStanding.SIGNED
        ),
        offers=tuple(replace(row, least_yearly=0.0) for row in study.offers),
        rules=(),
    )


@FEW
@given(study=studies())
def test_the_two_witnesses_agree(study: Study) -> None:
    """Where network simplex can price the flows, CBC prices them the same, so that neither is trusted blindly."""
    one, other = Enumeration(study=study), Enumeration(study=study, witness="cbc")
    assume(one.whole)
    first, second = one.best(), other.best()
    assert (first is None) == (second is None)
    if first is not None and second is not None:
        assert first.cost == money(second.cost)
