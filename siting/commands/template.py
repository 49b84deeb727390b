"""`siting template`: a workbook to fill in."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from siting.commands.command import BAD_INPUT, FOUND, say

if TYPE_CHECKING:
    import argparse

    from siting.commands.command import Commands


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "template",
        help="write a workbook to fill in",
        description="Write an .xlsx workbook with a sheet for each table and one for the settings: a note on every "
        "column, lists to choose from, and a few example rows in italics. To delete those of a sheet, choose "
        "examples_... in the name box left of the formula bar and press Delete; or ask for --empty.",
    )
    parser.add_argument("file", metavar="FILE.xlsx", help="the workbook to write; it must not be there yet")
    parser.add_argument("--empty", action="store_true", help="leave the example rows out")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """Write the workbook and say what to do with it; return the exit code."""
    path = Path(arguments.file)
    if path.suffix.lower() != ".xlsx":
        say(f"{path}: a template is an .xlsx workbook. Give it a name that ends in .xlsx.")
        return BAD_INPUT
    if path.exists():
        say(f"{path}: the file is already there and may hold your data. Give another name, or delete it first.")
        return BAD_INPUT
    from siting.study.template import write_template

    write_template(path, examples=not arguments.empty)
    rows = "no rows" if arguments.empty else "example rows in italics to delete"
    say(f"{path}: a workbook with every table, {rows}. Fill it in, then: siting check {path}")
    return FOUND
