"""What `siting runners-up` prints for a reader: how many there are, the list, what differs, how sure."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.layout import bullets, paragraph, table
from siting.plan.words import money, percent, percent_up

if TYPE_CHECKING:
    from siting.questions.runners_up_result import RunnersUp, RunnerUp

HALF = 0.5
"""Smaller than this rounds to 0."""


def runners_up_text(found: RunnersUp) -> str:
    """
    Return the answers as text of at most 100 columns, names aside.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    text
        Headline, table, what each does otherwise, how sure it is that none is missing.
    """
    best = found.best
    if best is None:
        return "\n\n".join(paragraph(sentence) for sentence in found.why_none)
    parts = [paragraph(headline_of(found, best)), _table(found)]
    lines = [f"{place}. {each.differs}" for place, each in enumerate(found.answers[1:], start=1)]
    if lines:
        said = [paragraph(line, indent="   ") for line in lines]
        parts.append("\n".join(["Otherwise than the best:", *said]))
    parts.append(bullets(_notes(found, best)))
    return "\n\n".join(parts)


def headline_of(found: RunnersUp, best: RunnerUp) -> str:
    """
    Return the one sentence that says what was found.

    Parameters
    ----------
    found
        What was found.
    best
        Its best answer.

    Returns
    -------
    sentence
        The nearest runner-up and what it costs more; or that there is none.
    """
    within = percent(found.within)
    if len(found.answers) == 1:
        if found.complete:
            return f"No other set of sites and suppliers comes within {within} of the best: proved."
        return f"No other set within {within} of the best was found so far; that there is none is not proved."
    if found.tied:
        count = len(found.tied)
        return f"{count} other set{'s' if count > 1 else ''} cost{'s' if count == 1 else ''} the same as the best."
    second = found.answers[1]
    share = f" ({percent(second.extra / abs(best.cost))})" if best.cost else ""
    return f"The next-best set costs {money(second.extra, found.currency)} a year more{share}: {second.differs}."


def _table(found: RunnersUp) -> str:
    caption = f"Cost and what it is above the best, {found.currency} a year; sites and suppliers in use"
    header = ("", "cost", "more", "share", "sites", "suppliers", "once")
    rows = [
        (
            "best" if place == 0 else str(place),
            f"{each.cost:,.0f}" if abs(each.cost) >= HALF else f"{each.cost:.3g}",
            "-" if place == 0 else _more(each.extra),
            "-" if place == 0 or not found.answers[0].cost else percent(each.extra / abs(found.answers[0].cost)),
            str(len(each.used_sites)),
            str(len(each.used_suppliers)),
            f"{each.plan.one_off:,.0f}",
        )
        for place, each in enumerate(found.answers)
    ]
    return "\n".join([paragraph(caption), table(header, rows)])


def _more(extra: float) -> str:
    return f"{extra:+,.0f}" if abs(extra) >= HALF else f"{extra:+.2g}" if extra else "same"


def _notes(found: RunnersUp, best: RunnerUp) -> list[str]:
    """Return how sure it is that none is missing, and of what order."""
    within, limit = percent(found.within), found.limit or best.cost
    notes = []
    if found.complete:
        notes.append(f"Complete: no other set within {within} of the best ({money(limit, found.currency)} a year).")
    elif found.complete_to is not None:
        above = max(found.complete_to - best.cost, 0.0)
        share = f" ({percent(above / abs(best.cost))} above the best)" if best.cost else ""
        why = "only as many were asked for" if len(found.answers) > found.most else "the search was stopped"
        notes.append(
            f"Complete up to {money(found.complete_to, found.currency)} a year{share}, not up to {within}: {why}. "
            "Raise --most or --time-limit for more."
        )
    else:
        notes.append("Nothing is proved about sets that are missing.")
    open_gaps = [each for each in found.answers if (each.gap or 0.0) > max(found.gap_asked, 1e-6)]
    if open_gaps:
        worst = max(each.gap or 0.0 for each in open_gaps)
        notes.append(
            f"{len(open_gaps)} of them are not proved: up to {percent_up(worst)} cheaper, so the order may change."
        )
    notes.append(
        "A set is what is used: sites and suppliers through which something moves. The cheapest plan stands for all "
        "that use the same."
    )
    return notes
