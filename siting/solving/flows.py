"""
The flows of a plan: decisions held, what moves is found anew as an exact linear program, straight in HiGHS.

A solver of whole numbers takes 0.999999999 for 1, and what leaks through such an answer would cost a big site's charge.
Here closed sites have no lanes at all. Flows are shares of demand (inbound: of the demand within the site's lanes).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import highspy
import numpy as np

from siting.errors import EngineError
from siting.network.decisions import NO_SOURCE, Amounts
from siting.solving.flow_rows import FlowRows
from siting.solving.highs import QuietHighs
from siting.solving.model import money_unit
from siting.solving.tightest import is_near

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.network.decisions import Decisions
    from siting.network.network import Network

TINY = 1e-9
"""Shares below this are noise of the solver: taken away, and the rest scaled so that every demand is met exactly."""

PRIMAL = 4
"""HiGHS's number for the primal simplex method, in its option `simplex_strategy`."""

SHORT = 1e-6
"""Share of all load by which capacity must fall short to be too little at sight: well above every tolerance."""

FEASIBLE = 1e-8
"""Feasibility tolerance of the flows: looser than that of the search, so that its findings are never refused."""


def flows_for(network: Network, decisions: Decisions) -> Amounts | None:
    """
    Return the cheapest flows with the decisions held.

    Capacities, offers, least volumes, the service share and the sources of single-sourced customers are kept; counts,
    budget and rules are matters of the decisions alone and not looked at.

    Parameters
    ----------
    network
        Where to move.
    decisions
        Which options are open, which suppliers signed, and where single-sourced customers get everything from.

    Returns
    -------
    amounts
        Units of the good a year on each lane, and the dual of each demand row in money per unit (NaN for single-sourced
        customers and where nothing is needed); None where the decisions cannot serve all demand.

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    if _too_little(network, decisions):
        return None
    held = _Held(network, decisions)
    if held.broken:
        return None
    rows = _rows(network, decisions, held)
    answer = _solve(held, rows)
    if answer is None:
        return None
    shares, duals = answer
    outbound, direct, inbound = np.split(shares, [held.outbound.size, held.outbound.size + held.direct.size])
    marginal = np.full(network.demand.shape, np.nan)
    marginal[held.asked] = duals / network.demand[held.asked]
    return _clean(network, held, outbound, direct, inbound, marginal)


def unserved_by(network: Network, decisions: Decisions) -> Floats:
    """
    Return what decisions leave unserved at least, where no customer is single-sourced.

    Parameters
    ----------
    network
        Without least volumes and service share, which may not be met while demand goes unserved.
    decisions
        Which options are open and which suppliers signed.

    Returns
    -------
    missing
        Shape (customers, goods). Units a year; the load unserved is least (a good without load counts its units).

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    held = _Held(network, decisions)
    customers = held.outbound.size + held.direct.size
    to = np.concatenate([network.outbound.destination[held.outbound], network.direct.destination[held.direct]])
    good = np.concatenate([network.outbound.good[held.outbound], network.direct.good[held.direct]])
    missing = network.demand.copy()
    if not customers:
        return missing
    weight = np.where(network.load > 0, network.load, 1.0)
    gain = np.zeros(held.units.size)
    gain[:customers] = held.units[:customers] * weight[good]
    problem = _rows(network, decisions, held).as_problem(-gain / float(gain.max()))
    lower = np.array(problem.row_lower_)
    lower[: np.count_nonzero(held.asked)] = 0.0
    problem.row_lower_ = lower
    highs = _run(problem, primal=True)  # nothing moved is a solution, so that the primal simplex need not look for one
    if highs.getModelStatus() != highspy.HighsModelStatus.kOptimal:
        msg = f"HiGHS could not find what is unserved: {highs.modelStatusToString(highs.getModelStatus())}."
        raise EngineError(msg)
    shares = np.array(highs.getSolution().col_value)[:customers]
    np.subtract.at(missing, (to, good), held.units[:customers] * shares)
    return missing


def price(network: Network, decisions: Decisions, amounts: Amounts) -> float:
    """
    Return what decisions and amounts cost, money a year.

    Parameters
    ----------
    network
        Charges and lane costs.
    decisions, amounts
        Of that network.

    Returns
    -------
    cost
        Charges of what is open, signed, closed and dropped, and all that moves.
    """
    open_sites = np.zeros(len(network.sites), dtype=np.bool_)
    open_sites[network.option_site[decisions.option_open]] = True
    charges = network.option_charge[decisions.option_open].sum() + network.site_closing[~open_sites].sum()
    charges += network.supplier_charge[decisions.supplier_signed].sum()
    charges += network.supplier_dropping[~decisions.supplier_signed].sum()
    for lanes, moved in (
        (network.inbound, amounts.inbound),
        (network.outbound, amounts.outbound),
        (network.direct, amounts.direct),
    ):
        charges += (lanes.cost * moved).sum()  # a product of vectors would wake threads for less than they take
    return float(charges)


def _too_little(network: Network, decisions: Decisions) -> bool:
    """Return whether the open sites cannot hold all demand by far, which is seen without a linear program."""
    if len(network.direct):
        return False
    asked = float((network.demand @ network.load).sum())
    return float(network.option_capacity[decisions.option_open].sum()) < asked * (1.0 - SHORT)


class _Held:
    """What the decisions fix: capacities, the lanes that may be used, the flows of single-sourced customers."""

    def __init__(self, network: Network, decisions: Decisions) -> None:
        sites = len(network.sites)
        is_open = np.zeros(sites, dtype=np.bool_)
        is_open[network.option_site[decisions.option_open]] = True
        self.is_open = is_open
        self.capacity = np.zeros(sites)
        self.least = np.zeros(sites)
        self.capacity[network.option_site[decisions.option_open]] = network.option_capacity[decisions.option_open]
        self.least[network.option_site[decisions.option_open]] = network.option_least[decisions.option_open]

        split = ~network.single_source
        self.asked = (network.demand > 0) & split[:, None]
        out, straight, into = network.outbound, network.direct, network.inbound
        self.outbound = np.flatnonzero(is_open[out.origin] & split[out.destination])
        self.direct = np.flatnonzero(decisions.supplier_signed[straight.origin] & split[straight.destination])

        source = decisions.source
        taken = is_open[out.origin] & ~split[out.destination] & (source[out.destination] == out.origin)
        self.fixed_outbound = np.where(taken, network.demand[out.destination, out.good], 0.0)
        taken = decisions.supplier_signed[straight.origin] & ~split[straight.destination]
        taken &= source[straight.destination] == straight.origin + sites
        self.fixed_direct = np.where(taken, network.demand[straight.destination, straight.good], 0.0)

        within = np.zeros((sites, len(network.goods)))
        np.add.at(within, (out.origin, out.good), self.fixed_outbound)
        usable = self.outbound
        np.add.at(
            within,
            (out.origin[usable], out.good[usable]),
            network.demand[out.destination[usable], out.good[usable]],
        )
        reachable = within[into.destination, into.good]
        self.inbound = np.flatnonzero(decisions.supplier_signed[into.origin] & (reachable > 0))
        self.units = np.concatenate(
            [
                network.demand[out.destination[self.outbound], out.good[self.outbound]],
                network.demand[straight.destination[self.direct], straight.good[self.direct]],
                reachable[self.inbound],
            ]
        )
        self.cost = self.units * np.concatenate(
            [out.cost[self.outbound], straight.cost[self.direct], into.cost[self.inbound]]
        )
        self.broken = not self._whole(network)

    def _whole(self, network: Network) -> bool:
        """Return whether every single-sourced customer gets all it needs from its source."""
        got = np.zeros(network.demand.shape)
        np.add.at(got, (network.outbound.destination, network.outbound.good), self.fixed_outbound)
        np.add.at(got, (network.direct.destination, network.direct.good), self.fixed_direct)
        needed = network.demand * network.single_source[:, None]
        return bool(np.all(got >= needed))


def _rows(network: Network, decisions: Decisions, held: _Held) -> FlowRows:
    """Return every row; the demand rows come first, customer by customer and good by good."""
    out, straight, into = network.outbound, network.direct, network.inbound
    goods, sites, suppliers = len(network.goods), len(network.sites), len(network.suppliers)
    column_out = np.arange(held.outbound.size)
    column_direct = column_out.size + np.arange(held.direct.size)
    column_in = column_out.size + column_direct.size + np.arange(held.inbound.size)
    units = held.units
    rows = FlowRows()

    asked = np.full(network.demand.shape, NO_SOURCE)
    asked[held.asked] = np.arange(np.count_nonzero(held.asked))
    rows.add(
        np.concatenate(
            [
                asked[out.destination[held.outbound], out.good[held.outbound]],
                asked[straight.destination[held.direct], straight.good[held.direct]],
            ]
        ),
        np.concatenate([column_out, column_direct]),
        np.ones(column_out.size + column_direct.size),
        np.ones(np.count_nonzero(held.asked)),
        np.ones(np.count_nonzero(held.asked)),
    )
    if network.two_echelons:
        leaves = np.zeros((sites, goods))
        np.add.at(leaves, (out.origin, out.good), held.fixed_outbound)
        key_in = into.destination[held.inbound].astype(np.int64) * goods + into.good[held.inbound]
        key_out = out.origin[held.outbound].astype(np.int64) * goods + out.good[held.outbound]
        rows.add(
            np.concatenate([key_in, key_out]),
            np.concatenate([column_in, column_out]),
            np.concatenate([units[column_in], -units[column_out]]),
            leaves.ravel(),
            leaves.ravel(),
        )
    moved = np.zeros(sites)
    np.add.at(moved, out.origin, held.fixed_outbound * network.load[out.good])
    load = units[column_out] * network.load[out.good[held.outbound]]
    rows.add(out.origin[held.outbound], column_out, load, held.least - moved, held.capacity - moved)

    sold = np.zeros((suppliers, goods))
    np.add.at(sold, (straight.origin, straight.good), held.fixed_direct)
    origin = np.concatenate([straight.origin[held.direct], into.origin[held.inbound]]).astype(np.int64)
    good = np.concatenate([straight.good[held.direct], into.good[held.inbound]])
    column = np.concatenate([column_direct, column_in])
    signed = decisions.supplier_signed
    least = np.where(signed[:, None], network.offer_least, 0.0) - sold
    most = np.where(signed[:, None], network.offer_capacity, 0.0) - sold
    rows.add(origin * goods + good, column, units[column], least.ravel(), most.ravel())
    sold_load = sold @ network.load
    least = np.where(signed, network.supplier_least, 0.0) - sold_load
    most = np.where(signed, network.supplier_capacity, 0.0) - sold_load
    rows.add(origin, column, units[column] * network.load[good], least, most)
    if network.service_share > 0:
        _service(network, held, rows, column_out, column_direct)
    return rows


def _service(
    network: Network,
    held: _Held,
    rows: FlowRows,
    column_out: NDArray[np.int64],
    column_direct: NDArray[np.int64],
) -> None:
    """Ask for the service share by weight."""
    asked = network.service_share * float((network.demand @ network.weight_t).sum())
    columns, weights = [], []
    for lanes, chosen, column, fixed in (
        (network.outbound, held.outbound, column_out, held.fixed_outbound),
        (network.direct, held.direct, column_direct, held.fixed_direct),
    ):
        near = is_near(network, lanes)
        asked -= float((fixed * network.weight_t[lanes.good])[near].sum())
        use = near[chosen]
        columns.append(column[use])
        weights.append((held.units[column] * network.weight_t[lanes.good[chosen]])[use])
    column = np.concatenate(columns)
    rows.add(np.zeros(column.size), column, np.concatenate(weights), np.array([asked]), np.array([np.inf]))


def _solve(held: _Held, rows: FlowRows) -> tuple[Floats, Floats] | None:
    """Return the shares and the duals of the demand rows in money, or None where nothing is feasible."""
    count = int(np.count_nonzero(held.asked))
    if not held.units.size:
        return (np.zeros(0), np.zeros(count)) if rows.hold_without_flow(FEASIBLE) else None
    money = money_unit(float(np.abs(held.cost).max(initial=0.0)))
    highs = _run(rows.as_problem(held.cost / money))
    status = highs.getModelStatus()
    if status in {highspy.HighsModelStatus.kInfeasible, highspy.HighsModelStatus.kUnboundedOrInfeasible}:
        return None
    if status != highspy.HighsModelStatus.kOptimal:
        msg = f"HiGHS could not settle the flows of a plan: {highs.modelStatusToString(status)}."
        raise EngineError(msg)
    solution = highs.getSolution()
    return np.array(solution.col_value), np.array(solution.row_dual)[:count] * money


def _run(problem: highspy.HighsLp, *, primal: bool = False) -> highspy.Highs:
    highs = QuietHighs()  # type: ignore[no-untyped-call] # highspy types only part of its methods
    highs.setOptionValue("output_flag", False)  # noqa: FBT003 - highspy takes it by position
    highs.setOptionValue("primal_feasibility_tolerance", FEASIBLE)
    highs.setOptionValue("dual_feasibility_tolerance", TINY)
    highs.setOptionValue("presolve", "off")  # next to nothing falls away here, and it takes half of the time
    if primal:
        highs.setOptionValue("simplex_strategy", PRIMAL)
    highs.passModel(problem)
    highs.run()
    return highs


def _clean(  # noqa: PLR0913, PLR0917 - the parts of one answer
    network: Network,
    held: _Held,
    outbound: Floats,
    direct: Floats,
    inbound: Floats,
    marginal: Floats,
) -> Amounts:
    """Take noise away and scale the rest: every demand is met exactly, inflow equals outflow."""
    out, straight, into = network.outbound, network.direct, network.inbound
    outbound, direct = _without_noise(outbound), _without_noise(direct)
    served = np.zeros(network.demand.shape)
    np.add.at(served, (out.destination[held.outbound], out.good[held.outbound]), outbound)
    np.add.at(served, (straight.destination[held.direct], straight.good[held.direct]), direct)
    scale = np.divide(network.demand, served, out=np.zeros_like(served), where=served > 0)
    moved = held.fixed_outbound.copy()
    moved[held.outbound] = outbound * scale[out.destination[held.outbound], out.good[held.outbound]]
    dropped = held.fixed_direct.copy()
    dropped[held.direct] = direct * scale[straight.destination[held.direct], straight.good[held.direct]]

    leaves = np.zeros((len(network.sites), len(network.goods)))
    np.add.at(leaves, (out.origin, out.good), moved)
    bought = _without_noise(inbound) * held.units[held.outbound.size + held.direct.size :]
    enters = np.zeros_like(leaves)
    np.add.at(enters, (into.destination[held.inbound], into.good[held.inbound]), bought)
    scale = np.divide(leaves, enters, out=np.zeros_like(leaves), where=enters > 0)
    arrives = np.zeros(len(into))
    arrives[held.inbound] = bought * scale[into.destination[held.inbound], into.good[held.inbound]]
    return Amounts(inbound=arrives, outbound=moved, direct=dropped, marginal_cost=marginal)


def _without_noise(shares: Floats) -> Floats:
    return np.where(shares < TINY, 0.0, shares)
