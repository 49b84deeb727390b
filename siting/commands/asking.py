"""What the commands of the follow-up questions share: their arguments, and how a question is run."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, TypeVar

from siting.commands.command import (
    FOUND,
    IMPOSSIBLE,
    NO_PLAN_YET,
    add_json,
    add_study,
    add_variants,
    changes_text,
    changes_to_json,
    say,
    say_json,
    varied,
)
from siting.commands.solving import add_solving

if TYPE_CHECKING:
    import argparse
    from collections.abc import Callable, Mapping

    from siting.listener import Listener, Stop
    from siting.plan.plan import Answer
    from siting.plan.proof import Outcome
    from siting.study.varying import Varied

Result = TypeVar("Result")


def add_asking(parser: argparse.ArgumentParser) -> None:
    """Add STUDY, --variant, the options of a solve and --json."""
    add_study(parser)
    add_variants(parser)
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


def study_and_answer(arguments: argparse.Namespace) -> tuple[Varied, Answer | None]:
    """
    Return the study to ask about, its variants applied, with its plan where the folder of one is given and none is.

    Raises
    ------
    StudyError
        If the study has faults, or a variant does not fit it.
    PlanFileError
        If the folder's plan cannot be read or is of other tables.
    """
    from siting.plan.folder import read_plan_folder
    from siting.study.demo import study_path
    from siting.study.read import read_study

    answer = None
    if (Path(arguments.study) / "plan.json").is_file():
        study, answer = read_plan_folder(Path(arguments.study))
        answer = answer if answer.plan and not arguments.variant else None
    else:
        study = read_study(study_path(arguments.study))
    return varied(study, arguments.variant), answer


def say_answer(
    arguments: argparse.Namespace, made: Varied, text: Callable[[], str], held: Callable[[], Mapping[str, object]]
) -> None:
    """Print a question's answer as text or as JSON, and what its variants changed."""
    if arguments.json:
        say_json({**held(), **changes_to_json(made)})
    else:
        say("\n\n".join(part for part in (text(), changes_text(made)) if part))


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
