"""
The location problem that the bounding engine works on, as flat arrays.

Everything is load (amount x the good's load). A *row* is a customer and a good with demand; an *option* is a way a site
may be open. Lanes lie by row, cheapest first; the options of a site lie together, greatest capacity first.

This is the seam of the engine: whatever can be put as a `Problem` is solved by it. `handles` says what cannot.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.network.decisions import NO_SOURCE, Decisions

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Flags, Floats, Positions
    from siting.network.network import Network


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Problem:
    """One echelon: sites with options, rows with demand. Shapes: S sites, O options, R rows, L lanes."""

    demand: Floats
    """(R,) load a year, above 0."""
    row_start: NDArray[np.int64]
    """(R + 1,) first lane of each row."""
    lane_site: Positions
    """(L,)"""
    lane_cost: Floats
    """(L,) money per load; ascending within a row."""
    site_option: NDArray[np.int64]
    """(S + 1,) first option of each site."""
    charge: Floats
    """(O,) money a year that opening the option adds (a closing charge saved is taken off)."""
    capacity: Floats
    """(O,) load a year; finite: an option holds no more than its lanes can bring."""
    must_open: Flags
    """(S,)"""
    fewest: int
    """Least number of open sites."""
    most: int
    """Greatest number of open sites."""
    constant: float
    """Money a year that no decision changes."""
    option: Positions
    """(O,) the option's position in the network."""

    @property
    def sites(self) -> int:
        """Return the number of sites."""
        return int(self.site_option.shape[0]) - 1

    @property
    def rows(self) -> int:
        """Return the number of rows."""
        return int(self.demand.shape[0])

    @property
    def one_option_each(self) -> bool:
        """Return whether every site has one option only."""
        return self.sites == int(self.charge.shape[0])

    @property
    def arrays(self) -> tuple[NDArray[np.generic], ...]:
        """Return what the compiled loops read, in the order they expect."""
        return (
            self.row_start,
            self.lane_site,
            self.lane_cost,
            self.site_option,
            self.charge,
            self.capacity,
            self.demand,
        )

    @property
    def option_site(self) -> Positions:
        """Return (O,) the site of each option."""
        return np.repeat(np.arange(self.sites, dtype=np.int32), np.diff(self.site_option))

    @property
    def greatest(self) -> Floats:
        """Return (S,) the greatest capacity of each site."""
        return self.capacity[self.site_option[:-1]]

    def restricted(self, keep: Flags) -> Problem:
        """
        Return the problem of the sites in `keep` alone.

        Parameters
        ----------
        keep
            (S,) True for the sites that stay; all that must open are among them.

        Returns
        -------
        problem
            With `option` still pointing into the network.
        """
        place = np.cumsum(keep, dtype=np.int32) - 1
        stays = keep[self.lane_site]
        kept_before = np.concatenate([[0], np.cumsum(stays)])
        options = keep[self.option_site]
        sizes = np.diff(self.site_option)[keep]
        return Problem(
            demand=self.demand,
            row_start=kept_before[self.row_start].astype(np.int64),
            lane_site=place[self.lane_site[stays]].astype(np.int32),
            lane_cost=self.lane_cost[stays],
            site_option=np.concatenate([[0], np.cumsum(sizes)]).astype(np.int64),
            charge=self.charge[options],
            capacity=self.capacity[options],
            must_open=self.must_open[keep],
            fewest=self.fewest,
            most=min(self.most, int(keep.sum())),
            constant=self.constant,
            option=self.option[options],
        )


def handles(network: Network) -> str | None:
    """
    Return why the bounding engine cannot take a network, or None where it can.

    Parameters
    ----------
    network
        What is to be decided.

    Returns
    -------
    reason
        A clause such as `it has suppliers`; None where every requirement is handled exactly.
    """
    needed = network.demand.sum(axis=1) > 0
    reasons = (
        (not network.sites, "it has no sites"),
        (bool(network.suppliers), "it has suppliers"),
        (bool((network.load[network.demand.sum(axis=0) > 0] <= 0).any()), "a good uses no capacity"),
        (bool((network.single_source & needed).any()), "it has single-sourced customers"),
        (bool((network.option_least > 0).any()), "it has least throughputs"),
        (bool(network.rules), "it has rules"),
        (math.isfinite(network.one_off_budget), "it has a one-off budget"),
        (network.service_share > 0, "it asks for a service share"),
    )
    return next((reason for applies, reason in reasons if applies), None)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RowLanes:
    """The lanes of every site of a network by row, cheapest first: what networks that differ in rulings share."""

    demand: Floats
    """(R,) load a year, above 0."""
    row: NDArray[np.int64]
    """(L,)"""
    site: Positions
    """(L,) positions in the network."""
    cost: Floats
    """(L,) money per load; ascending within a row."""

    def of(self, keep: Flags) -> RowLanes:
        """Return the lanes of the sites in `keep` (S,) alone, which are counted anew."""
        if keep.all():
            return self
        stays = keep[self.site]
        place = np.cumsum(keep, dtype=np.int32) - 1
        return RowLanes(
            demand=self.demand, row=self.row[stays], site=place[self.site[stays]], cost=self.cost[stays]
        )  # fmt: skip


def row_lanes(network: Network) -> RowLanes:
    """
    Return the lanes by row of a network that `handles` has no objection to.

    Parameters
    ----------
    network
        One echelon: sites and customers.

    Returns
    -------
    lanes
        Of all sites, those pinned shut too.
    """
    lanes = network.outbound
    row_of = np.full(network.demand.shape, -1, dtype=np.int64)
    needed = network.demand > 0
    row_of[needed] = np.arange(int(needed.sum()))
    row = row_of[lanes.destination, lanes.good]
    live = row >= 0
    row, site = row[live], lanes.origin[live]
    cost = lanes.cost[live] / network.load[lanes.good[live]]
    order = np.lexsort((cost, row))
    return RowLanes(
        demand=(network.demand * network.load)[needed],
        row=row[order],
        site=np.ascontiguousarray(site[order], dtype=np.int32),
        cost=np.ascontiguousarray(cost[order]),
    )


def problem_of(network: Network, lanes: RowLanes | None = None) -> Problem:
    """
    Return the location problem of a network that `handles` has no objection to.

    Parameters
    ----------
    network
        One echelon: sites and customers.
    lanes
        Its lanes by row, where they are at hand.

    Returns
    -------
    problem
        Sites pinned shut are left out.
    """
    keep = ~network.site_pinned_shut
    lanes = (row_lanes(network) if lanes is None else lanes).of(keep)
    place = np.cumsum(keep, dtype=np.int32) - 1
    sites, rows = int(keep.sum()), lanes.demand.shape[0]
    within = np.bincount(lanes.site, weights=lanes.demand[lanes.row], minlength=sites)
    options = _options_of(network, keep)
    option_site = place[network.option_site[options]]
    closing = np.where(network.site_running, network.site_closing, 0.0)
    return Problem(
        demand=lanes.demand,
        row_start=np.searchsorted(lanes.row, np.arange(rows + 1)).astype(np.int64),
        lane_site=lanes.site,
        lane_cost=lanes.cost,
        site_option=np.searchsorted(option_site, np.arange(sites + 1)).astype(np.int64),
        charge=network.option_charge[options] - closing[network.option_site[options]],
        capacity=np.minimum(network.option_capacity[options], within[option_site]),
        must_open=network.site_pinned_open[keep],
        fewest=network.fewest_sites,
        most=min(network.most_sites, sites),
        constant=float(closing.sum()),
        option=options.astype(np.int32),
    )


def _options_of(network: Network, keep: Flags) -> NDArray[np.int64]:
    """Return the options of the sites in `keep`, by site, greatest capacity first."""
    order = np.lexsort((network.option_charge, -network.option_capacity, network.option_site))
    return order[keep[network.option_site[order]]]


def decisions_of(network: Network, options: Positions) -> Decisions:
    """
    Return the decisions that open the given options.

    Parameters
    ----------
    network
        The network the problem came from.
    options
        Positions of the open options in the network.

    Returns
    -------
    decisions
        Nothing signed, nothing single-sourced.
    """
    is_open = np.zeros(network.option_site.shape[0], dtype=np.bool_)
    is_open[options] = True
    return Decisions(
        option_open=is_open,
        supplier_signed=np.zeros(len(network.suppliers), dtype=np.bool_),
        source=np.full(len(network.customers), NO_SOURCE, dtype=np.int32),
    )
