"""`siting check`: read a study and list everything that is wrong with it, at once."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from siting.commands.command import BAD_INPUT, FOUND, add_json, add_study, say, say_json

if TYPE_CHECKING:
    import argparse
    from collections.abc import Sequence

    from siting.commands.command import Commands
    from siting.errors import Fault
    from siting.study.tables import Study


def add(commands: Commands) -> None:
    """Add the command to the command line."""
    parser = commands.add_parser(
        "check",
        help="list every fault and warning of a study",
        description="Read a study and list every fault and warning: table, row, column, value, repair. "
        "Exit code 0 without a fault, 2 with one.",
    )
    add_study(parser)
    add_json(parser)
    parser.add_argument("--mapping", metavar="FILE", help="what the columns of the study's files are called")
    parser.add_argument(
        "--propose-mapping",
        metavar="FILE",
        help="write a proposal of what the columns are called, to be corrected and given as --mapping FILE, or kept as "
        "mapping.toml in the folder of the study (NAME.mapping.toml beside NAME.xlsx), where it is always used",
    )
    parser.set_defaults(run=run)


def run(arguments: argparse.Namespace) -> int:
    """Print what the study holds and its warnings, or its faults and warnings; return the exit code."""
    from siting.errors import StudyError
    from siting.plan.contract import check_to_json
    from siting.study.demo import study_path
    from siting.study.mapping import read_mapping
    from siting.study.read import read_study

    if arguments.propose_mapping:
        return _propose(arguments)
    faults: Sequence[Fault] = ()
    try:
        mapping = read_mapping(arguments.mapping) if arguments.mapping else None
        study = read_study(study_path(arguments.study), mapping)
    except StudyError as error:
        faults, warnings, text = error.faults, error.warnings, str(error)
    else:
        warnings, text = study.warnings, f"No fault. {_contents(study)}"
    if arguments.json:
        say_json(check_to_json(faults, warnings))
    else:
        say("\n".join([text, *_warning_lines(warnings)]))
    return BAD_INPUT if faults else FOUND


def _propose(arguments: argparse.Namespace) -> int:
    """Write proposals for the columns of a study and list them; return the exit code."""
    from siting.study.demo import study_path
    from siting.study.mapping import ColumnMapping, Layout, mapping_from, write_mapping
    from siting.study.propose import propose_mapping, propose_sources
    from siting.study.read import read_raw

    file = Path(arguments.propose_mapping)
    if file.exists():
        say(f"{file}: the file is already there and may hold your corrections. Give another name, or delete it first.")
        return BAD_INPUT
    path = study_path(arguments.study)
    raw = read_raw(path, ColumnMapping())
    sources = propose_sources(raw)
    if sources:
        named = [Layout(table=table, header="", source=source) for source, table in sources.items()]
        raw = read_raw(path, ColumnMapping(layouts=tuple(named)))
    proposals = propose_mapping(raw)
    mapping = mapping_from(raw, proposals)
    if not mapping.layouts:
        say("Every column has the name of one of ours: there is nothing to propose.")
        return FOUND
    write_mapping(mapping, file, proposals)
    count = "1 column" if len(proposals) == 1 else f"{len(proposals)} columns"
    lines = [f"  {source!r} as the table {table}: by its name" for source, table in sources.items()]
    lines += [
        f"  {each.table}, {each.typed!r} as {each.column}: {each.confidence:.0%}, {'; '.join(each.reasons)}"
        for each in proposals
    ]
    head = f"{file}: a proposal for {count}. Read and correct it, then: siting check {arguments.study} --mapping {file}"
    say("\n".join([head, *lines]))
    return FOUND


def _warning_lines(warnings: Sequence[Fault]) -> list[str]:
    if not warnings:
        return []
    head = "1 warning:" if len(warnings) == 1 else f"{len(warnings)} warnings:"
    return [head, *(f"  {warning}" for warning in warnings)]


def _contents(study: Study) -> str:
    running = sum(row.standing == "running" for row in study.sites)
    signed = sum(row.standing == "signed" for row in study.suppliers)
    parts = [
        f"{_many(len(study.sites), 'site')} ({running} running)" if study.sites else "",
        f"{_many(len(study.suppliers), 'supplier')} ({signed} signed)" if study.suppliers else "",
        _many(len(study.customers), "customer"),
        "one good" if len(study.all_goods) == 1 else _many(len(study.all_goods), "good"),
        f"{_many(len(study.lanes), 'row')} of lanes" if len(study.lanes) else "",
        _many(len(study.rules), "rule") if study.rules else "",
    ]
    title = f"{study.settings.title}: " if study.settings.title else ""
    return f"{title}{', '.join(part for part in parts if part)}."


def _many(count: int, noun: str) -> str:
    return f"{count:,} {noun}" if count == 1 else f"{count:,} {noun}s"
