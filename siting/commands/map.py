"""`siting map`: draw a written plan on one HTML file that opens anywhere."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from siting.commands.command import FOUND, say
from siting.commands.kept_plan import add_plan, read_audited

if TYPE_CHECKING:
    import argparse

    from siting.commands.command import Commands


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "map",
        help="draw a written plan on a map, one HTML file",
        description="Draw a written plan on a map: one HTML file that opens from an e-mail, without a network.",
    )
    add_plan(parser)
    parser.add_argument("--out", metavar="FILE", help="file to write (default: map.html in the PLAN folder)")
    parser.add_argument("--locale", default="en", help="whose separators numbers carry, such as de (default: en)")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Write the map; return the exit code.

    Raises
    ------
    PlanFileError
        If the folder holds no plan, its tables are not the plan's, or the map cannot be written where it should.
    AuditError
        If the plan does not pass its audit.
    """
    from siting.errors import PlanFileError
    from siting.plan.folder import MAP_FILE
    from siting.plan.words import headline
    from siting.sharing.map import write_map

    study, answer, plan = read_audited(arguments.plan)
    file = Path(arguments.out or Path(arguments.plan) / MAP_FILE)
    try:
        write_map(file, study, plan, headline=headline(answer), locale=arguments.locale)
    except OSError as error:
        msg = f"{file}: the map cannot be written ({error.strerror}). Give another file with --out."
        raise PlanFileError(msg) from error
    say(f"{file}: {file.stat().st_size / 1000:,.0f} kB, opens without a network.")
    return FOUND
