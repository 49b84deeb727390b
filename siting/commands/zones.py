"""`siting zones`: a study of few zones from one of many customers, and how wrong that makes it."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING

from siting.commands.command import FOUND, add_study, say
from siting.commands.new_study import add_out, refuse_taken, write_new
from siting.commands.solving import add_solving, solve_settings

if TYPE_CHECKING:
    from siting.commands.command import Commands
    from siting.questions.zone_error import ZoneError
    from siting.study.tables import Study
    from siting.study.zones import Zoned


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "zones",
        help="put many customers together into few zones, and measure what that costs in accuracy",
        description="Write a study whose customers are zones, each at the demand-weighted centre of its customers. "
        "Then plan on the zones, hold the verdicts, price that plan on all customers, and say how far apart they are.",
    )
    add_study(parser)
    parser.add_argument("--zones", type=_whole, metavar="N", help="most zones; 150 to 200 are usual")
    parser.add_argument(
        "--by",
        default="sphere",
        help="what customers of a zone have in common: sphere, where they are (the default); place; or a column of "
        "customers such as postcode, or its first letters as in postcode:2",
    )
    parser.add_argument("--members", metavar="FILE", type=Path, help="also write a CSV file: each customer's zone")
    parser.add_argument("--unmeasured", action="store_true", help="leave the measuring out, which takes a plan")
    add_out(parser)
    add_solving(parser)
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Write the study of zones and print what it is and how far off; return the exit code.

    Raises
    ------
    SitingError
        If the study has faults, before or after, cannot be grouped so, or something is in the place to write to.
    """
    from siting.study.demo import study_path
    from siting.study.read import read_study
    from siting.study.zones import zone_study

    out = refuse_taken(arguments.out)
    study = read_study(study_path(arguments.study))
    zoned = zone_study(study, count=arguments.zones, by=arguments.by)
    write_new(zoned.study, out)
    read_study(out)  # what customers lacked, zones may lack too
    if arguments.members:
        _write_members(arguments.members, study, zoned)
    say("\n".join(zoned.notes))
    if not arguments.unmeasured:
        say(_measured(arguments, study, zoned))
    say(f"{out}: the study of zones. Next: siting plan {out}")
    return FOUND


def _measured(arguments: argparse.Namespace, study: Study, zoned: Zoned) -> str:
    from siting.commands.interrupt import run_stoppable
    from siting.commands.progress import progress_on_stderr
    from siting.listener import Stop
    from siting.questions.zone_error import zone_error

    settings = solve_settings(arguments, study.settings.solve)
    listener, stop = progress_on_stderr(wanted=not arguments.quiet), Stop()
    found = run_stoppable(lambda: zone_error(study, zoned, settings, listener=listener, stop=stop), stop)
    return error_text(found, study.settings.currency)


def error_text(found: ZoneError, currency: str) -> str:
    """
    Return how far a plan on zones is from the same plan on all customers.

    Parameters
    ----------
    found
        As measured.
    currency
        ISO 4217 code.

    Returns
    -------
    text
        One paragraph.
    """
    from siting.plan.words import money

    if found.plan is None or found.cost is None:
        return f"Not measured: {found.reason}."
    text = (
        f"Measured: the plan on the zones costs {money(found.plan.cost, currency)} a year on the zones and "
        f"{money(found.cost, currency, like=found.plan.cost)} on all customers, verdicts held: the zones "
        f"{_off(found.cost_error)}."
    )
    if found.delivering_error is not None:
        text += f" Of the way to customers alone they {_off(found.delivering_error)}."
    if found.left_out:
        text += f" Left out of the price, since the customers cannot keep it: {found.left_out}."
    return text


def _off(error: float | None) -> str:
    """Return which way and how far zones are off, in per cent with two decimals: a tenth matters here."""
    if error is None or abs(error) < 5e-5:  # noqa: PLR2004  (half of what two decimals can show)
        return "are off by less than 0.01 %"
    return f"{'under' if error < 0 else 'over'}state it by {abs(error) * 100:.2f} %"


def _write_members(path: Path, study: Study, zoned: Zoned) -> None:
    from siting.cells import write_csv

    names = [*(row.customer for row in zoned.study.customers), ""]
    rows = ([row.customer, names[zone]] for row, zone in zip(study.customers, zoned.zone.tolist(), strict=True))
    write_csv(path, ("customer", "zone"), rows)


def _whole(text: str) -> int:
    if not text.isdecimal() or int(text) < 1:
        msg = f"a number of zones is a whole number of at least 1, got {text}; write 150"
        raise argparse.ArgumentTypeError(msg)
    return int(text)
