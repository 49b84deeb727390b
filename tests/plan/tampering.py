"""Ways to spoil a good plan in one place, for the tests of the audit."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from siting.plan.audit import audit
from siting.plan.plan import CostLine, Plan
from tests.plan import hand

if TYPE_CHECKING:
    from siting.study.tables import Study

Tamper = Callable[[Plan], Plan]


def objections(plan: Plan, study: Study = hand.STUDY, *, of_today: bool = False) -> str:
    """Return the faults of a plan that must fail, one a line."""
    report = audit(study, plan, of_today=of_today)
    assert report.passed is (not report.faults)
    assert not report.passed
    return "\n".join(report.faults)


def with_site(plan: Plan, site: str, /, **changes: Any) -> Plan:  # noqa: ANN401  # fields by name
    """Return the plan with one site's line changed."""
    return replace(plan, sites=tuple(replace(line, **changes) if line.site == site else line for line in plan.sites))


def with_supplier(plan: Plan, supplier: str, /, **changes: Any) -> Plan:  # noqa: ANN401  # fields by name
    """Return the plan with one supplier's line changed."""
    lines = tuple(replace(line, **changes) if line.supplier == supplier else line for line in plan.suppliers)
    return replace(plan, suppliers=lines)


def with_customer(plan: Plan, customer: str, /, **changes: Any) -> Plan:  # noqa: ANN401  # fields by name
    """Return the plan with one customer's line changed."""
    lines = tuple(replace(line, **changes) if line.customer == customer else line for line in plan.customers)
    return replace(plan, customers=lines)


def with_flow(plan: Plan, origin: str, destination: str, good: str = "pots", /, **changes: Any) -> Plan:  # noqa: ANN401  # fields by name
    """Return the plan with one flow changed."""
    key = (origin, destination, good)
    flows = [
        replace(flow, **changes) if (flow.origin, flow.destination, flow.good) == key else flow for flow in plan.flows
    ]
    assert flows != list(plan.flows)
    return replace(plan, flows=tuple(flows))


def with_line(plan: Plan, line: CostLine, share: float) -> Plan:
    """Return the plan with one cost line multiplied."""
    return replace(plan, cost_lines={**plan.cost_lines, line: plan.cost_lines[line] * share})


def with_proof(plan: Plan, /, **changes: Any) -> Plan:  # noqa: ANN401  # fields by name
    """Return the plan with its proof changed."""
    return replace(plan, proof=replace(plan.proof, **changes))


def with_service(plan: Plan, /, **changes: Any) -> Plan:  # noqa: ANN401  # fields by name
    """Return the plan with its service changed."""
    return replace(plan, service=replace(plan.service, **changes))


def cost_of(plan: Plan) -> float:
    """Return the cost of a plan that has one."""
    assert plan.proof.cost is not None
    return plan.proof.cost


def with_today(plan: Plan, /, **changes: Any) -> Plan:  # noqa: ANN401  # fields by name
    """Return the plan with its today changed."""
    assert plan.today is not None
    return replace(plan, today=replace(plan.today, **changes))


def today_plan(plan: Plan) -> Plan:
    """Return the plan of today."""
    assert plan.today is not None
    assert plan.today.plan is not None
    return plan.today.plan
