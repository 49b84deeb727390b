"""Headlines and notes: every outcome and edge, rounded so that what they say stays true."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from siting.plan.plan import Answer, CostLine, Plan, Reason, Today, TodayOutcome, Unserved
from siting.plan.proof import Outcome, Proof
from siting.plan.words import (
    CAUTIONS,
    against_today,
    delivery_sentence,
    headline,
    money,
    money_down,
    money_up,
    payback,
    percent,
    percent_up,
    seconds,
    sureness,
)
from tests.building import lane_table
from tests.plan import hand

PLAN = hand.plan_of()


def proof(outcome: Outcome, cost: float | None, bound: float | None) -> Proof:
    """Return a proof of 3 seconds with a gap asked of 1e-4."""
    return Proof(outcome=outcome, cost=cost, bound=bound, gap_asked=1e-4, seconds=3.0, engine="direct")


def with_cost(cost: float, today_cost: float | None, *, goods: float = 0.0, one_off_lines: float = 0.0) -> Plan:
    """Return the hand-worked verdicts with other money."""

    def lines(total: float, opening: float) -> dict[CostLine, float]:
        return {
            **dict.fromkeys(CostLine, 0.0),
            CostLine.GOODS: goods,
            CostLine.OPENING: opening,
            CostLine.OUTBOUND: total - goods - opening,
        }

    plan = replace(PLAN, cost_lines=lines(cost, one_off_lines), proof=proof(Outcome.PROVED, cost, cost))
    if today_cost is None:
        return replace(plan, today=Today(outcome=TodayOutcome.ABSENT, reason="Nothing runs.", plan=None))
    assert PLAN.today is not None
    assert PLAN.today.plan is not None
    before = replace(
        PLAN.today.plan, cost_lines=lines(today_cost, 0.0), proof=proof(Outcome.PROVED, today_cost, today_cost)
    )
    return replace(plan, today=replace(PLAN.today, plan=before))


def said(plan: Plan, **changes: Any) -> str:  # noqa: ANN401  # fields by name
    """Return the headline of a plan with changes."""
    plan = replace(plan, **changes)
    return headline(Answer(proof=plan.proof, plan=plan, today=plan.today))


def test_the_headline_counts_verdicts_apart_and_states_cost_saving_and_proof() -> None:
    """The whole sentence for millions."""
    plan = with_cost(4_210_000.0, 4_590_000.0, goods=1_500_000.0)
    bounded = replace(plan, proof=proof(Outcome.WITHIN_GAP, 4_210_000.0, 4_209_579.0))
    assert said(bounded) == (
        "Run 2 of 4 sites (keep 1, open 1, close 1), have 2 of 3 suppliers signed (stay 1, sign 1, drop 1): "
        "4.21 M EUR a year, 0.38 M EUR less than today (8.3 %, 12.3 % without goods prices); "
        "proved within 0.01 % (at most 421 EUR a year)."
    )


def test_one_site_and_no_suppliers() -> None:
    """The singular, and nothing about suppliers."""
    assert said(with_cost(1_000.0, None), sites=PLAN.sites[2:3], suppliers=()) == (
        "Run 1 of 1 site (open 1): 1,000 EUR a year; proved: no plan is cheaper."
    )


def test_suppliers_alone() -> None:
    """A pure choice of suppliers starts with them."""
    assert said(with_cost(1_000.0, None), sites=()).startswith(
        "Have 2 of 3 suppliers signed (stay 1, sign 1, drop 1): "
    )


def test_nothing_taken_at_all() -> None:
    """No brackets where nobody has a verdict worth counting."""
    assert said(with_cost(0.0, None), sites=PLAN.sites[3:], suppliers=()).startswith("Run 0 of 1 site: 0 EUR a year;")


def test_a_dearer_plan_says_more_than_today() -> None:
    """Extra cost is no negative saving."""
    assert against_today(with_cost(1_100.0, 1_000.0)) == "100 EUR more than today (10 %)"


@pytest.mark.parametrize(("cost", "text"), [(1_000.004, "the same as today"), (1_000.01, "0.01 EUR more than today")])
def test_the_same_cost_is_said_to_be_the_same(cost: float, text: str) -> None:
    """Never a saving of 0."""
    assert against_today(with_cost(cost, 1_000.0)).startswith(text)


def test_a_small_saving_beside_millions_is_not_rounded_away() -> None:
    """3,000 EUR of 4 M EUR is not 0.00 M EUR."""
    assert against_today(with_cost(4_000_000.0, 4_003_000.0)) == "3,000 EUR less than today (0.07 %)"


def test_no_today_says_nothing_of_it() -> None:
    """Where nothing runs there is nothing to compare with."""
    assert against_today(with_cost(1_000.0, None)) == ""
    assert "today" not in said(with_cost(1_000.0, None))


def test_a_short_today_states_no_saving() -> None:
    """Today does not serve everything, so its cost is no yardstick."""
    short = Today(
        outcome=TodayOutcome.SHORT,
        reason="5 t cannot be served.",
        plan=None,
        unserved=(Unserved(customer="Zlin", good="trees", amount=5.0),),
    )
    assert against_today(replace(PLAN, today=short)) == "no saving stated since today cannot serve everything"


@pytest.mark.parametrize(
    ("outcome", "cost", "bound", "text"),
    [
        (Outcome.PROVED, 100.0, 100.0, "proved: no plan is cheaper"),
        (Outcome.PROVED, 1e6, 1e6 - 0.5, "proved within 0.0001 % (at most 0.50 EUR a year)"),
        (Outcome.PROVED, 1e6, 1e6 - 1e-6, "proved within 0.0001 % (at most 0.01 EUR a year)"),
        (Outcome.WITHIN_GAP, 1e6, 1e6 - 99.0, "proved within 0.0099 % (at most 99.00 EUR a year)"),
        (Outcome.WITHIN_GAP, 1e6, 1e6 - 99.1, "proved within 0.01 % (at most 99.10 EUR a year)"),
        (Outcome.STOPPED, 1e6, 1e6 - 12_100.0, "not proved: could be up to 1.3 % (12,100 EUR a year) cheaper"),
        (Outcome.STOPPED, 1e6, -1e6, "not proved: could be up to 200 % (2.00 M EUR a year) cheaper"),
        (Outcome.STOPPED, 0.0, -5.0, "not proved: could be up to 5.00 EUR a year cheaper"),
        (Outcome.STOPPED, 1e6, None, "not proved: nothing is known yet about how much cheaper a plan could be"),
    ],
)
def test_how_sure_a_plan_is(outcome: Outcome, cost: float, bound: float | None, text: str) -> None:
    """The gap is rounded up, in per cent and in money, and never to 0."""
    assert sureness(proof(outcome, cost, bound), "EUR") == text


@pytest.mark.parametrize(
    ("share", "text"),
    [
        (0.0, "0 %"),
        (1e-12, "0.0001 %"),
        (1e-6, "0.0001 %"),
        (1.01e-6, "0.00011 %"),
        (1e-4, "0.01 %"),
        (0.99e-4, "0.0099 %"),
        (1.001e-4, "0.011 %"),
        (0.0121, "1.3 %"),
        (0.012, "1.2 %"),
        (0.0999, "10 %"),
        (0.5, "50 %"),
        (1.234, "130 %"),
    ],
)
def test_gaps_are_rounded_up_to_two_digits(share: float, text: str) -> None:
    """What stands there is never less than the gap."""
    assert percent_up(share) == text
    assert float(text.removesuffix(" %")) / 100 >= share


@pytest.mark.parametrize(
    ("share", "text"),
    [
        (0.0, "0 %"),
        (0.00009, "less than 0.01 %"),
        (0.0001, "0.01 %"),
        (0.0009, "0.09 %"),
        (0.001, "0.1 %"),
        (0.142, "14.2 %"),
        (0.10, "10 %"),
    ],
)
def test_shares_never_round_to_nothing(share: float, text: str) -> None:
    """0 % is kept for nothing at all."""
    assert percent(share) == text


@pytest.mark.parametrize(
    ("amount", "text"),
    [
        (383.0, "383 EUR"),
        (198.5, "198.50 EUR"),
        (999.999, "1,000 EUR"),
        (1_000.4, "1,000 EUR"),
        (999_999.0, "999,999 EUR"),
        (1_000_000.0, "1.00 M EUR"),
        (-1_234_567.0, "-1.23 M EUR"),
        (0.0, "0 EUR"),
        (0.005, "0.01 EUR"),
        (0.00042, "less than 0.01 EUR"),
        (-0.00042, "more than -0.01 EUR"),
        (1_234_567_890.0, "1,234.57 M EUR"),
    ],
)
def test_money_of_a_headline(amount: float, text: str) -> None:
    """Thousands separated, millions from a million, hundredths for the small money of a textbook."""
    assert money(amount, "EUR") == text


@pytest.mark.parametrize(
    ("amount", "text"), [(9_999.0, "9,999 EUR"), (10_000.0, "0.01 M EUR"), (380_000.0, "0.38 M EUR")]
)
def test_money_beside_millions(amount: float, text: str) -> None:
    """In millions too where two decimals show it."""
    assert money(amount, "EUR", like=4e6) == text


@pytest.mark.parametrize(
    ("amount", "text"),
    [(0.0, "0.00 EUR"), (0.001, "0.01 EUR"), (99.991, "100.00 EUR"), (100.2, "101 EUR"), (1_000_001.0, "1.01 M EUR")],
)
def test_at_most_is_rounded_up(amount: float, text: str) -> None:
    """So that no plan is cheaper by more than it says."""
    assert money_up(amount, "EUR") == text


@pytest.mark.parametrize(
    ("amount", "text"),
    [
        (0.0, "0 EUR"),
        (0.009, "0 EUR"),
        (198.509, "198.50 EUR"),
        (999.999, "999.99 EUR"),
        (1_000.9, "1,000 EUR"),
        (1_019_999.0, "1.01 M EUR"),
        (-198.501, "-198.51 EUR"),
        (0.29, "0.29 EUR"),
    ],
)
def test_a_floor_is_rounded_down(amount: float, text: str) -> None:
    """So that no plan can cost less than it says."""
    assert money_down(amount, "EUR") == text


@pytest.mark.parametrize(
    ("length", "text"), [(0.04, "0.0 s"), (0.31, "0.3 s"), (9.94, "9.9 s"), (10.0, "10 s"), (3600, "3,600 s")]
)
def test_short_times_have_a_decimal(length: float, text: str) -> None:
    """A search of a third of a second is not one of none."""
    assert seconds(length) == text


def test_the_headline_without_a_plan_yet() -> None:
    """Says how long it took, and what is known of the cost."""
    answer = Answer(proof=proof(Outcome.NO_PLAN_YET, None, 3_900_000.0), plan=None, today=None)
    assert headline(answer, currency="EUR") == (
        "No plan yet: the search was stopped after 3.0 s before it found one; "
        "no plan can cost less than 3.90 M EUR a year."
    )
    unbounded = replace(answer, proof=proof(Outcome.NO_PLAN_YET, None, None))
    assert headline(unbounded) == "No plan yet: the search was stopped after 3.0 s before it found one."


def reason(sentence: str) -> Reason:
    """Return a reason with a sentence."""
    return Reason(family="capacity", sentence=sentence, amount=None, unit="")


@pytest.mark.parametrize(
    ("sentences", "together", "text"),
    [
        ([], False, "Impossible: no plan can meet everything that is asked."),
        (["Capacity is short by 1,240 t."], False, "Impossible: Capacity is short by 1,240 t."),
        (["A is short.", "B is far."], False, "Impossible (any one of these repairs it): A is short; B is far."),
        (["A is short.", "B is far."], True, "Impossible (all of these together must be met): A is short; B is far."),
    ],
)
def test_the_headline_of_an_impossible_study(sentences: list[str], together: bool, text: str) -> None:  # noqa: FBT001  # a parameter
    """Never a bare "impossible" where a reason is known."""
    reasons = tuple(reason(sentence) for sentence in sentences)
    answer = Answer(
        proof=proof(Outcome.IMPOSSIBLE, None, None), plan=None, today=None, reasons=reasons, together=together
    )
    assert headline(answer) == text


@pytest.mark.parametrize(
    ("one_off", "today_cost", "text"),
    [
        (1_200_000.0, 4_500_000.0, "One-off money 1.20 M EUR, running saving 0.68 M EUR a year, payback in 1.8 years."),
        (
            20_000.0,
            3_500_000.0,
            "One-off money 0.02 M EUR, running cost 0.32 M EUR a year higher: it never pays back.",
        ),
        (0.0, 4_500_000.0, "No one-off money, running saving 0.68 M EUR a year."),
        (-50_000.0, 4_500_000.0, "Brings in 0.05 M EUR once, running saving 0.68 M EUR a year."),
        (-50_000.0, 3_500_000.0, "Brings in 0.05 M EUR once, running cost 0.32 M EUR a year higher."),
        (1_200_000.0, None, "One-off money 1.20 M EUR."),
        (0.0, 3_820_000.0, "No one-off money, running cost the same as today."),
        (0.0, 3_820_000.003, "No one-off money, running cost the same as today."),
        (0.0, 3_819_999.997, "No one-off money, running cost the same as today."),
        (1_200_000.0, 3_820_000.0, "One-off money 1.20 M EUR, running cost the same as today: it never pays back."),
    ],
)
def test_payback_counts_no_money_twice(one_off: float, today_cost: float | None, text: str) -> None:
    """0.5 M EUR cheaper with 0.18 M EUR of annualised one-offs inside is a running saving of 0.68 M EUR."""
    plan = with_cost(4_000_000.0, today_cost, one_off_lines=180_000.0)
    assert payback(replace(plan, one_off=one_off)) == text


def test_the_delivery_charge_is_said_to_be_the_same_only_where_it_is() -> None:
    """Lanes to customers with a unit cost of their own escape it, and so does a study without it."""
    assert delivery_sentence(hand.STUDY, PLAN) == ""
    study = replace(hand.STUDY, lanes=lane_table([hand.LANES[0], hand.LANES[1], hand.LANES[4]]))
    plan = hand.plan_of(study)
    assert delivery_sentence(study, plan) == (
        "Delivery charges (6,528 EUR a year) are the same in every plan: "
        "each 2.5 t is one delivery, wherever it comes from."
    )
    free = replace(study, settings=replace(hand.SETTINGS, drop_charge=0.0, drop_size=None))
    assert delivery_sentence(free, hand.plan_of(free)) == ""


def test_the_cautions_are_all_there() -> None:
    """What must be confirmed by whom, short trips, and what a proof is about."""
    text = " ".join(CAUTIONS)
    for words in ("freight quotes", "flood and fire", "labour law", "understate short trips", "not about the data"):
        assert words in text
