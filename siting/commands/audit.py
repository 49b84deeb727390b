"""`siting audit`: re-price and re-check a written plan from the tables beside it."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from siting.commands.command import FOUND, add_json, say, say_json

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
    parser.add_argument("plan", metavar="PLAN", help="folder that `siting plan --out` wrote")
    add_json(parser)
    parser.set_defaults(run=run)
