"""`siting counts`: the best cost for each number of open sites."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from siting.commands.asking import add_asking, exit_code, run_question, say_answer, study_and_answer
from siting.commands.solving import solve_settings

if TYPE_CHECKING:
    from siting.commands.command import Commands


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "counts",
        help="the best cost for each number of sites",
        description="Find the best plan for each number of open sites, from the fewest possible to where adding stops "
        "paying. fewest_sites and most_sites of the study are not held to, but numbers outside them are marked. STUDY "
        "may be a folder that `siting plan --out` wrote. Ctrl-C keeps what is done.",
    )
    add_asking(parser)
    parser.add_argument("--from", dest="least", type=_number, metavar="N", help="first number of sites")
    parser.add_argument("--to", dest="most", type=_number, metavar="N", help="last number of sites")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Ask and print; return the exit code.

    Raises
    ------
    SitingError
        If the study has faults or no sites, the engine gives up, or a plan fails its audit.
    """
    from siting.commands.counts_text import counts_text
    from siting.questions.counts import counts
    from siting.questions.counts_result import counts_to_json

    made, answer = study_and_answer(arguments)
    settings = solve_settings(arguments, made.study.settings.solve)
    found = run_question(
        arguments,
        lambda listener, stop: counts(
            made.study,
            answer,
            least=arguments.least,
            most=arguments.most,
            settings=settings,
            listener=listener,
            stop=stop,
        ),
    )
    say_answer(arguments, made, lambda: counts_text(found), lambda: counts_to_json(found))
    return exit_code(found.outcome, planned=found.outcome not in {"impossible", "no-plan-yet"})


def _number(text: str) -> int:
    if not text.isdecimal():
        msg = f"{text!r} is not a whole number of sites; write one such as 5"
        raise argparse.ArgumentTypeError(msg)
    return int(text)
