"""
The smallest constants that are valid in the links of the model, and which customers are taken whole from which origin.

All are derived from the network: demand, capacities and the lanes that exist. None is chosen by hand.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.network.lanes import EDGE

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Flags, Floats, Positions
    from siting.network.network import LegLanes, Network


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Pairs:
    """
    The pairs of an origin and a single-sourced customer that can hold together, P of them.

    A pair exists only where a lane for every good the customer needs exists, and some option of the site (or the
    supplier) can hold the customer whole.
    """

    origin: Positions
    """(P,) site i is i, supplier k is S + k."""
    customer: Positions
    """(P,)"""
    load: Floats
    """(P,) load a year of the customer over all its goods."""
    of_outbound: Positions
    """(outbound lanes,) pair of the lane; -1 where the customer may split or the lane is of no pair."""
    of_direct: Positions
    """(direct lanes,) the same."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Tightest:
    """The most that can move, lane by lane and end by end; a *unit* is one of the good, load is capacity used."""

    pairs: Pairs
    outbound_usable: Flags
    """(outbound lanes,) False where the site is pinned shut, or the customer single-sourced and in no such pair."""
    direct_usable: Flags
    """(direct lanes,) the same."""
    outbound_demand: Floats
    """(outbound lanes,) units the customer needs."""
    direct_demand: Floats
    """(direct lanes,) units the customer needs."""
    direct_most: Floats
    """(direct lanes,) units: min(demand, the supplier's capacity for the good, its whole capacity)."""
    inbound_most: Floats
    """(inbound lanes,) units: min(the supplier's capacities, the largest option, demand within the site's lanes)."""
    supplier_most: Floats
    """(inbound lanes,) units: the part of `inbound_most` that depends on the supplier and the demand only."""
    site_load: Floats
    """(S,) load of the demand within the site's lanes."""
    option_most: Floats
    """(O,) load: min(capacity, `site_load`)."""
    offer_most: Floats
    """(K, G) units: min(capacities, demand the supplier can reach straight or through a site)."""


def tightest(network: Network) -> Tightest:
    """
    Return the smallest valid constants of a network.

    Parameters
    ----------
    network
        Shapes as in `Network`; demand in units of each good a year.

    Returns
    -------
    constants
        Arrays by lane, option, site and offer, in the units stated at each field.
    """
    pairs, outbound_usable, direct_usable = _pairs(network)
    outbound, direct, inbound = network.outbound, network.direct, network.inbound
    outbound_demand = network.demand[outbound.destination, outbound.good]
    direct_demand = network.demand[direct.destination, direct.good]
    site_load = np.zeros(len(network.sites))
    lane_load = np.where(outbound_usable, outbound_demand * network.load[outbound.good], 0.0)
    np.add.at(site_load, outbound.origin, lane_load)
    within = np.zeros((len(network.sites), len(network.goods)))
    np.add.at(within, (outbound.origin, outbound.good), np.where(outbound_usable, outbound_demand, 0.0))

    largest = np.zeros(len(network.sites))
    np.maximum.at(largest, network.option_site, network.option_capacity)
    whole = in_units(network.supplier_capacity[:, None], network.load[None, :])
    offered = np.where(network.supplier_pinned_unsigned[:, None], 0.0, np.minimum(network.offer_capacity, whole))
    supplier_most = np.minimum(offered[inbound.origin, inbound.good], within[inbound.destination, inbound.good])
    site_most = in_units(largest[inbound.destination], network.load[inbound.good])
    reach = _supplier_reach(network, outbound_usable, direct_usable)
    return Tightest(
        pairs=pairs,
        outbound_usable=outbound_usable,
        direct_usable=direct_usable,
        outbound_demand=outbound_demand,
        direct_demand=direct_demand,
        direct_most=np.where(direct_usable, np.minimum(direct_demand, offered[direct.origin, direct.good]), 0.0),
        inbound_most=np.minimum(supplier_most, site_most),
        supplier_most=supplier_most,
        site_load=site_load,
        option_most=np.minimum(network.option_capacity, site_load[network.option_site]),
        offer_most=np.minimum(offered, reach),
    )


def in_units(load: Floats, load_per_unit: Floats) -> Floats:
    """Return how many units a load is; without limit where a unit uses none of it."""
    load, per_unit = np.broadcast_arrays(load, load_per_unit)
    units = np.full(load.shape, np.inf)
    np.divide(load, per_unit, out=units, where=per_unit > 0)
    return units


def holds(capacity: Floats, load: Floats) -> Flags:
    """Return whether a capacity holds a load, give or take rounding: the same edge as where lanes are made."""
    return np.asarray(load <= capacity * (1.0 + EDGE))


def is_near(network: Network, lanes: LegLanes) -> Flags:
    """
    Return which lanes are within the service distance.

    Parameters
    ----------
    network
        Gives the service distance.
    lanes
        Outbound or direct.

    Returns
    -------
    near
        Shape (lanes,); a lane longer by no more than rounding is near, one without a distance is not.
    """
    return np.asarray(lanes.km <= network.service_km * (1.0 + EDGE))


def _pairs(network: Network) -> tuple[Pairs, Flags, Flags]:
    """Return the pairs, and which outbound and direct lanes can be used at all."""
    customer_load = network.demand @ network.load
    largest = np.zeros(len(network.sites))
    np.maximum.at(largest, network.option_site, network.option_capacity)
    fits_site = holds(largest[:, None], customer_load[None, :]) & ~network.site_pinned_shut[:, None]
    offered = np.where(network.demand[None, :, :] > 0, network.offer_capacity[:, None, :], np.inf)
    fits_supplier = np.all(holds(offered, network.demand[None, :, :]), axis=2)
    fits_supplier &= holds(network.supplier_capacity[:, None], customer_load[None, :])
    fits_supplier &= ~network.supplier_pinned_unsigned[:, None]

    of_outbound, key_outbound = _whole(network, network.outbound, fits_site)
    of_direct, key_direct = _whole(network, network.direct, fits_supplier)
    of_direct = np.where(of_direct >= 0, of_direct + key_outbound.size, -1)
    width = max(len(network.customers), 1)
    customer = np.concatenate([key_outbound, key_direct]) % width
    origin = np.concatenate([key_outbound // width, key_direct // width + len(network.sites)])
    pairs = Pairs(
        origin=origin.astype(np.int32),
        customer=customer.astype(np.int32),
        load=customer_load[customer],
        of_outbound=of_outbound.astype(np.int32),
        of_direct=of_direct.astype(np.int32),
    )
    outbound_usable = ~network.single_source[network.outbound.destination] | (pairs.of_outbound >= 0)
    outbound_usable &= ~network.site_pinned_shut[network.outbound.origin]
    direct_usable = ~network.single_source[network.direct.destination] | (pairs.of_direct >= 0)
    direct_usable &= ~network.supplier_pinned_unsigned[network.direct.origin]
    return pairs, outbound_usable, direct_usable


def _whole(network: Network, lanes: LegLanes, fits: Flags) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return the pair of each lane (-1 for none) and the key origin x customers + customer of each pair."""
    goods_needed = np.count_nonzero(network.demand > 0, axis=1)
    key = lanes.origin.astype(np.int64) * max(len(network.customers), 1) + lanes.destination
    single = network.single_source[lanes.destination]
    found, inverse, count = np.unique(key[single], return_inverse=True, return_counts=True)
    origin, customer = np.divmod(found, max(len(network.customers), 1))
    whole = (count == goods_needed[customer]) & fits[origin, customer]
    number = np.where(whole, np.cumsum(whole) - 1, -1)
    pair = np.full(len(lanes), -1, dtype=np.int64)
    pair[single] = number[inverse]
    return pair, found[whole]


def _supplier_reach(network: Network, outbound_usable: Flags, direct_usable: Flags) -> Floats:
    """Return (K, G): units a year demanded by customers whom the supplier reaches straight or through a site."""
    suppliers, customers = len(network.suppliers), len(network.customers)
    reach = np.zeros((suppliers, len(network.goods)))
    for good in range(len(network.goods)):
        to_site = np.zeros((suppliers, len(network.sites)), dtype=np.float32)
        lanes = network.inbound
        mine = lanes.good == good
        to_site[lanes.origin[mine], lanes.destination[mine]] = 1.0
        to_customer = np.zeros((len(network.sites), customers), dtype=np.float32)
        lanes = network.outbound
        mine = (lanes.good == good) & outbound_usable
        to_customer[lanes.origin[mine], lanes.destination[mine]] = 1.0
        served = to_site @ to_customer > 0
        lanes = network.direct
        mine = (lanes.good == good) & direct_usable
        served[lanes.origin[mine], lanes.destination[mine]] = True
        reach[:, good] = served @ network.demand[:, good]
    return reach
