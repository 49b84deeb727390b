"""`siting compare`: two to six written plans side by side."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.command import FOUND, add_json, say, say_json

if TYPE_CHECKING:
    import argparse

    from siting.commands.command import Commands


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "compare",
        help="set two to six plans side by side",
        description="Set plans side by side: figures, cost lines, verdicts that differ, customers that change site. "
        "Each goes by the name of its variants, or else of its folder.",
    )
    parser.add_argument("plans", metavar="PLAN", nargs="+", help="folder that `siting plan --out` wrote; two to six")
    add_json(parser)
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Compare and print; return the exit code.

    Raises
    ------
    SettingsError
        If there are too few or too many plans, or one is given twice.
    PlanFileError
        If a folder holds no plan, or the plans count in different currencies or units.
    """
    from siting.commands.compare_text import comparison_text
    from siting.questions.compare import compare, read_named
    from siting.questions.compare_result import comparison_to_json

    found = compare(read_named(arguments.plans))
    if arguments.json:
        say_json(comparison_to_json(found))
    else:
        say(comparison_text(found))
    return FOUND
