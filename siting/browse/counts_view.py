"""What the page How many sites? says: its table as HTML, and its notes. Knows no Streamlit."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.browse.tables import Heading, Line, report_table
from siting.plan.proof import PROVED_GAP
from siting.plan.words import money, percent, percent_up

if TYPE_CHECKING:
    from siting.questions.counts_result import CountLine, Counts

MOST_NAMED = 40


def counts_notes(found: Counts) -> list[str]:
    """Return what was not searched and why, what the study rules out, and how sure the costs are, as sentences."""
    notes = [
        f"{_range(each.least, each.most)} not tried: no plan with so many can cost less than "
        f"{money(each.bound, found.currency)} a year."
        for each in found.pruned
    ]
    best, allowed = found.best, found.best_allowed
    if best is not None and best.cost is not None and not best.allowed:
        more = "" if allowed is None or allowed.cost is None else (
            f"; keeping to them costs {money(allowed.cost - best.cost, found.currency)} a year more"
        )  # fmt: skip
        notes.append(f"The study's own fewest_sites and most_sites rule {best.count} out{more}.")
    gaps = [line.gap for line in found.lines if line.gap is not None]
    if gaps:
        worst = max(gaps)
        notes.append(
            "Every cost is proved." if worst <= PROVED_GAP else f"Every cost is proved within {percent_up(worst)}."
        )
    return notes


def _range(least: int, most: int) -> str:
    return f"{least} sites were" if least == most else f"{least} to {most} sites were"


def counts_table(found: Counts) -> str:
    """Return one row for each number of sites as an HTML table."""
    served = any(line.share_within is not None for line in found.lines)
    headings = [
        Heading(text="Sites", number=True),
        Heading(text=f"Cost, {found.currency} a year", number=True),
        Heading(text="At least", number=True),
        Heading(text="Fixed", number=True),
        Heading(text="Freight", number=True),
        Heading(text="Rest", number=True),
        Heading(text="Road km", number=True),
        *([Heading(text=f"Within {found.service_km:g} km", number=True)] if served else []),
        Heading(text="Open"),
    ]
    return report_table(headings, [_row(found, line, served=served) for line in found.lines])


def _row(found: Counts, line: CountLine, *, served: bool) -> Line:
    best = found.best
    is_best = best is not None and best.count == line.count
    remark = "" if line.allowed else "ruled out by the study. "
    if line.cost is None:
        word = "impossible" if line.outcome == "impossible" else "not yet"
        bound = "" if line.bound is None else f"{line.bound:,.0f}"
        blank = ("",) * (5 if served else 4)
        return Line(cells=(str(line.count), word, bound, *blank, remark.strip()), kind="faint")
    share = ("" if line.share_within is None else percent(line.share_within),) if served else ()
    more = "" if len(line.open_sites) <= MOST_NAMED else f" and {len(line.open_sites) - MOST_NAMED} more"
    return Line(
        cells=(
            str(line.count),
            _money(line.cost),
            "" if line.bound is None else _money(line.bound),
            _money(line.fixed or 0.0),
            _money(line.freight or 0.0),
            _money(line.rest or 0.0),
            "" if line.average_km is None else f"{line.average_km:,.0f}",
            *share,
            f"{remark}{', '.join(line.open_sites[:MOST_NAMED])}{more}",
        ),
        kind="total" if is_best else "" if line.allowed else "faint",
    )


def _money(amount: float) -> str:
    return f"{amount:,.0f}"
