"""
Plans to begin a restricted search from, and what other searches of the same study prove about it.

A search without X begins from the incumbent without X where that can serve everything, from the best plan already found
that has no X, or from the incumbent with one more site or supplier in the place of X. And what is known about others
narrows it: where every plan without Y is known to cost more than the start, Y is in every plan worth looking for.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.questions.restriction import parts_of
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping
    from collections.abc import Set as AbstractSet

    from siting.network.network import Network
    from siting.plan.plan import Plan
    from siting.questions.restriction import Restriction
    from siting.study.tables import Study

    Parts = frozenset[tuple[str, str]]

STAND_INS = 4
"""Sites or suppliers tried in turn in the place of what is held out; each costs one linear program of the flows."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Hints:
    """What other searches of a study have found."""

    without: Mapping[str, float] = field(default_factory=dict)
    """Money a year that no plan without the site or supplier can undercut."""
    plans: tuple[tuple[float, Parts], ...] = ()
    """Cost and parts of plans, the cheapest first."""

    def fitting(self, restriction: Restriction) -> Parts | None:
        """Return the parts of the cheapest plan that keeps a restriction, rulings and counts aside; None if none."""
        for _, parts in self.plans:
            names = {name for name, _ in parts}
            if not names & restriction.out and restriction.pinned <= names and not parts & restriction.without:
                return parts
        return None

    def cost_of(self, parts: Parts) -> float | None:
        """Return what the plan with exactly these parts costs, all of them usable; None where none was found."""
        return next((cost for cost, known in self.plans if known == parts), None)

    def needed(self, names: AbstractSet[str], ceiling: float) -> dict[str, float]:
        """
        Return what is in every plan that costs less than `ceiling`, with the bound that says so.

        Parameters
        ----------
        names
            Among which to look: what the plan to begin from has.
        ceiling
            Money a year.

        Returns
        -------
        needed
            Name and bound; a plan without one of them costs at least its bound, which is at least `ceiling`.
        """
        return {name: bound for name, bound in self.without.items() if name in names and bound >= ceiling}


def pinned_in(network: Network, names: set[str]) -> Network:
    """Return the network with more sites pinned open and suppliers pinned signed."""
    sites = np.fromiter((name in names for name in network.sites), dtype=np.bool_)
    suppliers = np.fromiter((name in names for name in network.suppliers), dtype=np.bool_)
    return replace(
        network,
        site_pinned_open=network.site_pinned_open | sites,
        supplier_pinned_signed=network.supplier_pinned_signed | suppliers,
    )


def stand_ins(study: Study, network: Network, plan: Plan, out: frozenset[str]) -> Iterator[Parts]:
    """
    Yield the plan's parts without what is held out and with one other part each, the most promising first.

    Parameters
    ----------
    study, network
        The study asked about, and its numbers.
    plan
        The incumbent.
    out
        What is held out.

    Yields
    ------
    parts
        At most `STAND_INS`: sites by their charge and what serving the orphaned customers from them costs (a part of
        it where their capacity is smaller, in proportion), suppliers by their charge.
    """
    kept = frozenset(part for part in parts_of(plan) if part[0] not in out)
    there = {name for name, _ in kept} | out
    if out & set(network.suppliers):
        free = [at for at, name in enumerate(network.suppliers) if name not in there]
        free.sort(key=lambda at: float(network.supplier_charge[at]))
        yield from (kept | {(network.suppliers[at], "")} for at in free[:STAND_INS])
        return
    worth = _worth_of_options(network, _orphaned(network, plan, out))
    order = [at for at in np.argsort(worth).tolist() if np.isfinite(worth[at]) and study.options[at].site not in there]
    yield from (kept | {(study.options[at].site, study.options[at].size)} for at in order[:STAND_INS])


def _orphaned(network: Network, plan: Plan, out: frozenset[str]) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Return (C, G) units that come from what is held out."""
    customer = {name: at for at, name in enumerate(network.customers)}
    good = {name: at for at, name in enumerate(network.goods)}
    orphaned = np.zeros(network.demand.shape)
    for flow in plan.flows:
        if flow.leg is Leg.OUTBOUND and flow.origin in out:
            orphaned[customer[flow.destination], good[flow.good]] += flow.amount
    return orphaned


def _worth_of_options(
    network: Network, orphaned: np.ndarray[tuple[int, ...], np.dtype[np.float64]]
) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Return (O,) money a year per share of the orphaned load that each option can take; inf where it takes none."""
    lanes, sites = network.outbound, len(network.sites)
    units = orphaned[lanes.destination, lanes.good]
    load = np.bincount(lanes.origin, weights=units * network.load[lanes.good], minlength=sites)
    cost = np.bincount(lanes.origin, weights=units * lanes.cost, minlength=sites)
    asked = max(float((orphaned @ network.load).sum()), np.finfo(float).tiny)
    site = network.option_site
    share = np.minimum(load[site], network.option_capacity) / asked
    part = np.divide(share * asked, load[site], out=np.zeros(site.size), where=load[site] > 0)
    money = network.option_charge + cost[site] * part
    return np.where(share > 0, money / np.where(share > 0, share, 1.0), np.inf)


def regret(network: Network, plan: Plan, name: str) -> float:
    """
    Return roughly what doing without a site or supplier costs, so that the dearest can be asked about first.

    Parameters
    ----------
    network
        The numbers of the study.
    plan
        The incumbent.
    name
        A site or supplier of it.

    Returns
    -------
    money
        A year: what its customers' lanes cost more from the next site that is open, less its charge; the load it moves
        where it serves no customer itself. No bound of any kind.
    """
    line = next((line for line in plan.sites if line.site == name), None)
    if line is None:
        return next(supplier.volume for supplier in plan.suppliers if supplier.supplier == name)
    is_open = {part for part, _ in parts_of(plan)} - {name}
    there = np.fromiter((site in is_open for site in network.sites), dtype=np.bool_)
    lanes = network.outbound
    orphaned = _orphaned(network, plan, frozenset({name}))
    best = np.full(network.demand.shape, np.inf)
    usable = there[lanes.origin]
    np.minimum.at(best, (lanes.destination[usable], lanes.good[usable]), lanes.cost[usable])
    own = lanes.origin == network.sites.index(name)
    dearest = float(lanes.cost.max(initial=0.0))
    more = np.minimum(best[lanes.destination[own], lanes.good[own]], dearest) - lanes.cost[own]
    return float(orphaned[lanes.destination[own], lanes.good[own]] @ more) - line.charge
