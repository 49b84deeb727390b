"""Which lanes the relaxation begins with: each customer's cheapest, all that leads to them rated in."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.solving.bounding.whole_problem import WholeProblem

NEAREST = 8
"""Outbound lanes of each customer and good to begin with."""

FEEDERS = 20
"""Inbound lanes of each site and good to begin with."""


def first_lanes(problem: WholeProblem) -> NDArray[np.intp]:
    """
    Return the lanes to begin with.

    Parameters
    ----------
    problem
        What to relax.

    Returns
    -------
    columns
        The cheapest outbound lanes of each customer and good, with each site's cheapest way in and its charge spread
        over its capacity; the cheapest inbound lanes of each site and good; all direct lanes.
    """
    network, places = problem.network, problem.places
    goods = max(len(network.goods), 1)
    into, out = network.inbound, network.outbound
    inbound = (
        into.cost + _spread(network.supplier_charge, network.supplier_capacity)[into.origin] * network.load[into.good]
    )
    key = into.destination.astype(np.int64) * goods + into.good
    arriving = np.zeros(len(network.sites) * goods)
    if network.two_echelons:
        arriving[:] = np.inf
        np.minimum.at(arriving, key, inbound)
    charge = np.full(len(network.sites), np.inf)
    np.minimum.at(charge, network.option_site, _spread(network.option_charge, network.option_capacity))
    outbound = (
        out.cost
        + arriving[out.origin.astype(np.int64) * goods + out.good]
        + charge[out.origin] * network.load[out.good]
    )
    outbound = np.where(problem.upper[places.outbound] > 0, outbound, np.inf)
    chosen = cheapest(out.destination.astype(np.int64) * goods + out.good, outbound, NEAREST)
    feeding = cheapest(key, inbound, FEEDERS)
    return np.unique(np.concatenate([places.outbound[chosen], places.inbound[feeding], places.direct])).astype(np.intp)


def _spread(charge: Floats, capacity: Floats) -> Floats:
    """Return money per load of capacity: 0 where that is unlimited, infinite where there is none."""
    share = np.where(capacity > 0, 0.0, np.inf)
    np.divide(charge, capacity, out=share, where=(capacity > 0) & np.isfinite(capacity))
    return share


def cheapest(key: NDArray[np.int64], cost: Floats, most: int) -> NDArray[np.intp]:
    """Return the positions of the `most` cheapest of each key."""
    order = np.lexsort((cost, key))
    ranked = key[order]
    rank = np.arange(ranked.size) - np.searchsorted(ranked, ranked)
    return order[rank < most]
