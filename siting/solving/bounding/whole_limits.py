"""Every row of the whole model but the links, as arrays: the same rows as `siting.solving.limits` states in PuLP."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.matrix import Gathering, Rows
from siting.solving.tightest import is_near
from siting.study.tables import RuleKind

if TYPE_CHECKING:
    from siting.arrays import Floats, Positions
    from siting.network.network import Network, NetworkRule
    from siting.solving.bounding.whole_problem import Places
    from siting.solving.tightest import Tightest

NO_ROW = -1
"""In an array of rows: this place has none."""


def gather_limits(network: Network, most: Tightest, places: Places) -> Rows:
    """
    Return every row that is not a link, scaled.

    Parameters
    ----------
    network, most, places
        The network, its smallest constants and where its columns stand.

    Returns
    -------
    rows
        Demand first, one for each customer and good that is needed (single-sourced: one a customer), then balance,
        sizes, capacities, least volumes, service, budget and rules; last the number of sites and of suppliers.
    """
    made = Gathering(places.count)
    _demand(made, network, places)
    if network.two_echelons:
        _balance(made, network, most, places)
    _sites(made, network, most, places)
    _suppliers(made, network, most, places)
    _service(made, network, most, places)
    _budget(made, network, places)
    for rule in network.rules:
        _rule(made, network, places, rule)
    _counts(made, network, places)
    return made.rows(scaled=True)


def demand_rows(network: Network) -> Positions:
    """Return (C, G) the demand row of each customer and good, `NO_ROW` where nothing is needed (or another says it)."""
    needed = network.demand > 0
    first = np.cumsum(needed, axis=1) == 1
    asked = needed & (first | ~network.single_source[:, None])
    row = np.full(needed.shape, NO_ROW, dtype=np.int32)
    row[asked] = np.arange(int(asked.sum()))
    return row


def _demand(made: Gathering, network: Network, places: Places) -> None:
    """Ask that the shares of every demand add up to 1."""
    row = demand_rows(network)
    at = np.concatenate(
        [
            row[network.outbound.destination, network.outbound.good],
            row[network.direct.destination, network.direct.good],
        ]
    )
    column = np.concatenate([places.outbound, places.direct])
    count = int((row != NO_ROW).sum())
    made.add(at[at != NO_ROW], column[at != NO_ROW], np.ones(int((at != NO_ROW).sum())), np.ones(count), np.ones(count))


def _balance(made: Gathering, network: Network, most: Tightest, places: Places) -> None:
    goods = len(network.goods)
    into, out = network.inbound, network.outbound
    nothing = np.zeros(len(network.sites) * goods)
    made.add(
        np.concatenate(
            [into.destination.astype(np.int64) * goods + into.good, out.origin.astype(np.int64) * goods + out.good]
        ),
        np.concatenate([places.inbound, places.outbound]),
        np.concatenate([most.inbound_most, -most.outbound_demand]),
        nothing,
        nothing,
    )


def _sites(made: Gathering, network: Network, most: Tightest, places: Places) -> None:
    lanes, sites = network.outbound, len(network.sites)
    load = np.where(most.outbound_usable, most.outbound_demand * network.load[lanes.good], 0.0)
    row = np.concatenate([lanes.origin, network.option_site])
    column = np.concatenate([places.outbound, places.option])
    nothing, endless = np.zeros(sites), np.full(sites, math.inf)
    made.add(
        network.option_site,
        places.option,
        np.ones(places.option.size),
        network.site_pinned_open.astype(np.float64),
        np.ones(sites),
    )
    made.add(row, column, np.concatenate([load, -most.option_most]), -endless, nothing)
    if np.any(network.option_least > 0):
        made.add(row, column, np.concatenate([load, -network.option_least]), nothing, endless)


def _suppliers(made: Gathering, network: Network, most: Tightest, places: Places) -> None:
    goods, suppliers = len(network.goods), len(network.suppliers)
    if not suppliers:
        return
    origin = np.concatenate([network.inbound.origin, network.direct.origin]).astype(np.int64)
    good = np.concatenate([network.inbound.good, network.direct.good])
    lane = np.concatenate([places.inbound, places.direct])
    units = np.concatenate([most.inbound_most, np.where(most.direct_usable, most.direct_demand, 0.0)])
    signed = np.repeat(places.supplier, goods)
    offer = np.concatenate([origin * goods + good, np.arange(suppliers * goods)])
    supplier = np.concatenate([origin, np.arange(suppliers)])
    load = units * network.load[good]
    by_offer, by_supplier = np.concatenate([lane, signed]), np.concatenate([lane, places.supplier])
    nothing, endless = np.zeros(suppliers * goods), np.full(suppliers * goods, math.inf)
    made.add(offer, by_offer, np.concatenate([units, -most.offer_most.ravel()]), -endless, nothing)
    if np.any(network.offer_least > 0):
        made.add(offer, by_offer, np.concatenate([units, -network.offer_least.ravel()]), nothing, endless)
    nothing, endless = nothing[:suppliers], endless[:suppliers]
    capacity = np.minimum(network.supplier_capacity, most.offer_most @ network.load)
    made.add(supplier, by_supplier, np.concatenate([load, -capacity]), -endless, nothing)
    if np.any(network.supplier_least > 0):
        made.add(supplier, by_supplier, np.concatenate([load, -network.supplier_least]), nothing, endless)


def _service(made: Gathering, network: Network, most: Tightest, places: Places) -> None:
    if network.service_share <= 0:
        return
    columns, weights = [], []
    for lanes, column, units in (
        (network.outbound, places.outbound, most.outbound_demand),
        (network.direct, places.direct, most.direct_demand),
    ):
        near = is_near(network, lanes)
        columns.append(column[near])
        weights.append((units * network.weight_t[lanes.good])[near])
    column = np.concatenate(columns)
    asked = network.service_share * float((network.demand @ network.weight_t).sum())
    made.add(np.zeros(column.size), column, np.concatenate(weights), np.array([asked]), np.array([math.inf]))


def _budget(made: Gathering, network: Network, places: Places) -> None:
    if math.isfinite(network.one_off_budget):
        site = network.option_one_off - network.site_closing_one_off[network.option_site]
        supplier = network.supplier_one_off - network.supplier_dropping_one_off
        spent = float(network.site_closing_one_off.sum() + network.supplier_dropping_one_off.sum())
        column = np.concatenate([places.option, places.supplier])
        left = np.array([network.one_off_budget - spent])
        made.add(0 * column, column, np.concatenate([site, supplier]), np.array([-math.inf]), left)


def _counts(made: Gathering, network: Network, places: Places) -> None:
    """Add the numbers of open sites and of signed suppliers, also where they are free: a search splits them."""
    fewest, most = np.array([float(network.fewest_sites)]), np.array([float(network.most_sites)])
    made.add(0 * places.option, places.option, np.ones(places.option.size), fewest, most)
    all_of_them = np.array([float(places.supplier.size)])
    made.add(0 * places.supplier, places.supplier, np.ones(places.supplier.size), np.zeros(1), all_of_them)


def _rule(made: Gathering, network: Network, places: Places, rule: NetworkRule) -> None:
    members = [_member(network, places, member) for member in rule.members]
    number = float(rule.number or 0)
    lower, upper = {
        RuleKind.ONE_OF: (1.0, 1.0),
        RuleKind.NOT_TOGETHER: (-math.inf, 1.0),
        RuleKind.AT_MOST: (-math.inf, number),
        RuleKind.AT_LEAST: (number, math.inf),
        RuleKind.TOGETHER: (0.0, 0.0),
        RuleKind.NEEDS: (-math.inf, 0.0),
    }[rule.kind]
    if rule.kind in {RuleKind.TOGETHER, RuleKind.NEEDS}:
        for member in members[1:]:
            _one(
                made,
                np.concatenate([members[0], member]),
                np.repeat([1.0, -1.0], [members[0].size, member.size]),
                lower,
                upper,
            )
    else:
        everyone = np.concatenate(members)
        _one(made, everyone, np.ones(everyone.size), lower, upper)


def _one(made: Gathering, column: Positions, value: Floats, lower: float, upper: float) -> None:
    made.add(0 * column, column, value, np.array([lower]), np.array([upper]))


def _member(network: Network, places: Places, member: tuple[str, int]) -> Positions:
    """Return the columns that add up to 1 when the member holds: a site open at any size, a supplier signed."""
    kind, place = member
    if kind == "supplier":
        return places.supplier[place : place + 1]
    sizes: Positions = places.option[network.option_site == place]
    return sizes
