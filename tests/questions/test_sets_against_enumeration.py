"""
Random small studies: runners-up and counts are what trying every set of verdicts says, ties included.

The witness is `tests/whole/enumeration.py`, which shares nothing with the solvers.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings

from siting.plan.plan import LOAD_TOLERANCE
from siting.plan.proof import Outcome
from siting.questions.counts import counts
from siting.questions.counts_result import FIXED
from siting.questions.restriction import parts_of
from siting.questions.runners_up import runners_up
from siting.study.tables import SiteRow
from tests.building import one_echelon
from tests.questions.asked import EXACT
from tests.whole.enumeration import Enumeration
from tests.whole.generator import studies
from tests.whole.test_against_enumeration import FEW

if TYPE_CHECKING:
    from siting.questions.runners_up_result import RunnerUp
    from siting.study.tables import Study

MONEY = 2e-6
"""Relative to the cost: two costs are compared, each proved to 1e-6."""
WITHIN, MOST = 0.4, 12

Parts = frozenset[tuple[str, str]]

SOME = settings(FEW, max_examples=40)
SURE = settings(FEW, max_examples=25)


@dataclass(frozen=True, slots=True)
class Tried:
    """One set of verdicts, priced by enumeration; or an answer."""

    parts: Parts
    """What is open, by site and size, and signed."""
    cost: float
    moving: float


def tried(study: Study) -> list[Tried]:
    """Return every set of verdicts that can serve the demand."""
    return [
        Tried(frozenset({*best.sizes.items(), *((name, "") for name in best.signed)}), best.cost, moving)
        for best, moving in Enumeration(study=study).every()
    ]


def as_tried(each: RunnerUp) -> Tried:
    """Return an answer with all its plan opens and signs."""
    return Tried(parts_of(each.plan), each.cost, each.cost - sum(each.plan.cost_lines[line] for line in FIXED))


def used(each: RunnerUp) -> Parts:
    """Return what an answer uses."""
    return frozenset({*each.used_sites, *((name, "") for name in each.used_suppliers)})


def must_move(study: Study) -> Parts:
    """Return what cannot idle once it is open or signed."""
    sites = {(row.site, row.size) for row in study.options if row.least_throughput > 0}
    signed = {(row.supplier, "") for row in study.suppliers if row.least_yearly > 0}
    return frozenset(sites | signed | {(row.supplier, "") for row in study.all_offers if row.least_yearly > 0})


def is_the_same(one: Tried, by: RunnerUp, forced: Parts, scale: float) -> bool:
    """Return whether a set of verdicts can move just as an answer does, no dearer: then it is the same answer."""
    inside = used(by) <= one.parts and not (one.parts - used(by)) & forced
    return inside and one.moving >= as_tried(by).moving - scale


def check_runners_up(study: Study) -> None:
    """Assert that every set of verdicts up to the proof is one of the answers, each once, cheapest plan first."""
    found = runners_up(study, within=WITHIN, most=MOST, settings=EXACT)
    every = tried(study)
    if not every:
        assert found.outcome is Outcome.IMPOSSIBLE
        assert found.answers == ()
        return
    best = min(each.cost for each in every)
    scale = MONEY * max(1.0, abs(best))
    forced = must_move(study)
    assert found.answers[0].cost == pytest.approx(best, abs=scale)
    assert len({each.used for each in found.answers}) == len(found.answers)
    assert [each.cost for each in found.answers] == sorted(each.cost for each in found.answers)
    assert found.complete_to is not None
    assert found.complete or len(found.answers) == MOST + 1
    for place, each in enumerate(found.answers):
        own = as_tried(each)
        (same,) = (one for one in every if one.parts == own.parts)
        assert own.cost == pytest.approx(same.cost, abs=scale)
        assert own.cost <= found.answers[0].cost + WITHIN * abs(best) + scale
        loads = {("site", line.site, line.size): line.throughput for line in each.plan.sites}
        loads |= {("supplier", line.supplier, ""): line.volume for line in each.plan.suppliers}
        assert {part for part, load in loads.items() if load > LOAD_TOLERANCE} == each.used
        for earlier in found.answers[:place]:
            assert not is_the_same(own, earlier, forced, scale / 100)
    upto = min(found.complete_to, best + WITHIN * abs(best)) - scale
    for one in every:
        if one.cost < upto:
            assert any(
                is_the_same(one, each, forced, scale) and each.cost <= one.cost + scale for each in found.answers
            )


@SOME
@given(study=studies())
def test_runners_up_are_every_set_there_is(study: Study) -> None:
    """With features on by chance, no set of verdicts up to the proof is missing, and none is there twice."""
    check_runners_up(study)


@SURE
@given(study=studies(on=("suppliers", "goods", "offers", "running", "closing charges")))
def test_runners_up_with_suppliers_and_closing_charges(study: Study) -> None:
    """Suppliers in use count like sites; what stays open only because closing costs more does not."""
    check_runners_up(study)


@SURE
@given(study=studies(on=("sizes", "least volumes", "pins", "rules")))
def test_runners_up_with_sizes_least_volumes_pins_and_rules(study: Study) -> None:
    """Sizes tell answers apart; what must move is used once it is open."""
    check_runners_up(study)


@SURE
@given(study=studies(on=("single sourcing", "service", "counts", "budget")))
def test_runners_up_with_single_sources_and_limits(study: Study) -> None:
    """Limits on the whole hold in every answer."""
    check_runners_up(study)


@pytest.mark.parametrize("seed", range(6))
def test_runners_up_of_dense_studies(seed: int) -> None:
    """With five sites that reach all customers there are many answers, and many sets with a site nobody uses."""
    draws = np.random.default_rng(seed)
    sites = [
        SiteRow(site=f"S{n}", yearly_charge=float(draws.integers(0, 6)), capacity=float(draws.integers(6, 30)))
        for n in range(5)
    ]
    demand = {f"C{n}": float(draws.integers(1, 5)) for n in range(5)}
    check_runners_up(one_echelon("dense", sites, demand, draws.integers(1, 7, size=(5, 5)).tolist()))


def check_counts(study: Study) -> None:
    """Assert that the best cost for each number of sites is the enumerated one, and that nothing left out can win."""
    if not study.sites:
        return
    free = replace(study, settings=replace(study.settings, fewest_sites=None, most_sites=None))
    sites = {row.site for row in study.sites}
    best: dict[int, float] = {}
    for each in tried(free):
        count = sum(name in sites for name, _ in each.parts)
        best[count] = min(best.get(count, each.cost), each.cost)
    found = counts(study, settings=EXACT)
    if not best:
        assert found.outcome is Outcome.IMPOSSIBLE
        assert (found.lines, found.best) == ((), None)
        return
    least = min(best.values())
    scale = MONEY * max(1.0, abs(least))
    assert found.best is not None
    assert found.best.cost == pytest.approx(least, abs=scale)
    assert found.fewest == min(best)
    searched = {line.count for line in found.lines}
    assert searched == set(range(min(searched), max(searched) + 1))
    for line in found.lines:
        if line.count not in best:
            assert line.outcome is Outcome.IMPOSSIBLE
            assert line.plan is None
            continue
        assert line.cost == pytest.approx(best[line.count], abs=MONEY * max(1.0, abs(best[line.count])))
        assert line.bound is not None
        assert line.bound <= best[line.count] + scale
        assert (line.fixed or 0) + (line.freight or 0) + (line.rest or 0) == pytest.approx(line.cost, abs=scale)
        assert len(line.open_sites) == line.count
        fewest, most = study.settings.fewest_sites or 0, study.settings.most_sites
        assert line.allowed is (fewest <= line.count and (most is None or line.count <= most))
    for pruned in found.pruned:
        for count in range(pruned.least, pruned.most + 1):
            assert best.get(count, pruned.bound) >= pruned.bound - scale
    assert set(best) <= searched | {n for each in found.pruned for n in range(each.least, each.most + 1)}


@SOME
@given(study=studies())
def test_counts_are_what_enumeration_says(study: Study) -> None:
    """With features on by chance, the best cost for each number of sites is that of trying every set."""
    check_counts(study)


@SURE
@given(study=studies(on=("counts", "rules", "direct lanes", "running")))
def test_counts_with_limits_rules_and_direct_lanes(study: Study) -> None:
    """The study's own numbers are lifted and marked; rules can leave holes; direct lanes can do without any site."""
    check_counts(study)
