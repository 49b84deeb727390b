"""`siting audit`: re-price and re-check a written plan from the tables beside it."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from siting.commands.command import FOUND, add_json, say, say_json
from siting.commands.kept_plan import add_plan
from siting.commands.layout import bullets, paragraph

if TYPE_CHECKING:
    import argparse

    from siting.commands.command import Commands


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "audit",
        help="re-check a written plan from its tables",
        description="Re-price and re-check a plan from the tables written beside it, in code that shares nothing with "
        "the solvers. Exit code 0 when it passes, 5 when it fails.",
    )
    add_plan(parser)
    add_json(parser)
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Print what the audit found; return the exit code.

    Raises
    ------
    PlanFileError
        If the folder holds no plan, or its tables are not the ones the plan was made from.
    """
    from siting.errors import AuditError, PlanFileError
    from siting.plan.audit import audit
    from siting.plan.folder import read_plan_folder

    study, answer = read_plan_folder(Path(arguments.plan))
    if answer.plan is None:
        msg = f"{arguments.plan} holds no plan to audit (outcome: {answer.proof.outcome}). Name the folder of a plan."
        raise PlanFileError(msg)
    report = audit(study, answer.plan)
    if arguments.json:
        say_json({"passed": report.passed, "faults": list(report.faults)})
    elif report.passed:
        say(paragraph(f"Passed: {arguments.plan}, priced and checked again from its tables, agrees in every figure."))
    else:
        say("\n".join([f"Failed: {len(report.faults)} faults in {arguments.plan}.", bullets(report.faults)]))
    return FOUND if report.passed else AuditError.exit_code
