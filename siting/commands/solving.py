"""The options of every command that solves: gap, time limit, engine, quiet."""

from __future__ import annotations

import argparse
from dataclasses import replace
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from siting.study.settings import SolveSettings


def add_solving(parser: argparse.ArgumentParser, *, each: str = "") -> None:
    """Add --gap, --time-limit, --engine and --quiet; `each` says what the limits are of, where it is not the plan."""
    from siting.study.settings import ENGINES

    parser.add_argument(
        "--gap", type=_gap, metavar="FRACTION", help=f"stop{each} within this fraction of the best; 1 %% is 0.01"
    )
    parser.add_argument("--time-limit", type=_seconds, metavar="SECONDS", help=f"stop{each} after this long")
    parser.add_argument("--engine", choices=ENGINES, help="how to search; auto picks")
    parser.add_argument("--quiet", action="store_true", help="show no progress")


def solve_settings(arguments: argparse.Namespace, of_study: SolveSettings) -> SolveSettings:
    """Return the study's solve settings with what the command line says in their place."""
    return replace(
        of_study,
        gap=of_study.gap if arguments.gap is None else arguments.gap,
        time_limit_s=arguments.time_limit or of_study.time_limit_s,
        engine=arguments.engine or of_study.engine,
    )


def _gap(text: str) -> float:
    value = _number(text)
    if not 0.0 <= value < 1.0:
        msg = f"a gap is a fraction from 0 to below 1, got {text}; write 1 % as 0.01"
        raise argparse.ArgumentTypeError(msg)
    return value


def _seconds(text: str) -> float:
    value = _number(text)
    if not 0.0 < value < float("inf"):
        msg = f"a time limit is a number of seconds above 0, got {text}; write two minutes as 120"
        raise argparse.ArgumentTypeError(msg)
    return value


def _number(text: str) -> float:
    try:
        return float(text)
    except ValueError:
        msg = f"{text!r} is not a number; write one such as 0.01 or 120"
        raise argparse.ArgumentTypeError(msg) from None
