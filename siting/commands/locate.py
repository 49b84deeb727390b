"""`siting locate`: coordinates for the places a study names."""

from __future__ import annotations

from collections import Counter
from pathlib import Path
from typing import TYPE_CHECKING

from siting.commands.command import FOUND, add_study, say
from siting.commands.new_study import refuse_taken

if TYPE_CHECKING:
    import argparse
    from collections.abc import Callable, Sequence

    from siting.commands.command import Commands
    from siting.study.gazetteer import Town
    from siting.study.locate_study import Located, LocatedStudy

SHOWN = 20


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "locate",
        help="find the coordinates of places by name, without a network",
        description="Fill in coordinates that are blank from place and country, among 170,000 towns that come with the "
        "program. A name that fits several towns is never decided: its candidates go to the file of --choices, where "
        "you mark the right one and run the command again. Given coordinates are kept, and checked against place and "
        "country.",
    )
    add_study(parser)
    parser.add_argument("--out", metavar="STUDY2", required=True, help="folder to write; it must not be there yet")
    parser.add_argument(
        "--choices", metavar="FILE", type=Path, help="CSV file of candidates: read where it is there, and written"
    )
    parser.add_argument(
        "--online", metavar="URL", help="also ask this server, of the kind of Nominatim, for places not known here"
    )
    parser.add_argument("--contact", default="", help="your e-mail address, told to the server of --online")
    parser.add_argument(
        "--cache", metavar="FILE", type=Path, help="where answers of the server are kept (default: in your home folder)"
    )
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """
    Write the study with what was found and print the rest; return the exit code.

    Raises
    ------
    SitingError
        If the study or the choices cannot be read, or something is in the place to write to.
    """
    from siting.errors import DataFileError, StudyError
    from siting.study.choices import read_choices, write_choices
    from siting.study.demo import study_path
    from siting.study.locate_study import locate_study
    from siting.study.numbers import with_plain_numbers
    from siting.study.read import read_raw
    from siting.study.write_raw import write_raw

    out = refuse_taken(arguments.out)
    if out.suffix.lower() == ".xlsx":
        msg = f"{out}: the study is written as a folder of tables. Give --out a name without .xlsx"
        raise DataFileError(msg)
    raw = with_plain_numbers(read_raw(study_path(arguments.study)))
    if raw.faults:
        raise StudyError(raw.faults, raw.warnings)
    chosen = read_choices(arguments.choices) if arguments.choices and arguments.choices.is_file() else {}
    located = locate_study(raw, choices=chosen, online=_online(arguments))
    write_raw(located.raw, out)
    say("\n".join(located_lines(located)))
    if arguments.choices:
        waiting = write_choices(arguments.choices, located.rows, chosen)
        if waiting:
            say(f"{arguments.choices}: {waiting} places to choose. Write yes under choose, and locate again.")
    say(f"{out}: the study with coordinates. {_credit()} Next: siting check {out}")
    return FOUND


def _credit() -> str:
    from siting.study.gazetteer import CREDIT

    return f"{CREDIT}."


def _online(arguments: argparse.Namespace) -> Callable[[str, str], Town | None] | None:
    if not arguments.online:
        return None
    from siting.study.ask_online import ask_online, cache_file

    return ask_online(arguments.online, contact=arguments.contact, cache=arguments.cache or cache_file())


def located_lines(located: LocatedStudy) -> list[str]:
    """
    Return what was found and what was not.

    Parameters
    ----------
    located
        A study after looking its places up.

    Returns
    -------
    lines
        How many by kind of match, then each near-spelling, ambiguous and unknown place, then coordinates worth a look.
    """
    from siting.study.locate import Match

    counts = Counter(row.found.match for row in located.rows)
    told = ", ".join(f"{counts[match]} {match}" for match in Match if counts[match])
    lines = [f"{len(located.rows)} rows without coordinates: {told}." if located.rows else "Every row has coordinates."]
    by_name = sum(row.by_name and row.found.town is not None for row in located.rows)
    if by_name:
        lines.append(f"{by_name} of them have no place and were found by their own name.")
    for match in (Match.NEAR, Match.ONLINE, Match.AMBIGUOUS, Match.UNKNOWN):
        lines += _listed([row for row in located.rows if row.found.match is match])
    lines += [f"Worth a look: {warning}" for warning in located.warnings[:SHOWN]]
    if len(located.warnings) > SHOWN:
        lines.append(f"... and {len(located.warnings) - SHOWN} more.")
    return lines


def _listed(rows: Sequence[Located]) -> list[str]:
    lines = [_line(row) for row in rows[:SHOWN]]
    return [*lines, f"  ... and {len(rows) - SHOWN} more like it."] if len(rows) > SHOWN else lines


def _line(row: Located) -> str:
    from siting.study.locate_study import furthest_apart_km

    found, asked = row.found, ", ".join(filter(None, (row.place, row.country)))
    head = f"  {row.table}, row {row.row}: {asked!r}"
    if found.town is not None:
        return f"{head} taken for {_town(found.town)}: {found.match}, confidence {found.confidence:.2f}"
    if not found.candidates:
        return f"{head} is not known; it stays without coordinates"
    shown = "; ".join(map(_town, found.candidates))
    return f"{head} fits several towns, up to {furthest_apart_km(found.candidates):,.0f} km apart: {shown}"


def _town(town: Town) -> str:
    return f"{town.name} ({town.country}, {town.population:,} people, {town.latitude:.2f} {town.longitude:.2f})"
