"""The one sentence that says what a question found, for commands and pages alike."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.plan.words import money

if TYPE_CHECKING:
    from siting.questions.compare_result import Comparison
    from siting.questions.counts_result import Counts


def counts_headline(found: Counts) -> str:
    """
    Return the one sentence that says what counts found.

    Parameters
    ----------
    found
        What was found.

    Returns
    -------
    sentence
        The best number, and what one more and one fewer would cost.
    """
    best = found.best
    if best is None or best.cost is None:
        return "No plan with any of these numbers of sites was found."
    near = {line.count: line for line in found.lines}
    said = []
    for word, other in (("fewer", near.get(best.count - 1)), ("more", near.get(best.count + 1))):
        if other is None:
            continue
        if other.outcome == "impossible":
            said.append(f"one {word} is impossible")
        elif other.cost is not None:
            said.append(f"one {word} costs {money(other.cost - best.cost, found.currency)} a year more")
    things = "site is" if best.count == 1 else "sites are"
    return (
        f"{best.count} {things} best, at {money(best.cost, found.currency)} a year"
        + "".join(f"{', ' if at == 0 else ' and '}{part}" for at, part in enumerate(said))
        + "."
    )


def comparison_headline(found: Comparison) -> str:
    """
    Return the one sentence that says how plans compare.

    Parameters
    ----------
    found
        What was compared.

    Returns
    -------
    sentence
        The cheapest, by how much, and how many verdicts and customers differ.
    """
    ranked = sorted(found.plans, key=lambda plan: plan.cost)
    first, second = ranked[0], ranked[1]
    gap = second.cost - first.cost
    if abs(gap) <= 1e-6 * abs(second.cost):
        costs = f"{first.name} and {second.name} cost the same"
    else:
        costs = f"{first.name} is the cheapest, {money(gap, found.currency)} a year less than {second.name}"
    differ, moved = len(found.differing), len(found.customers)
    if not differ and not moved:
        return f"{costs}; no verdict differs and every customer is served from the same places."
    verdicts = f"{differ} verdict{'' if differ == 1 else 's'} differ{'s' if differ == 1 else ''}"
    customers = f"{moved} customer{'' if moved == 1 else 's'} change{'s' if moved == 1 else ''} site"
    return f"{costs}; {verdicts} and {customers}."
