"""
The covering problem in which the sites compete once their knapsacks are priced, compiled.

    min sum_o cost_o y_o,  sum_o capacity_o y_o >= need,  fewest <= sum_o y_o <= most,  at most one option a site

`price_cover` solves its continuous relaxation by one multiplier, `whole_cover` the 0-1 problem itself by depth-first
search where each site has one option.
"""

# mypy: allow-untyped-defs
# ruff: noqa: ANN001, ANN201, ANN202, PLR0913, PLR0917, PLR0912, PLR0915, PLR2004, C901 - compiled loops: the compiler
# finds the types, and takes arrays and work space one by one.
from __future__ import annotations

import numpy as np

from siting.solving.bounding.compiled import compiled
from siting.solving.bounding.knapsack import FREE, OPEN, SHUT, copy, fill, wipe

WINDOW = 48
"""Items on each side of the edge that are exchanged for a first cover."""


@compiled
def _edge_price(reduced, state, rank):
    """Return the `rank`-th lowest reduced cost of the free sites."""
    sites = state.shape[0]
    worth, one, order = np.empty(sites), np.empty(sites), np.empty(sites, np.int32)
    count = 0
    for site in range(sites):
        if state[site] == FREE:
            worth[count], one[count], order[count] = -reduced[site], 1.0, site
            count += 1
    k, _ = fill(worth, one, order, 0, count, rank - 0.5, 0.0)
    return -worth[k]


@compiled
def pick_options(cost, capacity, site_option, state, fewest, most, mu, reduced, pick):
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
    free = 0
    for site in range(state.shape[0]):
        free += state[site] == FREE
    wanted = min(max(min(max(held + below, fewest), most) - held, 0), free)
    rate, ties = 0.0, 0
    if wanted != below:
        rate = _edge_price(reduced, state, max(wanted, 1))
        if wanted > 0:
            ties = wanted
            for site in range(state.shape[0]):
                ties -= state[site] == FREE and reduced[site] < rate
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
def _fill_cover(cost, capacity, site_option, state, need, fewest, most, reduced, pick, pick_more):
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
        elif capacity[site] > 0.0 and cost[site] < np.inf:
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
def price_cover(cost, capacity, site_option, state, need, fewest, most, mu, reduced, pick, pick_more):
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
    plain, value, mu, share = _fill_cover(
        cost, capacity, site_option, state, need, fewest, most, reduced, pick, pick_more
    )
    if plain:
        return value, mu, 0.0, share
    value, total, rate = pick_options(cost, capacity, site_option, state, fewest, most, 0.0, reduced, pick)
    if total >= need:
        copy(pick_more, pick)
        return value, 0.0, rate, 1.0
    low, low_value, low_slope = 0.0, value, need - total
    high = mu if mu > 0.0 else 1e-3
    while True:
        value, total, rate = pick_options(cost, capacity, site_option, state, fewest, most, high, reduced, pick_more)
        value += high * need
        if total >= need or high > 1e30:
            break
        low, low_value, low_slope = high, value, need - total
        copy(pick, pick_more)
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
            copy(pick_more, other)
        else:
            low, low_value, low_slope = mu, value, need - total
            copy(pick, other)
    value, total, rate = pick_options(cost, capacity, site_option, state, fewest, most, mu, reduced, other)
    share = -high_slope / (low_slope - high_slope) if low_slope > high_slope else 0.0
    return value + mu * need, mu, rate, share


@compiled
def _least_cost(room, first, total, spent, order, cost, capacity):
    """Return the continuous minimum of covering `room` with the items from `first` on; inf where they cannot."""
    items = order.shape[0]
    goal = total[first] + room
    if goal > total[items]:
        return np.inf
    low, high = first, items
    while low < high:
        middle = (low + high) >> 1
        if total[middle] <= goal:
            low = middle + 1
        else:
            high = middle
    k = low - 1
    value = spent[k] - spent[first]
    if goal > total[k]:
        value += (goal - total[k]) * cost[order[k]] / capacity[order[k]]
    return value


@compiled
def _first_cover(room, total, order, cost, capacity, taken):
    """Set `taken` to a good cover of `room`: cheapest items per capacity, the last ones exchanged; return its cost."""
    items = order.shape[0]
    last = np.searchsorted(total, room) - 1
    best, out, into = np.inf, -1, -1
    value = 0.0
    for k in range(last):
        value += cost[order[k]]
    # The first `last` items fall short and one more is enough: add one, or exchange one, near the edge.
    for enough in range(2):
        size = last + enough
        base = value if enough == 0 else value + cost[order[last]]
        left = room - total[size]
        for b in range(size - 1, min(items, size + WINDOW)):
            gain_b = capacity[order[b]] if b >= size else 0.0
            paid_b = cost[order[b]] if b >= size else 0.0
            for a in range(size, max(-1, size - WINDOW), -1):
                gain = gain_b - (capacity[order[a]] if a < size else 0.0)
                paid = base + paid_b - (cost[order[a]] if a < size else 0.0)
                if gain >= left and paid < best:
                    best = paid
                    out, into = (a if a < size else -1), (b if b >= size else -1)
                    keep = size
    for k in range(items):
        taken[k] = k < keep
    if out >= 0:
        taken[out] = False
    if into >= 0:
        taken[into] = True
    return best


@compiled
def whole_cover(cost, capacity, state, need, rate, count, slack, limit, pick):
    """
    Solve the 0-1 covering problem of sites with one option each to within `slack`, by depth-first search.

    The count row enters by its price: `rate` is taken off each site and `rate` x `count` added. At most `limit` items
    are tried; the value returned is a valid bound also when they run out. `pick` becomes the best solution found.

    Returns
    -------
    value, found
        Lower bound of the minimum, at most `slack` below it unless `limit` was reached, and what `pick` costs.
    """
    sites = state.shape[0]
    base, room, items = rate * count, need, 0
    order, ratio = np.empty(sites, np.int32), np.empty(sites)
    for site in range(sites):
        pick[site] = -1
        price = cost[site] - rate
        if state[site] == OPEN or (state[site] == FREE and price <= 0.0):
            pick[site] = site
            base += price
            room -= capacity[site]
        elif state[site] == FREE and capacity[site] > 0.0 and price < np.inf:
            order[items] = site
            ratio[items] = price / capacity[site]
            items += 1
    if room <= 0.0:
        return base, base
    sorted_items = np.argsort(ratio[:items])
    listed = order.copy()
    order = np.empty(items, np.int32)
    for k in range(items):
        order[k] = listed[sorted_items[k]]
    price = np.empty(sites)
    total, spent = np.zeros(items + 1), np.zeros(items + 1)
    for k in range(items):
        site = order[k]
        price[site] = cost[site] - rate
        total[k + 1] = total[k] + capacity[site]
        spent[k + 1] = spent[k] + price[site]
    if total[items] < room:
        return np.inf, np.inf
    taken = np.zeros(items, np.bool_)
    best_taken = np.zeros(items, np.bool_)
    other = np.empty(items)
    wipe(other, np.inf)
    best = _first_cover(room, total, order, price, capacity, best_taken)
    least, paid, k, tried = best, 0.0, 0, 0
    while True:
        # Going down: take items while that may still beat the best; remember what leaving each one out promises.
        while k < items and room > 0.0 and tried < limit:
            tried += 1
            site = order[k]
            skip = paid + _least_cost(room, k + 1, total, spent, order, price, capacity)
            take = (
                paid
                + price[site]
                + (
                    _least_cost(room - capacity[site], k + 1, total, spent, order, price, capacity)
                    if room > capacity[site]
                    else 0.0
                )
            )
            if min(skip, take) >= best - slack:
                least = min(least, skip, take)
                break
            if take >= best - slack:
                least = min(least, take)
                other[k] = np.inf
            else:
                other[k] = skip
                taken[k] = True
                paid += price[site]
                room -= capacity[site]
            k += 1
        if room <= 0.0:
            if paid < best:
                best = paid
                for j in range(items):
                    best_taken[j] = j < k and taken[j]
            least = min(least, paid)
        elif tried >= limit:
            least = min(least, paid + _least_cost(room, k, total, spent, order, price, capacity))
        # Going back: to the last item taken whose other branch still promises something.
        found = False
        while k > 0 and not found:
            k -= 1
            if taken[k]:
                taken[k] = False
                paid -= price[order[k]]
                room += capacity[order[k]]
                if other[k] < best - slack and tried < limit:
                    found = True
                else:
                    least = min(least, other[k])
        if not found:
            break
        k += 1
    for k in range(items):
        if best_taken[k]:
            pick[order[k]] = order[k]
    return base + least, base + best
