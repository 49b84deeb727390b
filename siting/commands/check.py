"""`siting check`: read a study and list everything that is wrong with it, at once."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.command import BAD_INPUT, FOUND, add_json, add_study, say, say_json

if TYPE_CHECKING:
    import argparse
    from collections.abc import Sequence

    from siting.commands.command import Commands
    from siting.errors import Fault
    from siting.study.tables import Study


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "check",
        help="list every fault and warning of a study",
        description="Read a study and list every fault and warning: table, row, column, value, repair. "
        "Exit code 0 without a fault, 2 with one.",
    )
    add_study(parser)
    add_json(parser)
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """Print what the study holds and its warnings, or its faults and warnings; return the exit code."""
    from siting.errors import StudyError
    from siting.plan.contract import check_to_json
    from siting.study.demo import study_path
    from siting.study.read import read_study

    faults: Sequence[Fault] = ()
    try:
        study = read_study(study_path(arguments.study))
    except StudyError as error:
        faults, warnings, text = error.faults, error.warnings, str(error)
    else:
        warnings, text = study.warnings, f"No fault. {_contents(study)}"
    if arguments.json:
        say_json(check_to_json(faults, warnings))
    else:
        say("\n".join([text, *_warning_lines(warnings)]))
    return BAD_INPUT if faults else FOUND


def _warning_lines(warnings: Sequence[Fault]) -> list[str]:
    if not warnings:
        return []
    head = "1 warning:" if len(warnings) == 1 else f"{len(warnings)} warnings:"
    return [head, *(f"  {warning}" for warning in warnings)]


def _contents(study: Study) -> str:
    running = sum(row.standing == "running" for row in study.sites)
    signed = sum(row.standing == "signed" for row in study.suppliers)
    parts = [
        f"{len(study.sites)} sites ({running} running)" if study.sites else "",
        f"{len(study.suppliers)} suppliers ({signed} signed)" if study.suppliers else "",
        f"{len(study.customers)} customers",
        f"{len(study.all_goods)} goods" if len(study.all_goods) > 1 else "one good",
        f"{len(study.lanes)} rows of lanes" if len(study.lanes) else "",
        f"{len(study.rules)} rules" if study.rules else "",
    ]
    title = f"{study.settings.title}: " if study.settings.title else ""
    return f"{title}{', '.join(part for part in parts if part)}."
