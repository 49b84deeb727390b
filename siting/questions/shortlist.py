"""
Shortlist: which sites and suppliers stand whatever else is decided, within a percentage of the best cost.

Two questions answered together: the near-best answers (runners-up) say how often each is used, headroom says what the
best plan on the other side costs. The word for each rests on headroom alone, so that it is proved even where the list
of near-best answers is cut short.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

from siting.plan.proof import Outcome
from siting.questions.headroom import headroom
from siting.questions.headroom_result import Headroom, HeadroomLine, Room
from siting.questions.runners_up import MOST, WITHIN, runners_up
from siting.questions.runners_up_result import RunnersUp  # noqa: TC001 - the codec reads the hints at run time
from siting.questions.store import MemoryStore

if TYPE_CHECKING:
    from siting.listener import Listener, Stop
    from siting.plan.plan import Answer
    from siting.questions.store import Store
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study


class Firmness(StrEnum):
    """How firmly a site or supplier is in or out of the plans within the percentage, in a word."""

    IRREPLACEABLE = "irreplaceable"
    """No plan at all can do without it."""
    ROBUST = "robust"
    """Every plan within the percentage has it."""
    REPLACEABLE = "replaceable"
    """The best plan has it, but a plan within the percentage does without it."""
    STAND_IN = "stand-in"
    """The best plan does without it, but a plan within the percentage uses it."""
    NEVER = "never"
    """No plan within the percentage uses it."""
    PINNED = "pinned"
    """Only its ruling puts it where it is."""
    UNKNOWN = "not known yet"
    """The search that decides it was stopped or cut short."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ShortlistLine:
    """One site or supplier."""

    kind: str
    """`site` or `supplier`."""
    name: str
    verdict: str
    """In the best plan."""
    firmness: Firmness
    used_in: int
    """Number of the near-best answers that use it."""
    headroom: HeadroomLine


@dataclass(frozen=True, slots=True, kw_only=True)
class Shortlist:
    """Near-best answers and headroom of one study, at one percentage."""

    near: RunnersUp
    room: Headroom

    @property
    def count(self) -> int:
        """Number of near-best answers listed, the best among them."""
        return len(self.near.answers)

    @property
    def why_none(self) -> tuple[str, ...]:
        """Where there is no plan: why."""
        return self.near.why_none or self.room.why_none

    @property
    def complete(self) -> bool:
        """True where every search was made to its end and none of the near-best answers is missing."""
        return self.near.complete and self.room.complete

    @property
    def lines(self) -> tuple[ShortlistLine, ...]:
        """Every site and supplier: the firmest in the plan first, what is never used last."""
        used = [{name for _, name, _ in answer.used} for answer in self.near.answers]
        lines = [
            ShortlistLine(
                kind=line.kind,
                name=line.name,
                verdict=line.verdict,
                firmness=firmness_of(line, self.room.cost or 0.0, self.near.within),
                used_in=sum(line.name in names for names in used),
                headroom=line,
            )
            for line in self.room.lines
        ]
        return tuple(sorted(lines, key=_rank))


def firmness_of(line: HeadroomLine, cost: float, within: float) -> Firmness:
    """
    Return how firmly a site or supplier is in or out.

    Parameters
    ----------
    line
        Its headroom.
    cost
        Money a year of the best plan.
    within
        The percentage, as a fraction of the best cost.

    Returns
    -------
    firmness
        By headroom: a plan on the other side costs the best plus the headroom.
    """
    if line.outcome is Outcome.IMPOSSIBLE:
        return Firmness.IRREPLACEABLE if line.inside else Firmness.NEVER
    if line.room is Room.PINNED:
        return Firmness.PINNED
    limit = within * abs(cost) + line.tolerance
    if line.yearly is not None and line.yearly <= limit:
        return Firmness.REPLACEABLE if line.inside else Firmness.STAND_IN
    if line.least is not None and line.least > limit:
        return Firmness.ROBUST if line.inside else Firmness.NEVER
    return Firmness.UNKNOWN


def shortlist(  # noqa: PLR0913 - what a question is asked with, all but the first two by name
    study: Study,
    answer: Answer | None = None,
    *,
    within: float = WITHIN,
    most: int = MOST,
    settings: SolveSettings | None = None,
    store: Store | None = None,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> Shortlist:
    """
    Return how firmly each site and supplier is in or out of the plans within a percentage of the best.

    Parameters
    ----------
    study
        Checked.
    answer
        Its plan, where there is one already.
    within
        How far above the best to look, as a fraction of its cost, at least 0.
    most
        How many near-best answers to list next to the best, at least 1.
    settings
        Time limit of each search; the study's own where None.
    store
        Where answers are kept and found again; in memory, for this call only, where None.
    listener
        Told how far it is and how long it may still take.
    stop
        Once requested, what is done is returned.

    Returns
    -------
    shortlist
        Headroom is measured first, since the words rest on it; then the near-best answers are listed.

    Raises
    ------
    SettingsError
        If `within` or `most` is out of its range.
    PlanFileError
        If the answer is of another study.
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If a plan fails its audit.
    """
    kept = MemoryStore() if store is None else store
    room = headroom(study, answer, settings=settings, store=kept, listener=listener, stop=stop)
    near = runners_up(
        study, answer, within=within, most=most, settings=settings, store=kept, listener=listener, stop=stop
    )
    return Shortlist(near=near, room=room)


ORDER = tuple(Firmness)


def _rank(line: ShortlistLine) -> tuple[int, int, float, str]:
    """Return what sorts the firmest first: within a word by headroom, the largest first inside, the nearest outside."""
    inside, yearly = line.headroom.inside, line.headroom.yearly or 0.0
    return (0 if inside else 1), ORDER.index(line.firmness), -yearly if inside else yearly, line.name
