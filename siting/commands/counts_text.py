"""What `siting counts` prints for a reader: where adding sites stops paying, the curve, how sure."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.layout import bullets, paragraph, table
from siting.plan.words import money, percent, percent_up
from siting.questions.words import counts_headline

if TYPE_CHECKING:
    from siting.questions.counts_result import CountLine, Counts

HALF = 0.5
"""Smaller than this rounds to 0."""


def counts_text(found: Counts) -> str:
    """
    Return the curve as text of at most 100 columns.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    text
        Headline, table, what was not searched and how sure the costs are.
    """
    if found.why_none:
        return "\n\n".join(paragraph(sentence) for sentence in found.why_none)
    return "\n\n".join([paragraph(counts_headline(found)), _table(found), bullets(_notes(found))])


def _table(found: Counts) -> str:
    served = any(line.share_within is not None for line in found.lines)
    within = f"; share of weight within {found.service_km:g} km" if served else ""
    caption = f"{found.currency} a year; `at least` is proved; road km on average{within}"
    header = ("sites", "cost", "at least", "fixed", "freight", "rest", "km", *(["within"] if served else []), "")
    rows = [_row(found, line, served=served) for line in found.lines]
    return "\n".join([paragraph(caption), table(header, rows)])


def _row(found: Counts, line: CountLine, *, served: bool) -> tuple[str, ...]:
    best = found.best
    remark = "ruled out" if not line.allowed else "best" if best is not None and line.count == best.count else ""
    if line.plan is None:
        cost = "impossible" if line.outcome == "impossible" else "not yet"
        return (str(line.count), cost, _number(line.bound), *["-"] * (5 if served else 4), remark)
    share = [("-" if line.share_within is None else percent(line.share_within))] if served else []
    return (
        str(line.count),
        _number(line.cost),
        _number(line.bound),
        _number(line.fixed),
        _number(line.freight),
        _number(line.rest),
        "-" if line.average_km is None else f"{line.average_km:,.0f}",
        *share,
        remark,
    )


def _number(value: float | None) -> str:
    if value is None:
        return "-"
    return f"{value:,.0f}" if abs(value) >= HALF or value == 0 else f"{value:.2g}"


def _notes(found: Counts) -> list[str]:
    """Return what was not searched and why, and how sure the costs are."""
    notes = [
        f"{f'{each.least} sites' if each.least == each.most else f'{each.least} to {each.most} sites'} were not "
        f"searched: no plan with that many can cost less than {money(each.bound, found.currency)} a year."
        for each in found.pruned
    ]
    if found.not_asked:
        notes.append(f"Stopped before {', '.join(map(str, found.not_asked))}.")
    allowed, best = found.best_allowed, found.best
    if best is not None and not best.allowed and best.cost is not None:
        least = (
            ""
            if allowed is None or allowed.cost is None
            else (f"; keeping to them costs {money(allowed.cost - best.cost, found.currency)} a year more")
        )
        notes.append(f"The study's own fewest_sites and most_sites rule {best.count} out{least}.")
    gaps = [line.gap for line in found.lines if line.gap is not None]
    if gaps:
        worst = max(gaps)
        notes.append(
            "Every cost is proved."
            if worst <= 1e-6  # noqa: PLR2004  # what counts as proved
            else f"Every cost is proved within {percent_up(worst)}: the true one lies between `at least` and `cost`."
        )
    return notes
