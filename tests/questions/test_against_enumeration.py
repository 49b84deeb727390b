"""
Random small studies: closings and headroom are what trying every set of verdicts says, ties included.

The witness is `tests/whole/enumeration.py`, which shares nothing with the solvers.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import pytest
from hypothesis import given, settings

from siting.plan.plan import SiteVerdict
from siting.plan.proof import Outcome
from siting.questions.closing import closing
from siting.questions.headroom import headroom
from siting.questions.headroom_result import Room
from siting.questions.restriction import OPEN, SIGNED
from siting.solving.solve import solve
from tests.questions.asked import EXACT, freed, held_in, held_out, using
from tests.whole.enumeration import Enumeration
from tests.whole.generator import studies
from tests.whole.test_against_enumeration import FEW, SAME

if TYPE_CHECKING:
    from siting.plan.plan import Plan
    from siting.questions.closing_result import ClosingLine, Without
    from siting.questions.headroom_result import HeadroomLine
    from siting.study.tables import Study

MONEY = 2e-6
"""Relative to the cost: two costs are compared, each proved to 1e-6."""
LITTLE = 1.0 / 1024
"""Load that surely counts as moving something, and costs next to nothing."""
LITTLE_COST = 0.1
"""Money that moving `LITTLE` may cost at most: prices are at most 100 per unit of load."""

SOME = settings(FEW, max_examples=40)


def check_closing(study: Study) -> None:
    """Assert that each re-plan and each re-route costs what enumeration says."""
    answer = solve(study, EXACT)
    test = closing(study, answer, settings=EXACT)
    if answer.plan is None:
        assert test.outcome is Outcome.IMPOSSIBLE
        assert (test.cost, test.lines) == (None, ())
        return
    plan = answer.plan
    sizes = {line.site: line.size for line in plan.sites if line.verdict in OPEN}
    signed = frozenset(line.supplier for line in plan.suppliers if line.verdict in SIGNED)
    assert {line.name for line in test.lines} == {*sizes, *signed}
    for line in test.lines:
        best = Enumeration(study=held_out(study, line.name)).best()
        agrees(line.replan, None if best is None else best.cost, plan)
        rest = {site: size for site, size in sizes.items() if site != line.name}
        others = Enumeration(study=freed(study, line.name)).cost_of(rest, signed - {line.name})
        agrees(line.reroute, others, plan)
        check_words(line, plan)
    extras = [line.replan.extra_cost for line in test.lines if line.replan and line.replan.extra_cost is not None]
    assert extras == sorted(extras)


def agrees(found: Without | None, cost: float | None, plan: Plan) -> None:
    """Assert that an answer has the cost enumerated, lies in its own interval, and adds up."""
    assert found is not None
    if cost is None:
        assert found.possible is False
        assert found.why
        return
    scale = MONEY * max(1.0, abs(cost), abs(plan.cost))
    assert found.cost == pytest.approx(cost, abs=scale)
    assert found.extra_cost == pytest.approx(cost - plan.cost, abs=scale)
    assert found.extra_least is not None
    assert found.extra_most is not None
    assert found.extra_least - scale <= cost - plan.cost <= found.extra_most + scale
    assert sum(found.cost_lines.values()) == pytest.approx(found.extra_cost, abs=scale)


def check_words(line: ClosingLine, plan: Plan) -> None:
    """Assert that what is tested is gone, that a re-route leaves the others alone, and that shifts add up."""
    for found in (line.reroute, line.replan):
        if found is None or found.plan is None:
            continue
        own = next(change for change in found.changes if change.name == line.name)
        assert own.after in {"close", "leave", "drop"}
        if found is line.reroute:
            assert [change.name for change in found.changes] == [line.name]
        before = {row.site: row.throughput for row in plan.sites} | {row.supplier: row.volume for row in plan.suppliers}
        for filling in found.fillings:
            assert filling.before == pytest.approx(before[filling.name])


@SAME
@given(study=studies())
def test_closings_are_what_enumeration_says(study: Study) -> None:
    """With features on by chance, each re-plan and re-route costs what trying every set of verdicts says."""
    check_closing(study)


@SOME
@given(study=studies(on=("suppliers", "running", "closing charges", "rules")))
def test_closings_with_suppliers_rules_and_closing_charges(study: Study) -> None:
    """Dropping suppliers, and sites that a rule or a charge holds, are what enumeration says too."""
    check_closing(study)


@SOME
@given(study=studies(on=("single sourcing", "sizes", "pins", "running")))
def test_closings_with_single_sources_sizes_and_pins(study: Study) -> None:
    """Single-sourced customers find another origin; sizes are held; the own ruling is lifted, the others hold."""
    check_closing(study)


def check_headroom(study: Study) -> None:
    """Assert that each headroom is the difference of two enumerated costs."""
    found = headroom(study, settings=EXACT)
    best = Enumeration(study=study).best()
    if best is None:
        assert found.outcome is Outcome.IMPOSSIBLE
        assert found.lines == ()
        return
    assert found.cost == pytest.approx(best.cost, abs=MONEY * max(1.0, abs(best.cost)))
    assert {line.name for line in found.lines} == {
        *(row.site for row in study.sites),
        *(row.supplier for row in study.suppliers),
    }
    for line in found.lines:
        scale = MONEY * max(1.0, abs(best.cost))
        if line.inside:
            without = Enumeration(study=held_out(study, line.name)).best()
            if without is None:
                assert line.room is Room.IRREPLACEABLE
                assert (line.yearly, line.most) == (None, None)
                continue
            assert line.yearly == pytest.approx(without.cost - best.cost, abs=scale)
            check_interval(line, without.cost - best.cost, scale)
            assert (line.room is Room.TIED) == (abs(without.cost - best.cost) <= line.tolerance + 1e-12)
        else:
            check_outside(study, line, best.cost)


def check_interval(line: HeadroomLine, right: float, scale: float) -> None:
    """Assert that the interval holds the right headroom and is as narrow as two proofs can make it."""
    assert line.least is not None
    assert line.most is not None
    assert line.least - scale <= right <= line.most + scale
    assert line.exact


def check_outside(study: Study, line: HeadroomLine, best: float) -> None:
    """Assert that the fall needed is that of the best plan with it in use, however little moves."""
    free = Enumeration(study=held_in(study, line.name)).best()
    used = Enumeration(study=using(study, line.name, LITTLE)).best()
    if used is None:
        assert line.room is Room.CANNOT
        return
    assert free is not None
    assert line.yearly is not None
    scale = MONEY * max(1.0, abs(best), abs(used.cost))
    assert free.cost - best - scale <= line.yearly
    assert used.cost - best - LITTLE_COST <= line.yearly <= used.cost - best + scale
    assert line.most is not None
    assert line.yearly <= line.most + scale
    assert math.isfinite(line.most)


@SAME
@given(study=studies())
def test_headroom_is_what_enumeration_says(study: Study) -> None:
    """With features on by chance, rises and falls are differences of enumerated costs."""
    check_headroom(study)


@SOME
@given(study=studies(on=("suppliers", "single sourcing", "least volumes", "goods")))
def test_headroom_where_use_is_a_matter_of_verdicts(study: Study) -> None:
    """Where whole customers or least volumes decide what can move, moving something is more than being open."""
    check_headroom(study)


@SOME
@given(study=studies(on=("sizes", "pins", "running", "opening charges", "closing charges")))
def test_headroom_with_sizes_pins_and_one_off_charges(study: Study) -> None:
    """One-off headroom is spread by the annuity and blank for what runs already; pins of the others hold."""
    check_headroom(study)
    found = headroom(study, settings=EXACT)
    for line in found.lines:
        if line.verdict in {SiteVerdict.KEEP, SiteVerdict.CLOSE, "stay", "drop"}:
            assert line.one_off is None
        elif line.one_off is not None:
            assert line.per_one_off is not None
            assert line.one_off * line.per_one_off == pytest.approx(line.yearly)
