"""`siting circuity`: start a table of road factors by country from published ones."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.command import FOUND, add_study, say
from siting.commands.new_study import add_out, refuse_taken, write_new

if TYPE_CHECKING:
    import argparse

    from siting.commands.command import Commands


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "circuity",
        help="start a table of road factors by country from published ones",
        description="Write the study again with a table circuity: for each of its countries the published ratio of "
        "road distance to straight-line distance, each marked as from memory, to be edited. Rows that are there stay.",
    )
    add_study(parser)
    add_out(parser)
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Write the study with the table; return the exit code.

    Raises
    ------
    StudyError
        If the study has faults.
    DataFileError
        If there is something at the place to write to already.
    """
    from siting.study.countries import country_name
    from siting.study.demo import study_path
    from siting.study.published_circuity import FACTORS, SOURCE, with_published_factors
    from siting.study.read import read_study

    out = refuse_taken(arguments.out)
    found = with_published_factors(read_study(study_path(arguments.study)))
    write_new(found.study, out)
    for code in found.added:
        say(f"{country_name(code)} ({code}): {FACTORS[code]:.2f}  {SOURCE}")
    if found.without:
        listed = ", ".join(found.without)
        say(f"No published factor for {listed}: {found.study.settings.circuity:g}, as the settings say, holds there.")
    say(f"{out}: edit the table circuity, then: siting check {out}")
    return FOUND
