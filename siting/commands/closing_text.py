"""What `siting closing` prints for a reader: the cheapest to do without, the ranking, what would change, how sure."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.layout import bullets, paragraph, table
from siting.plan.plan import CostLine
from siting.plan.proof import Outcome
from siting.plan.words import money, percent, percent_up
from siting.study.tables import IMPLIED_GOOD

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.questions.closing_result import ClosingLine, ClosingTest, Without

HALF = 0.5
"""Smaller than this rounds to 0."""
NAMED = 4
"""Names listed before "and n more"."""
MOST_SHIFTS = 12
"""Customers listed one by one."""
DOING = {"site": "close", "supplier": "drop"}


def closing_text(test: ClosingTest, *, in_full: bool = False) -> str:
    """
    Return a closing test as text of at most 100 columns, names aside.

    Parameters
    ----------
    test
        What was found.
    in_full
        Whether to add cost lines, customers and loads of each answer, for a test of a few.

    Returns
    -------
    text
        Headline, ranking, and for each site and supplier what would change or why it is impossible.
    """
    if test.cost is None:
        return "\n\n".join(paragraph(sentence) for sentence in test.why_none)
    parts = [paragraph(headline_of(test)), _ranking(test)]
    parts += [_what_changes(test, line, in_full=in_full) for line in test.lines]
    parts += [bullets(notes)] if (notes := _notes(test)) else []
    return "\n\n".join(part for part in parts if part)


def headline_of(test: ClosingTest) -> str:
    """
    Return the one sentence that says what was found.

    Parameters
    ----------
    test
        Of a plan that exists.

    Returns
    -------
    sentence
        The cheapest to do without and what that costs; or that nothing can be done without.
    """
    best = next((line for line in test.lines if line.replan is not None and line.replan.possible), None)
    if best is None or best.replan is None or best.replan.extra_cost is None:
        if test.lines and all(line.replan is not None and line.replan.possible is False for line in test.lines):
            one = len(test.lines) == 1
            return f"{test.lines[0].name} cannot be done without." if one else "None of these can be done without."
        return "Nothing was found out before the stop." if test.lines else "The plan has nothing to do without."
    found, what = best.replan, DOING[best.kind].capitalize()
    if len(test.lines) > 1:
        what = f"Cheapest to do without: {DOING[best.kind]}"
    extra = found.extra_cost or 0.0
    if found.tied:
        costs = "it costs the same as the plan, a tie"
    elif found.saves:
        costs = f"it saves {money(-extra, test.currency)} a year, so the plan was not the best: plan again"
    else:
        share = f" ({percent(extra / abs(test.cost))})" if test.cost else ""
        costs = f"{money(extra, test.currency)} a year more{share}"
    return f"{what} {best.name}: {costs}, everything else decided afresh; {_sure(found, test.currency)}."


def _sure(found: Without, currency: str) -> str:
    """Return how sure an answer is."""
    if found.outcome is Outcome.PROVED:
        return "proved"
    gap = found.gap
    if gap is None or found.cost is None or found.bound is None:
        return "not proved"
    could = money(found.cost - found.bound, currency)
    how = "proved within" if found.outcome is Outcome.WITHIN_GAP else "not proved:"
    return f"{how} {percent_up(gap)} of its cost ({could})"


def _ranking(test: ClosingTest) -> str:
    """Return the table of everything tested."""
    if not test.lines:
        return ""
    caption = (
        f"What doing without costs on top of the plan's {test.cost or 0.0:,.0f} {test.currency} a year, and once "
        f"({test.currency})"
    )
    header = ("without", "verdict", "re-planned", "once", "at least", "re-routed", "once")
    rows = [
        (line.name, line.verdict, *_cells(line.replan), _least(line.replan), *_cells(line.reroute))
        for line in test.lines
    ]
    return "\n".join([paragraph(caption), table(header, rows, words=2)])


def _cells(found: Without | None) -> tuple[str, str]:
    if found is None:
        return "not asked", "-"
    if found.possible is False:
        return "impossible", "-"
    if found.extra_cost is None:
        return "not yet", "-"
    return "tied" if found.tied else _signed(found.extra_cost), _signed(found.extra_one_off or 0.0)


def _least(found: Without | None) -> str:
    return "-" if found is None or found.extra_least is None else _signed(found.extra_least)


def _signed(amount: float) -> str:
    return f"{amount:+,.0f}" if abs(amount) >= HALF else "0" if amount == 0 else f"{amount:+.2g}"


def _what_changes(test: ClosingTest, line: ClosingLine, *, in_full: bool) -> str:
    """Return what would change without a site or supplier, re-planned and re-routed."""
    said = []
    for how, found in (("Re-planned", line.replan), ("Re-routed", line.reroute)):
        if found is None:
            continue
        if found.possible is False:
            said.append(f"{how}: impossible. {_short(test, found)}{' '.join(found.why)}")
        elif found.extra_cost is not None:
            said += [f"{how}: {'; '.join(_facts(test, line, found))}.", *(_details(test, found) if in_full else ())]
    return f"Without {line.name}:\n" + bullets(said) if said else ""


def _short(test: ClosingTest, found: Without) -> str:
    if not found.unserved:
        return ""
    customers = list(dict.fromkeys(short.customer for short in found.unserved))
    who = "customer goes" if len(customers) == 1 else "customers go"
    goods = [good for good in dict.fromkeys(short.good for short in found.unserved) if good != IMPLIED_GOOD]
    what = f" of {_some(goods)}" if goods else ""
    return f"At least {found.unserved_load:,.6g} {test.unit}{what} stay unserved; {len(customers)} {who} short. "


def _facts(test: ClosingTest, line: ClosingLine, found: Without) -> Iterator[str]:
    """Yield other verdicts, who takes over, what that fills, distance and service."""
    others = [change for change in found.changes if change.name != line.name]
    for verdict in dict.fromkeys(change.after for change in others):
        names = [change.name for change in others if change.after == verdict and change.before != verdict]
        if names:
            yield f"{verdict} {_some(names)}"
    sizes = [f"{c.name} {c.size_before} to {c.size_after}" for c in others if c.before == c.after]
    if sizes:
        yield f"change size {_some(sizes)}"
    gains = [
        f"{filling.name} +{filling.after - filling.before:,.0f}"
        for filling in found.fillings
        if filling.name != line.name and filling.after > filling.before
    ]
    if gains:
        yield f"more load ({test.unit}) at {_some(gains)}"
    if found.filled:
        yield f"fills {_some(list(found.filled))}"
    if found.extra_km is not None and found.average_km is not None and abs(found.extra_km) >= HALF:
        yield f"{found.average_km:,.0f} road km on average ({found.extra_km:+,.0f})"
    if found.extra_share is not None and found.share_within is not None:
        yield f"{percent(found.share_within)} of the weight within the service distance"
    if not others and not gains:
        yield "nothing else changes"


def _details(test: ClosingTest, found: Without) -> Iterator[str]:
    """Yield cost lines that differ and customers that shift."""
    lines = [
        f"{line} {_signed(found.cost_lines[line])}" for line in CostLine if abs(found.cost_lines.get(line, 0.0)) >= HALF
    ]
    if lines:
        yield f"Cost lines ({test.currency} a year): {', '.join(lines)}."
    largest = sorted(found.shifts, key=lambda shift: -shift.load)
    moved = [
        f"{shift.customer} {shift.load:,.6g} from {shift.before or 'nowhere'} to {shift.after or 'nowhere'}"
        for shift in largest[:MOST_SHIFTS]
    ]
    if moved:
        more = f"; and {len(largest) - MOST_SHIFTS} more" if len(largest) > MOST_SHIFTS else ""
        yield f"Customers served from elsewhere ({test.unit}): {'; '.join(moved)}{more}."


def _some(names: list[str]) -> str:
    listed = ", ".join(names[:NAMED])
    return listed if len(names) <= NAMED else f"{listed} and {len(names) - NAMED} more"


def _notes(test: ClosingTest) -> list[str]:
    """Return what has to be said about the whole test."""
    notes = []
    saving = [line.name for line in test.lines if line.replan is not None and line.replan.saves]
    if saving:
        notes.append(
            f"Doing without {_some(saving)} is cheaper than the plan, which was not proved to be the best. Plan again "
            "with a smaller --gap or a longer --time-limit."
        )
    tied = [line.name for line in test.lines if line.replan is not None and line.replan.tied]
    if tied:
        notes.append(f"Tied: a plan without {_some(tied)} costs the same, as far as a proof can tell.")
    if not test.complete:
        notes.append("Stopped: what reads `not asked` was not begun.")
    if test.gap_asked > 0:
        notes.append(
            f"Each search was asked to come within {percent_up(test.gap_asked)} of the best; `at least` is what no "
            "plan without it can undercut, less the cost of the plan."
        )
    return notes
