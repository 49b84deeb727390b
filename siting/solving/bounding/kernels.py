"""
Inner loops of the Lagrangean relaxation, compiled.

Sets: rows r (a customer and a good), sites i, options o (ways a site may be open). All amounts are load. The demand
rows are relaxed with multipliers v_r (money per load); the margin of a lane is v_r less its cost. Lanes lie by row,
cheapest first, so that only lanes with a positive margin are touched: the walk along a row ends at the first other one.

Each site is then a continuous knapsack (`_fill_option`) whose profit K_o(v) makes opening option o cost
L_o = charge_o - K_o; the options compete in a small covering problem (`price_cover`):

    min sum_o L_o y_o,  sum_o capacity_o y_o >= demand,  least count <= sum_o y_o <= greatest count,  one option a site

The bound is sum_r v_r demand_r plus that minimum.

References
----------
Geoffrion (1974), Mathematical Programming Study 2: 82-114; Cornuejols, Sridharan & Thizy (1991), European Journal of
Operational Research 50(3): 280-297; Barahona & Anbil (2000), Mathematical Programming 87(3): 385-399.
"""

# mypy: allow-untyped-defs
# ruff: noqa: ANN001, ANN201, ANN202, PLR0913, PLR0917, PLR0912 - compiled loops: the compiler
# finds the types, and takes arrays and work space one by one.
from __future__ import annotations

import numpy as np

from siting.solving.bounding.compiled import compiled
from siting.solving.bounding.knapsack import FREE, OPEN, SHUT, copy, fill, wipe
from siting.solving.bounding.master import price_cover, whole_cover

BEST, FACTOR, MU, STEPS, IDLE = 0, 1, 2, 3, 4
"""Places in `numbers`: best bound, step factor, cover multiplier, steps made, steps since the bound last rose."""
DEFLECTION = 0.7
"""Share of the last direction that the next one keeps."""
AVERAGING = 0.1
"""Weight of the newest solution in the averaged one."""
ROUNDING = 1e-14
"""Share of the sum of all multipliers times demand by which rounding may at most falsify a bound: taken off it."""
SERVED = 1e-18
"""Squared share of demand not served, or served twice, at which the relaxed solution is a plan: nothing to gain."""
LEAST_FACTOR = 1e-4
"""Step factor at which steps have become too short to help."""


@compiled
def gather_margins(v, row_start, lane_site, lane_cost, demand, state, site_start, held, margin, load, row):
    """Put the lanes with a positive margin into their site's part of `margin`, `load` and `row`; it ends at `held`."""
    copy(held, site_start)
    for r in range(v.shape[0]):
        worth, amount = v[r], demand[r]
        for lane in range(row_start[r], row_start[r + 1]):
            # Unsigned positions spare the check for positions counted from the end.
            at = np.uint64(lane)
            gain = worth - lane_cost[at]
            if gain <= 0.0:
                break
            site = np.uint64(lane_site[at])
            if state[site] == SHUT:
                continue
            k = np.uint64(held[site])
            margin[k] = gain
            load[k] = amount
            row[k] = r
            held[site] += 1


@compiled
def price_options(charge, capacity, site_option, state, site_start, held, margin, load, row, cost, taken, rest, edge):
    """
    Set `cost` (options,) to charge less knapsack profit; options of a site lie by falling capacity.

    `taken` and `rest` say what each option's knapsack holds: the lanes from the site's start up to `taken` whole, and
    the load `rest` of the lane at `taken`. `edge` keeps the margin at which each was full.
    """
    for site in range(state.shape[0]):
        if state[site] == SHUT:
            continue
        begin, end = site_start[site], held[site]
        total, profit, full = 0.0, 0.0, False
        for k in range(begin, end):
            total += load[k]
            profit += margin[k] * load[k]
        for option in range(site_option[site], site_option[site + 1]):
            part = 0.0
            if total > capacity[option]:
                end, part = fill(margin, load, row, begin, end, capacity[option], edge[option])
                total, profit = 0.0, 0.0
                for k in range(begin, end):
                    total += load[k]
                    profit += margin[k] * load[k]
                full = True
            elif full:
                # A smaller size that takes the same lanes whole, and less of the next one.
                part = capacity[option] - total
            extra = 0.0
            if part > 0.0:
                edge[option] = margin[end]
                extra = part * margin[end]
            cost[option] = charge[option] - profit - extra
            taken[option] = end
            rest[option] = part


@compiled
def cover_rows(weight, pick, site_start, taken, rest, load, row, covered, used):
    """Add `weight` times what the picked options serve to `covered` (rows,) and times 1 to `used` (options,)."""
    for site in range(pick.shape[0]):
        option = pick[site]
        if option < 0:
            continue
        used[option] += weight
        end = taken[option]
        for k in range(site_start[site], end):
            covered[row[k]] += weight * load[k]
        if rest[option] > 0.0:
            covered[row[end]] += weight * rest[option]


@compiled
def sift(reduced, rate, state, slack):
    """
    Fix sites whose other choice would lift the bound by more than `slack`; return how many were fixed.

    Valid for any multipliers: leaving a picked site out adds -(reduced - rate), taking another in adds reduced - rate.
    """
    fixed = 0
    for site in range(state.shape[0]):
        if state[site] == FREE:
            price = reduced[site] - rate
            if price > slack:
                state[site] = SHUT
                fixed += 1
            elif -price > slack:
                state[site] = OPEN
                fixed += 1
    return fixed


@compiled
def _follow(numbers, v, way, covered, demand, target, value):
    """Make the subgradient step: `way` is the deflected direction; return False when there is nowhere to go."""
    norm, asked = 0.0, 0.0
    for r in range(v.shape[0]):
        asked += demand[r]
        way[r] = demand[r] - covered[r] + DEFLECTION * way[r]
        norm += way[r] * way[r] / demand[r]
    if norm <= SERVED * asked or numbers[FACTOR] < LEAST_FACTOR:
        return False
    size = numbers[FACTOR] * (target - value) / norm
    for r in range(v.shape[0]):
        v[r] += size * way[r] / demand[r]
    return True


@compiled
def ascend(problem, space, state, charge, fewest, most, numbers, steps, target, cutoff, patience, fix, whole):
    """
    Raise the bound by at most `steps` deflected subgradient steps; return True when there is no more to gain.

    `space` holds the multipliers and `numbers` the rest of the state, so that the steps may be made in portions. Rows
    are weighted by one over their demand, so that steps do not depend on the unit of amount. Sites are fixed in `state`
    on the way when `fix`; steps end when the bound reaches `cutoff`. `charge` is infinite for options not allowed;
    `whole` is how many items the 0-1 covering problem may try in each step (0: its continuous relaxation).
    """
    row_start, lane_site, lane_cost, site_option, _, capacity, demand = problem
    site_start, held, margin, load, row, cost, taken, rest, edge, reduced, pick, pick_more, pick_whole = space[:13]
    covered, opened, way, v, best_v, used = space[13:]
    asked = 0.0
    for r in range(demand.shape[0]):
        asked += demand[r]
    need = asked * (1.0 - 1e-12)
    for _ in range(steps):
        gather_margins(v, row_start, lane_site, lane_cost, demand, state, site_start, held, margin, load, row)
        price_options(
            charge, capacity, site_option, state, site_start, held, margin, load, row, cost, taken, rest, edge
        )
        bound, numbers[MU], rate, share = price_cover(
            cost, capacity, site_option, state, need, fewest, most, numbers[MU], reduced, pick, pick_more
        )
        worth, size = 0.0, 0.0
        for r in range(v.shape[0]):
            worth += v[r] * demand[r]
            size += abs(v[r]) * demand[r]
        worth -= ROUNDING * size
        bound += worth
        numbers[STEPS] += 1.0
        if fix and bound > numbers[BEST] - 0.5 * (cutoff - numbers[BEST]):
            sift(reduced, rate, state, cutoff - bound)
        if whole > 0 and share < 1.0 and bound < cutoff:
            count = fewest if rate > 0.0 else most
            slack = 0.01 * (cutoff - bound)
            exact, found = whole_cover(cost, capacity, state, need, rate, count, slack, whole, pick_whole)
            if exact + worth > bound and found - exact <= 0.1 * (cutoff - bound):
                copy(pick, pick_whole)
                share = 1.0
            bound = max(bound, exact + worth)
        if bound > numbers[BEST]:
            if bound > numbers[BEST] + 1e-6 * abs(bound):
                numbers[IDLE] = 0.0
            numbers[BEST] = bound
            copy(best_v, v)
            if bound >= cutoff:
                return True
        else:
            numbers[IDLE] += 1.0
        wipe(covered, 0.0)
        wipe(opened, 0.0)
        cover_rows(share, pick, site_start, taken, rest, load, row, covered, opened)
        if share < 1.0:
            cover_rows(1.0 - share, pick_more, site_start, taken, rest, load, row, covered, opened)
        weight = 1.0 if numbers[STEPS] == 1.0 else AVERAGING
        for option in range(used.shape[0]):
            used[option] += weight * (opened[option] - used[option])
        if numbers[IDLE] >= patience:
            numbers[FACTOR] *= 0.5
            numbers[IDLE] = 0.0
            copy(v, best_v)
            bound = numbers[BEST]
        if not _follow(numbers, v, way, covered, demand, target, bound):
            return True
    return False
