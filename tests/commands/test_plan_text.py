"""What `siting plan` prints: true to the figures behind it, in every corner."""

from __future__ import annotations

from dataclasses import replace

import pytest

from siting.commands.plan_text import answer_text
from siting.plan.plan import Answer, CostLine, Plan
from siting.plan.proof import Outcome, Proof
from tests.plan import hand

PLAN = hand.plan_of()


def text_of(plan: Plan) -> str:
    """Return what is printed, its line breaks taken out."""
    text = answer_text(hand.STUDY, Answer(proof=plan.proof, plan=plan, today=plan.today))
    return " ".join(text.split())


def bounded(bound: float | None, cost: float | None = None, *, outcome: Outcome = Outcome.STOPPED) -> Proof:
    """Return the proof of the hand-worked plan with another bound."""
    return replace(PLAN.proof, outcome=outcome, cost=PLAN.cost if cost is None else cost, bound=bound)


@pytest.mark.parametrize(
    ("bound", "said"),
    [
        (1_234_567.9, "No plan can cost less than 1,234,567 EUR a year."),
        (4_321.9, "No plan can cost less than 4,321 EUR a year."),
        (198.609, "No plan can cost less than 198.60 EUR a year."),
    ],
)
def test_a_bound_is_never_rounded_up(bound: float, said: str) -> None:
    """A bound rounded up would be above plans that exist."""
    assert said in text_of(replace(PLAN, proof=bounded(bound, 2e6)))


def test_a_plan_at_its_bound_is_said_to_be_the_cheapest() -> None:
    """The figure would only repeat the cost."""
    text = text_of(replace(PLAN, proof=bounded(PLAN.cost, outcome=Outcome.PROVED)))
    assert " s. No plan can cost less. " in text


@pytest.mark.parametrize(
    ("load", "capacity", "shown"),
    [
        (0.4, 100.0, " <1 % "),
        (0.5, 100.0, " <1 % "),
        (0.6, 100.0, " 1 % "),
        (99.0, 100.0, " 99 % "),
        (5.0, None, " - "),
    ],
)
def test_a_site_that_moves_something_is_not_said_to_be_empty(load: float, capacity: float | None, shown: str) -> None:
    """A share is never 0 % by rounding."""
    first = next(line for line in PLAN.sites if line.throughput)
    lines = tuple(replace(line, throughput=load, capacity=capacity) if line is first else line for line in PLAN.sites)
    plan = replace(PLAN, sites=lines)
    text = answer_text(hand.STUDY, Answer(proof=plan.proof, plan=plan, today=plan.today))
    assert shown in next(line for line in text.splitlines() if line.startswith(first.site))


def test_the_small_money_of_a_textbook_keeps_its_decimals() -> None:
    """198.50 in the headline and 198 below it would not be one figure."""
    lines = {**dict.fromkeys(CostLine, 0.0), CostLine.SITES: 100.0, CostLine.OUTBOUND: 98.5}
    plan = replace(PLAN, cost_lines=lines, today=None, proof=bounded(198.5, 198.5))
    text = text_of(plan)
    assert "sites 100.00 outbound 98.50 cost 198.50" in text
    whole = {**lines, CostLine.OUTBOUND: 98.0}
    assert "sites 100 outbound 98 cost 198 " in text_of(replace(plan, cost_lines=whole))


def test_why_a_search_stopped_is_said() -> None:
    """What the engine notes is part of the proof's line."""
    proof = replace(PLAN.proof, reason="auto: the whole model, 12 lanes, goes to one solver; stopped by the time limit")
    assert "goes to one solver; stopped by the time limit) in " in text_of(replace(PLAN, proof=proof))


def test_customers_served_from_more_than_one_place_are_listed() -> None:
    """With the places, the largest first; after ten the others are counted."""
    first, *others = PLAN.customers
    alone = [replace(line, origins=("Linz",)) for line in others]
    split = replace(first, origins=("Linz", "Brno"))
    assert "served from more than one place" not in text_of(replace(PLAN, customers=tuple(alone)))
    text = text_of(replace(PLAN, customers=(split, *alone)))
    assert f"- 1 customer is served from more than one place: {first.customer} (Linz, Brno). " in text
    twelve = tuple(replace(split, customer=f"C{number}") for number in range(12))
    text = text_of(replace(PLAN, customers=twelve))
    assert "- 12 customers are served from more than one place: C0 (Linz, Brno), C1 (Linz, Brno), " in text
    assert "C9 (Linz, Brno) and 2 more. " in text
