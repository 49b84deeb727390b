"""The audit objects when a formula of the network is wrong, one at a time: it shares none of them."""

from __future__ import annotations

import re
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
import pytest

from siting.network import annualise, lanes, legs
from siting.plan.audit import audit
from tests.plan import hand

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.network.freight import LegLanes
    from siting.study.tables import Leg


def faults() -> str:
    """Return what the audit says about a plan drawn up with the network as it is now."""
    return "\n".join(audit(hand.STUDY, hand.plan_of()).faults)


def wrap(monkeypatch: pytest.MonkeyPatch, module: object, name: str, change: Callable[[Any], Any]) -> None:
    """Let a function of the network return a changed result."""
    right = getattr(module, name)
    monkeypatch.setattr(module, name, lambda *given, **named: change(right(*given, **named)))


def test_the_right_formulas_pass() -> None:
    """Without corruption there is no fault, so each fault below is the corruption's."""
    assert faults() == ""


def corrupt_lanes(monkeypatch: pytest.MonkeyPatch, change: Callable[[LegLanes], LegLanes]) -> None:
    """Corrupt what one unit costs on every lane."""
    wrap(monkeypatch, legs, "price_lanes", change)


LANES: list[tuple[str, Callable[[LegLanes], LegLanes], str]] = [
    (
        "freight",
        lambda priced: replace(priced, freight=priced.freight * 1.01, cost=priced.cost + priced.freight * 0.01),
        r"cost line (inbound|outbound|direct) is stated as",
    ),
    (
        "delivery",
        lambda priced: replace(priced, delivery=priced.delivery * 1.01, cost=priced.cost + priced.delivery * 0.01),
        r"cost line delivery is stated as",
    ),
    (
        "carbon",
        lambda priced: replace(priced, kg_co2e=priced.kg_co2e * 1.01, cost=priced.cost + priced.kg_co2e * 0.0008),
        r"cost line carbon is stated as",
    ),
    (
        "cost that leaves a part out",
        lambda priced: replace(priced, cost=priced.cost - priced.delivery),
        r"is stated to cost",
    ),
    ("estimated or given", lambda priced: replace(priced, km_given=~priced.km_given), r"the plan says otherwise"),
]


@pytest.mark.parametrize(("change", "message"), [pytest.param(*case[1:], id=case[0]) for case in LANES])
def test_a_corrupted_lane_formula_is_caught(
    monkeypatch: pytest.MonkeyPatch, change: Callable[[LegLanes], LegLanes], message: str
) -> None:
    """Freight, delivery, carbon, their sum and the origin of a distance, each off in the network alone."""
    corrupt_lanes(monkeypatch, change)
    assert re.search(message, faults())


def test_a_corrupted_distance_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """A geodesic 1 % too long in the network's lanes (the audit calls its own)."""
    wrap(monkeypatch, lanes, "geodesic_km", lambda km: km * 1.01)
    assert re.search(r"is stated to be [\d.]+ km long, the tables give", faults())


def test_a_corrupted_circuity_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """The network multiplies by 1.31 in place of the study's 1.3."""
    wrap(monkeypatch, legs, "factors_between", lambda factors: factors * 1.31 / 1.3)
    assert re.search(r"is stated to be [\d.]+ km long, the tables give", faults())


def test_a_corrupted_annuity_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """One-off money spread without interest: 1/n in place of the capital recovery factor."""
    wrap(monkeypatch, annualise, "capital_recovery", lambda _: 0.1)
    found = faults()
    for line in ("opening", "closing", "signing", "dropping"):
        assert re.search(rf"cost line {line} is stated as", found)


def test_a_corrupted_residual_value_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """A residual value counted as if it were got back at once."""
    wrap(monkeypatch, annualise, "present_worth", lambda _: 1.0)
    found = faults()
    assert re.search(r"cost line opening is stated as", found)
    assert not re.search(r"cost line closing is stated as", found)


def corrupt_added(monkeypatch: pytest.MonkeyPatch, leg: str) -> None:
    """Corrupt what is added to the freight of one leg: handling or price."""
    right: Any = getattr(legs, "price_lanes")  # noqa: B009  # the name as that module holds it

    def wrong(of_leg: Leg, *given: Any) -> Any:  # noqa: ANN401  # passed on
        *first, added = given
        return right(of_leg, *first, added * 1.01 if of_leg == leg else added)

    monkeypatch.setattr(legs, "price_lanes", wrong)


def test_a_corrupted_handling_rate_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """Handling 1 % too dear in the network: the flows' own costs give it away."""
    corrupt_added(monkeypatch, "outbound")
    assert re.search(r"from Brno to Zlin is stated to cost", faults())


@pytest.mark.parametrize(("leg", "lane"), [("inbound", "Farm to Linz"), ("direct", "Orchard to Ostrava")])
def test_a_corrupted_price_is_caught(monkeypatch: pytest.MonkeyPatch, leg: str, lane: str) -> None:
    """Prices 1 % too high in the network: the flows' own costs give it away."""
    corrupt_added(monkeypatch, leg)
    assert re.search(rf"from {lane} is stated to cost", faults())


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("option_one_off", r"one-off money is stated as"),
        ("option_charge", r"charge is stated as"),
        ("option_capacity", r"capacity is stated as"),
        ("site_closing", r"cost line closing is stated as"),
        ("site_closing_one_off", r"site Graz: one-off money is stated as"),
        ("supplier_charge", r"cost line signing is stated as"),
        ("supplier_one_off", r"supplier Orchard: one-off money is stated as"),
        ("supplier_dropping", r"cost line dropping is stated as"),
        ("supplier_dropping_one_off", r"supplier Nursery: one-off money is stated as"),
        ("offer_capacity", r"supplier Farm: capacity is stated as"),
        ("load", r"(throughput|volume) is stated as"),
    ],
)
def test_a_corrupted_array_is_caught(monkeypatch: pytest.MonkeyPatch, name: str, message: str) -> None:
    """Each array of charges, capacities and loads 1 % too high in the network alone."""
    wrap(monkeypatch, hand, "build_network", lambda built: replace(built, **{name: getattr(built, name) * 1.01}))
    assert re.search(message, faults())


def test_a_corrupted_weight_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """Weights sway the service share: all trees as light as pots."""
    wrap(monkeypatch, hand, "build_network", lambda built: replace(built, weight_t=np.full(2, 0.5)))
    assert re.search(r"the share delivered within service_km is stated as", faults())


def test_swapped_standings_are_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    """A network that takes running for proposed gives verdicts that do not go with the tables."""
    wrap(monkeypatch, hand, "build_network", lambda built: replace(built, site_running=~built.site_running))
    assert re.search(r"site Graz is running, which does not go with verdict leave", faults())
