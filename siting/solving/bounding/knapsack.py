"""The continuous knapsack by quickselect, compiled; used for the lanes of a site and for the sites themselves."""

# mypy: allow-untyped-defs
# ruff: noqa: ANN001, ANN201, ANN202, PLR0913, PLR0917, PLR0912, PLR2004 - compiled loops: the compiler
# finds the types, and takes arrays and work space one by one.
from __future__ import annotations

from siting.solving.bounding.compiled import compiled

FREE, OPEN, SHUT = 0, 1, -1
"""State of a site in a node of the search."""


@compiled
def copy(target, source):
    """Copy a flat array: a plain loop compiles ten times as fast as a slice and runs as fast."""
    for k in range(target.shape[0]):
        target[k] = source[k]


@compiled
def wipe(target, content):
    """Set every element of a flat array."""
    for k in range(target.shape[0]):
        target[k] = content


@compiled
def _swap(margin, load, row, a, b):
    gain, amount, r = margin[a], load[a], row[a]
    margin[a], load[a], row[a] = margin[b], load[b], row[b]
    margin[b], load[b], row[b] = gain, amount, r


@compiled
def fill(margin, load, row, begin, end, room, guess):
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
