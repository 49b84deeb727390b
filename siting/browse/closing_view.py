"""What the page Close a site says of a closing test: sentences, and tables as HTML. Knows no Streamlit."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.browse.tables import Heading, Line, report_table
from siting.plan.plan import CostLine, SiteVerdict, SupplierVerdict
from siting.plan.proof import Outcome
from siting.plan.words import money, percent, percent_up
from siting.sharing.charts import LINE_NAMES
from siting.sharing.looks import NO_BREAK, SITE_SYMBOLS, SUPPLIER_SYMBOLS
from siting.sharing.symbols import symbol_svg

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from siting.questions.closing_result import ClosingLine, ClosingTest, Without
    from siting.sharing.looks import Formats

HALF = 0.5
"""Money a year, or km, that rounds to nothing."""
NAMED = 3
"""Names listed before "and n more"."""
HOW = {"reroute": "Others take over", "replan": "Everything re-planned"}
"""The two answers, in words; the first leaves all other verdicts as they are."""
WORDS = {"site": ("close", "Cheapest to close"), "supplier": ("drop", "Cheapest supplier to drop")}


def closing_headline(test: ClosingTest) -> tuple[str, str]:
    """
    Return the sentence a closing test opens with, and a second one.

    Parameters
    ----------
    test
        Of a plan that exists.

    Returns
    -------
    first, second
        The cheapest site to close with both answers; then the cheapest supplier to drop, and what is irreplaceable.
    """
    kinds = [kind for kind in ("site", "supplier") if any(line.kind == kind for line in test.lines)]
    said = [_cheapest(test, kind) for kind in kinds]
    never = [line.name for line in test.lines if line.replan is not None and line.replan.possible is False]
    if never:
        said.append(f"Nothing can replace {some(never)}.")
    first, *rest = said or ["The plan has nothing open or signed to do without."]
    return first, " ".join(rest)


def _cheapest(test: ClosingTest, kind: str) -> str:
    lines = [line for line in test.lines if line.kind == kind]
    doing, opening = WORDS[kind]
    best = next((line for line in lines if line.replan is not None and line.replan.extra_cost is not None), None)
    if best is None:
        if all(line.replan is not None and line.replan.possible is False for line in lines):
            return f"No {kind} can be done without: no plan meets everything that is asked without it."
        return f"What it costs to {doing} a {kind} is not known yet."
    so_far = "" if all(_settled(line.replan) for line in lines) else " so far, the search being cut short"
    return f"{opening}{so_far}: {best.name}, {answer_words(best, test.currency)}."


def _settled(found: Without | None) -> bool:
    """Return whether an answer is as good as was asked."""
    return found is not None and found.outcome in {Outcome.PROVED, Outcome.WITHIN_GAP, Outcome.IMPOSSIBLE}


def answer_words(line: ClosingLine, currency: str) -> str:
    """Return both answers of a line in words."""
    replan, reroute = line.replan, line.reroute
    if reroute is not None and reroute.possible is False:
        return f"{_extra_words(replan, currency)} if everything is re-planned; the others alone cannot take over"
    if reroute is None or reroute.extra_cost is None:
        return f"{_extra_words(replan, currency)} if everything is re-planned"
    brief = reroute.extra_cost > 0 and not reroute.tied
    return (
        f"{_extra_words(reroute, currency)} if others take over, "
        f"{_extra_words(replan, currency, brief=brief)} if everything is re-planned"
    )


def _extra_words(found: Without | None, currency: str, *, brief: bool = False) -> str:
    """Return what it costs more; `brief` after another amount of the same kind."""
    if found is None or found.extra_cost is None:
        return "not known yet"
    if found.tied:
        return "at the same cost"
    amount = money(abs(found.extra_cost), currency)
    if found.extra_cost < 0:
        return f"{amount} a year less"
    most = "" if _settled(found) else "at most "
    return f"{most}{amount}" if brief else f"{most}{amount} a year more"


def ranking_table(test: ClosingTest) -> str:
    """Return everything tested with both answers side by side, the cheapest to do without first, as HTML."""
    year, once = f"{test.currency} a year", f"once, {test.currency}"
    headings = (
        Heading(text="Without", name=True),
        Heading(text="Verdict now", verdict=True),
        Heading(text=f"{HOW['reroute']}: more, {year}", number=True),
        Heading(text=once, number=True),
        Heading(text=f"{HOW['replan']}: more, {year}", number=True),
        Heading(text="at least", number=True),
        Heading(text=once, number=True),
        Heading(text="What then happens"),
    )
    lines = [
        Line(
            mark=_mark(line),
            kind="faint" if line.replan is not None and line.replan.possible is False else "",
            cells=(
                line.name,
                line.verdict,
                *_cells(line.reroute),
                *_cells(line.replan, least=True),
                then_words(line),
            ),
        )
        for line in test.lines
    ]
    return report_table(headings, lines)


def _mark(line: ClosingLine) -> str:
    if line.kind == "site":
        return symbol_svg(SITE_SYMBOLS[SiteVerdict(line.verdict)], fill=0.6)
    return symbol_svg(SUPPLIER_SYMBOLS[SupplierVerdict(line.verdict)])


def _cells(found: Without | None, *, least: bool = False) -> tuple[str, ...]:
    blank = ("", "") if least else ("",)
    if found is None:
        return ("not asked", *blank)
    if found.possible is False:
        return ("impossible", *blank)
    if found.extra_cost is None:
        return ("not yet", *blank)
    most = "" if _settled(found) else "up to "
    more = "same" if found.tied else f"{most}{signed(found.extra_cost)}"
    low = () if not least else ("" if found.extra_least is None else signed(found.extra_least),)
    return (more, *low, signed(found.extra_one_off) if found.extra_one_off else "")


def signed(amount: float) -> str:
    """Return money or load with its sign, never rounded to nothing."""
    return f"{amount:+,.0f}" if abs(amount) >= HALF else f"{amount:+.2g}" if amount else "0"


def then_words(line: ClosingLine) -> str:
    """Return in a few words what happens without a site or supplier, everything re-planned."""
    found = line.replan
    if found is None or (found.plan is None and found.possible is not False):
        return ""
    if found.possible is False:
        return " ".join(found.why)
    parts = []
    others = [change for change in found.changes if change.name != line.name]
    for verdict, word in (("open", "opens"), ("sign", "signs"), ("close", "closes"), ("drop", "drops")):
        names = [change.name for change in others if change.after == verdict]
        if names:
            parts.append(f"{word} {some(names)}")
    kept = [change.name for change in others if change.after in {"keep", "stay"}]
    left = [change.name for change in others if change.after == "leave"]
    parts += [f"keeps {some(kept)}"] if kept else []
    parts += [f"leaves {some(left)}"] if left else []
    resized = [f"{change.name} at {change.size_after}" for change in others if change.before == change.after]
    parts += [f"sizes {some(resized)}"] if resized else []
    gains = [each.name for each in found.fillings if each.after > each.before and each.name != line.name]
    if not parts and gains:
        parts.append(f"{some(gains)} take{'s' if len(gains) == 1 else ''} over")
    if found.filled:
        parts.append(f"fills {some(found.filled)}")
    return "; ".join(parts)


def some(names: Sequence[str], most: int = NAMED) -> str:
    """Return names in a row, the first few of many."""
    shown, left = list(names[:most]), len(names) - most
    if left > 0:
        return f"{', '.join(shown)} and {left} more"
    return shown[0] if len(shown) == 1 else f"{', '.join(shown[:-1])} and {shown[-1]}"


def facts(line: ClosingLine, found: Without | None, test: ClosingTest, formats: Formats) -> list[tuple[str, str]]:
    """Return what one of the two answers amounts to, as label and text."""
    if found is None:
        return [("Answer", "not asked before the stop")]
    if found.possible is False:
        return list(_impossible(found, test, formats))
    if found.extra_cost is None or found.cost is None:
        return [("Answer", "no plan was found in the time allowed")]
    return list(_possible(line, found, test, formats))


def _impossible(found: Without, test: ClosingTest, formats: Formats) -> Iterator[tuple[str, str]]:
    yield "Answer", "impossible"
    if found.unserved:
        customers = dict.fromkeys(short.customer for short in found.unserved)
        load = f"{formats.number(found.unserved_load)}{NO_BREAK}{formats.unit}"
        yield "Cannot be served", f"at least {load} a year, at {some(list(customers))} ({len(customers)} in all)"
    for at, sentence in enumerate(found.why):
        yield "Why" if at == 0 else "", sentence
    if not found.why:
        yield "Why", f"nothing that is asked of {test.title or 'the study'} can then be met in full"


def _possible(line: ClosingLine, found: Without, test: ClosingTest, formats: Formats) -> Iterator[tuple[str, str]]:
    extra = found.extra_cost or 0.0
    share = f" ({percent(extra / abs(test.cost))})" if test.cost and extra > 0 and not found.tied else ""
    more = "the same, as far as a proof can tell" if found.tied else f"{signed(extra)} {test.currency} a year{share}"
    yield "Extra cost", more
    yield "One-off money", f"{signed(found.extra_one_off or 0.0)} {test.currency} once"
    yield "How sure", _sure(found, test)
    if found.filled:
        yield "Hits its capacity", some(found.filled)
    gains = [each for each in found.fillings if each.name != line.name and each.after > each.before]
    taken = [f"{each.name} {signed(each.after - each.before)}" for each in gains]
    if taken:
        yield "Takes over", f"{some(taken)} {formats.unit} a year"
    others = [change for change in found.changes if change.name != line.name]
    if others:
        verdicts = [
            f"{each.name}: {_verdict(each.after, each.size_after)} (was {_verdict(each.before, each.size_before)})"
            for each in others
        ]
        yield "Other verdicts", "; ".join(verdicts)
    if found.average_km is not None and found.extra_km is not None:
        yield "Average distance", f"{formats.distance(found.average_km)} ({_km(found.extra_km)})"
    if found.share_within is not None and found.extra_share is not None:
        points = f"{100 * found.extra_share:+.1f} points"
        yield "Within the service distance", f"{formats.share(found.share_within)} of weight ({points})"
    moved = len({shift.customer for shift in found.shifts})
    yield "Customers that change", f"{moved:,}"


def _verdict(verdict: str, size: str) -> str:
    return f"{verdict} {size}".strip()


def _km(extra: float) -> str:
    return f"{extra:+,.1f}{NO_BREAK}km" if abs(extra) >= 0.05 else "unchanged"  # noqa: PLR2004 - rounds to 0.0


def _sure(found: Without, test: ClosingTest) -> str:
    if found.outcome is Outcome.PROVED:
        return "proved"
    least = "" if found.extra_least is None else f"; at least {signed(found.extra_least)} {test.currency} a year"
    gap = "" if found.gap is None else f" within {percent_up(found.gap)} of the cost"
    return f"{'proved' if found.outcome is Outcome.WITHIN_GAP else 'not proved:'}{gap}{least}"


def facts_table(pairs: Sequence[tuple[str, str]], caption: str) -> str:
    """Return label and text as an HTML table."""
    return report_table((Heading(text=""), Heading(text="")), (Line(cells=pair) for pair in pairs), caption=caption)


def lines_table(line: ClosingLine, currency: str) -> str:
    """Return by how much each cost line differs in both answers as an HTML table; empty where there is neither."""
    answers = {how: found.cost_lines for how, found in (("reroute", line.reroute), ("replan", line.replan))
               if found is not None and found.cost_lines}  # fmt: skip
    if not answers:
        return ""
    headings = [Heading(text="Cost line"), *(Heading(text=f"{HOW[how]}, {currency} a year", number=True)
                                             for how in answers)]  # fmt: skip
    rows = [
        Line(cells=(LINE_NAMES[name], *(signed(lines.get(name, 0.0)) for lines in answers.values())))
        for name in CostLine
        if any(abs(lines.get(name, 0.0)) >= HALF for lines in answers.values())
    ]
    sums = (signed(sum(lines.values())) for lines in answers.values())
    return report_table(headings, [*rows, Line(cells=("Extra cost", *sums), kind="total")], caption="By cost line")
