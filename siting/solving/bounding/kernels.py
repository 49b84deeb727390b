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

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.compiled import compiled

if TYPE_CHECKING:
    from siting.arrays import Floats

FREE, OPEN, SHUT = 0, 1, -1
"""State of a site in a node of the search."""


@compiled
def gather_margins(v, row_start, lane_site, lane_cost, demand, state, site_start, held, margin, load, row):  # type: ignore[no-untyped-def]
    """Put the lanes with a positive margin into their site's part of `margin`, `load` and `row`; it ends at `held`."""
    for site in range(held.shape[0]):
        held[site] = site_start[site]
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
def _swap(margin, load, row, a, b):  # type: ignore[no-untyped-def]
    gain, amount, r = margin[a], load[a], row[a]
    margin[a], load[a], row[a] = margin[b], load[b], row[b]
    margin[b], load[b], row[b] = gain, amount, r


@compiled
def fill(margin, load, row, begin, end, room, guess):  # type: ignore[no-untyped-def]
    """
    Fill a continuous knapsack of size `room` with the lanes in `begin:end`, whose loads exceed it.

    Reorders the lanes so that `begin:k` are taken whole and k in part. A quickselect by weight, linear on average;
    the first pivots lie closely around `guess`, the margin at which the knapsack was full last time.

    Returns
    -------
    k, rest
        First lane not taken whole, and the load taken of it.
    """
    a, b = begin, end
    turn = 0
    while b > a:
        if turn < 2 and guess > 0.0:
            pivot = guess * (1.02 if turn == 0 else 0.98)
        else:
            x, y, z = margin[a], margin[(a + b) >> 1], margin[b - 1]
            pivot = max(min(x, y), min(max(x, y), z))
        turn += 1
        above, k, below = a, a, b
        heavy, equal = 0.0, 0.0
        while k < below:
            gain = margin[k]
            if gain > pivot:
                heavy += load[k]
                if above < k:
                    _swap(margin, load, row, k, above)
                above += 1
                k += 1
            elif gain < pivot:
                below -= 1
                _swap(margin, load, row, k, below)
            else:
                equal += load[k]
                k += 1
        if heavy > room:
            b = above
        elif heavy + equal > room:
            room -= heavy
            for j in range(above, below):
                if load[j] > room:
                    return j, room
                room -= load[j]
            return below, 0.0
        else:
            room -= heavy + equal
            a = below
    return a, 0.0


@compiled
def price_options(charge, capacity, site_option, state, site_start, held, margin, load, row, cost, taken, rest, edge):  # type: ignore[no-untyped-def]
    """
    Set `cost` (options,) to charge less knapsack profit; options of a site lie by falling capacity.

    `taken` and `rest` say what each option's knapsack holds: the lanes from the site's start up to `taken` whole, and
    the load `rest` of the lane at `taken`. `edge` keeps the margin at which each was full.
    """
    for site in range(state.shape[0]):
        if state[site] == SHUT:
            continue
        begin, end = site_start[site], held[site]
        total = 0.0
        profit = 0.0
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
                if part > 0.0:
                    edge[option] = margin[end]
                    profit += part * margin[end]
            cost[option] = charge[option] - profit
            taken[option] = end
            rest[option] = part
            if part > 0.0:
                profit -= part * margin[end]


@compiled
def pick_options(cost, capacity, site_option, state, fewest, most, mu, reduced, pick):  # type: ignore[no-untyped-def]
    """
    Pick the options that are cheapest when each unit of capacity earns `mu`.

    Returns
    -------
    value, total, rate
        Sum of cost - mu x capacity picked, capacity picked, and the price of the count row (0 where it is slack).
    """
    value, total = 0.0, 0.0
    held, below = 0, 0
    for site in range(state.shape[0]):
        pick[site] = -1
        if state[site] == SHUT:
            continue
        least = np.inf
        for option in range(site_option[site], site_option[site + 1]):
            price = cost[option] - mu * capacity[option]
            if price < least:
                least = price
                pick[site] = option
        reduced[site] = least
        if state[site] == OPEN:
            held += 1
        elif least < 0.0:
            below += 1
    free = reduced[state == FREE]
    wanted = min(min(max(held + below, fewest), most) - held, free.shape[0])
    rate, ties = 0.0, 0
    if wanted != below:
        if wanted > 0:
            rate = np.partition(free, wanted - 1)[wanted - 1]
            ties = wanted - np.sum(free < rate)
        else:
            rate = np.min(free)
    for site in range(state.shape[0]):
        if state[site] == FREE:
            price = reduced[site]
            if price == rate and ties > 0 and wanted != below:
                ties -= 1
            elif not price < rate:
                pick[site] = -1
        if pick[site] >= 0:
            value += reduced[site]
            total += capacity[pick[site]]
    return value, total, rate


@compiled
def _fill_cover(cost, capacity, site_option, state, need, fewest, most, reduced, pick, pick_more):  # type: ignore[no-untyped-def]
    """
    Solve the covering problem as a continuous knapsack where each site has one option and the counts do not bind.

    Returns
    -------
    solved, value, mu, share
        False where the counts bind (or a site has several options); else as `price_cover`.
    """
    sites = state.shape[0]
    if site_option[sites] != sites:
        return False, 0.0, 0.0, 1.0
    value, room, count, listed = 0.0, need, 0, 0
    ratio, order = np.empty(sites), np.empty(sites, np.int32)
    for site in range(sites):
        pick[site] = -1
        if state[site] == SHUT:
            continue
        if state[site] == OPEN or cost[site] < 0.0:
            pick[site] = site
            value += cost[site]
            room -= capacity[site]
            count += 1
        else:
            ratio[listed] = -cost[site] / capacity[site]
            order[listed] = site
            listed += 1
    mu, share, last = 0.0, 1.0, -1
    if room > 0.0:
        size = np.empty(listed)
        for k in range(listed):
            size[k] = capacity[order[k]]
        k, part = fill(ratio, size, order, 0, listed, room, 0.0)
        if k >= listed:
            return False, 0.0, 0.0, 1.0
        for j in range(k):
            site = order[j]
            pick[site] = site
            value += cost[site]
            count += 1
        last = order[k]
        share = 1.0 - part / capacity[last]
        mu = cost[last] / capacity[last]
        value += (1.0 - share) * cost[last]
    if count + 1.0 - share < fewest or count + 1.0 - share > most:
        return False, 0.0, 0.0, 1.0
    for site in range(sites):
        pick_more[site] = pick[site]
        reduced[site] = cost[site] - mu * capacity[site]
    if last >= 0:
        pick_more[last] = last
    return True, value, mu, share


@compiled
def price_cover(cost, capacity, site_option, state, need, fewest, most, mu, reduced, pick, pick_more):  # type: ignore[no-untyped-def]
    """
    Solve the continuous covering problem of the options by its one multiplier `mu` (money per load of capacity).

    The value is concave and piecewise linear in `mu`: two picks, one with too little capacity and one with enough,
    are moved to where their lines meet until the meeting point is the top. `pick` and `pick_more` are left as the two
    picks whose mixture is the continuous optimum, `reduced` as the options' reduced costs at `mu`.

    Returns
    -------
    value, mu, rate, share
        Minimum, the two multipliers, and the weight of `pick` in the mixture.
    """
    plain, value, mu, share = _fill_cover(cost, capacity, site_option, state, need, fewest, most, reduced, pick, pick_more)
    if plain:
        return value, mu, 0.0, share
    value, total, rate = pick_options(cost, capacity, site_option, state, fewest, most, 0.0, reduced, pick)
    if total >= need:
        pick_more[:] = pick
        return value, 0.0, rate, 1.0
    low, low_value, low_slope = 0.0, value, need - total
    high = mu if mu > 0.0 else 1e-3
    while True:
        value, total, rate = pick_options(cost, capacity, site_option, state, fewest, most, high, reduced, pick_more)
        value += high * need
        if total >= need or high > 1e30:
            break
        low, low_value, low_slope = high, value, need - total
        pick[:] = pick_more
        high *= 2.0
    high_value, high_slope = value, need - total
    other = np.empty_like(pick)
    for _ in range(60):
        if low_slope <= high_slope:
            break
        mu = (high_value - high_slope * high - low_value + low_slope * low) / (low_slope - high_slope)
        top = low_value + low_slope * (mu - low)
        value, total, rate = pick_options(cost, capacity, site_option, state, fewest, most, mu, reduced, other)
        value += mu * need
        if value >= top - 1e-12 * abs(top):
            break
        if total >= need:
            high, high_value, high_slope = mu, value, need - total
            pick_more[:] = other
        else:
            low, low_value, low_slope = mu, value, need - total
            pick[:] = other
    value, total, rate = pick_options(cost, capacity, site_option, state, fewest, most, mu, reduced, other)
    share = -high_slope / (low_slope - high_slope) if low_slope > high_slope else 0.0
    return value + mu * need, mu, rate, share


@compiled
def cover_rows(weight, pick, site_start, taken, rest, load, row, covered, used):  # type: ignore[no-untyped-def]
    """Add `weight` times what the picked options serve to `covered` (rows,) and times 1 to `used` (sites,)."""
    for site in range(pick.shape[0]):
        option = pick[site]
        if option < 0:
            continue
        used[site] += weight
        end = taken[option]
        for k in range(site_start[site], end):
            covered[row[k]] += weight * load[k]
        if rest[option] > 0.0:
            covered[row[end]] += weight * rest[option]


@compiled
def sift(reduced, rate, state, slack):  # type: ignore[no-untyped-def]
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
def ascend(problem, space, state, fewest, most, v, mean, used, numbers, steps, target, cutoff, alpha, patience, fix):  # type: ignore[no-untyped-def]
    """
    Raise the bound by `steps` deflected subgradient steps from multipliers `v` (rows,), which become the best seen.

    Rows are weighted by one over their demand, so that steps do not depend on the unit of amount. `mean` (rows,) and
    `used` (sites,) become what the averaged solution serves and opens. Sites are fixed in `state` on the way when
    `fix`; steps end early when the bound reaches `cutoff`. `numbers` = [best bound, step factor, mu, steps made].

    """
    row_start, lane_site, lane_cost, site_option, charge, capacity, demand = problem
    site_start, held, margin, load, row, cost, taken, rest, edge, reduced, pick, pick_more = space[:12]
    covered, opened, way, best_v = space[12:]
    need = np.sum(demand) * (1.0 - 1e-12)
    best, factor, mu = numbers[0], numbers[1], numbers[2]
    best_v[:] = v
    way[:] = 0.0
    bad = 0
    made = 0
    first = True
    while made < steps:
        made += 1
        gather_margins(v, row_start, lane_site, lane_cost, demand, state, site_start, held, margin, load, row)
        price_options(charge, capacity, site_option, state, site_start, held, margin, load, row, cost, taken, rest, edge)
        bound, mu, rate, share = price_cover(
            cost, capacity, site_option, state, need, fewest, most, mu, reduced, pick, pick_more
        )
        for r in range(v.shape[0]):
            bound += v[r] * demand[r]
        if bound > best:
            if bound > best + 1e-6 * abs(bound):
                bad = 0
            best = bound
            best_v[:] = v
            if best >= cutoff:
                break
        else:
            bad += 1
        if fix and bound > best - 0.5 * (cutoff - best):
            sift(reduced, rate, state, cutoff - bound)
        covered[:] = 0.0
        opened[:] = 0.0
        cover_rows(share, pick, site_start, taken, rest, load, row, covered, opened)
        if share < 1.0:
            cover_rows(1.0 - share, pick_more, site_start, taken, rest, load, row, covered, opened)
        weight = 1.0 if first else alpha
        first = False
        for site in range(used.shape[0]):
            used[site] += weight * (opened[site] - used[site])
        if bad >= patience:
            factor *= 0.5
            bad = 0
            v[:] = best_v
            bound = best
        norm = 0.0
        for r in range(v.shape[0]):
            mean[r] += weight * (covered[r] - mean[r])
            way[r] = demand[r] - covered[r] + 0.7 * way[r]
            norm += way[r] * way[r] / demand[r]
        if norm <= 1e-24 * need or factor < 1e-4:
            break
        size = factor * (target - bound) / norm
        for r in range(v.shape[0]):
            v[r] += size * way[r] / demand[r]
    v[:] = best_v
    numbers[0], numbers[1], numbers[2], numbers[3] = best, factor, mu, made
