"""`siting headroom`: how far charges may move before the best plan changes its mind."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.commands.asking import add_asking, add_names, exit_code, run_question, say_answer, study_and_answer
from siting.commands.solving import solve_settings

if TYPE_CHECKING:
    import argparse

    from siting.commands.command import Commands


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "headroom",
        help="how far a charge may rise, or must fall, before the best plan changes",
        description="For each site and supplier of the plan: how far its charge may rise before the best plan does "
        "without it. For each outside: how far its charge must fall before the best plan takes it. Each search is "
        "proved to a gap of 0.000001 unless --gap says otherwise. STUDY may be a folder that `siting plan --out` "
        "wrote. Ctrl-C keeps what is done.",
    )
    add_asking(parser)
    add_names(parser, what="all sites and suppliers")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Ask and print; return the exit code.

    Raises
    ------
    SitingError
        If the study has faults, a name is unknown, the engine gives up, or a plan fails its audit.
    """
    from siting.commands.headroom_text import headroom_text
    from siting.plan.proof import PROVED_GAP
    from siting.questions.headroom import headroom
    from siting.questions.headroom_result import headroom_to_json

    made, answer = study_and_answer(arguments)
    study = made.study
    settings = solve_settings(arguments, study.settings.solve)
    found = run_question(
        arguments,
        lambda listener, stop: headroom(
            study,
            answer,
            sites=arguments.site,
            suppliers=arguments.supplier,
            gap=PROVED_GAP if arguments.gap is None else arguments.gap,
            settings=settings,
            listener=listener,
            stop=stop,
        ),
    )
    say_answer(arguments, made, lambda: headroom_text(found), lambda: headroom_to_json(found))
    return exit_code(found.outcome, planned=found.cost is not None)
