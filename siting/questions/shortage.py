"""Why it is impossible to do without a site or supplier, in sentences."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.plan.plan import LOAD_TOLERANCE
from siting.questions.restriction import parts_of

if TYPE_CHECKING:
    from siting.network.network import Network
    from siting.plan.plan import Plan
    from siting.questions.resolved import Resolved
    from siting.study.tables import Study

NAMED = 5
"""Names listed before "and n more"."""


def sentences_of(  # noqa: PLR0913 - a plan, what is done without, and what was asked
    study: Study, network: Network, plan: Plan, name: str, found: Resolved, *, rerouted: bool
) -> tuple[str, ...]:
    """
    Return why there is no plan without a site or supplier.

    Parameters
    ----------
    study, network
        What was asked about.
    plan
        The plan in which it is open or signed.
    name
        What is done without.
    found
        No plan; where that is proved, with what stays unserved or the reasons.
    rerouted
        Whether all others keep their verdict and size.

    Returns
    -------
    sentences
        At least one where it is impossible; none where no plan was found in time.
    """
    if not found.impossible:
        return ()
    if found.unserved:
        return _short(study, network, plan, name, found)
    if not found.reasons and rerouted:
        return (f"With all others as they are, not everything that is asked can be met without {name}.",)
    if not found.reasons:
        return (f"No plan can meet everything that is asked without {name}: only {name} itself repairs it.",)
    said = tuple(reason.sentence for reason in found.reasons)
    if len(said) == 1:
        return said
    return ("All of these together must be met:" if found.together else "Any one of these repairs it:", *said)


def _short(study: Study, network: Network, plan: Plan, name: str, found: Resolved) -> tuple[str, ...]:
    """Return who goes short and whether lanes or capacity are missing."""
    unit, left = study.settings.unit, {part for part, _ in parts_of(plan)} - {name}
    customers = list(dict.fromkeys(short.customer for short in found.unserved))
    reached = _reached(network, left)
    cut_off = [customer for customer in customers if customer not in reached]
    others = [customer for customer in customers if customer in reached]
    said = []
    if cut_off:
        said.append(f"Nothing else that is open reaches {_some(cut_off)}.")
    if others:
        said.append(f"What is open and reaches {_some(others)} cannot take all of it.")
    needed = float((network.demand @ network.load).sum())
    for what, capacity in _capacities(network, plan, left):
        if capacity < needed - LOAD_TOLERANCE:
            said.append(f"The {what} left have a capacity of {capacity:,.6g} {unit}; {needed:,.6g} {unit} are needed.")
    return tuple(said)


def _reached(network: Network, left: set[str]) -> set[str]:
    """Return the customers that every good they need can reach from something left open or signed."""
    reached = np.zeros(network.demand.shape, dtype=np.bool_)
    for lanes, names in ((network.outbound, network.sites), (network.direct, network.suppliers)):
        there = np.fromiter((name in left for name in names), dtype=np.bool_)
        usable = there[lanes.origin] if len(lanes) else np.zeros(0, dtype=np.bool_)
        reached[lanes.destination[usable], lanes.good[usable]] = True
    whole = np.all(reached | (network.demand <= 0), axis=1)
    return {network.customers[at] for at in np.flatnonzero(whole).tolist()}


def _capacities(network: Network, plan: Plan, left: set[str]) -> list[tuple[str, float]]:
    """Return the capacity of what is left, where one kind of origin has to bring everything."""
    found = []
    if network.sites and not len(network.direct):
        limits = [line.capacity for line in plan.sites if line.site in left]
        if None not in limits:
            found.append(("sites", sum(limit for limit in limits if limit is not None)))
    if network.suppliers:
        limits = [line.capacity for line in plan.suppliers if line.supplier in left]
        if None not in limits:
            found.append(("suppliers", sum(limit for limit in limits if limit is not None)))
    return found


def _some(names: list[str]) -> str:
    listed = ", ".join(names[:NAMED])
    return listed if len(names) <= NAMED else f"{listed} and {len(names) - NAMED} more"
