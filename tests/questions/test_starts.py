"""What searches take from one another: plans to begin from, and what every plan worth looking for has."""

from __future__ import annotations

import math

import pytest

from siting.network.network import build_network
from siting.questions.resolver import Resolver
from siting.questions.restriction import Restriction, parts_of
from siting.questions.searching import Ask, resolve_one
from siting.questions.starts import STAND_INS, Hints, pinned_in, regret, stand_ins
from tests.published import instances
from tests.questions.asked import EXACT

CHEAP = frozenset({("A", ""), ("B", "small")})
DEAR = frozenset({("A", ""), ("C", "")})


def test_the_cheapest_plan_that_fits_is_begun_from() -> None:
    """A plan fits where it has nothing that is held out and all that is held in, at a size that is allowed."""
    hints = Hints(plans=((1.0, CHEAP), (2.0, DEAR)))
    assert hints.fitting(Restriction()) == CHEAP
    assert hints.fitting(Restriction(out=frozenset({"B"}))) == DEAR
    assert hints.fitting(Restriction(used=frozenset({"C"}))) == DEAR
    assert hints.fitting(Restriction(without=frozenset({("B", "small")}))) == DEAR
    assert hints.fitting(Restriction(out=frozenset({"A"}))) is None


def test_the_cost_of_a_plan_found_before_is_known() -> None:
    """Only for exactly its parts; of two searches that ended with them, what the cheaper one says."""
    hints = Hints(plans=((1.0, CHEAP), (2.0, DEAR), (3.0, CHEAP)))
    assert hints.cost_of(CHEAP) == pytest.approx(1.0)
    assert hints.cost_of(DEAR) == pytest.approx(2.0)
    assert hints.cost_of(frozenset({("A", "")})) is None


def test_what_costs_too_much_to_do_without_is_needed() -> None:
    """A bound at the ceiling or above makes a site needed, one below does not, nor does a name that is not there."""
    hints = Hints(without={"below": 9.999, "at": 10.0, "never": math.inf, "elsewhere": 50.0})
    assert hints.needed({"below", "at", "never"}, 10.0) == {"at": 10.0, "never": math.inf}


def test_more_may_be_pinned_in_a_network() -> None:
    """Sites are pinned open and suppliers signed on top of what is pinned already."""
    network = build_network(instances.distribution_centres())
    pinned = pinned_in(pinned_in(network, {"Denver"}), {"Toledo"})
    assert [name for name, pin in zip(network.sites, pinned.site_pinned_open, strict=True) if pin] == [
        "Toledo",
        "Denver",
    ]
    farms = pinned_in(build_network(instances.farms_as_suppliers()), {"farm 2"})
    assert farms.supplier_pinned_signed.tolist() == [name == "farm 2" for name in farms.suppliers]


def test_stand_ins_take_the_place_of_what_is_out() -> None:
    """Each has the rest of the plan and one other site or supplier, never what is held out."""
    for study, out in ((instances.distribution_centres(), "Kansas City"), (instances.farms_as_suppliers(), "farm 6")):
        resolver = Resolver(study, settings=EXACT)
        plan = resolver.plan().plan
        assert plan is not None
        tried = list(stand_ins(study, resolver.bench().network, plan, frozenset({out})))
        rest = {part for part in parts_of(plan) if part[0] != out}
        assert 0 < len(tried) <= STAND_INS
        assert all(len(parts) == len(rest) + 1 and rest < parts and (out, "") not in parts for parts in tried)


def test_regret_is_what_the_next_site_costs_more_less_the_charge() -> None:
    """From St. Louis its customers are served dearer or cheaper, and the charge of Kansas City, 500, is saved."""
    study = instances.distribution_centres()
    plan = Resolver(study, settings=EXACT).plan().plan
    assert plan is not None
    network = build_network(study)
    by_lane = {(flow.origin, flow.destination): flow.amount for flow in plan.flows}
    more = {"Boston": 8 - 10, "Atlanta": 4 - 4, "Houston": 3 - 2}
    expected = sum(amount * more[to] for (origin, to), amount in by_lane.items() if origin == "Kansas City") - 500.0
    assert regret(network, plan, "Kansas City") == pytest.approx(expected)


def test_hints_change_no_answer() -> None:
    """Searched with what others proved, or alone, the best plan without a farm costs the same, with a valid bound."""
    study = instances.farms_as_suppliers()
    resolver = Resolver(study, settings=EXACT)
    plan = resolver.plan().plan
    assert plan is not None
    bench = resolver.bench()
    asks = {name: Ask(restriction=Restriction(out=frozenset({name})), gap=1e-6) for name, _ in parts_of(plan)}
    alone = {name: resolve_one(bench, ask, resolver.stop) for name, ask in asks.items()}
    bounds = {name: found.bound if found.bound is not None else math.inf for name, found in alone.items()}
    for name, ask in asks.items():
        others = Hints(without={other: bound for other, bound in bounds.items() if other != name})
        found = resolve_one(bench, ask, resolver.stop, others)
        assert found.cost == pytest.approx(alone[name].cost)
        assert found.bound is not None
        assert found.cost is not None
        assert found.bound <= found.cost
        assert found.within
