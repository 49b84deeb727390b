"""plan.json: valid against its schema, without loss, and refused with clear words where it does not fit."""

from __future__ import annotations

import json
import math
from copy import deepcopy
from dataclasses import replace
from typing import Any

import jsonschema
import pytest

from siting.errors import Fault, PlanFileError
from siting.plan.audit import AuditReport, audit
from siting.plan.codec import encode
from siting.plan.contract import (
    DETAIL,
    answer_from_json,
    answer_to_json,
    check_to_json,
    schema,
    summary_to_json,
    to_text,
)
from siting.plan.plan import Answer, Reason, Today, TodayOutcome, Unserved
from siting.plan.proof import Outcome, Proof
from tests.plan import hand

PLAN = hand.plan_of()
PASSED = AuditReport(passed=True, faults=())
SHORT = Today(
    outcome=TodayOutcome.SHORT,
    reason="12 t cannot be served.",
    plan=None,
    unserved=(Unserved(customer="Zlin", good="trees", amount=12.0),),
)


def without_plan(outcome: Outcome, **changes: Any) -> Answer:  # noqa: ANN401  # fields by name
    """Return an answer without a plan."""
    proof = Proof(outcome=outcome, cost=None, bound=31_000.5, gap_asked=0.0, seconds=3.0, engine="direct")
    return replace(Answer(proof=proof, plan=None, today=None), **changes)


REASON = Reason(family="capacity", sentence="Total capacity is short by 1,240 t.", amount=1240.0, unit="t")
ANSWERS = {
    "a plan": Answer(proof=PLAN.proof, plan=PLAN, today=PLAN.today),
    "bounds a count": Answer(
        proof=replace(PLAN.proof, site_count_bounds={1: math.inf, 2: 30_000.0}),
        plan=replace(PLAN, proof=replace(PLAN.proof, site_count_bounds={1: math.inf, 2: 30_000.0})),
        today=PLAN.today,
    ),
    "today short": Answer(proof=PLAN.proof, plan=replace(PLAN, today=SHORT), today=SHORT),
    "no plan yet": without_plan(Outcome.NO_PLAN_YET, today=PLAN.today),
    "impossible": without_plan(Outcome.IMPOSSIBLE, reasons=(REASON, replace(REASON, amount=None)), together=True),
}


@pytest.fixture(params=ANSWERS)
def answer(request: pytest.FixtureRequest) -> Answer:
    """Return one answer of each kind."""
    return ANSWERS[request.param]


def report_of(answer: Answer) -> AuditReport | None:
    """Return the audit of an answer's plan, if it has one."""
    return PASSED if answer.plan else None


def test_the_schemas_are_valid_themselves() -> None:
    """Both name draft 2020-12 and keep to it."""
    for name in ("plan", "check"):
        jsonschema.Draft202012Validator.check_schema(schema(name))
        assert schema(name)["$schema"] == "https://json-schema.org/draft/2020-12/schema"


def test_what_is_written_keeps_to_the_schema(answer: Answer) -> None:
    """Both the object of --json and plan.json, after a trip through text."""
    validator = jsonschema.Draft202012Validator(schema())
    for held in (
        summary_to_json(answer, report_of(answer), fingerprint="f"),
        answer_to_json(answer, report_of(answer), fingerprint="f"),
    ):
        validator.validate(json.loads(to_text(held)))


def test_nothing_is_lost(answer: Answer) -> None:
    """Reading what was written gives an equal answer, to the last digit."""
    text = to_text(answer_to_json(answer, report_of(answer), fingerprint="f"))
    assert answer_from_json(json.loads(text)) == answer


@pytest.mark.parametrize("place", ["cost", "audit", "sites"])
def test_the_schema_refuses_other_forms(place: str) -> None:
    """A key left out, or null beside a cost, is not valid: the schema is no rubber stamp."""
    held = summary_to_json(ANSWERS["a plan"], PASSED)
    validator = jsonschema.Draft202012Validator(schema())
    assert not validator.is_valid({key: value for key, value in held.items() if key != place})
    assert not validator.is_valid({**held, "sites": None})
    assert not validator.is_valid({**held, "surprise": 1})


def test_the_summary_has_the_keys_other_programs_rely_on() -> None:
    """The agreed keys, money unrounded, names under their verdicts."""
    held = summary_to_json(ANSWERS["a plan"], AuditReport(passed=False, faults=("x",)))
    agreed = "outcome cost bound gap seconds engine sites suppliers cost_lines today saving audit fingerprint warnings"
    assert set(agreed.split()) <= held.keys()
    assert held["cost"] == PLAN.proof.cost
    assert held["gap"] == pytest.approx(1e-5)
    assert held["sites"] == {"keep": ["Linz"], "open": ["Brno"], "close": ["Graz"], "leave": ["Wels"]}
    assert held["suppliers"] == {"stay": ["Farm"], "sign": ["Orchard"], "drop": ["Nursery"], "leave": []}
    assert PLAN.today is not None
    assert held["today"] == {"cost": PLAN.today.cost, "outcome": "served"}
    assert held["saving"] == PLAN.saving
    assert held["audit"] == {"passed": False, "faults": ["x"]}
    assert sum(held["cost_lines"].values()) == pytest.approx(held["cost"])


def test_an_impossible_study_has_reasons_and_no_cost() -> None:
    """Cost, verdicts, lines, saving and audit are null; the fingerprint is still there."""
    held = summary_to_json(ANSWERS["impossible"], None, fingerprint="abc")
    assert [held[key] for key in ("cost", "sites", "suppliers", "cost_lines", "saving", "audit")] == [None] * 6
    assert held["fingerprint"] == "abc"
    assert held["together"] is True
    assert held["reasons"][0]["amount"] == 1240.0


def test_an_infinite_gap_is_null() -> None:
    """A cost of 0 with a bound below has no relative gap, and JSON no infinity."""
    proof = Proof(outcome=Outcome.STOPPED, cost=0.0, bound=-1.0, gap_asked=0.0, seconds=0.0, engine="direct")
    held = summary_to_json(Answer(proof=proof, plan=None, today=None), None)
    assert held["gap"] is None
    assert "Infinity" not in to_text(held)


@pytest.mark.parametrize("number", [math.inf, -math.inf, math.nan])
def test_numbers_json_cannot_hold_are_refused(number: float) -> None:
    """Neither the encoder nor the writer lets them through."""
    with pytest.raises(ValueError, match=f"a plan cannot hold the number {number}"):
        encode(replace(PLAN, one_off=number))
    with pytest.raises(ValueError, match="not JSON compliant"):
        to_text({"number": number})


def edited(path: str, value: object) -> dict[str, Any]:
    """Return the good plan.json with one place changed, or removed where the value is ...."""
    held: dict[str, Any] = deepcopy(answer_to_json(ANSWERS["a plan"], PASSED))
    *above, last = path.split("/")
    place: Any = held
    for key in above:
        place = place[int(key)] if isinstance(place, list) else place[key]
    if value is ...:
        del place[last]
    else:
        place[last] = value
    return held


@pytest.mark.parametrize(
    ("path", "value", "message"),
    [
        ("format_version", ..., r"this is not a plan: format_version is missing. Give the folder"),
        ("format_version", 2, r"format_version is 2, this program reads 1. Plan the study again"),
        ("detail", ..., r"detail is missing \(it is in what --out writes"),
        ("detail/plan/sites/1/throughput", "80", r"detail\.plan\.sites\[1\]\.throughput: '80' is not a number"),
        ("detail/plan/sites/1/throughput", True, r"sites\[1\]\.throughput: True is not a number"),
        ("detail/plan/sites/1/throughput", None, r"sites\[1\]\.throughput: None is not a number"),
        ("detail/plan/sites/1/customers", 1.5, r"sites\[1\]\.customers: 1\.5 is not a whole number"),
        ("detail/plan/sites/1/verdict", "pass", r"verdict: 'pass' is not one of keep, open, close, leave"),
        ("detail/plan/sites/1/size", ..., r"detail\.plan\.sites\[1\]: size missing. Write the plan again"),
        ("detail/plan/sites/1/colour", "teal", r"detail\.plan\.sites\[1\]: colour unknown. It was written by a newer"),
        ("detail/plan/sites", {}, r"detail\.plan\.sites: \{\} is not a list"),
        ("detail/plan/service", [], r"detail\.plan\.service: \[\] is not an object"),
        ("detail/plan/title", 7, r"detail\.plan\.title: 7 is not text"),
        ("detail/plan/title", ["x" * 80], r"detail\.plan\.title: \['x+\.\.\. is not text"),
        ("detail/together", 0, r"detail\.together: 0 is not true or false"),
        ("detail/plan/cost_lines/tips", 1.0, r"detail\.plan\.cost_lines: 'tips' is not a known name as key"),
        ("detail/proof/site_count_bounds", {"two": 1.0}, r"site_count_bounds: 'two' is not a known name as key"),
        ("cost", 1.0, r"cost and detail contradict each other; the file was edited"),
        ("saving", ..., r"saving is missing. Write the plan again"),
        ("sites/open", ["Wels"], r"sites and detail contradict each other"),
    ],
)
def test_what_does_not_fit_is_refused_in_words(path: str, value: object, message: str) -> None:
    """Each message gives the place, what is there and what is wanted."""
    with pytest.raises(PlanFileError, match=message):
        answer_from_json(edited(path, value))


def test_something_else_is_no_plan() -> None:
    """A list, say."""
    with pytest.raises(PlanFileError, match="this is not a plan"):
        answer_from_json([])


def test_a_read_plan_passes_the_audit_again() -> None:
    """Nothing of what the audit looks at is lost on the way."""
    held = json.loads(to_text(answer_to_json(ANSWERS["a plan"], PASSED)))
    plan = answer_from_json(held).plan
    assert plan is not None
    assert audit(hand.STUDY, plan).passed
    assert DETAIL in held


def test_the_check_of_a_study_keeps_to_its_schema() -> None:
    """Faults and warnings with their parts and as one sentence."""
    fault = Fault(
        table="customers", row=14, column="demand", value="abc", wrong="not a number", repair="Write a number"
    )
    warning = Fault(table="study.toml", wrong="no standing", repair="Add one")
    held = check_to_json([fault], [warning])
    jsonschema.Draft202012Validator(schema("check")).validate(held)
    assert held["faults"][0]["text"] == str(fault)
    assert held["faults"][0]["row"] == 14
    assert held["warnings"][0]["row"] is None
