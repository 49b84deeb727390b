"""
The whole model as arrays: the same columns, rows and links that `model.py` states in PuLP, without an object a lane.

Every column is a share or a yes-or-no in [0, 1]. *Limits* are the rows but the links; a *link* is one lane (or pair)
column and what must be open or signed for it, `share - sum of fit x binary <= 0`. Links stand apart because most of
them never bind: the relaxation loads those it needs.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.network.decisions import NO_SOURCE, Decisions
from siting.solving.bounding.matrix import Gathering, Rows
from siting.solving.bounding.whole_limits import gather_limits
from siting.solving.model import money_unit
from siting.solving.tightest import holds, in_units, tightest

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats, Positions
    from siting.network.network import Network
    from siting.solving.tightest import Tightest


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Places:
    """Where each column stands: options, suppliers and pairs first, then the lanes that split. N columns."""

    option: Positions
    """(O,)"""
    supplier: Positions
    """(K,)"""
    pair: Positions
    """(P,)"""
    inbound: Positions
    """(inbound lanes,)"""
    outbound: Positions
    """(outbound lanes,) its own column, or its pair's."""
    direct: Positions
    """(direct lanes,) its own column, or its pair's."""
    count: int
    """N."""

    @property
    def binaries(self) -> int:
        """Return how many columns, the first ones, are yes or no."""
        return int(self.option.size + self.supplier.size + self.pair.size)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class WholeProblem:
    """Least cost over the columns in [lower, upper], the first of them whole, subject to limits and links."""

    network: Network
    most: Tightest
    places: Places
    cost: Floats
    """(N,) in `money`."""
    lower: Floats
    """(N,)"""
    upper: Floats
    """(N,)"""
    limits: Rows
    links: Rows
    link_of: NDArray[np.int32]
    """(links,) the share that the link is about."""
    money: float
    """Money a year of 1 in `cost`."""
    constant: float
    """Money a year that is paid whatever is decided, in `money`."""

    def decisions(self, values: Floats) -> Decisions:
        """
        Return the decisions of a solution, binaries rounded.

        Parameters
        ----------
        values
            Shape (N,), or (binaries,) at least.

        Returns
        -------
        decisions
            Of the network, by position.
        """
        pairs = self.most.pairs
        taken = values[self.places.pair] > 0.5  # noqa: PLR2004 - rounding a binary
        source = np.full(len(self.network.customers), NO_SOURCE, dtype=np.int32)
        source[pairs.customer[taken]] = pairs.origin[taken]
        return Decisions(
            option_open=values[self.places.option] > 0.5,  # noqa: PLR2004
            supplier_signed=values[self.places.supplier] > 0.5,  # noqa: PLR2004
            source=source,
        )

    def binaries(self, decisions: Decisions) -> Floats:
        """Return (binaries,) the yes-or-no columns at the decisions."""
        pairs = self.most.pairs
        taken = decisions.source[pairs.customer] == pairs.origin
        return np.concatenate([decisions.option_open, decisions.supplier_signed, taken]).astype(np.float64)


def state(network: Network) -> WholeProblem:
    """
    State a network as arrays.

    Parameters
    ----------
    network
        What to state.

    Returns
    -------
    problem
        Same optimum as the model in PuLP, with and without whole numbers.
    """
    most = tightest(network)
    places = _places(network, most)
    cost = _cost(network, most, places)
    constant = float(network.site_closing.sum() + network.supplier_dropping.sum())
    money = money_unit(float(np.abs(np.append(cost, constant)).max(initial=0.0)))
    lower, upper = _bounds(network, most, places)
    links = _Links(network, most, places)
    links.outbound()
    links.inbound()
    links.direct()
    links.pairs()
    return WholeProblem(
        network=network,
        most=most,
        places=places,
        cost=cost / money,
        lower=lower,
        upper=upper,
        limits=gather_limits(network, most, places),
        links=links.gathering.rows(scaled=False),
        link_of=np.concatenate([np.zeros(0, np.int32), *links.shares]),
        money=money,
        constant=constant / money,
    )


def _places(network: Network, most: Tightest) -> Places:
    options, suppliers, pairs = network.option_site.size, len(network.suppliers), most.pairs.origin.size
    place = np.arange(options + suppliers + pairs, dtype=np.int32)
    option, supplier, pair = np.split(place, [options, options + suppliers])
    count = place.size
    inbound = count + np.arange(len(network.inbound), dtype=np.int32)
    count += inbound.size
    lanes = []
    for of_pair in (most.pairs.of_outbound, most.pairs.of_direct):
        own = of_pair < 0
        column = np.empty(of_pair.size, dtype=np.int32)
        column[own] = count + np.arange(int(own.sum()))
        column[~own] = pair[of_pair[~own]]
        count += int(own.sum())
        lanes.append(column)
    return Places(
        option=option, supplier=supplier, pair=pair, inbound=inbound, outbound=lanes[0], direct=lanes[1], count=count
    )


def _cost(network: Network, most: Tightest, places: Places) -> Floats:
    """Return (N,) money a year of each column at 1."""
    cost = np.zeros(places.count)
    cost[places.option] = network.option_charge - network.site_closing[network.option_site]
    cost[places.supplier] = network.supplier_charge - network.supplier_dropping
    np.add.at(cost, places.inbound, network.inbound.cost * most.inbound_most)
    np.add.at(cost, places.outbound, network.outbound.cost * most.outbound_demand)
    np.add.at(cost, places.direct, network.direct.cost * most.direct_demand)
    return cost


def _bounds(network: Network, most: Tightest, places: Places) -> tuple[Floats, Floats]:
    """Return (N,) lower and upper bounds: pins, and lanes that can carry nothing."""
    lower, upper = np.zeros(places.count), np.ones(places.count)
    alone = np.bincount(network.option_site, minlength=len(network.sites))[network.option_site] == 1
    upper[places.option[network.site_pinned_shut[network.option_site]]] = 0.0
    lower[places.option[network.site_pinned_open[network.option_site] & alone]] = 1.0
    upper[places.supplier[network.supplier_pinned_unsigned]] = 0.0
    lower[places.supplier[network.supplier_pinned_signed]] = 1.0
    upper[places.inbound[most.inbound_most <= 0]] = 0.0
    upper[places.outbound[~most.outbound_usable & (most.pairs.of_outbound < 0)]] = 0.0
    upper[places.direct[~most.direct_usable & (most.pairs.of_direct < 0)]] = 0.0
    return lower, upper


class _Links:
    """Gathers the links of every leg, each with the smallest constant that is valid."""

    def __init__(self, network: Network, most: Tightest, places: Places) -> None:
        self._network = network
        self._most = most
        self._places = places
        self._size_start = np.searchsorted(network.option_site, np.arange(len(network.sites) + 1))
        self.gathering = Gathering(places.count)
        self.shares: list[NDArray[np.int32]] = []

    def outbound(self) -> None:
        """Let goods leave a site only through an open option."""
        lanes, most = self._network.outbound, self._most
        chosen = np.flatnonzero(most.outbound_usable & (most.pairs.of_outbound < 0))
        demand = most.outbound_demand[chosen]
        self._to_options(self._places.outbound[chosen], lanes.origin[chosen], lanes.good[chosen], demand, demand)

    def inbound(self) -> None:
        """Let goods enter a site only through an open option, and leave a supplier only when it is signed."""
        lanes, most = self._network.inbound, self._most
        chosen = np.flatnonzero(most.inbound_most > 0)
        share = self._places.inbound[chosen]
        units, ceiling = most.inbound_most[chosen], most.supplier_most[chosen]
        self._to_options(share, lanes.destination[chosen], lanes.good[chosen], units, ceiling)
        self._to_supplier(share, lanes.origin[chosen], np.ones(chosen.size))

    def direct(self) -> None:
        """Let goods leave a supplier for a customer only when it is signed."""
        lanes, most = self._network.direct, self._most
        chosen = np.flatnonzero(most.direct_usable & (most.pairs.of_direct < 0))
        fits = most.direct_most[chosen] / most.direct_demand[chosen]
        self._to_supplier(self._places.direct[chosen], lanes.origin[chosen], fits)

    def pairs(self) -> None:
        """Let a customer be taken whole only by an open option that holds it whole, or by a signed supplier."""
        pairs, sites = self._most.pairs, len(self._network.sites)
        by_site = np.flatnonzero(pairs.origin < sites)
        row, option = self._spread(pairs.origin[by_site])
        fits = holds(self._network.option_capacity[option], pairs.load[by_site][row])
        self._add(self._places.pair[by_site], row[fits], self._places.option[option[fits]], np.ones(int(fits.sum())))
        by_supplier = np.flatnonzero(pairs.origin >= sites)
        self._to_supplier(self._places.pair[by_supplier], pairs.origin[by_supplier] - sites, np.ones(by_supplier.size))

    def _to_supplier(self, share: Positions, supplier: Positions, fits: Floats) -> None:
        self._add(share, np.arange(share.size), self._places.supplier[supplier], fits)

    def _to_options(self, share: Positions, site: Positions, good: Positions, units: Floats, ceiling: Floats) -> None:
        """Add, for each share: share x units <= sum over the site's options of min(ceiling, capacity / load) y."""
        row, option = self._spread(site)
        room = in_units(self._network.option_capacity[option], self._network.load[good[row]])
        self._add(share, row, self._places.option[option], np.minimum(ceiling[row], room) / units[row])

    def _spread(self, site: Positions) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Return the row and the option of every (row, option of the row's site)."""
        sizes = np.diff(self._size_start)[site]
        row = np.repeat(np.arange(site.size), sizes)
        within = np.arange(row.size) - np.repeat(np.cumsum(sizes) - sizes, sizes)
        return row, self._size_start[site[row]] + within

    def _add(self, share: Positions, row: NDArray[np.int64], binary: Positions, fits: Floats) -> None:
        """Add one link a share: share <= sum of fits x binary."""
        count = share.size
        self.gathering.add(
            np.concatenate([np.arange(count), row]),
            np.concatenate([share, binary]),
            np.concatenate([np.ones(count), -fits]),
            np.full(count, -math.inf),
            np.zeros(count),
        )
        self.shares.append(share)
