"""The command-line shell: reads the command, hands it over, turns every error into one paragraph and an exit code."""

from __future__ import annotations

import argparse
import os
import sys
from typing import TYPE_CHECKING

from siting.commands import (
    audit,
    browse,
    check,
    circuity,
    closing,
    compare,
    counts,
    headroom,
    locate,
    plan,
    rollup,
    runners_up,
    template,
    zones,
)
from siting.commands import map as map_command
from siting.commands.command import BAD_INPUT, FOUND, NO_PLAN_YET
from siting.errors import SitingError

if TYPE_CHECKING:
    from collections.abc import Sequence

COMMANDS = (
    check,
    plan,
    closing,
    headroom,
    runners_up,
    counts,
    compare,
    audit,
    map_command,
    template,
    circuity,
    rollup,
    zones,
    locate,
    browse,
)
"""In the order of the help."""

EXIT_CODES = (
    "exit codes: 0 plan found and audited (check: no fault), 1 internal error, 2 bad input, 3 impossible, "
    "4 stopped before any plan, 5 audit failed"
)

INTERNAL_ERROR = 1


class _ShowVersion(argparse.Action):
    """Print the version; it is looked up only when asked for, since the look-up takes time."""

    def __call__(self, parser: argparse.ArgumentParser, *_rest: object) -> None:
        """Print the version and end."""
        from importlib.metadata import version  # noqa: PLC0415  (only here is it worth its time)

        sys.stdout.write(f"siting {version('siting')}\n")
        parser.exit()


def make_parser() -> argparse.ArgumentParser:
    """Return the parser of the whole command line."""
    parser = argparse.ArgumentParser(
        prog="siting",
        description="Decide which sites to open, keep or close and which suppliers to sign, "
        "with the cost of the plan proved to be within a stated distance of the best possible.",
        epilog=EXIT_CODES,
    )
    parser.add_argument("--version", action=_ShowVersion, nargs=0, help="print the version and end")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", required=True)
    for command in COMMANDS:
        command.add(commands)
    return parser


def main(given: Sequence[str] | None = None) -> int:
    """
    Run one command.

    Parameters
    ----------
    given
        The arguments; None = those of the process.

    Returns
    -------
    exit_code
        As `EXIT_CODES` says.
    """
    arguments = make_parser().parse_args(given)
    try:
        exit_code: int = arguments.run(arguments)
        sys.stdout.flush()
    except BrokenPipeError:  # whoever read the answer had enough of it, as `| head` does
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return FOUND
    except (Exception, KeyboardInterrupt) as error:  # a user gets a paragraph, never a traceback
        text, exit_code = _explained(error)
        if exit_code == INTERNAL_ERROR and os.environ.get("SITING_DEBUG"):
            raise
        sys.stderr.write(text.rstrip("\n") + "\n")
    return exit_code


def _explained(error: BaseException) -> tuple[str, int]:
    """Return what to tell the user about an error, and the exit code."""
    if isinstance(error, SitingError):
        return str(error), error.exit_code
    if isinstance(error, KeyboardInterrupt):
        return "Stopped before any plan was found.", NO_PLAN_YET
    if isinstance(error, OSError) and error.filename:
        return f"{error.filename}: {error.strerror}. Check the path and its permissions.", BAD_INPUT
    text = (
        f"Internal error, a fault of the program and not of the study: {type(error).__name__}: {error}. "
        "Run the same command with SITING_DEBUG=1 in the environment to see where it happened."
    )
    return text, INTERNAL_ERROR
