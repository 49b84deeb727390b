"""The least load that cannot be served with the verdicts held, by customer and good."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from siting.listener import Silent, Stop
from siting.network.decisions import NO_SOURCE, Decisions
from siting.plan.plan import LOAD_TOLERANCE, Unserved
from siting.solving.columns import NONE
from siting.solving.direct import search
from siting.solving.flows import unserved_by
from siting.solving.model import build_model
from siting.solving.today import unlimited

if TYPE_CHECKING:
    from siting.arrays import Floats
    from siting.network.network import Network
    from siting.study.settings import SolveSettings


def least_unserved(
    network: Network, settings: SolveSettings, *, seconds: float, stop: Stop | None = None
) -> tuple[Unserved, ...]:
    """
    Return what stays unserved at least with every pinned option open and every pinned supplier signed.

    Rules, counts, budget, service share and least volumes are ignored; capacity, reach, bars and single sourcing hold.

    Parameters
    ----------
    network
        With its options and suppliers pinned: open and signed, or shut and unsigned.
    settings
        Gap and engine of the search that single-sourced customers need.
    seconds
        Time that search may take.
    stop
        Once requested, the best found so far is returned.

    Returns
    -------
    unserved
        Customers in the order of the table; empty where everything can be served.

    Raises
    ------
    EngineError
        If HiGHS gives up for a reason of its own.
    """
    free = unlimited(network)
    if free.single_source.any():
        missing = _by_search(free, replace(settings, time_limit_s=seconds), stop or Stop())
    else:
        source = np.full(len(free.customers), NO_SOURCE, dtype=np.int32)
        is_open = ~free.site_pinned_shut[free.option_site]
        signed = ~free.supplier_pinned_unsigned
        missing = unserved_by(free, Decisions(option_open=is_open, supplier_signed=signed, source=source))
    load = missing * np.where(free.load > 0, free.load, 1.0)
    noise = max(LOAD_TOLERANCE, LOAD_TOLERANCE * float((free.demand @ free.load).max(initial=0.0)))
    return tuple(
        Unserved(customer=free.customers[customer], good=free.goods[good], amount=float(missing[customer, good]))
        for customer, good in np.argwhere(load > noise).tolist()
    )


def _by_search(network: Network, settings: SolveSettings, stop: Stop) -> Floats:
    """Return the units unserved where single-sourced customers are served whole or not at all."""
    model = build_model(network, serve_all=False)
    found = search(model, settings, listener=Silent(), stop=stop)
    if found.values is None:
        return network.demand
    share = np.zeros(network.demand.shape)
    there = model.columns.unserved != NONE
    share[there] = found.values[model.columns.unserved[there]]
    missing: Floats = share * network.demand
    return missing
