"""What charge headroom returns."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, Any

from siting.plan.proof import Outcome

if TYPE_CHECKING:
    from collections.abc import Mapping


class Room(StrEnum):
    """What a headroom amounts to, in a word."""

    RISE = "may rise"
    """In the plan: its charge may rise by the headroom."""
    IRREPLACEABLE = "irreplaceable"
    """In the plan: no plan can do without it, whatever it costs."""
    PINNED = "pinned"
    """Only its ruling puts it where it is: the best plan decides otherwise without the ruling."""
    FALL = "must fall"
    """Outside: its charge must fall by the headroom."""
    NOT_FREE = "not even free of charge"
    """Outside: it saves nothing elsewhere, so that no charge is low enough."""
    CANNOT = "cannot be used"
    """Outside: no plan can use it, whatever it costs."""
    TIED = "tied"
    """The best plans with it and without it cost the same."""
    UNKNOWN = "not known yet"
    """Stopped before there was a plan to compare with."""


@dataclass(frozen=True, slots=True, kw_only=True)
class HeadroomLine:
    """How far the charge of one site or supplier may move. Money a year unless it says one-off."""

    kind: str
    """`site` or `supplier`."""
    name: str
    verdict: str
    inside: bool
    """True where the best plan has it open or signed."""
    ruling: str
    """Its ruling in the study, which is lifted here."""
    outcome: Outcome | None
    """Of the best plan on the other side; `impossible` where there is none, None where it was not asked."""
    yearly: float | None
    """The rise it can bear (inside), or the fall it needs (outside); with sizes, the same on every size."""
    least: float | None
    """The headroom is at least this, whatever was left unproved."""
    most: float | None
    """The headroom is at most this, whatever was left unproved; None where unknown or without limit."""
    per_one_off: float | None
    """Yearly money per one-off money; None where no opening or signing charge is paid."""
    charge: float | None
    """Its whole charge a year, annualised opening or signing included; outside, at the size it would open at."""
    tolerance: float
    """Money a year below which two costs are the same, as far as a proof can tell."""
    why: tuple[str, ...] = ()
    """Where irreplaceable: what would have to give for a plan to do without it."""

    @property
    def one_off(self) -> float | None:
        """The same on the opening or signing charge, one-off money; None for what runs or is signed already."""
        return None if self.yearly is None or self.per_one_off is None else self.yearly / self.per_one_off

    @property
    def room(self) -> Room:
        """What it amounts to, in a word."""
        if self.outcome is Outcome.IMPOSSIBLE:
            return Room.IRREPLACEABLE if self.inside else Room.CANNOT
        if self.yearly is None:
            return Room.UNKNOWN
        if abs(self.yearly) <= self.tolerance:
            return Room.TIED
        if self.yearly < 0 and self.ruling != "free":
            return Room.PINNED
        if self.inside:
            return Room.RISE
        free = self.charge is not None and self.yearly >= self.charge - self.tolerance
        return Room.NOT_FREE if free else Room.FALL

    @property
    def exact(self) -> bool:
        """True where least and most agree as far as a proof can tell."""
        known = self.least is not None and self.most is not None
        return known and (self.most or 0.0) - (self.least or 0.0) <= 2 * self.tolerance


@dataclass(frozen=True, slots=True, kw_only=True)
class Headroom:
    """The headroom of every site and supplier asked about."""

    title: str
    currency: str
    fingerprint: str
    """Of the study."""
    outcome: Outcome
    """Of the best plan, from which everything is measured."""
    cost: float | None
    """Money a year of the best plan; None where there is none, and then there are no lines."""
    bound: float | None
    gap_asked: float
    lines: tuple[HeadroomLine, ...]
    """In the plan first, the smallest headroom first; then outside, the smallest fall first."""
    budgeted: bool
    """True where the study has a one-off budget, which a higher opening charge may break before that."""
    why_none: tuple[str, ...] = ()
    """Where there is no plan to measure from: why."""
    seconds: float = 0.0

    @property
    def complete(self) -> bool:
        """True where nothing was left out by a stop."""
        return all(line.outcome is not None for line in self.lines)


def headroom_to_json(found: Headroom) -> dict[str, Any]:
    """
    Return the object of `siting headroom --json`.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    object
        Plain JSON values: money unrounded, one entry a site and a supplier; null where something does not exist.
    """
    return {
        "outcome": str(found.outcome),
        "cost": found.cost,
        "bound": found.bound,
        "gap_asked": found.gap_asked,
        "complete": found.complete,
        "budgeted": found.budgeted,
        "seconds": found.seconds,
        "fingerprint": found.fingerprint,
        "why_none": list(found.why_none),
        "sites": [_line(line) for line in found.lines if line.kind == "site"],
        "suppliers": [_line(line) for line in found.lines if line.kind == "supplier"],
    }


def _line(line: HeadroomLine) -> Mapping[str, object]:
    return {
        line.kind: line.name,
        "verdict": line.verdict,
        "inside": line.inside,
        "ruling": line.ruling,
        "room": str(line.room),
        "yearly": line.yearly,
        "least": line.least,
        "most": line.most,
        "exact": line.exact,
        "one_off": line.one_off,
        "charge": line.charge,
        "outcome": None if line.outcome is None else str(line.outcome),
        "why": list(line.why),
    }
