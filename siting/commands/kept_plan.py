"""Read a kept plan for a command that shows it: from its folder, audited again."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import argparse

    from siting.plan.plan import Answer, Plan
    from siting.study.tables import Study


def add_plan(parser: argparse.ArgumentParser) -> None:
    """Add the argument PLAN."""
    parser.add_argument("plan", metavar="PLAN", help="folder that `siting plan --out` wrote")


def read_audited(folder: str) -> tuple[Study, Answer, Plan]:
    """
    Return a kept plan with its study.

    Parameters
    ----------
    folder
        The PLAN folder as typed.

    Returns
    -------
    study, answer, plan
        The tables as read when it was planned, the answer, and its plan.

    Raises
    ------
    PlanFileError
        If the folder holds no plan, or its tables are not the ones the plan was made from.
    AuditError
        If the plan does not pass its audit.
    """
    from siting.errors import AuditError, PlanFileError
    from siting.plan.audit import audit
    from siting.plan.folder import read_plan_folder

    study, answer = read_plan_folder(Path(folder))
    if answer.plan is None:
        msg = f"{folder} holds no plan (outcome: {answer.proof.outcome}). Name the folder of a plan."
        raise PlanFileError(msg)
    report = audit(study, answer.plan)
    if not report.passed:
        msg = f"the plan in {folder} failed its audit and is not shown: " + "; ".join(report.faults)
        raise AuditError(msg)
    return study, answer, answer.plan
