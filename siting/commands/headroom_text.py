"""What `siting headroom` prints for a reader: the tightest charge, then what is in the plan and what is outside."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.layout import bullets, paragraph, table
from siting.plan.words import money, percent_up
from siting.questions.headroom_result import Room

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.questions.headroom_result import Headroom, HeadroomLine

ABSENT = "-"


def headroom_text(found: Headroom) -> str:
    """
    Return headroom as text of at most 100 columns, names aside.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    text
        Headline, a table of what is in the plan, one of what is outside, and notes.
    """
    if found.cost is None:
        return "\n\n".join(paragraph(sentence) for sentence in found.why_none)
    inside = [line for line in found.lines if line.inside]
    outside = [line for line in found.lines if not line.inside]
    parts = [paragraph(headline_of(found))]
    if inside:
        caption = f"In the plan: how far the charge may rise ({found.currency} a year; once on the opening or signing"
        parts.append(_part(f"{caption} charge)", "may rise", inside))
    if outside:
        caption = f"Outside: how far the charge must fall ({found.currency} a year; once on the opening or signing"
        parts.append(_part(f"{caption} charge)", "must fall", outside))
    parts.append(bullets(_notes(found)))
    return "\n\n".join(part for part in parts if part)


def headline_of(found: Headroom) -> str:
    """
    Return the one sentence that says what was found.

    Parameters
    ----------
    found
        Measured from a plan that exists.

    Returns
    -------
    sentence
        The tightest charge in the plan and the nearest one outside.
    """
    rises = [line for line in found.lines if line.inside and line.room in {Room.RISE, Room.TIED}]
    falls = [line for line in found.lines if not line.inside and line.room in {Room.FALL, Room.TIED}]
    said = []
    if rises and rises[0].yearly is not None:
        first = rises[0]
        how = "is tied with doing without it" if first.room is Room.TIED else f"may rise by {_money(found, first)}"
        said.append(f"Tightest in the plan: the charge of {first.name} {how}")
    if falls and falls[0].yearly is not None:
        first = falls[0]
        how = "is tied with leaving it" if first.room is Room.TIED else f"must fall by {_money(found, first)}"
        said.append(f"nearest outside: the charge of {first.name} {how}")
    if not said:
        return "No charge here has a headroom that can be stated: see the words below."
    sentence = "; ".join(said)
    return f"{sentence[0].upper()}{sentence[1:]}."


def _money(found: Headroom, line: HeadroomLine) -> str:
    return f"{money(line.yearly or 0.0, found.currency)} a year"


def _part(caption: str, column: str, lines: Sequence[HeadroomLine]) -> str:
    """Return one table under its caption, with the reasons of what cannot be measured below it."""
    header = ("name", "verdict", "in a word", column, "at least", "at most", "once", "of a charge of")
    rows = [
        (
            line.name,
            line.verdict,
            str(line.room),
            _amount(line.yearly),
            _amount(line.least),
            "no limit" if line.room is Room.IRREPLACEABLE else _amount(line.most),
            _amount(line.one_off),
            _amount(line.charge),
        )
        for line in lines
    ]
    why = [f"{line.name}: {' '.join(line.why)}" for line in lines if line.why]
    return "\n".join([paragraph(caption), table(header, rows, words=3), *([bullets(why)] if why else [])])


def _amount(value: float | None) -> str:
    """Return money with two decimals: a cent decides."""
    return ABSENT if value is None else f"{value:,.2f}"


def _notes(found: Headroom) -> list[str]:
    """Return what has to be said about the whole."""
    notes = [
        (
            "A headroom is for one charge at a time, all else as it is. With sizes, the same amount goes on every "
            "size. The own ruling is lifted, all others hold."
        )
    ]
    rooms = {line.room for line in found.lines}
    if Room.NOT_FREE in rooms:
        notes.append("Not even free of charge: it saves nothing elsewhere that would be worth having it.")
    if Room.IRREPLACEABLE in rooms:
        notes.append("Irreplaceable: no plan can do without it, whatever it costs.")
    if Room.PINNED in rooms:
        notes.append("Pinned: only its ruling puts it where it is; the amount is what the ruling costs a year.")
    if any(line.outcome is not None and not line.exact and line.yearly is not None for line in found.lines):
        notes.append(
            f"Where `at least` and `at most` differ, a search ended at a gap wider than {percent_up(1e-6)}: allow a "
            "smaller --gap or a longer --time-limit."
        )
    if found.budgeted:
        notes.append("The study has a one-off budget: a higher opening or signing charge may break it before that.")
    if not found.complete:
        notes.append("Stopped: what reads `not known yet` was not finished.")
    return notes
