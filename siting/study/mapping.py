"""
Keep and apply what the analyst confirmed about the columns of a file: their names and the decimal mark.

A mapping is a TOML file with one `[[layout]]` for each file layout, which is told by a hash of its header. It lies
beside the study (`mapping.toml` in a folder, `NAME.mapping.toml` beside the workbook NAME.xlsx), or is named with
`--mapping`. It only ever renames; a warning says what it renamed.
"""

from __future__ import annotations

import hashlib
import json
import tomllib
from collections import Counter
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import tomli_w

from siting.errors import Fault, StudyError
from siting.study.columns import TABLES
from siting.study.gathering import did_you_mean

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from siting.study.propose import Proposal
    from siting.study.raw import RawStudy, RawTable

MAPPING_FILE = "mapping.toml"

DECIMALS = {"": "", "point": ".", "comma": ","}
"""Words of a mapping for the decimal mark; empty = as the cells say."""

_HASH_LETTERS = 16

_INTRODUCTION = """\
# What the columns of the study's files are called in its tables. Left of each = is the name in the file, right of it
# the column of ours, or "" where the column is not to be read as any. Correct what is wrong, delete what is not wanted.
# decimal = "point" or "comma" settles numbers such as 1.234 in columns that can be read in two ways.
"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Layout:
    """What is confirmed about files of one header."""

    table: str
    header: str
    """As `layout_hash` gives it."""
    columns: Mapping[str, str] = field(default_factory=dict)
    """Column of ours by column as typed; "" = left as it is."""
    decimal: str = ""
    """One of the keys of `DECIMALS`."""
    source: str = ""
    """Name of the file, without its ending, or of the sheet, where it is not that of the table."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnMapping:
    """All layouts that are known."""

    layouts: tuple[Layout, ...] = ()
    name: str = MAPPING_FILE
    """What warnings call it."""

    @property
    def sources(self) -> dict[str, str]:
        """Tables by the name of the file or sheet that holds them, where it is not their own."""
        return {each.source: each.table for each in self.layouts if each.source}

    def find(self, table: str, header: Sequence[str]) -> Layout | None:
        """Return what is confirmed about a table with this header, or None."""
        wanted = layout_hash(header)
        return next((each for each in self.layouts if (each.table, each.header) == (table, wanted)), None)

    def with_layouts(self, layouts: Iterable[Layout]) -> ColumnMapping:
        """Return the mapping with layouts added, or put in the place of those of the same table and header."""
        kept = {(each.table, each.header): each for each in (*self.layouts, *layouts)}
        return replace(self, layouts=tuple(kept.values()))


def layout_hash(header: Sequence[str]) -> str:
    """Return what a file layout is known by: the start of the SHA-256 of its column names."""
    return hashlib.sha256(json.dumps(list(header)).encode()).hexdigest()[:_HASH_LETTERS]


def mapping_from(raw: RawStudy, proposals: Iterable[Proposal]) -> ColumnMapping:
    """
    Return the mapping that takes proposals as confirmed.

    Parameters
    ----------
    raw
        The study that they are for.
    proposals
        Those the analyst confirmed.

    Returns
    -------
    mapping
        A layout for each table that has a column of another name, which is left as it is unless a proposal says more,
        or that is not written as the program writes it, so that its decimal mark may have to be stated.
    """
    confirmed = {(each.table, each.typed): each.column for each in proposals}
    layouts = []
    for name, table in raw.tables.items():
        others = [typed for typed in table.header if typed.strip() and typed not in TABLES[name].names]
        if others or table.form.source or table.form.separator in {";", "\t"} or table.form.text_cells:
            columns = {typed: confirmed.get((name, typed), "") for typed in others}
            header, source = layout_hash(table.header), table.form.source
            layouts.append(Layout(table=name, header=header, columns=columns, source=source))
    return ColumnMapping(layouts=tuple(layouts))


def apply_mapping(raw: RawStudy, mapping: ColumnMapping) -> RawStudy:
    """
    Rename the columns of tables whose layout is known, and settle their decimal mark.

    Parameters
    ----------
    raw
        A study as read.
    mapping
        What the analyst confirmed.

    Returns
    -------
    raw
        With a warning for each table that was renamed, and a fault for each column that would be there twice.
    """
    tables: dict[str, RawTable] = {}
    faults: list[Fault] = []
    warnings: list[Fault] = []
    for name, table in raw.tables.items():
        layout = mapping.find(name, table.header)
        tables[name] = table if layout is None else _renamed(table, layout)
        if layout is None:
            continue
        renamed = {typed: ours for typed, ours in layout.columns.items() if ours and ours != typed}
        for ours, count in Counter(tables[name].header).items():
            if count > 1 and ours in renamed.values():
                wrong = f"{mapping.name} would give the table this column {count} times"
                repair = f"Keep one of its lines for {ours}, and delete the others"
                faults.append(Fault(table=name, column=ours, wrong=wrong, repair=repair))
        if renamed:
            listed = ", ".join(f"{typed!r} as {ours}" for typed, ours in renamed.items() if typed in table.header)
            wrong = f"columns were read as {mapping.name} says: {listed}"
            warnings.append(Fault(table=name, wrong=wrong, repair=f"Nothing to do, unless {mapping.name} is wrong"))
    return replace(raw, tables=tables, faults=(*raw.faults, *faults), warnings=(*raw.warnings, *warnings))


def _renamed(table: RawTable, layout: Layout) -> RawTable:
    names = {typed: ours for typed, ours in layout.columns.items() if ours}
    form = replace(
        table.form,
        decimal=DECIMALS[layout.decimal],
        text_cells={names.get(name, name): rows for name, rows in table.form.text_cells.items()},
    )
    return replace(table, header=tuple(names.get(name, name) for name in table.header), form=form)


def mapping_beside(path: Path) -> Path:
    """Return where the mapping of a study lies, whether or not it is there."""
    return path / MAPPING_FILE if path.is_dir() else path.with_name(f"{path.stem}.{MAPPING_FILE}")


def read_mapping(path: Path | str) -> ColumnMapping:
    """
    Read a mapping.

    Parameters
    ----------
    path
        The TOML file.

    Returns
    -------
    mapping
        Its layouts.

    Raises
    ------
    StudyError
        If the file cannot be read, or names what does not exist; the error lists every fault.
    """
    path = Path(path)
    try:
        held = tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except (UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        wrong = f"the file is not TOML in UTF-8 ({error})"
        raise StudyError([Fault(table=path.name, wrong=wrong, repair="Have it proposed again")]) from error
    except OSError as error:
        wrong = f"the file cannot be read ({error.strerror})"
        raise StudyError([Fault(table=path.name, wrong=wrong, repair="Check its path")]) from error
    faults = [
        Fault(table=path.name, column=key, wrong="not a part of a mapping", repair="Delete it")
        for key in sorted(held.keys() - {"layout"})
    ]
    given = held.get("layout", [])
    if not isinstance(given, list):
        faults.append(Fault(table=path.name, column="layout", wrong="not a list", repair="Write [[layout]]"))
        given = []
    layouts = [layout for each in given if (layout := _layout(each, path.name, faults)) is not None]
    if faults:
        raise StudyError(faults)
    return ColumnMapping(layouts=tuple(layouts), name=path.name)


def _layout(held: object, file: str, faults: list[Fault]) -> Layout | None:
    """Return one layout of a file, or None after noting what is wrong with it."""
    before = len(faults)

    def fault(column: str, value: object, wrong: str, repair: str) -> None:
        faults.append(Fault(table=file, column=column, value=str(value), wrong=wrong, repair=repair))

    if not isinstance(held, dict):
        fault("layout", held, "not a layout", "Write [[layout]]")
        return None
    given: dict[str, Any] = {"decimal": "", "columns": {}, "source": "", **held}
    for key in sorted(given.keys() - {"table", "header", "decimal", "columns", "source"}):
        fault(key, given[key], "not a part of a layout", "Delete it")
    table = given.get("table")
    spec = TABLES.get(table) if isinstance(table, str) else None
    if spec is None:
        fault("table", table, "not a table", did_you_mean(str(table), TABLES, f"Write one of {', '.join(TABLES)}"))
    if not isinstance(given.get("header"), str):
        fault("header", given.get("header"), "not the hash of a header", "Have the mapping proposed again")
    if not isinstance(given["source"], str) or given["source"] in TABLES:
        fault("source", given["source"], "not another name of a file or sheet", 'Write its name, or ""')
    if given["decimal"] not in list(DECIMALS):
        fault("decimal", given["decimal"], "not a decimal mark", 'Write "point", "comma" or ""')
    if not isinstance(given["columns"], dict):
        fault("columns", given["columns"], "not a list of columns", "Write [layout.columns]")
    elif spec is not None:
        for typed, ours in given["columns"].items():
            if ours != "" and ours not in spec.names:
                repair = did_you_mean(str(ours), spec.names, 'Write one of its columns, or ""')
                fault(typed, ours, f"not a column of {table}", repair)
    return Layout(**given) if len(faults) == before else None


def write_mapping(mapping: ColumnMapping, path: Path | str, proposals: Iterable[Proposal] = ()) -> None:
    """
    Write a mapping as a TOML file that can be read, corrected and kept.

    Parameters
    ----------
    mapping
        The layouts.
    path
        File to write; it is replaced.
    proposals
        Where they are given, each line says how sure it is and why.
    """
    why = {(each.table, each.typed): f"{each.confidence:.0%}: {'; '.join(each.reasons)}" for each in proposals}
    lines = [_INTRODUCTION]
    for layout in mapping.layouts:
        head = {"table": layout.table, "header": layout.header, "decimal": layout.decimal}
        if layout.source:
            head = {"source": layout.source, **head}
        lines += ["[[layout]]", tomli_w.dumps(head), "[layout.columns]"]
        for typed, ours in layout.columns.items():
            reason = why.get((layout.table, typed))
            lines += [f"# {_one_line(reason)}"] if reason else []
            lines.append(tomli_w.dumps({typed: ours}).rstrip("\n"))
        lines.append("")
    Path(path).write_text("\n".join(lines), encoding="utf-8", newline="\n")


def _one_line(text: str) -> str:
    return "".join(letter if letter.isprintable() else " " for letter in text)
