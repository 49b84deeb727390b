"""Solve a study to the proof and audit the plan, and bound it by its linear relaxation, for tests of whole answers."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pulp

from siting.network.network import build_network
from siting.plan.audit import audit
from siting.plan.plan import SiteVerdict, SupplierVerdict
from siting.plan.proof import Outcome
from siting.solving.model import build_model
from siting.solving.solve import solve
from siting.study.settings import SolveSettings

if TYPE_CHECKING:
    from siting.plan.plan import Answer, Plan
    from siting.solving.model import Links
    from siting.study.tables import Study

EXACT = SolveSettings(gap=0.0, engine="direct")
"""HiGHS stops at a relative gap of 1e-4 by default; published optima need the proof."""


def audited(study: Study, settings: SolveSettings = EXACT) -> Answer:
    """Solve a study; a plan there is must pass its audit."""
    answer = solve(study, settings)
    if answer.plan is not None:
        report = audit(study, answer.plan)
        assert report.passed, report.faults
    return answer


def proved(study: Study, settings: SolveSettings = EXACT) -> Plan:
    """Solve a study to the proof and return its audited plan."""
    answer = audited(study, settings)
    assert answer.proof.outcome is Outcome.PROVED
    assert answer.plan is not None
    return answer.plan


def open_sites(plan: Plan) -> set[str]:
    """Return the names of the sites that a plan keeps or opens."""
    return {line.site for line in plan.sites if line.verdict in {SiteVerdict.KEEP, SiteVerdict.OPEN}}


def signed_suppliers(plan: Plan) -> set[str]:
    """Return the names of the suppliers that a plan signs or that stay."""
    return {line.supplier for line in plan.suppliers if line.verdict in {SupplierVerdict.STAY, SupplierVerdict.SIGN}}


def relaxation(study: Study, links: Links) -> float:
    """Return the money a year of the best plan with every yes or no a share between 0 and 1."""
    model = build_model(build_network(study), links=links, relaxed=True)
    model.problem.solve(pulp.HiGHS(msg=False))
    assert model.problem.status == pulp.LpStatusOptimal
    return float(pulp.value(model.problem.objective)) * model.money
