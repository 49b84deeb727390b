"""What the commands of the follow-up questions share: their arguments, and how a question is run."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, TypeVar

from siting.commands.command import FOUND, IMPOSSIBLE, NO_PLAN_YET, add_json, add_study
from siting.commands.solving import add_solving

if TYPE_CHECKING:
    import argparse
    from collections.abc import Callable

    from siting.listener import Listener, Stop
    from siting.plan.plan import Answer
    from siting.plan.proof import Outcome
    from siting.study.tables import Study

Result = TypeVar("Result")


def add_asking(parser: argparse.ArgumentParser) -> None:
    """Add STUDY, the options of a solve and --json."""
    add_study(parser)
    add_solving(parser, each=" each search")
    add_json(parser)


def add_names(parser: argparse.ArgumentParser, *, what: str) -> None:
    """Add --site and --supplier, each to be given as often as wanted."""
    for kind in ("site", "supplier"):
        parser.add_argument(
            f"--{kind}",
            action="append",
            metavar="NAME",
            help=f"only this {kind}; may be repeated (default: {what})",
        )


def study_and_answer(given: str) -> tuple[Study, Answer | None]:
    """
    Return the study to ask about, with its plan where the folder that `siting plan --out` wrote is given.

    Raises
    ------
    StudyError
        If the study has faults.
    PlanFileError
        If the folder's plan cannot be read or is of other tables.
    """
    from siting.plan.folder import read_plan_folder
    from siting.study.demo import study_path
    from siting.study.read import read_study

    if (Path(given) / "plan.json").is_file():
        study, answer = read_plan_folder(Path(given))
        return study, answer if answer.plan else None
    return read_study(study_path(given)), None


def run_question(arguments: argparse.Namespace, work: Callable[[Listener, Stop], Result]) -> Result:
    """Run a question with progress on standard error; the first Ctrl-C keeps what is done, the second aborts."""
    from siting.commands.interrupt import run_stoppable
    from siting.commands.progress import progress_on_stderr
    from siting.listener import Stop

    stop = Stop()
    listener = progress_on_stderr(wanted=not (arguments.json or arguments.quiet))
    return run_stoppable(lambda: work(listener, stop), stop, keeping="what is done")


def exit_code(outcome: Outcome, *, planned: bool) -> int:
    """Return the exit code of a question: found where there is a plan to ask about."""
    if planned:
        return FOUND
    return IMPOSSIBLE if outcome == "impossible" else NO_PLAN_YET
