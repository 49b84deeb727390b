"""`siting runners-up`: the next-best sets of sites and suppliers, in order."""

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
        "runners-up",
        help="the next-best sets of sites and suppliers",
        description="List the best set of sites and suppliers in use and those next to it, cheapest first, each with "
        "what it does otherwise. It is proved, or said not to be, that none within the percentage is missing. STUDY "
        "may be a folder that `siting plan --out` wrote. Ctrl-C keeps what is done.",
    )
    add_asking(parser)
    parser.add_argument(
        "--within",
        type=_share,
        metavar="SHARE",
        help="how far above the best to look, as 0.02 or 2%% (default: 2%%)",
    )
    parser.add_argument("--most", type=_number, metavar="N", help="how many to list next to the best (default: 10)")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Ask and print; return the exit code.

    Raises
    ------
    SitingError
        If the study has faults, the solver gives up, or a plan fails its audit.
    """
    from siting.commands.runners_up_text import runners_up_text
    from siting.plan.proof import PROVED_GAP
    from siting.questions.runners_up import MOST, WITHIN, runners_up
    from siting.questions.runners_up_result import runners_up_to_json

    made, answer = study_and_answer(arguments)
    settings = solve_settings(arguments, made.study.settings.solve)
    found = run_question(
        arguments,
        lambda listener, stop: runners_up(
            made.study,
            answer,
            within=WITHIN if arguments.within is None else arguments.within,
            most=arguments.most or MOST,
            gap=PROVED_GAP if arguments.gap is None else arguments.gap,
            settings=settings,
            listener=listener,
            stop=stop,
        ),
    )
    say_answer(arguments, made, lambda: runners_up_text(found), lambda: runners_up_to_json(found))
    return exit_code(found.outcome, planned=found.best is not None)


def _share(text: str) -> float:
    try:
        value = float(text.removesuffix("%")) / 100 if text.endswith("%") else float(text)
    except ValueError:
        value = -1.0
    if not 0.0 <= value < float("inf"):
        msg = f"{text!r} is not a share of at least 0; write 2 % as 0.02 or 2%"
        raise argparse.ArgumentTypeError(msg)
    return value


def _number(text: str) -> int:
    if not text.isdecimal() or int(text) < 1:
        msg = f"{text!r} is not a whole number of at least 1; write one such as 10"
        raise argparse.ArgumentTypeError(msg)
    return int(text)
