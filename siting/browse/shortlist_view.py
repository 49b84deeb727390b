"""What the page Shortlist says: its headline, the rule behind each word, the near-best plans. Knows no Streamlit."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.browse.closing_view import some
from siting.browse.tables import Heading, Line, report_table
from siting.plan.words import money, percent
from siting.questions.shortlist import Firmness

if TYPE_CHECKING:
    from siting.questions.shortlist import Shortlist


NAMED = 5
"""Names that the headline lists before "and n more"."""


def shortlist_headline(found: Shortlist) -> tuple[str, str]:
    """
    Return the sentence a shortlist opens with, and a second one.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    first, second
        How many stand and how many never do; then how many near-best plans there are and whether that is all.
    """
    if found.why_none:
        return "There is no plan to make a shortlist from", " ".join(found.why_none)
    if not found.lines:
        return "There is nothing to choose between", ""
    names = {word: [line.name for line in found.lines if line.firmness is word] for word in Firmness}
    firm = [*names[Firmness.IRREPLACEABLE], *names[Firmness.ROBUST]]
    within = percent(found.near.within)
    parts = [f"Nothing is in every plan within {within} of the best"]
    if firm:
        parts = [f"{some(firm, NAMED)} {'is' if len(firm) == 1 else 'are'} in every plan within {within} of the best"]
    if names[Firmness.REPLACEABLE]:
        parts.append(f"{some(names[Firmness.REPLACEABLE], NAMED)} can be replaced")
    never = names[Firmness.NEVER]
    if never:
        parts.append(f"{some(never, NAMED)} {'is' if len(never) == 1 else 'are'} never worth having")
    return f"{'; '.join(parts)}.", _completeness(found)


def _completeness(found: Shortlist) -> str:
    near = found.near
    within = percent(near.within)
    if found.count == 1 and near.complete:
        return f"No other set of sites and suppliers comes within {within} of the best: proved."
    said = f"{found.count} plan{'' if found.count == 1 else 's'} within {within} of the best"
    if near.complete:
        return f"{said}: proved to be all there are."
    if near.complete_to is not None:
        known = money(near.complete_to, near.currency)
        return f"{said} listed; up to {known} a year none is missing, above that some may be."
    return f"{said} listed; others may be missing. The words rest on headroom, which is proved by itself."


def rule_table(found: Shortlist) -> str:
    """Return the rule behind each word, with who falls under it, as an HTML table."""
    near = found.near
    limit = f"{percent(near.within)} ({money(near.within * abs(found.room.cost or 0.0), near.currency)} a year)"
    rules = {
        Firmness.IRREPLACEABLE: "No plan at all can do without it.",
        Firmness.ROBUST: f"In the best plan, and the best plan without it costs more than {limit} above the best.",
        Firmness.REPLACEABLE: f"In the best plan, but a plan without it costs at most {limit} more.",
        Firmness.STAND_IN: f"Not in the best plan, but a plan that uses it costs at most {limit} more.",
        Firmness.NEVER: f"Every plan that uses it costs more than {limit} above the best, or there is none.",
        Firmness.PINNED: "Only its ruling puts it where it is: without the ruling the best plan decides otherwise.",
        Firmness.UNKNOWN: "The search that decides it was stopped, or ended with too wide a gap.",
    }
    lines = []
    for word, rule in rules.items():
        names = [line.name for line in found.lines if line.firmness is word]
        if names or word not in {Firmness.PINNED, Firmness.UNKNOWN}:
            lines.append(Line(cells=(str(word), rule, ", ".join(names) or "none"), kind="" if names else "faint"))
    headings = (Heading(text="Word", verdict=True), Heading(text="Rule"), Heading(text="Here"))
    return report_table(headings, lines)


def answers_table(found: Shortlist) -> str:
    """Return the near-best plans, the best first, as an HTML table."""
    near = found.near
    headings = (
        Heading(text="Plan"),
        Heading(text=f"Cost, {near.currency} a year", number=True),
        Heading(text=f"More, {near.currency} a year", number=True),
        Heading(text="More", number=True),
        Heading(text="What it does otherwise"),
    )
    best = near.best
    lines = [
        Line(
            cells=(
                "best" if place == 0 else str(place + 1),
                f"{each.cost:,.0f}",
                "" if place == 0 else f"{each.extra:+,.0f}",
                percent(each.extra / abs(best.cost)) if place and best is not None and best.cost else "",
                each.differs,
            )
        )
        for place, each in enumerate(near.answers)
    ]
    return report_table(headings, lines)
