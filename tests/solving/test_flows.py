"""Flows with decisions held: exact, clean, with the marginal cost of each customer."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest

from siting.network.decisions import Decisions
from siting.network.network import build_network
from siting.solving.flows import flows_for, price
from tests.published.large_instances import recipe

if TYPE_CHECKING:
    from siting.network.network import Network
    from tests.solving.conftest import NetworkMaker


def held(network: Network, options: list[int], suppliers: list[int] | None = None, **source: int) -> Decisions:
    """Return decisions: what is open, what is signed, and the origin of customer c<number>."""
    option_open = np.zeros(network.option_site.size, dtype=np.bool_)
    option_open[options] = True
    signed = np.zeros(len(network.suppliers), dtype=np.bool_)
    signed[suppliers or []] = True
    origins = np.full(len(network.customers), -1, dtype=np.int32)
    for customer, origin in source.items():
        origins[int(customer[1:])] = origin
    return Decisions(option_open=option_open, supplier_signed=signed, source=origins)


def test_one_site_serves_all(two_sites: Network) -> None:
    """With site 1 alone everything moves from it and the marginal costs are its lane costs."""
    amounts = flows_for(two_sites, held(two_sites, [1]))
    assert amounts is not None
    assert amounts.outbound.tolist() == [0, 0, 0, 10, 20, 30]
    assert amounts.marginal_cost.ravel() == pytest.approx([8, 3, 1])
    assert price(two_sites, held(two_sites, [1]), amounts) == pytest.approx(290)


def test_marginal_cost_at_a_full_site(two_sites: Network) -> None:
    """Site 1 holds 29: the last unit of customer 2, and so one more, comes from site 0 at 9."""
    network = replace(two_sites, option_capacity=np.array([np.inf, 29.0]))
    amounts = flows_for(network, held(network, [0, 1]))
    assert amounts is not None
    assert amounts.outbound == pytest.approx([10, 20, 1, 0, 0, 29])
    assert amounts.marginal_cost.ravel() == pytest.approx([1, 2, 9])


@pytest.mark.parametrize(("capacity", "served"), [(59.0, False), (60.0, True), (61.0, True)])
def test_what_cannot_be_served_is_none(two_sites: Network, capacity: float, served: bool) -> None:  # noqa: FBT001 - a row
    """One unit short of capacity there are no flows at all."""
    network = replace(two_sites, option_capacity=np.array([np.inf, capacity]))
    assert (flows_for(network, held(network, [1])) is not None) is served


def test_nothing_open_is_none(two_sites: Network) -> None:
    """Without any open site no demand is met."""
    assert flows_for(two_sites, held(two_sites, [])) is None


@pytest.mark.parametrize(("least", "served"), [(60.0, True), (61.0, False)])
def test_least_throughput_is_kept(two_sites: Network, least: float, served: bool) -> None:  # noqa: FBT001 - a row
    """A site open above what it can move makes the decisions useless."""
    network = replace(two_sites, option_least=np.array([0.0, least]))
    assert (flows_for(network, held(network, [1])) is not None) is served


def test_least_throughput_moves_volume(two_sites: Network) -> None:
    """Held to at least 40, site 1 takes customer 1's cheapest 10 from site 0: 300 + 10 x (3 - 2)."""
    network = replace(two_sites, option_least=np.array([0.0, 40.0]))
    amounts = flows_for(network, held(network, [0, 1]))
    assert amounts is not None
    assert price(network, held(network, [0, 1]), amounts) == pytest.approx(310)


def test_service_share_moves_volume(two_sites: Network) -> None:
    """Only site 1 is near: to deliver 45 of 60 from it, 15 of customer 1 come from it at 1 more."""
    lanes = replace(two_sites.outbound, km=np.array([200.0, 200.0, 200.0, 50.0, 50.0, 50.0]))
    network = replace(two_sites, outbound=lanes, service_km=100.0, service_share=0.75)
    amounts = flows_for(network, held(network, [0, 1]))
    assert amounts is not None
    assert amounts.outbound == pytest.approx([10, 5, 0, 0, 15, 30])


def two_echelons(make_network: NetworkMaker) -> Network:
    """Return two suppliers (1 and 2 a unit) and two sites; customers need 10 and 20."""
    return make_network(
        demand=[[10], [20]],
        charges=[0, 0],
        supplier_charges=[0, 0],
        inbound=[(0, 0, 1), (0, 1, 1.5), (1, 0, 2), (1, 1, 2)],
        outbound=[(0, 0, 1), (0, 1, 4), (1, 0, 4), (1, 1, 1)],
    )


def test_inbound_and_balance(make_network: NetworkMaker) -> None:
    """What enters a site leaves it, and marginal costs carry the price of the last supplier."""
    network = replace(two_echelons(make_network), supplier_capacity=np.array([25.0, np.inf]))
    amounts = flows_for(network, held(network, [0, 1], [0, 1]))
    assert amounts is not None
    assert amounts.inbound == pytest.approx([10, 15, 0, 5])
    assert amounts.outbound == pytest.approx([10, 0, 0, 20])
    assert amounts.marginal_cost.ravel() == pytest.approx([2.5, 3])


@pytest.mark.parametrize(("least", "supplied"), [(0.0, 0.0), (7.0, 7.0)])
def test_least_yearly_is_kept(make_network: NetworkMaker, least: float, supplied: float) -> None:
    """A signed supplier gets its least volume, in load and in units of a good."""
    network = two_echelons(make_network)
    for changed in (
        replace(network, supplier_least=np.array([0.0, least])),
        replace(network, offer_least=np.array([[0.0], [least]])),
    ):
        amounts = flows_for(changed, held(network, [0, 1], [0, 1]))
        assert amounts is not None
        assert amounts.inbound[2:].sum() == pytest.approx(supplied)


def test_unsigned_suppliers_and_closed_sites_move_nothing(make_network: NetworkMaker) -> None:
    """Not a crumb flows over the lanes of what is not in use."""
    network = two_echelons(make_network)
    amounts = flows_for(network, held(network, [1], [1]))
    assert amounts is not None
    assert amounts.inbound.tolist() == [0, 0, 0, 30]
    assert amounts.outbound.tolist() == [0, 0, 10, 20]


def test_single_sourced_customers_stay_at_their_source(make_network: NetworkMaker) -> None:
    """The source is kept although another is cheaper; such a customer has no marginal cost."""
    network = replace(two_echelons(make_network), single_source=np.array([True, False]))
    amounts = flows_for(network, held(network, [0, 1], [0], c0=1))
    assert amounts is not None
    assert amounts.outbound == pytest.approx([0, 0, 10, 20])
    assert amounts.inbound == pytest.approx([0, 30, 0, 0])
    assert np.isnan(amounts.marginal_cost[0, 0])
    assert amounts.marginal_cost[1, 0] == pytest.approx(2.5)


@pytest.mark.parametrize("source", [{}, {"c0": 0}], ids=["none", "closed"])
def test_a_single_sourced_customer_without_an_open_source_is_none(
    make_network: NetworkMaker, source: dict[str, int]
) -> None:
    """No source, or a closed one, serves nobody."""
    network = replace(two_echelons(make_network), single_source=np.array([True, False]))
    assert flows_for(network, held(network, [1], [0], **source)) is None


@pytest.mark.parametrize(("capacity", "served"), [(30.0, True), (29.0, False)])
def test_only_single_sourced_customers(two_sites: Network, capacity: float, served: bool) -> None:  # noqa: FBT001 - a row
    """With every flow fixed there is nothing left to solve, but capacities still count."""
    network = replace(two_sites, single_source=np.ones(3, dtype=np.bool_), option_capacity=np.array([np.inf, capacity]))
    amounts = flows_for(network, held(network, [0, 1], c0=0, c1=0, c2=1))
    assert (amounts is not None) is served
    assert amounts is None or amounts.outbound.tolist() == [10, 20, 0, 0, 0, 30]


def test_every_demand_is_met_to_the_last_digit() -> None:
    """On 50 x 200 with fractional data every customer gets what it needs, and nothing is a crumb of the solver."""
    network = build_network(recipe(50, 200, 5, 1))
    decisions = held(network, np.argsort(-network.option_capacity)[:15].tolist())
    amounts = flows_for(network, decisions)
    assert amounts is not None
    served = np.bincount(network.outbound.destination, weights=amounts.outbound, minlength=200)
    assert served == pytest.approx(network.demand[:, 0], rel=1e-14)
    moved = amounts.outbound[amounts.outbound > 0]
    assert moved.min() > 1e-9 * network.demand.min()
    load = np.bincount(network.outbound.origin, weights=amounts.outbound, minlength=50)
    assert np.all(load <= network.option_capacity * (1 + 1e-9))
    assert np.all(load[~decisions.option_open] == 0)


def test_closing_and_dropping_are_priced(make_network: NetworkMaker) -> None:
    """What is not open or signed costs its closing or dropping charge."""
    network = replace(
        two_echelons(make_network),
        site_closing=np.array([7.0, 0.0]),
        supplier_dropping=np.array([3.0, 0.0]),
    )
    decisions = held(network, [1], [1])
    amounts = flows_for(network, decisions)
    assert amounts is not None
    assert price(network, decisions, amounts) == pytest.approx(7 + 3 + 30 * 2 + 10 * 4 + 20)
