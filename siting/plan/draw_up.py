"""
Draw a plan up in the study's own names from what was decided and what moves.

Nothing here decides anything, and nothing is taken from a solver's objective: the cost is what the parts add up to.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.network.tariffs import NO_TARIFF
from siting.plan.freight_words import circuity_words, sensitivity_sentence
from siting.plan.plan import (
    LOAD_TOLERANCE,
    CustomerLine,
    Flow,
    Plan,
    SiteLine,
    SiteVerdict,
    SupplierLine,
    SupplierVerdict,
)
from siting.plan.pricing import cost_lines, costs_to_serve, moves_of
from siting.plan.proof import PROVED_GAP, Proof, outcome_of
from siting.plan.road_sensitivity import road_sensitivity
from siting.plan.service import service_of, tonnes_co2e_of
from siting.plan.words import percent
from siting.study.fingerprint import fingerprint
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.arrays import Floats
    from siting.network.decisions import Amounts, Decisions
    from siting.network.network import Network
    from siting.plan.plan import Service, Today
    from siting.plan.pricing import AllMoves, Moves
    from siting.study.tables import Study

FULL_SHARE = 0.85
"""A site fuller than this with demand grown by `GROWTH` is flagged."""

GROWTH = 0.10
"""Growth of demand at which sites are checked for being full."""

MOST_OF_THE_LOAD = 0.5
"""Where more of the load goes over estimated distances, what they decide is told."""

NO_BOUNDS: Mapping[int, float] = {}


def draw_up(  # noqa: PLR0913  # what a search hands over; all but the four inputs by name
    study: Study,
    network: Network,
    decisions: Decisions,
    amounts: Amounts,
    *,
    bound: float | None,
    gap_asked: float,
    seconds: float,
    engine: str,
    reason: str = "",
    site_count_bounds: Mapping[int, float] = NO_BOUNDS,
    today: Today | None = None,
) -> Plan:
    """
    Return the plan that decisions and amounts make.

    Parameters
    ----------
    study
        The study that is answered.
    network
        Its numbers.
    decisions
        Which options open, which suppliers are signed.
    amounts
        Units of the good a year on each lane of the network.
    bound
        Money a year that no plan can undercut; None where none was found.
    gap_asked
        The gap at which the search was allowed to stop.
    seconds
        How long the search took.
    engine
        Name of the engine that ran.
    reason
        Why that engine, where it was picked automatically.
    site_count_bounds
        Bound for each exact number of open sites, where kept.
    today
        What the saving is measured from; None only in the plan of today itself.

    Returns
    -------
    plan
        Priced from the network's arrays and the tables. Nobody sees it before it passes the audit.
    """
    moves = moves_of(study, network, amounts)
    lines = cost_lines(study, network, decisions, moves)
    cost = sum(lines.values())
    sites = _site_lines(study, network, decisions, moves.outbound)
    suppliers = _supplier_lines(study, network, decisions, moves)
    service = service_of(network, moves)
    bound = _without_noise(bound, cost)
    return Plan(
        title=study.settings.title,
        currency=study.settings.currency,
        unit=study.settings.unit,
        fingerprint=fingerprint(study),
        proof=Proof(
            outcome=outcome_of(cost, bound, gap_asked),
            cost=cost,
            bound=bound,
            gap_asked=gap_asked,
            seconds=seconds,
            engine=engine,
            reason=reason,
            site_count_bounds=dict(site_count_bounds),
        ),
        sites=sites,
        suppliers=suppliers,
        flows=_flows(network, moves),
        customers=_customer_lines(network, moves, amounts.marginal_cost),
        cost_lines=lines,
        service=service,
        tonnes_co2e=tonnes_co2e_of(study.settings, moves),
        one_off=sum(line.one_off for line in sites) + sum(line.one_off for line in suppliers),
        today=today,
        warnings=_warnings(study, network, sites, service, moves, cost),
    )


def _without_noise(bound: float | None, cost: float) -> float | None:
    """Return the bound, or the cost where the bound is above it by no more than rounding."""
    if bound is not None and cost < bound <= cost + PROVED_GAP * abs(cost):
        return cost
    return bound


def _site_lines(study: Study, network: Network, decisions: Decisions, out: Moves) -> tuple[SiteLine, ...]:
    """Return every site with its verdict."""
    count = len(network.sites)
    throughput = np.bincount(out.origin, weights=out.load, minlength=count)
    pairs = np.unique(np.stack([out.origin, out.destination]), axis=1)
    customers = np.bincount(pairs[0], minlength=count)
    option_of = {int(network.option_site[o]): int(o) for o in np.flatnonzero(decisions.option_open)}
    lines = []
    for i, name in enumerate(network.sites):
        running, option, load = bool(network.site_running[i]), option_of.get(i), float(throughput[i])
        if option is None:
            lines.append(
                SiteLine(
                    site=name,
                    verdict=SiteVerdict.CLOSE if running else SiteVerdict.LEAVE,
                    size="",
                    throughput=load,
                    capacity=None,
                    customers=int(customers[i]),
                    charge=float(network.site_closing[i]) if running else 0.0,
                    one_off=float(network.site_closing_one_off[i]) if running else 0.0,
                )
            )
            continue
        lines.append(
            SiteLine(
                site=name,
                verdict=SiteVerdict.KEEP if running else SiteVerdict.OPEN,
                size=study.options[option].size,
                throughput=load,
                capacity=_limit(network.option_capacity[option]),
                customers=int(customers[i]),
                charge=float(network.option_charge[option]),
                one_off=float(network.option_one_off[option]),
                note=_site_note(study, network, i, option, load),
            )
        )
    return tuple(lines)


def _site_note(study: Study, network: Network, site: int, option: int, load: float) -> str:
    """Return what is worth saying about an open site: that it is empty and why, or that it changes size."""
    if load <= LOAD_TOLERANCE:
        if not network.site_running[site]:
            return "empty: nothing moves through it"
        if network.site_pinned_open[site]:
            return "empty: pinned open"
        if network.site_closing[site] > network.option_charge[option]:
            return "empty: closing costs more than running"
        return "empty: nothing moves through it"
    if network.site_running[site] and not network.option_running[option]:
        was = np.flatnonzero((network.option_site == site) & network.option_running)
        before = study.options[int(was[0])].size if was.size else ""
        return f"changes size from {before} to {study.options[option].size}"
    return ""


def _supplier_lines(study: Study, network: Network, decisions: Decisions, moves: AllMoves) -> tuple[SupplierLine, ...]:
    """Return every supplier with its verdict."""
    count = len(network.suppliers)
    volume = np.zeros(count)
    for leg in (moves.inbound, moves.direct):
        np.add.at(volume, leg.origin, leg.load)
    offered = (network.offer_capacity * network.load).sum(axis=1)
    capacity = np.minimum(network.supplier_capacity, offered)
    lines = []
    for k, row in enumerate(study.suppliers):
        was, now = bool(network.supplier_signed[k]), bool(decisions.supplier_signed[k])
        if now:
            verdict = SupplierVerdict.STAY if was else SupplierVerdict.SIGN
            charge, one_off = network.supplier_charge[k], network.supplier_one_off[k]
        else:
            verdict = SupplierVerdict.DROP if was else SupplierVerdict.LEAVE
            charge = network.supplier_dropping[k] if was else 0.0
            one_off = network.supplier_dropping_one_off[k] if was else 0.0
        lines.append(
            SupplierLine(
                supplier=row.supplier,
                verdict=verdict,
                volume=float(volume[k]),
                capacity=_limit(capacity[k]),
                charge=float(charge),
                one_off=float(one_off),
                note=_supplier_note(network, k, float(volume[k])) if now else "",
            )
        )
    return tuple(lines)


def _supplier_note(network: Network, supplier: int, volume: float) -> str:
    """Return that nothing is bought from a signed supplier, and why; empty where something is."""
    if volume > LOAD_TOLERANCE:
        return ""
    if network.supplier_pinned_signed[supplier]:
        return "empty: pinned signed"
    dropping, staying = network.supplier_dropping[supplier], network.supplier_charge[supplier]
    if network.supplier_signed[supplier] and dropping > staying:
        return "empty: dropping costs more than staying"
    return "empty: nothing is bought from it"


def _limit(value: float) -> float | None:
    """Return a capacity, None where unlimited."""
    return float(value) if np.isfinite(value) else None


def _ends(network: Network, leg: Leg) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Return the names of origins and destinations of a leg."""
    origins = network.sites if leg is Leg.OUTBOUND else network.suppliers
    return origins, network.sites if leg is Leg.INBOUND else network.customers


def _flows(network: Network, moves: AllMoves) -> tuple[Flow, ...]:
    """Return what moves, by leg, origin, destination and good."""
    flows = []
    named = (*network.tariffs, "", "")  # `OWN_COST` and `NO_TARIFF` take the last two
    for leg in moves:
        origins, destinations = _ends(network, leg.leg)
        km = leg.km.tolist()
        flows += [
            Flow(
                leg=leg.leg,
                origin=origins[leg.origin[n]],
                destination=destinations[leg.destination[n]],
                good=network.goods[leg.good[n]],
                amount=amount,
                km=None if np.isnan(km[n]) else km[n],
                km_given=bool(leg.km_given[n]),
                cost=float(leg.cost[n]),
                tariff=named[leg.tariff[n]],
            )
            for n, amount in enumerate(leg.amount.tolist())
        ]
    return tuple(flows)


def _customer_lines(network: Network, moves: AllMoves, marginal: Floats) -> tuple[CustomerLine, ...]:
    """Return every customer with what serves it."""
    served: list[dict[str, float]] = [{} for _ in network.customers]
    load_km = np.zeros(len(network.customers))
    for leg in (moves.outbound, moves.direct):
        origins = _ends(network, leg.leg)[0]
        np.add.at(load_km, leg.destination, leg.load * leg.km)
        for origin, customer, load in zip(leg.origin, leg.destination, leg.load.tolist(), strict=True):
            loads = served[customer]
            loads[origins[origin]] = loads.get(origins[origin], 0.0) + load
    cost = costs_to_serve(network, moves)
    lines = []
    for j, name in enumerate(network.customers):
        load = sum(served[j].values())
        known = load > 0 and not np.isnan(load_km[j])
        lines.append(
            CustomerLine(
                customer=name,
                origins=tuple(sorted(served[j], key=served[j].__getitem__, reverse=True)),
                load=load,
                km=float(load_km[j]) / load if known else None,
                cost_to_serve=float(cost[j]),
                marginal_cost={}
                if network.single_source[j]
                else {
                    good: float(value)
                    for good, value in zip(network.goods, marginal[j], strict=True)
                    if not np.isnan(value)
                },
            )
        )
    return tuple(lines)


def _warnings(  # noqa: PLR0913, PLR0917  # all that may be worth a warning
    study: Study, network: Network, sites: tuple[SiteLine, ...], service: Service, moves: AllMoves, cost: float
) -> tuple[str, ...]:
    """Return what the analyst should know about this plan."""
    warnings = []
    unpriced = _outside_tariffs(study, moves)
    if unpriced:
        warnings.append(f"{percent(unpriced)} of all load moved fits no tariff and goes at the rates of the settings.")
    if service.estimated_share:
        warnings.append(
            f"{percent(service.estimated_share)} of the load is delivered over estimated distances "
            f"(straight line times {circuity_words(study)}), which understate short trips."
        )
        if service.estimated_share > MOST_OF_THE_LOAD:
            warnings.append(sensitivity_sentence(study, road_sensitivity(study, network, moves), cost))
    grown = [(line.site, line.utilisation * (1 + GROWTH)) for line in sites if line.utilisation is not None]
    full = [f"{site} ({percent(share)})" for site, share in grown if share > FULL_SHARE]
    if full:
        higher, limit = percent(GROWTH), percent(FULL_SHARE)
        warnings.append(f"With demand {higher} higher these sites would be above {limit} full: {', '.join(full)}.")
    return tuple(warnings)


def _outside_tariffs(study: Study, moves: AllMoves) -> float:
    """Return the share of all load moved that goes at the rates although the study has tariffs."""
    moved = sum(float(leg.load.sum()) for leg in moves)
    if not study.tariffs or not moved:
        return 0.0
    return sum(float(leg.load[leg.tariff == NO_TARIFF].sum()) for leg in moves) / moved
