"""Bringing a solver's bound and the cost priced from the tables together."""

from __future__ import annotations

from siting.errors import EngineError
from siting.plan.proof import PROVED_GAP

ROUNDING = 1e-9
"""Relative difference that is rounding of sums, not of a solver's tolerances."""


def settled_bound(bound: float | None, cost: float) -> float | None:
    """
    Return the bound that a priced plan leaves standing.

    No plan costs less than a true bound, so a bound above the cost of a plan is off by at least the difference. Up to
    rounding the cost itself is the bound. Up to `PROVED_GAP` the solver's tolerances are at work: the bound is then
    trusted only to the same distance below the cost.

    Parameters
    ----------
    bound
        Money a year, from a solver; None where it has none.
    cost
        Money a year, of a plan priced from the tables.

    Returns
    -------
    bound
        At most `cost`.

    Raises
    ------
    EngineError
        If the bound is above the cost by more than a solver's tolerances explain.
    """
    if bound is None or bound <= cost:
        return bound
    scale = max(abs(cost), 1.0)
    over = bound - cost
    if over <= ROUNDING * scale:
        return cost
    if over <= PROVED_GAP * scale:
        return cost - over
    msg = (
        f"the solver's bound, {bound:,.6f}, is above the cost of its own plan, {cost:,.6f}: it cannot be trusted. "
        "Try another engine."
    )
    raise EngineError(msg)
