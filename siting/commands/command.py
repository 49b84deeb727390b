"""What every command shares: how it is added to the command line, and the arguments several of them take."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Protocol, TypeAlias

if TYPE_CHECKING:
    import argparse
    from collections.abc import Mapping, Sequence

    from siting.study.tables import Study
    from siting.study.varying import Varied

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


def add_variants(parser: argparse.ArgumentParser) -> None:
    """Add the option --variant, to be given as often as wanted."""
    parser.add_argument(
        "--variant",
        action="append",
        default=[],
        metavar="FILE",
        help="apply the named changes of a TOML file first; may be repeated, a later one on top of an earlier one",
    )


def varied(study: Study, files: Sequence[str]) -> Varied:
    """
    Return a study with the variants of files applied.

    Raises
    ------
    StudyError
        If a file is no variant, or a variant does not fit the study.
    """
    from siting.study.variant import read_variant
    from siting.study.varying import vary

    return vary(study, [read_variant(file) for file in files])


def changes_text(made: Varied) -> str:
    """Return what variants changed, under their names; empty where there is none."""
    from siting.commands.layout import bullets, paragraph

    if not made.variants:
        return ""
    names = " + ".join(
        f"{variant.name} ({variant.note})" if variant.note else variant.name for variant in made.variants
    )
    return "\n".join([paragraph(f"Variant: {names}. It changes:"), bullets(made.lines or ["nothing"])])


def changes_to_json(made: Varied) -> dict[str, object]:
    """Return the key that --json gains where there are variants; none where there are not."""
    if not made.variants:
        return {}
    names = [{"name": variant.name, "note": variant.note} for variant in made.variants]
    return {"variants": names, "changes": list(made.lines)}


def say(text: str) -> None:
    """Print a command's answer."""
    sys.stdout.write(text.rstrip("\n") + "\n")


def say_json(answer: Mapping[str, object]) -> None:
    """Print a command's answer as one JSON object."""
    from siting.plan.contract import to_text

    say(to_text(answer))
