"""
The least cost of flows with verdicts held, by two witnesses that share nothing with the product.

`networkx.network_simplex` is exact on whole numbers of one good; CBC takes everything else.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import networkx as nx
import pulp

from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Mapping

    from tests.whole.enumeration import Enumeration, Lane, Verdicts, Way


def unlimited(capacity: float | None) -> float:
    """Return a capacity as a number: blank is without limit."""
    return math.inf if capacity is None else capacity


def flow_by_network_simplex(search: Enumeration, verdicts: Verdicts, ways: Mapping[Way, Lane]) -> float | None:
    """
    Return the least cost of whole-number flows.

    Everything leaves one source; a supplier and a site are two nodes with their capacity between them, and a least
    volume is moved out of the arc into the balance of its two nodes.
    """
    study = search.study
    graph = nx.DiGraph()
    good = study.all_goods[0].good

    def arc(tail: str, head: str, least: float, capacity: float, cost: float = 0.0) -> None:
        for node, amount in ((tail, least), (head, -least)):
            graph.add_node(node, demand=graph.nodes.get(node, {}).get("demand", 0) + int(amount))
        limit = {} if math.isinf(capacity) else {"capacity": int(capacity - least)}
        graph.add_edge(tail, head, weight=int(cost), **limit)

    ends = {f"buy {name}": limits for name, limits in _supply_limits(search, verdicts, good).items()}
    for site, option in verdicts.options.items():
        if option is not None:
            ends[f"out of {site}"] = (option.least_throughput, option.capacity)
    for node, (least, capacity) in ends.items():
        if least > capacity:
            return None
        before = node.replace("out of", "into") if study.suppliers and node.startswith("out of") else "source"
        arc(before, node, least, capacity)
    for (leg, origin, destination, _), lane in ways.items():
        tail = f"out of {origin}" if leg is Leg.OUTBOUND else f"buy {origin}"
        arc(tail, f"into {destination}" if leg is Leg.INBOUND else f"to {destination}", 0, math.inf, lane.cost)
    total = 0
    for (customer, _), amount in search.demand.items():
        node = f"to {customer}"
        graph.add_node(node, demand=graph.nodes.get(node, {}).get("demand", 0) + int(amount))
        total += int(amount)
    graph.add_node("source", demand=graph.nodes.get("source", {}).get("demand", 0) - total)
    try:
        return float(nx.network_simplex(graph)[0])
    except nx.NetworkXUnfeasible:
        return None


def _supply_limits(search: Enumeration, verdicts: Verdicts, good: str) -> dict[str, tuple[float, float]]:
    """Return the least and the most that each signed supplier sells of the only good."""
    limits = {}
    for row in search.study.suppliers:
        offer = search.offers.get((row.supplier, good))
        if row.supplier not in verdicts.signed:
            continue
        if offer is None:
            limits[row.supplier] = (row.least_yearly, 0.0)
        else:
            most = min(unlimited(row.capacity), unlimited(offer.capacity))
            limits[row.supplier] = (max(row.least_yearly, offer.least_yearly), most)
    return limits


def flow_by_cbc(search: Enumeration, verdicts: Verdicts, ways: Mapping[Way, Lane]) -> float | None:
    """Return the least cost of flows, solved by CBC."""
    problem = pulp.LpProblem("flows", pulp.LpMinimize)
    flow = {way: problem.add_variable(f"f{n}", 0) for n, way in enumerate(ways)}
    problem += pulp.lpSum(ways[way].cost * amount for way, amount in flow.items())
    for (customer, good), amount in search.demand.items():
        served = [flow[way] for way in ways if way[0] is not Leg.INBOUND and way[2:] == (customer, good)]
        problem += pulp.lpSum(served) == amount
    _limit_sites(problem, search, verdicts, flow)
    _limit_suppliers(problem, search, verdicts, flow)
    settings, weight = search.study.settings, search.weight
    if settings.service_share is not None and settings.service_km is not None:
        near = [
            weight[way[3]] * flow[way]
            for way, lane in ways.items()
            if way[0] is not Leg.INBOUND and lane.km is not None and lane.km <= settings.service_km
        ]
        everything = sum(weight[good] * amount for (_, good), amount in search.demand.items())
        problem += pulp.lpSum(near) >= settings.service_share * everything
    problem.solve(pulp.COIN_CMD(path=pulp.PULP_CBC_CMD.pulp_cbc_path, msg=False))
    if problem.status != pulp.LpStatusOptimal:
        return None
    return float(sum(ways[way].cost * (amount.value() or 0.0) for way, amount in flow.items()))


def _limit(problem: pulp.LpProblem, volume: object, least: float, most: float) -> None:
    if not math.isinf(most):
        problem += volume <= most  # type: ignore[operator]  # PuLP has no types
    if least > 0:
        problem += volume >= least  # type: ignore[operator]  # PuLP has no types


def _limit_sites(
    problem: pulp.LpProblem, search: Enumeration, verdicts: Verdicts, flow: Mapping[Way, pulp.LpVariable]
) -> None:
    """Hold each open site to its capacity, its least throughput and, where suppliers exist, its balance."""
    for site, option in verdicts.options.items():
        if option is None:
            continue
        out = [way for way in flow if way[0] is Leg.OUTBOUND and way[1] == site]
        through = pulp.lpSum(search.load[way[3]] * flow[way] for way in out)
        _limit(problem, through, option.least_throughput, option.capacity)
        for good in search.load if search.study.suppliers else ():
            inflow = [flow[way] for way in flow if way[0] is Leg.INBOUND and way[2:] == (site, good)]
            problem += pulp.lpSum(inflow) == pulp.lpSum(flow[way] for way in out if way[3] == good)


def _limit_suppliers(
    problem: pulp.LpProblem, search: Enumeration, verdicts: Verdicts, flow: Mapping[Way, pulp.LpVariable]
) -> None:
    """Hold each signed supplier to its load and each of its offers to its units."""
    for row in search.study.suppliers:
        if row.supplier not in verdicts.signed:
            continue
        sold = {good: [flow[way] for way in flow if way[1] == row.supplier and way[3] == good] for good in search.load}
        volume = pulp.lpSum(search.load[good] * pulp.lpSum(amounts) for good, amounts in sold.items())
        _limit(problem, volume, row.least_yearly, unlimited(row.capacity))
        for good, amounts in sold.items():
            offer = search.offers.get((row.supplier, good))
            if offer is not None:
                _limit(problem, pulp.lpSum(amounts), offer.least_yearly, unlimited(offer.capacity))
