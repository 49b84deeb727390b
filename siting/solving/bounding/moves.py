"""
Better plans from a set of open sites: drop, add and swap sites with exact flows, compiled.

A move is tried only if the prices of the flows do not rule it out. With prices pi of the open sites and u of the rows
(a dual solution of the flows), shutting site k saves at most

    charge_k - capacity_k pi_k - sum over rows served by k alone of demand x (second best price - u)

and opening site i saves at most K_i(u) - charge_i, K_i being its knapsack profit; a swap at most both, plus what the
rows of k would pay for i. Moves are tried in the order of that promise, so the search ends at a set that no single
move improves, or when its trials are used up.
"""

# mypy: allow-untyped-defs
# ruff: noqa: ANN001, ANN201, ANN202, PLR0913, PLR0917, PLR0912, PLR0915, C901 - compiled loops: the compiler
# finds the types, and takes arrays and work space one by one.
from __future__ import annotations

import numpy as np

from siting.solving.bounding.compiled import compiled
from siting.solving.bounding.knapsack import copy, fill, wipe
from siting.solving.bounding.simplex import (
    COST,
    DEPTH,
    FLOW,
    LEAF,
    PARENT,
    PRICE,
    flow_cost,
    improve,
    set_root_cost,
)

NO_END = 1 << 40
"""Pivots allowed where none are counted."""


@compiled
def price_moves(problem, flows, chosen, fixed, space, drop, add, worth, second):
    """
    Set `drop` and `add` (sites,) to what shutting or opening a site saves at most; -inf where it may not.

    `worth` and `second` (rows,) become each row's price and its second best one; `chosen` of a shut site becomes its
    most promising option, written as -1 - option.
    """
    row_start, lane_site, lane_cost, site_option, charge, capacity, demand = problem
    tree, value, limits, _, _, is_open, _ = flows
    site_start, held, margin, load, row, _, _, _, _ = space
    sites = is_open.shape[0]
    for site in range(sites):
        drop[site] = -np.inf
        add[site] = -np.inf
        if is_open[site] and fixed[site] == 0:
            drop[site] = charge[chosen[site]] - limits[site] * max(0.0, value[PRICE, site])
    for site in range(sites):
        held[site] = site_start[site]
    for r in range(demand.shape[0]):
        node = sites + 2 + r
        home = tree[PARENT, node]
        alone = tree[DEPTH, node] == LEAF
        price = value[PRICE, home] + value[COST, node] if alone else value[PRICE, node]
        worth[r], second[r] = price, price
        other = np.inf
        for lane in range(row_start[r], row_start[r + 1]):
            gain = price - lane_cost[lane]
            site = lane_site[lane]
            if is_open[site]:
                if alone and site != home:
                    other = min(other, lane_cost[lane] + max(0.0, value[PRICE, site]))
            elif gain > 0.0:
                k = held[site]
                margin[k], load[k], row[k] = gain, demand[r], r
                held[site] = k + 1
            if gain <= 0.0 and (not alone or lane_cost[lane] >= other):
                break
        if alone:
            second[r] = max(price, other)
            drop[home] -= demand[r] * (second[r] - price)
    for site in range(sites):
        if is_open[site] or fixed[site] != 0:
            continue
        first, end, full = site_start[site], held[site], False
        for option in range(site_option[site], site_option[site + 1]):
            total = 0.0
            for k in range(first, end):
                total += load[k]
            part = 0.0
            if total > capacity[option]:
                end, part = fill(margin, load, row, first, end, capacity[option], 0.0)
                full = True
            elif full:
                part = capacity[option] - total
            profit = part * margin[end] if part > 0.0 else 0.0
            for k in range(first, end):
                profit += margin[k] * load[k]
            if profit - charge[option] > add[site]:
                add[site] = profit - charge[option]
                chosen[site] = -1 - option


@compiled
def _longer(array, size):
    """Return the array with room for `size` elements."""
    longer = np.empty(size, array.dtype)
    copy(longer[: array.shape[0]], array)
    return longer


@compiled
def _keep(target, source):
    """Copy the tree or the values of the flows."""
    for line in range(target.shape[0]):
        copy(target[line], source[line])


@compiled
def list_moves(problem, flows, chosen, drop, add, worth, second, count, fewest, most, floor):
    """Return promise, site to shut (-1 = none) and site to open of every move that may save more than `floor`."""
    row_start, lane_site, lane_cost, _, _, capacity, demand = problem
    tree, _, limits, _, _, is_open, _ = flows
    sites = is_open.shape[0]
    total = 0.0
    for site in range(sites):
        if is_open[site]:
            total += limits[site]
    need = 0.0
    for r in range(demand.shape[0]):
        need += demand[r] * (1.0 - 1e-12)
    size = 1024
    promise, out, into = np.empty(size), np.empty(size, np.int32), np.empty(size, np.int32)
    found = 0
    start = np.zeros(sites + 1, np.int64)
    for r in range(demand.shape[0]):
        if second[r] > worth[r]:
            start[tree[PARENT, sites + 2 + r] + 1] += 1
    for site in range(sites):
        start[site + 1] += start[site]
    member = np.empty(start[sites], np.int32)
    fill_at = start.copy()
    for r in range(demand.shape[0]):
        if second[r] > worth[r]:
            home = tree[PARENT, sites + 2 + r]
            member[fill_at[home]] = r
            fill_at[home] += 1
    bonus = np.zeros(sites)
    for gone in range(-1, sites):
        if gone >= 0 and drop[gone] == -np.inf:
            continue
        base = drop[gone] if gone >= 0 else 0.0
        left = total - (limits[gone] if gone >= 0 else 0.0)
        wipe(bonus, 0.0)
        if gone >= 0:
            for k in range(start[gone], start[gone + 1]):
                r = member[k]
                for lane in range(row_start[r], row_start[r + 1]):
                    if lane_cost[lane] >= second[r]:
                        break
                    bonus[lane_site[lane]] += demand[r] * (second[r] - max(worth[r], lane_cost[lane]))
        for site in range(-1, sites):
            if site < 0:
                if gone < 0 or count <= fewest:
                    continue
                gain = base
                room = left
            else:
                if is_open[site] or add[site] == -np.inf or (gone < 0 and count >= most):
                    continue
                gain = base + add[site] + bonus[site]
                room = left + capacity[-1 - chosen[site]]
            if gain <= floor or room < need:
                continue
            if found == size:
                size *= 2
                promise, out, into = _longer(promise, size), _longer(out, size), _longer(into, size)
            promise[found], out[found], into[found] = gain, gone, site
            found += 1
    for k in range(found):
        promise[k] = -promise[k]
    order = np.argsort(promise[:found])
    first, second_out, second_into = np.empty(found), np.empty(found, np.int32), np.empty(found, np.int32)
    for k in range(found):
        first[k], second_out[k], second_into[k] = -promise[order[k]], out[order[k]], into[order[k]]
    return first, second_out, second_into


@compiled
def plan_cost(flows, chosen, charge):
    """Return charges plus flow costs of the open sites, or inf where they cannot serve everything."""
    tree, value, limits, at_top, _, is_open, _ = flows
    total, astray = flow_cost(tree, value, limits, at_top, is_open)
    carried = 0.0
    for node in range(is_open.shape[0] + 2, tree.shape[1]):
        carried += value[FLOW, node]
    if astray > 1e-9 * carried:
        return np.inf
    for site in range(is_open.shape[0]):
        if is_open[site]:
            total += charge[chosen[site]]
    return total


@compiled
def descend(problem, flows, saved, chosen, fixed, space, fewest, most, far, tolerance, numbers, trials):
    """
    Try at most `trials` moves, take each that saves; return True at a set that no single move improves.

    `numbers` = [cost of `flows`, moves of the present list tried so far].
    """
    row_start, lane_site, lane_cost, _, charge, capacity, _ = problem
    tree, value, limits, at_top, root_cost, is_open, turn = flows
    sites = is_open.shape[0]
    drop, add = np.empty(sites), np.empty(sites)
    rows = row_start.shape[0] - 1
    worth, second = np.empty(rows), np.empty(rows)
    floor = 1e-9 * abs(numbers[0])
    while True:
        count = 0
        for site in range(sites):
            count += is_open[site]
        price_moves(problem, flows, chosen, fixed, space, drop, add, worth, second)
        promise, out, into = list_moves(problem, flows, chosen, drop, add, worth, second, count, fewest, most, floor)
        moved = False
        for k in range(int(numbers[1]), promise.shape[0]):
            if trials <= 0:
                return False
            trials -= 1
            numbers[1] += 1.0
            _keep(saved[0], tree)
            _keep(saved[1], value)
            copy(saved[2], at_top)
            gone, site = out[k], into[k]
            if gone >= 0:
                is_open[gone] = False
                set_root_cost(tree, value, root_cost, gone, far)
            if site >= 0:
                chosen[site] = -1 - chosen[site]
                limits[site] = capacity[chosen[site]]
                is_open[site] = True
                set_root_cost(tree, value, root_cost, site, 0.0)
            improve(
                tree,
                value,
                limits,
                at_top,
                root_cost,
                is_open,
                row_start,
                lane_site,
                lane_cost,
                turn,
                NO_END,
                tolerance,
            )
            cost = plan_cost(flows, chosen, charge)
            if cost < numbers[0] - floor:
                numbers[0] = cost
                numbers[1] = 0.0
                moved = True
                break
            _keep(tree, saved[0])
            _keep(value, saved[1])
            copy(at_top, saved[2])
            if gone >= 0:
                is_open[gone] = True
                root_cost[gone] = 0.0
            if site >= 0:
                is_open[site] = False
                root_cost[site] = far
                chosen[site] = -1 - chosen[site]
        if not moved:
            return True
