"""Every row of the model but the links: demand, balance, capacities, least volumes, service, counts, budget, rules."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from siting.solving.columns import NONE
from siting.solving.rows import AT_LEAST, AT_MOST, EXACTLY, Family, grouped
from siting.solving.tightest import is_near
from siting.study.tables import RuleKind

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats, Positions
    from siting.network.network import Network, NetworkRule
    from siting.solving.columns import Columns
    from siting.solving.rows import Rows
    from siting.solving.tightest import Tightest

Terms = list[tuple[int, float]]


def add_limits(rows: Rows, network: Network, columns: Columns, most: Tightest) -> None:
    """
    Add every row that is not a link.

    Parameters
    ----------
    rows
        Where the rows are added.
    network, columns, most
        The network, its variables and its smallest constants.
    """
    _demand(rows, network, columns)
    if network.two_echelons:
        _balance(rows, network, columns)
    _sites(rows, network, columns, most)
    _suppliers(rows, network, columns, most)
    _service(rows, network, columns)
    _counts(rows, network, columns)
    _budget(rows, network, columns)
    for place, rule in enumerate(network.rules):
        _rule(rows, place, [_member(network, columns, member) for member in rule.members], rule)


def paired(columns: NDArray[np.integer], coefficients: Floats) -> Terms:
    """Return (column, coefficient) for two arrays of one length."""
    return list(zip(columns.tolist(), coefficients.tolist(), strict=True))


def _demand(rows: Rows, network: Network, columns: Columns) -> None:
    """
    Ask that the shares of every demand add up to 1.

    The goods of a single-sourced customer share one binary a pair, so one row, that of its first good, says it all.
    """
    goods = len(network.goods)
    size = network.demand.size
    lanes = np.concatenate([network.outbound.destination, network.direct.destination]).astype(np.int64) * goods
    lanes += np.concatenate([network.outbound.good, network.direct.good])
    column = np.concatenate([columns.outbound, columns.direct])
    at = grouped(lanes, size)
    for customer in np.flatnonzero((network.demand > 0).any(axis=1)).tolist():
        needed = np.flatnonzero(network.demand[customer] > 0).tolist()
        for good in needed[:1] if network.single_source[customer] else needed:
            place = customer * goods + good
            terms: Terms = [(share, 1.0) for share in column[at[place]].tolist()]
            if columns.unserved[customer, good] != NONE:
                terms.append((int(columns.unserved[customer, good]), 1.0))
            rows.add(Family.DEMAND, place, terms, EXACTLY, 1.0)


def _balance(rows: Rows, network: Network, columns: Columns) -> None:
    goods = len(network.goods)
    size = len(network.sites) * goods
    into = grouped(network.inbound.destination.astype(np.int64) * goods + network.inbound.good, size)
    out_of = grouped(network.outbound.origin.astype(np.int64) * goods + network.outbound.good, size)
    for place in range(size):
        if not into[place].size and not out_of[place].size:
            continue
        terms = paired(columns.inbound[into[place]], columns.inbound_units[into[place]])
        terms += paired(columns.outbound[out_of[place]], -columns.outbound_units[out_of[place]])
        rows.add(Family.BALANCE, place, terms, EXACTLY, 0.0)


def _sites(rows: Rows, network: Network, columns: Columns, most: Tightest) -> None:
    lanes = network.outbound
    load = columns.outbound_units * network.load[lanes.good]
    load = np.where(most.outbound_usable, load, 0.0)
    at = grouped(lanes.origin, len(network.sites))
    options_at = grouped(network.option_site, len(network.sites))
    for site in range(len(network.sites)):
        options = columns.option[options_at[site]]
        _sizes(rows, network, site, options)
        moved = paired(columns.outbound[at[site]], load[at[site]])
        ceiling = most.option_most[options_at[site]]
        rows.add(Family.SITE_CAPACITY, site, moved + paired(options, -ceiling), AT_MOST, 0.0)
        least = network.option_least[options_at[site]]
        if np.any(least > 0):
            rows.add(Family.SITE_LEAST, site, moved + paired(options, -least), AT_LEAST, 0.0)


def _sizes(rows: Rows, network: Network, site: int, options: Positions) -> None:
    """Allow one size a site; where it is pinned open, ask for one."""
    terms: Terms = [(option, 1.0) for option in options.tolist()]
    if len(terms) > 1:
        rows.add(Family.SIZE, site, terms, EXACTLY if network.site_pinned_open[site] else AT_MOST, 1.0)


def _suppliers(rows: Rows, network: Network, columns: Columns, most: Tightest) -> None:
    goods, suppliers = len(network.goods), len(network.suppliers)
    origin = np.concatenate([network.inbound.origin, network.direct.origin]).astype(np.int64)
    good = np.concatenate([network.inbound.good, network.direct.good])
    column = np.concatenate([columns.inbound, columns.direct])
    units = np.concatenate([columns.inbound_units, np.where(most.direct_usable, columns.direct_units, 0.0)])
    at_offer = grouped(origin * goods + good, suppliers * goods)
    at_supplier = grouped(origin, suppliers)
    load = units * network.load[good]
    for supplier in range(suppliers):
        signed = int(columns.supplier[supplier])
        for place in range(supplier * goods, (supplier + 1) * goods):
            moved = paired(column[at_offer[place]], units[at_offer[place]])
            ceiling, least = float(most.offer_most.flat[place]), float(network.offer_least.flat[place])
            if moved:
                rows.add(Family.OFFER_CAPACITY, place, [*moved, (signed, -ceiling)], AT_MOST, 0.0)
            if least > 0:
                rows.add(Family.OFFER_LEAST, place, [*moved, (signed, -least)], AT_LEAST, 0.0)
        moved = paired(column[at_supplier[supplier]], load[at_supplier[supplier]])
        capacity, least = float(network.supplier_capacity[supplier]), float(network.supplier_least[supplier])
        if capacity < float(most.offer_most[supplier] @ network.load):
            rows.add(Family.SUPPLIER_CAPACITY, supplier, [*moved, (signed, -capacity)], AT_MOST, 0.0)
        if least > 0:
            rows.add(Family.SUPPLIER_LEAST, supplier, [*moved, (signed, -least)], AT_LEAST, 0.0)


def _service(rows: Rows, network: Network, columns: Columns) -> None:
    if network.service_share <= 0:
        return
    terms: Terms = []
    for lanes, column, units in (
        (network.outbound, columns.outbound, columns.outbound_units),
        (network.direct, columns.direct, columns.direct_units),
    ):
        near = is_near(network, lanes)
        terms += paired(column[near], (units * network.weight_t[lanes.good])[near])
    asked = network.service_share * float((network.demand @ network.weight_t).sum())
    rows.add(Family.SERVICE, 0, terms, AT_LEAST, asked)


def _counts(rows: Rows, network: Network, columns: Columns) -> None:
    terms: Terms = [(option, 1.0) for option in columns.option.tolist()]
    if network.fewest_sites > 0:
        rows.add(Family.FEWEST, 0, terms, AT_LEAST, float(network.fewest_sites))
    if network.most_sites < len(network.sites):
        rows.add(Family.MOST, 0, terms, AT_MOST, float(network.most_sites))


def _budget(rows: Rows, network: Network, columns: Columns) -> None:
    if not math.isfinite(network.one_off_budget):
        return
    terms = paired(columns.option, network.option_one_off - network.site_closing_one_off[network.option_site])
    terms += paired(columns.supplier, network.supplier_one_off - network.supplier_dropping_one_off)
    spent = float(network.site_closing_one_off.sum() + network.supplier_dropping_one_off.sum())
    rows.add(Family.BUDGET, 0, terms, AT_MOST, network.one_off_budget - spent)


def _member(network: Network, columns: Columns, member: tuple[str, int]) -> Terms:
    """Return the terms that add up to 1 when the member holds: a site open at any size, a supplier signed."""
    kind, place = member
    if kind == "supplier":
        return [(int(columns.supplier[place]), 1.0)]
    return [(option, 1.0) for option in columns.option[network.option_site == place].tolist()]


def _rule(rows: Rows, place: int, members: list[Terms], rule: NetworkRule) -> None:
    everyone = [term for member in members for term in member]
    number = float(rule.number or 0)
    if rule.kind is RuleKind.ONE_OF:
        rows.add(Family.RULE, place, everyone, EXACTLY, 1.0)
    elif rule.kind is RuleKind.NOT_TOGETHER:
        rows.add(Family.RULE, place, everyone, AT_MOST, 1.0)
    elif rule.kind is RuleKind.AT_MOST:
        rows.add(Family.RULE, place, everyone, AT_MOST, number)
    elif rule.kind is RuleKind.AT_LEAST:
        rows.add(Family.RULE, place, everyone, AT_LEAST, number)
    else:
        sense = EXACTLY if rule.kind is RuleKind.TOGETHER else AT_MOST
        for other, member in enumerate(members[1:], start=1):
            difference = members[0] + [(column, -value) for column, value in member]
            rows.add(Family.RULE, place, difference, sense, 0.0, suffix=f"_{other}")
