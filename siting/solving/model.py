"""
The whole problem stated once, as a mixed-integer linear program in PuLP.

Sets
    sites i with their options o (sizes, or the site itself as its only option), suppliers k, customers j, goods p;
    lanes inbound (k, i, p), outbound (i, j, p) and direct (k, j, p), only those that exist.

Variables
    y_o = 1 when the option is open, z_k = 1 when the supplier is signed; x_ijp and w_kjp = share of the demand d_jp
    that moves over the lane, u_kip = share of the most U_kip the lane can carry; a single-sourced customer has one
    binary a for each origin it may have, which stands for x (or w) of all its goods. All lie in [0, 1];
    flow = share x units.

Constraints
    demand: the shares of every customer and good add up to 1 (of a single-sourced customer: of its pairs);
    balance: at every site and good, sum U u = sum d x, where suppliers exist;
    links: d x <= sum_o min(d, s_o / load_p) y_o; U u <= sum_o min(U', s_o / load_p) y_o and U u <= U z with
    U = min(cap_kp, cap_k / load_p, largest s_o / load_p, demand of p within the site's lanes) and U' the same without
    the site; d w <= min(d, cap_kp, cap_k / load_p) z; a <= sum of y over the options that hold the customer whole, or
    a <= z;
    sizes: at most one option a site is open; pinned open: one, pinned shut: none; suppliers likewise;
    capacities: load out of a site <= sum_o min(s_o, load of the demand within its lanes) y_o; units of a good from a
    supplier <= min(cap_kp, demand it can reach) z; load from a supplier <= cap_k z;
    least volumes: load out of a site >= sum_o least_o y_o; load and units from a supplier >= least z;
    service: weight moved within the service distance >= share x all weight;
    counts: fewest <= sum y <= most; budget: one-off money of opening, closing, signing and dropping <= budget; rules.

Objective
    least yearly money: charges of open options and signed suppliers, closing charges of running sites not open,
    dropping charges of signed suppliers not signed, and cost x flow on every lane. The constant part (every closing and
    dropping charge, taken back by y and z) hangs on a column fixed at 1, so that the solver's value is the whole cost.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np
import pulp

from siting.network.decisions import NO_SOURCE, Decisions
from siting.solving.columns import NONE, make_columns
from siting.solving.limits import add_limits, paired
from siting.solving.links import add_links
from siting.solving.rows import Rows
from siting.solving.tightest import tightest

if TYPE_CHECKING:
    from siting.arrays import Floats, Positions
    from siting.network.network import Network
    from siting.solving.columns import Columns
    from siting.solving.rows import Row
    from siting.solving.tightest import Tightest

Links = Literal["tight", "capacity"]

MONEY_COMFORT = (1.0, 1e6)
"""Largest coefficient of the objective that solvers take as it is: their dual tolerance is 1e-7, absolute."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Model:
    """A problem in PuLP with its variables by position."""

    network: Network
    problem: pulp.LpProblem
    columns: Columns
    most: Tightest
    rows: tuple[Row, ...]
    """Every row but the links, by family, so that one family can be relaxed."""
    money: float
    """Money a year of 1 in the objective: the objective was divided by it."""

    def decisions(self, values: Floats) -> Decisions:
        """
        Return the decisions of a solution, binaries rounded.

        Parameters
        ----------
        values
            Shape (columns,). Value of each variable in the order of `columns.all`.

        Returns
        -------
        decisions
            Of the network, by position.
        """
        taken = values[self.columns.pair] > 0.5  # noqa: PLR2004 - rounding a binary
        source = np.full(len(self.network.customers), NO_SOURCE, dtype=np.int32)
        source[self.most.pairs.customer[taken]] = self.most.pairs.origin[taken]
        return Decisions(
            option_open=np.rint(values[self.columns.option]).astype(np.bool_),
            supplier_signed=np.rint(values[self.columns.supplier]).astype(np.bool_),
            source=source,
        )

    def binaries(self, decisions: Decisions) -> tuple[Positions, Floats]:
        """
        Return the columns and values of the binaries that decisions fix, to start a solver from.

        Parameters
        ----------
        decisions
            Of this network.

        Returns
        -------
        positions, values
            Shape (binaries,) each.
        """
        pairs = self.most.pairs
        taken = decisions.source[pairs.customer] == pairs.origin
        positions = np.concatenate([self.columns.option, self.columns.supplier, self.columns.pair])
        values = np.concatenate([decisions.option_open, decisions.supplier_signed, taken])
        return positions, values.astype(np.float64)


def build_model(
    network: Network,
    *,
    links: Links = "tight",
    relaxed: bool = False,
    serve_all: bool = True,
) -> Model:
    """
    State a network as a problem in PuLP.

    Parameters
    ----------
    network
        What to state.
    links
        `tight`: a link on every lane with the smallest valid constant. `capacity`: charges linked by the capacity rows
        alone, the weaker form of the textbooks.
    relaxed
        True lets every binary be a share between 0 and 1; the optimum is then a bound.
    serve_all
        False lets demand stay unserved and makes the load unserved the objective, in place of money; a single-sourced
        customer is then served whole or not at all.

    Returns
    -------
    model
        The problem, its variables by position, its rows by family.

    References
    ----------
    Tight links, site by customer: Balinski (1965), Management Science 12(3): 253-313; Cornuejols, Sridharan & Thizy
    (1991), European Journal of Operational Research 50(3): 280-297.
    """
    problem = pulp.LpProblem("siting", pulp.LpMinimize)
    most = tightest(network)
    constant = float(network.site_closing.sum() + network.supplier_dropping.sum()) if serve_all else 0.0
    columns = make_columns(problem, network, most, relaxed=relaxed, serve_all=serve_all, constant=constant)
    costs = _costs(network, columns, constant) if serve_all else _unserved_load(network, columns)
    money = money_unit(np.abs(costs).max(initial=0.0))
    used = np.flatnonzero(costs)
    terms = [(columns.all[column], value) for column, value in paired(used, costs[used] / money)]
    problem.setObjective(pulp.LpAffineExpression(terms))
    rows = Rows(problem, columns.all)
    add_links(rows, network, columns, most, every_lane=links == "tight")
    add_limits(rows, network, columns, most)
    return Model(network=network, problem=problem, columns=columns, most=most, rows=tuple(rows.kept), money=money)


def money_unit(largest: float) -> float:
    """Return the power of 2 to divide money by, so that the largest coefficient suits a solver; 1 where it does."""
    low, high = MONEY_COMFORT
    if largest <= 0 or low <= largest <= high:
        return 1.0
    return math.ldexp(1.0, math.frexp(largest / (low if largest < low else high))[1])


def _costs(network: Network, columns: Columns, constant: float) -> Floats:
    """Return (columns,) money a year of each variable at 1."""
    costs = np.zeros(len(columns.all))
    costs[columns.option] = network.option_charge - network.site_closing[network.option_site]
    costs[columns.supplier] = network.supplier_charge - network.supplier_dropping
    for lanes, column, units in (
        (network.inbound, columns.inbound, columns.inbound_units),
        (network.outbound, columns.outbound, columns.outbound_units),
        (network.direct, columns.direct, columns.direct_units),
    ):
        np.add.at(costs, column, lanes.cost * units)
    if columns.fixed != NONE:
        costs[columns.fixed] = constant
    return costs


def _unserved_load(network: Network, columns: Columns) -> Floats:
    """Return (columns,) load left unserved by each variable at 1; units of a good that uses no load count as load."""
    costs = np.zeros(len(columns.all))
    load = network.demand * np.where(network.load > 0, network.load, 1.0)
    there = columns.unserved != NONE
    np.add.at(costs, columns.unserved[there], load[there])
    return costs
