"""What every command shares: how it is added to the command line, and the arguments several of them take."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Protocol, TypeAlias

if TYPE_CHECKING:
    import argparse
    from collections.abc import Mapping

    Commands: TypeAlias = argparse._SubParsersAction[argparse.ArgumentParser]  # noqa: SLF001  (no public name exists)

FOUND = 0
"""Exit code: a plan was found and audited, or the check found no fault."""
BAD_INPUT = 2
"""Exit code: the study, a setting or the command itself is wrong."""
IMPOSSIBLE = 3
"""Exit code: no plan can exist."""
NO_PLAN_YET = 4
"""Exit code: stopped before any plan was found."""


class Run(Protocol):
    """What a command does once its arguments are read."""

    def __call__(self, arguments: argparse.Namespace) -> int:
        """Return the exit code."""


def add_study(parser: argparse.ArgumentParser) -> None:
    """Add the argument STUDY."""
    parser.add_argument(
        "study",
        metavar="STUDY",
        help="folder of CSV tables with study.toml, an .xlsx workbook, or the word demo for the demo study",
    )


def add_json(parser: argparse.ArgumentParser) -> None:
    """Add the option --json."""
    parser.add_argument("--json", action="store_true", help="print one JSON object and nothing else")


def say(text: str) -> None:
    """Print a command's answer."""
    sys.stdout.write(text.rstrip("\n") + "\n")


def say_json(answer: Mapping[str, object]) -> None:
    """Print a command's answer as one JSON object."""
    from siting.plan.contract import to_text

    say(to_text(answer))
