"""What must not change a plan, and what can change its cost in one direction only, at full size."""

from __future__ import annotations

import random
from dataclasses import replace
from typing import TYPE_CHECKING, TypeVar

import pytest

from siting.plan.proof import Outcome
from siting.study.tables import CustomerRow, DemandRow, Leg, RuleKind, RuleRow, SiteRow, SiteRuling
from tests.answers import EXACT, audited, open_sites, proved, signed_suppliers
from tests.building import LaneRow, lane_rows, lane_table
from tests.whole.full_size import full_size

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.plan.plan import Answer, Plan
    from siting.study.tables import Study

Row = TypeVar("Row")

SAME = 1e-6
"""Relative: two proofs of one optimum."""

CLOSE = replace(EXACT, gap=5e-3)
"""Enough where only bounds are compared."""


@pytest.fixture(scope="module")
def study() -> Study:
    """Return the study that everything is compared with."""
    return full_size(8)


@pytest.fixture(scope="module")
def plan(study: Study) -> Plan:
    """Return its proved plan."""
    return proved(study)


def decided(plan: Plan) -> dict[str, object]:
    """Return every verdict and size of a plan by name."""
    sites = {line.site: (line.verdict, line.size) for line in plan.sites}
    return {**sites, **{line.supplier: line.verdict for line in plan.suppliers}}


def cost_and_bound(answer: Answer) -> tuple[float, float]:
    """Return cost and bound of an answer that is within the gap asked."""
    assert answer.proof.outcome in {Outcome.PROVED, Outcome.WITHIN_GAP}
    assert answer.proof.cost is not None
    assert answer.proof.bound is not None
    return answer.proof.cost, answer.proof.bound


def assert_never_dearer(plan: Plan, richer: Study) -> None:
    """Assert that a study with more to choose from is not dearer, as far as cost and bound can tell."""
    cost, bound = cost_and_bound(audited(richer, CLOSE))
    assert bound <= plan.cost * (1 + SAME)
    assert cost <= plan.cost * (1 + CLOSE.gap + SAME)


def assert_never_cheaper(plan: Plan, poorer: Study) -> None:
    """Assert that a study with less to choose from is not cheaper, as far as cost and bound can tell."""
    assert plan.proof.bound is not None
    cost, _ = cost_and_bound(audited(poorer, CLOSE))
    assert cost >= plan.proof.bound * (1 - SAME)


def shuffled(rows: Sequence[Row], order: random.Random) -> tuple[Row, ...]:
    """Return the rows in another order."""
    return tuple(order.sample(list(rows), len(rows)))


def test_the_order_of_rows_does_not_matter(study: Study, plan: Plan) -> None:
    """With the rows of every table in another order, cost and verdicts stay."""
    order = random.Random(3)  # noqa: S311 - no secret depends on it
    other = proved(
        replace(
            study,
            sites=shuffled(study.sites, order),
            customers=shuffled(study.customers, order),
            suppliers=shuffled(study.suppliers, order),
            sizes=shuffled(study.sizes, order),
            goods=shuffled(study.goods, order),
            demands=shuffled(study.demands, order),
            offers=shuffled(study.offers, order),
            rules=shuffled(study.rules, order),
            lanes=lane_table(shuffled(lane_rows(study.lanes), order)),
        )
    )
    assert other.cost == pytest.approx(plan.cost, rel=SAME)
    assert decided(other) == decided(plan)


@pytest.mark.parametrize("factor", [1000.0, 0.001])
def test_another_unit_of_money_scales_the_cost(study: Study, plan: Plan, factor: float) -> None:
    """With every amount of money times 1000 (or over 1000) the cost is too, and the verdicts stay."""
    other = proved(in_money(study, factor))
    assert other.cost == pytest.approx(factor * plan.cost, rel=SAME)
    assert decided(other) == decided(plan)


MONEY_COLUMNS = {
    "opening_charge",
    "yearly_charge",
    "closing_charge",
    "handling_rate",
    "residual_value",
    "signing_charge",
    "dropping_charge",
    "unit_price",
    "unit_cost",
    "outbound_rate",
    "inbound_rate",
    "drop_charge",
    "carbon_price_per_t",
}


def in_money(study: Study, factor: float) -> Study:
    """Return the study with every money column and setting times a factor."""

    def scaled(row: Row) -> Row:
        values = {name: getattr(row, name) for name in MONEY_COLUMNS if hasattr(row, name)}
        return replace(row, **{name: value * factor for name, value in values.items() if value is not None})  # type: ignore[type-var]  # every row is a dataclass

    return replace(
        study,
        settings=scaled(study.settings),
        sites=tuple(map(scaled, study.sites)),
        suppliers=tuple(map(scaled, study.suppliers)),
        sizes=tuple(map(scaled, study.sizes)),
        offers=tuple(map(scaled, study.offers)),
        lanes=lane_table(map(scaled, lane_rows(study.lanes))),
    )


def test_a_customer_in_two_halves_costs_the_same(study: Study, plan: Plan) -> None:
    """Two customers at one place with half the demand each are served at the cost of the one."""
    first, *others = study.customers
    halves = tuple(replace(first, customer=f"half {n}") for n in (1, 2))
    demands = [row for row in study.demands if row.customer != first.customer] + [
        DemandRow(customer=half.customer, good=row.good, demand=row.demand / 2)
        for half in halves
        for row in study.demands
        if row.customer == first.customer
    ]
    lanes = [row for row in lane_rows(study.lanes) if row.destination != first.customer] + [
        replace(row, destination=half.customer)
        for half in halves
        for row in lane_rows(study.lanes)
        if row.destination == first.customer
    ]
    other = proved(replace(study, customers=(*halves, *others), demands=tuple(demands), lanes=lane_table(lanes)))
    assert other.cost == pytest.approx(plan.cost, rel=SAME)
    assert decided(other) == decided(plan)


def test_a_customer_that_needs_nothing_changes_nothing(study: Study, plan: Plan) -> None:
    """A customer without demand, and a site that is pinned shut, leave cost and verdicts as they are."""
    more = replace(
        study,
        customers=(*study.customers, CustomerRow(customer="nobody", latitude=48.0, longitude=15.0)),
        sites=(*study.sites, SiteRow(site="never", latitude=48.0, longitude=15.0, ruling=SiteRuling.PINNED_SHUT)),
    )
    other = proved(more)
    assert other.cost == pytest.approx(plan.cost, rel=SAME)
    assert {name: value for name, value in decided(other).items() if name != "never"} == decided(plan)


def test_another_site_is_never_dearer(study: Study, plan: Plan) -> None:
    """A proposed site more, cheap and in the middle, can only lower the cost; this one does."""
    cheap = SiteRow(site="more", latitude=49.0, longitude=14.5, yearly_charge=20_000.0, capacity=4000.0)
    richer = replace(study, sites=(*study.sites, cheap))
    assert_never_dearer(plan, richer)
    assert audited(richer, CLOSE).proof.cost < plan.cost  # type: ignore[operator]  # there is a plan


def test_another_lane_is_never_dearer(study: Study, plan: Plan) -> None:
    """A lane straight from a signed supplier to a customer, or a bar taken away, can only lower the cost."""
    lanes = [row for row in lane_rows(study.lanes) if not row.barred]
    used = min(signed_suppliers(plan))
    direct = LaneRow(leg=Leg.DIRECT, origin=used, destination="C5", unit_cost=0.0, road_km=1.0)
    assert_never_dearer(plan, replace(study, lanes=lane_table([*lanes, direct])))


def test_more_capacity_is_never_dearer(study: Study, plan: Plan) -> None:
    """With half as much capacity again at every site and supplier, the cost can only fall."""
    richer = replace(
        study,
        sites=tuple(replace(row, capacity=1.5 * row.capacity) if row.capacity else row for row in study.sites),
        sizes=tuple(replace(row, capacity=1.5 * row.capacity) for row in study.sizes),
        suppliers=tuple(replace(row, capacity=1.5 * row.capacity) if row.capacity else row for row in study.suppliers),
    )
    assert_never_dearer(plan, richer)


@pytest.mark.parametrize("kind", [RuleKind.NOT_TOGETHER, RuleKind.AT_MOST, RuleKind.ONE_OF, RuleKind.AT_LEAST])
def test_another_rule_is_never_cheaper(study: Study, plan: Plan, kind: RuleKind) -> None:
    """A rule that the plan breaks can only raise the cost, and the new plan keeps it."""
    members = tuple(sorted(open_sites(plan)))[:3]
    if kind is RuleKind.AT_LEAST:
        members = tuple(row.site for row in study.sites if row.site not in open_sites(plan))[:3]
    number = {RuleKind.AT_MOST: 2, RuleKind.AT_LEAST: 1}.get(kind)
    poorer = replace(study, rules=(*study.rules, RuleRow(rule=kind, members=members, number=number)))
    assert_never_cheaper(plan, poorer)


def test_a_site_pinned_shut_is_never_cheaper(study: Study, plan: Plan) -> None:
    """Without one of its sites the plan can only be dearer."""
    shut = max(open_sites(plan))
    sites = tuple(replace(row, ruling=SiteRuling.PINNED_SHUT) if row.site == shut else row for row in study.sites)
    assert_never_cheaper(plan, replace(study, sites=sites))


def test_a_smaller_budget_is_never_cheaper(study: Study, plan: Plan) -> None:
    """With less one-off money than the plan spends, the cost can only rise and the budget holds."""
    assert plan.one_off > 0
    poorer = replace(study, settings=replace(study.settings, one_off_budget=0.9 * plan.one_off))
    answer = audited(poorer, CLOSE)
    cost, _ = cost_and_bound(answer)
    assert answer.plan is not None
    assert answer.plan.one_off <= 0.9 * plan.one_off + SAME
    assert plan.proof.bound is not None
    assert cost >= plan.proof.bound * (1 - SAME)


def test_a_wider_gap_keeps_its_promise(study: Study, plan: Plan) -> None:
    """A run that asks for 2 % brackets the proved cost between its bound and its cost."""
    cost, bound = cost_and_bound(audited(study, replace(EXACT, gap=0.02)))
    assert bound * (1 - SAME) <= plan.cost <= cost * (1 + SAME)
    assert cost - bound <= 0.02 * cost
