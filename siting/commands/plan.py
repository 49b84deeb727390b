"""`siting plan`: solve a study, audit the plan, show it, write it."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

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
from siting.commands.solving import add_solving, solve_settings

if TYPE_CHECKING:
    import argparse

    from siting.commands.command import Commands
    from siting.plan.audit import AuditReport
    from siting.plan.plan import Answer
    from siting.study.tables import Study
    from siting.study.varying import Varied


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "plan",
        help="find the plan: which sites to open, keep or close, which suppliers to sign",
        description="Solve a study, audit the plan and print it. Ctrl-C stops and keeps the best plan so far.",
    )
    add_study(parser)
    add_variants(parser)
    parser.add_argument("--out", metavar="DIR", type=Path, help="write the plan folder: plan, study, result tables")
    add_solving(parser)
    parser.add_argument("--mps", metavar="FILE", type=Path, help="also write the exact model as free MPS")
    parser.add_argument("--lp", metavar="FILE", type=Path, help="also write the exact model as an LP file")
    add_json(parser)
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Solve, audit, write and print; return the exit code.

    Raises
    ------
    SitingError
        If the study has faults, the engine gives up, or the plan fails its audit.
    """
    from siting.commands.interrupt import run_stoppable
    from siting.commands.progress import progress_on_stderr
    from siting.listener import Stop
    from siting.plan.audit import audit
    from siting.plan.folder import check_place, write_plan_folder
    from siting.solving.solve import solve
    from siting.study.demo import study_path
    from siting.study.read import read_study

    made = varied(read_study(study_path(arguments.study)), arguments.variant)
    study = made.study
    if arguments.out:
        check_place(arguments.out)
    _write_model(arguments, study)
    settings = solve_settings(arguments, study.settings.solve)
    listener = progress_on_stderr(wanted=not (arguments.json or arguments.quiet))
    stop = Stop()
    answer = run_stoppable(lambda: solve(study, settings, listener=listener, stop=stop), stop)
    report = audit(study, answer.plan) if answer.plan else None
    if arguments.out:
        write_plan_folder(arguments.out, study, answer, report, more=_more(made, answer))
    _show(arguments, made, answer, report)
    if answer.plan:
        return FOUND
    return IMPOSSIBLE if answer.proof.outcome == "impossible" else NO_PLAN_YET


def _write_model(arguments: argparse.Namespace, study: Study) -> None:
    if arguments.mps is None and arguments.lp is None:
        return
    from siting.network.network import build_network
    from siting.solving.export import write_models

    write_models(build_network(study), mps=arguments.mps, lp=arguments.lp)


def _more(made: Varied, answer: Answer) -> dict[str, str]:
    """Return the map of the plan, where there is one, and the variants, by their file names."""
    from siting.plan.folder import MAP_FILE, VARIANTS_FILE
    from siting.plan.words import headline
    from siting.sharing.map import draw_map
    from siting.study.variant import variants_text

    more = {VARIANTS_FILE: variants_text(made.variants)} if made.variants else {}
    if answer.plan is not None:
        more[MAP_FILE] = draw_map(made.study, answer.plan, headline=headline(answer)).html
    return more


def _show(arguments: argparse.Namespace, made: Varied, answer: Answer, report: AuditReport | None) -> None:
    from siting.commands.plan_text import answer_text
    from siting.plan.contract import summary_to_json
    from siting.study.fingerprint import fingerprint

    if arguments.json:
        say_json(summary_to_json(answer, report, fingerprint=fingerprint(made.study)) | changes_to_json(made))
        return
    say(answer_text(made.study, answer))
    if made.variants:
        say(f"\n{changes_text(made)}")
    if arguments.out:
        again = f"; `siting audit {arguments.out}` checks it again" if answer.plan else ", the reasons in plan.json"
        say(f"\nWritten to {arguments.out}{again}.")
