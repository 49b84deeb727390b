"""`siting closing`: what it costs to close a site or to drop a supplier of the plan."""

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
        "closing",
        help="what closing a site, or dropping a supplier, would cost",
        description="Close each site and drop each supplier of the plan, one at a time: re-routed (the others stay as "
        "they are) and re-planned (everything else is decided afresh). The cheapest to do without comes first. "
        "STUDY may be a folder that `siting plan --out` wrote: its plan is then tested. Ctrl-C keeps what is done.",
    )
    add_asking(parser)
    add_names(parser, what="all that the plan has open or signed")
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Ask and print; return the exit code.

    Raises
    ------
    SitingError
        If the study has faults, a name is not in the plan, the engine gives up, or a plan fails its audit.
    """
    from siting.commands.closing_text import closing_text
    from siting.questions.closing import closing
    from siting.questions.closing_result import closing_to_json

    made, answer = study_and_answer(arguments)
    study = made.study
    settings = solve_settings(arguments, study.settings.solve)
    test = run_question(
        arguments,
        lambda listener, stop: closing(
            study,
            answer,
            sites=arguments.site,
            suppliers=arguments.supplier,
            settings=settings,
            listener=listener,
            stop=stop,
        ),
    )
    in_full = bool(arguments.site or arguments.supplier)
    say_answer(arguments, made, lambda: closing_text(test, in_full=in_full), lambda: closing_to_json(test))
    return exit_code(test.outcome, planned=test.cost is not None)
