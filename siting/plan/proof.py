"""How sure a plan is: outcome, cost, bound and gap."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping

PROVED_GAP = 1e-6
"""Largest gap that counts as proved."""


class Outcome(StrEnum):
    """How a search for a plan ended."""

    PROVED = "proved"
    """Gap at most `PROVED_GAP`."""
    WITHIN_GAP = "within-gap"
    """Gap at most the gap asked."""
    STOPPED = "stopped"
    """A plan, with a wider gap than asked."""
    NO_PLAN_YET = "no-plan-yet"
    """Stopped before any plan."""
    IMPOSSIBLE = "impossible"
    """No plan can exist."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Proof:
    """Outcome, cost, bound and how they were reached."""

    outcome: Outcome
    cost: float | None
    """Money a year, priced from the tables; None without a plan."""
    bound: float | None
    """Money a year that no plan can undercut; None where none was found."""
    gap_asked: float
    seconds: float
    engine: str
    """Name of the engine that ran."""
    reason: str = ""
    """Why that engine, where `auto` picked it, and why it stopped before its end, where it did."""
    site_count_bounds: Mapping[int, float] = field(default_factory=dict)
    """Bound for each exact number of open sites, where the engine keeps them; empty otherwise."""

    @property
    def gap(self) -> float | None:
        """(cost - bound) / |cost|, at least 0; None without cost or bound."""
        return gap_of(self.cost, self.bound)


def gap_of(cost: float | None, bound: float | None) -> float | None:
    """Return (cost - bound) / |cost|, at least 0; None while either is missing."""
    if cost is None or bound is None:
        return None
    if cost <= bound:
        return 0.0
    return (cost - bound) / abs(cost) if cost else float("inf")


def outcome_of(cost: float | None, bound: float | None, gap_asked: float) -> Outcome:
    """Return the outcome that cost and bound earn; `impossible` is never concluded from them."""
    gap = gap_of(cost, bound)
    if cost is None:
        return Outcome.NO_PLAN_YET
    if gap is None:
        return Outcome.STOPPED
    if gap <= PROVED_GAP:
        return Outcome.PROVED
    return Outcome.WITHIN_GAP if gap <= gap_asked else Outcome.STOPPED
