"""
Today: the running sites at their running size and the signed suppliers, all in use, flows re-planned.

It is what every plan's saving is measured from. Rulings, rules, counts, budget, service share and least volumes are
ignored; capacity, reach, bars and single sourcing hold. Nothing opens or closes, so no one-off money is spent.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.errors import AuditError
from siting.listener import Silent, Stop
from siting.network.decisions import NO_SOURCE, Decisions
from siting.plan.audit import audit
from siting.plan.draw_up import draw_up
from siting.plan.plan import LOAD_TOLERANCE, Today, TodayOutcome, Unserved
from siting.solving.columns import NONE
from siting.solving.direct import direct, search
from siting.solving.flows import flows_for, price
from siting.solving.model import build_model
from siting.solving.settle import settled_bound

if TYPE_CHECKING:
    from siting.arrays import Flags, Floats, Positions
    from siting.listener import Listener
    from siting.network.network import Network
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

ENGINE = "direct"
"""What finds the plan of today; without single-sourced customers it is one linear program."""


def plan_today(
    study: Study,
    network: Network,
    settings: SolveSettings | None = None,
    *,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> Today:
    """
    Return the plan of today, how much demand today leaves unserved, or why there is no today.

    Parameters
    ----------
    study
        The study.
    network
        Its numbers.
    settings
        Gap and time limit where single-sourced customers make today a search; the study's own where None.
    listener, stop
        Told how far the search is; ask it to stop.

    Returns
    -------
    today
        `served` with its audited plan, `short` with the least load unserved by customer and good, or `absent`.

    Raises
    ------
    AuditError
        If the plan of today fails its audit.
    EngineError
        If the solver gives up for a reason of its own.
    """
    reason = _why_absent(network)
    if reason:
        return Today(outcome=TodayOutcome.ABSENT, reason=reason, plan=None)
    settings = settings or study.settings.solve
    began = time.monotonic()
    as_it_is = unlimited(network)
    held = Decisions(
        option_open=network.option_running,
        supplier_signed=network.supplier_signed,
        source=np.full(len(network.customers), NO_SOURCE, dtype=np.int32),
    )
    if not network.single_source.any():
        found = _Sources(source=held.source, bound=None, short=None)
    else:
        found = _sources(study, as_it_is, settings, listener or Silent(), stop or Stop())
    if found.short is not None:
        return found.short
    decisions = replace(held, source=found.source)
    amounts = flows_for(as_it_is, decisions)
    if amounts is None:
        missing, _ = _least_unserved(as_it_is, settings)
        return _short(study, network, missing, exact=True)
    cost = price(network, decisions, amounts)
    plan = draw_up(
        study,
        network,
        decisions,
        amounts,
        bound=settled_bound(found.bound, cost) if network.single_source.any() else cost,
        gap_asked=settings.gap,
        seconds=time.monotonic() - began,
        engine=ENGINE,
    )
    report = audit(study, plan, of_today=True)
    if not report.passed:
        msg = "the plan of today failed its audit: " + "; ".join(report.faults)
        raise AuditError(msg)
    return Today(outcome=TodayOutcome.SERVED, reason="", plan=plan)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Sources:
    """Where single-sourced customers get everything from today, or that today is short."""

    source: Positions
    bound: float | None
    short: Today | None


def _sources(study: Study, as_it_is: Network, settings: SolveSettings, listener: Listener, stop: Stop) -> _Sources:
    """Search the sources; where the search ends without any, find the least load unserved."""
    network = only_running(as_it_is)
    result = direct(network, settings, listener=listener, stop=stop)
    if result.decisions is not None:
        return _Sources(source=result.decisions.source, bound=result.bound, short=None)
    missing, source = _least_unserved(as_it_is, settings)
    served = not _above_noise(as_it_is, missing).any()
    short = None if served else _short(study, as_it_is, missing, exact=result.impossible)
    return _Sources(source=source, bound=result.bound, short=short)


def unlimited(network: Network) -> Network:
    """
    Return the network without rules, counts, budget, service share and least volumes.

    Parameters
    ----------
    network
        Of the study.

    Returns
    -------
    network
        With the same lanes and options.
    """
    return replace(
        network,
        option_least=np.zeros_like(network.option_least),
        supplier_least=np.zeros_like(network.supplier_least),
        offer_least=np.zeros_like(network.offer_least),
        rules=(),
        fewest_sites=0,
        most_sites=len(network.sites),
        one_off_budget=np.inf,
        service_km=np.inf,
        service_share=0.0,
    )


def only_running(network: Network) -> Network:
    """
    Return the network with the running options and signed suppliers pinned, and nothing else to choose.

    Parameters
    ----------
    network
        Of the study.

    Returns
    -------
    network
        With the same lanes and sites, but only the options that are running.
    """
    kept = network.option_running
    running = np.zeros(len(network.sites), dtype=np.bool_)
    running[network.option_site[kept]] = True
    return replace(
        network,
        option_site=network.option_site[kept],
        option_running=network.option_running[kept],
        option_charge=network.option_charge[kept],
        option_one_off=network.option_one_off[kept],
        option_capacity=network.option_capacity[kept],
        option_least=network.option_least[kept],
        site_pinned_open=running,
        site_pinned_shut=~running,
        supplier_pinned_signed=network.supplier_signed,
        supplier_pinned_unsigned=~network.supplier_signed,
    )


def _why_absent(network: Network) -> str:
    """Return why there is no today; empty where there is one."""
    if network.sites and not network.option_running.any():
        return "No site is running, so there is no today to measure a saving from."
    if network.suppliers and not network.supplier_signed.any():
        return "No supplier is signed, so there is no today to measure a saving from."
    return ""


def _least_unserved(as_it_is: Network, settings: SolveSettings) -> tuple[Floats, Positions]:
    """
    Return the least units left unserved by customer and good, and the sources of single-sourced customers then.

    A single-sourced customer is served whole or not at all. Stopping is not heard here: leaving everything unserved is
    a solution from the start, so the time limit suffices.
    """
    model = build_model(only_running(as_it_is), serve_all=False)
    found = search(model, settings, listener=Silent(), stop=Stop())
    if found.values is None:
        return as_it_is.demand, np.full(len(as_it_is.customers), NO_SOURCE, dtype=np.int32)
    share = np.zeros(as_it_is.demand.shape)
    there = model.columns.unserved != NONE
    share[there] = found.values[model.columns.unserved[there]]
    return share * as_it_is.demand, model.decisions(found.values).source


def _short(study: Study, network: Network, missing: Floats, *, exact: bool) -> Today:
    """Return today with what it leaves unserved; `exact` where serving everything is proved to be impossible."""
    where = _above_noise(network, missing)
    unserved = tuple(
        Unserved(customer=network.customers[customer], good=network.goods[good], amount=float(missing[customer, good]))
        for customer, good in np.argwhere(where).tolist()
    )
    load = float((missing * network.load)[where].sum())
    kinds = " and ".join(kind for kind, there in (("sites", study.sites), ("suppliers", study.suppliers)) if there)
    reason = f"Today's {kinds} leave {_shown(load)} {study.settings.unit} a year unserved"
    if not exact:
        reason += " as far as the search got before its time was over"
    return Today(outcome=TodayOutcome.SHORT, reason=f"{reason}, so no saving is stated.", plan=None, unserved=unserved)


def _above_noise(network: Network, units: Floats) -> Flags:
    """Return where units are more than nothing: by load, or by units for a good that uses no load."""
    return np.asarray(units * np.where(network.load > 0, network.load, 1.0) > LOAD_TOLERANCE)


def _shown(load: float) -> str:
    """Return a load for a sentence: whole above 100, else to four digits, never as 0."""
    return f"{load:,.0f}" if load >= 100 else f"{load:,.4g}"  # noqa: PLR2004 - three digits suffice above 100
