"""
A network simplex for the flows of a fixed set of open sites, compiled, and quick to start again after a change.

Nodes: sites 0..S-1, the *overflow* S (a site of no size limit that no plan may use), the *root* S + 1, rows from S + 2.
Arcs: root to site (flow in [0, capacity], cost 0 while it is open), site to row (flow at least 0, the lane's cost).
A shut site and the overflow cost `far` per load at the root, more than any way round them can cost, so that opening and
shutting change costs only and the last flows stay a feasible start.

Basis: a spanning tree held as parents and child lists. Most rows take all they need from one site; such a row is a
leaf, knows its parent, but is on no child list: its price is its lane's cost plus its site's price, and no pivot has to
visit it. So a pivot costs as much as the tree of the sites and the few divided rows. The leaving arc is the last
blocking one on the cycle seen from its apex (Cunningham 1976), which rules out cycling.

`tree` (5, nodes): parent, first child, next and previous sibling, depth (`LEAF` = a leaf row, on no list).
`value` (3, nodes): flow on the arc to the parent, that arc's cost, price of the node (not kept for leaf rows).

References
----------
Cunningham (1976), Mathematical Programming 11: 105-116; Ahuja, Magnanti & Orlin (1993), Network Flows, chapter 11.
"""

# mypy: allow-untyped-defs
# ruff: noqa: ANN001, ANN201, ANN202, PLR0913, PLR0917, PLR0912, PLR0915, C901 - compiled loops: the compiler
# finds the types, and takes arrays and work space one by one.
from __future__ import annotations

import numpy as np

from siting.solving.bounding.compiled import compiled
from siting.solving.bounding.knapsack import wipe

PARENT, FIRST, NEXT, BEFORE, DEPTH = 0, 1, 2, 3, 4
FLOW, COST, PRICE = 0, 1, 2
NONE = -1
LEAF = -2
"""Depth of a row that one site serves alone."""
BLOCK = 12
"""Rows priced before the best lane among them enters: measured best from 100 to 10,000 rows."""


@compiled
def _link(tree, node, parent):
    head = tree[FIRST, parent]
    tree[PARENT, node] = parent
    tree[NEXT, node] = head
    tree[BEFORE, node] = NONE
    if head != NONE:
        tree[BEFORE, head] = node
    tree[FIRST, parent] = node


@compiled
def _unlink(tree, node):
    before, after = tree[BEFORE, node], tree[NEXT, node]
    if before == NONE:
        tree[FIRST, tree[PARENT, node]] = after
    else:
        tree[NEXT, before] = after
    if after != NONE:
        tree[BEFORE, after] = before


@compiled
def _shift(tree, value, top, amount):
    """Add `amount` to the prices in the subtree of `top` and set its depths."""
    node = top
    while True:
        tree[DEPTH, node] = tree[DEPTH, tree[PARENT, node]] + 1
        value[PRICE, node] += amount
        if tree[FIRST, node] != NONE:
            node = tree[FIRST, node]
            continue
        while node != top and tree[NEXT, node] == NONE:
            node = tree[PARENT, node]
        if node == top:
            return
        node = tree[NEXT, node]


@compiled
def _demote(tree, node, sites):
    """Take a row off the child lists once one site serves it alone."""
    if node >= sites + 2 and tree[FIRST, node] == NONE and tree[DEPTH, node] != LEAF:
        _unlink(tree, node)
        tree[DEPTH, node] = LEAF


@compiled
def _depth(tree, node):
    depth = tree[DEPTH, node]
    return tree[DEPTH, tree[PARENT, node]] + 1 if depth == LEAF else depth


@compiled
def _rehang(tree, value, cut, end, parent, flow, cost):
    """Cut the subtree of `cut` off and hang it by its node `end` under `parent`."""
    node = end
    while True:
        above, old_flow, old_cost = tree[PARENT, node], value[FLOW, node], value[COST, node]
        _unlink(tree, node)
        _link(tree, node, parent)
        value[FLOW, node], value[COST, node] = flow, cost
        if node == cut:
            return
        parent, node, flow, cost = node, above, old_flow, old_cost


@compiled
def pivot(tree, value, capacity, at_top, sites, tail, head, cost, reduced, limit):
    """
    Send flow over the entering arc from `tail` to `head` and back through the tree; the leaving arc makes room.

    `reduced` (below 0) is the change of cost per load, `limit` the entering arc's own. An entering root arc that gives
    flow back has its site as tail and the root as head.
    """
    root = sites + 1
    a, b = tail, head
    depth_a, depth_b = _depth(tree, a), _depth(tree, b)
    tail_limit, tail_cut = np.inf, NONE
    head_limit, head_cut = np.inf, NONE
    while a != b:
        if depth_a > depth_b:
            # The cycle comes down to a: arcs that point down gain flow, others lose it.
            above = tree[PARENT, a]
            room = np.inf
            if above == root:
                room = capacity[a] - value[FLOW, a]
            elif a <= sites:
                room = value[FLOW, a]
            if room < tail_limit:
                tail_limit, tail_cut = room, a
            a = above
            depth_a -= 1
        else:
            # The cycle goes up from b: arcs that point down lose flow.
            above = tree[PARENT, b]
            if above == root or b > root:
                room = value[FLOW, b]
                if room <= head_limit:
                    head_limit, head_cut = room, b
            b = above
            depth_b -= 1
    apex = a
    moved = max(0.0, min(tail_limit, head_limit, limit))
    a, b = tail, head
    while a != apex:
        up = a <= sites and tree[PARENT, a] != root
        value[FLOW, a] += -moved if up else moved
        a = tree[PARENT, a]
    while b != apex:
        up = b <= sites and tree[PARENT, b] != root
        value[FLOW, b] += moved if up else -moved
        b = tree[PARENT, b]
    is_root_arc = tail == root or head == root  # noqa: PLR1714 - the compiler knows no `in` here
    if limit <= tail_limit and limit < head_limit:
        site = head if tail == root else tail
        at_top[site] = tail == root
        return
    flow = capacity[tail] - moved if head == root else moved
    if head_limit <= tail_limit:
        cut, end, parent, change = head_cut, head, tail, reduced
        if cut <= sites and tree[PARENT, cut] == root:
            at_top[cut] = False
        if cut == head and not is_root_arc and tree[DEPTH, head] == LEAF:
            tree[PARENT, head] = tail
            value[FLOW, head], value[COST, head] = flow, cost
            return
    else:
        cut, end, parent, change = tail_cut, tail, head, -reduced
        if tree[PARENT, cut] == root:
            at_top[cut] = True
    if tree[DEPTH, head] == LEAF:
        home = tree[PARENT, head]
        _link(tree, head, home)
        tree[DEPTH, head] = tree[DEPTH, home] + 1
        value[PRICE, head] = value[PRICE, home] + value[COST, head]
    left = tree[PARENT, cut]
    _rehang(tree, value, cut, end, parent, flow, cost)
    _shift(tree, value, end, change)
    _demote(tree, left, sites)
    _demote(tree, cut, sites)


@compiled
def price_row(tree, value, is_open, row_start, lane_site, lane_cost, sites, r, lowest):
    """Return the lane of row `r` with the most negative reduced cost over open sites, and that cost."""
    node = sites + 2 + r
    is_leaf = tree[DEPTH, node] == LEAF
    price = value[PRICE, tree[PARENT, node]] + value[COST, node] if is_leaf else value[PRICE, node]
    best, found = 0.0, NONE
    for lane in range(row_start[r], row_start[r + 1]):
        gain = lane_cost[lane] - price
        if gain + lowest >= best:
            break
        site = lane_site[lane]
        if is_open[site]:
            gain += value[PRICE, site]
            if gain < best:
                best, found = gain, lane
    return found, best


@compiled
def price_root(tree, value, at_top, root_cost, sites, tolerance):
    """Return the site whose root arc most wants to enter, its reduced cost, and the lowest price of a site."""
    best, found, lowest = -tolerance, NONE, 0.0
    for site in range(sites):
        price = value[PRICE, site]
        lowest = min(lowest, price)
        if tree[PARENT, site] != sites + 1:
            change = root_cost[site] - price
            if at_top[site]:
                change = -change
            if change < best:
                best, found = change, site
    return found, best, lowest


@compiled
def improve(
    tree, value, capacity, at_top, root_cost, is_open, row_start, lane_site, lane_cost, state, pivots, tolerance
):
    """
    Pivot until the flows are optimal or `pivots` pivots were made; return True when optimal.

    Rows are priced in turn, a block at a time, the best lane of the block enters. `state[0]` is the row to go on from.
    """
    sites = is_open.shape[0]
    root = sites + 1
    rows = row_start.shape[0] - 1
    block = BLOCK
    r = state[0]
    clean = 0
    made = 0
    while clean < rows:
        site, best, lowest = price_root(tree, value, at_top, root_cost, sites, tolerance)
        found, where = NONE, 0
        for _ in range(min(block, rows)):
            lane, reduced = price_row(tree, value, is_open, row_start, lane_site, lane_cost, sites, r, lowest)
            if reduced < best:
                best, found, where = reduced, lane, r
            r = r + 1 if r + 1 < rows else 0
        if found != NONE:
            tail, head = lane_site[found], sites + 2 + where
            pivot(tree, value, capacity, at_top, sites, tail, head, lane_cost[found], best, np.inf)
        elif site != NONE:
            tail, head = (site, root) if at_top[site] else (root, site)
            pivot(tree, value, capacity, at_top, sites, tail, head, root_cost[site], best, capacity[site])
        else:
            clean += block
            continue
        clean = 0
        made += 1
        if made >= pivots:
            state[0] = r
            return False
    state[0] = r
    return True


@compiled
def set_root_cost(tree, value, root_cost, site, cost):
    """Change what a site's arc from the root costs and the prices that hang on it."""
    sites = root_cost.shape[0] - 1
    change = cost - root_cost[site]
    root_cost[site] = cost
    if change != 0.0 and tree[PARENT, site] == sites + 1:
        value[COST, site] = cost
        _shift(tree, value, site, change)


@compiled
def begin(tree, value, capacity, at_top, root_cost, is_open, row_start, lane_site, lane_cost, demand, far):
    """Set up the first basis: each row whole at its cheapest open site with room, else at the overflow."""
    sites = is_open.shape[0]
    root = sites + 1
    for line in range(tree.shape[0]):
        wipe(tree[line], NONE)
    for line in range(value.shape[0]):
        wipe(value[line], 0.0)
    wipe(at_top, False)  # noqa: FBT003 - compiled functions take no names
    tree[DEPTH, root] = 0
    for site in range(sites + 1):
        root_cost[site] = 0.0 if site < sites and is_open[site] else far
        _link(tree, site, root)
        tree[DEPTH, site] = 1
        value[COST, site] = root_cost[site]
        value[PRICE, site] = root_cost[site]
    order = np.argsort(demand)
    for k in range(order.shape[0] - 1, -1, -1):
        r = order[k]
        node = sites + 2 + r
        home, cost = sites, 0.0
        for lane in range(row_start[r], row_start[r + 1]):
            site = lane_site[lane]
            if is_open[site] and value[FLOW, site] + demand[r] <= capacity[site]:
                home, cost = site, lane_cost[lane]
                break
        tree[PARENT, node] = home
        tree[DEPTH, node] = LEAF
        value[FLOW, node], value[COST, node] = demand[r], cost
        value[FLOW, home] += demand[r]


@compiled
def flow_cost(tree, value, capacity, at_top, is_open):
    """Return the cost of the lanes' flows, and the load that shut sites and the overflow carry."""
    sites = is_open.shape[0]
    root = sites + 1
    total, astray = 0.0, 0.0
    for node in range(sites + 1):
        if tree[PARENT, node] != root:
            total += value[FLOW, node] * value[COST, node]
            if at_top[node] and not is_open[node]:
                astray += capacity[node]
        elif node == sites or not is_open[node]:
            astray += value[FLOW, node]
    for node in range(sites + 2, tree.shape[1]):
        total += value[FLOW, node] * value[COST, node]
    return total, astray
