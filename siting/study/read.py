"""Read a study: a folder of CSV tables with `study.toml`, or one .xlsx workbook with the same tables as sheets."""

from __future__ import annotations

import tomllib
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from siting.errors import Fault, StudyError
from siting.study.check import check_raw
from siting.study.columns import TABLES
from siting.study.gathering import nearest
from siting.study.mapping import ColumnMapping, apply_mapping, mapping_beside, read_mapping
from siting.study.raw import RawStudy
from siting.study.read_csv import read_csv
from siting.study.read_workbook import read_workbook

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.study.raw import RawTable
    from siting.study.tables import Study

SETTINGS_FILE = "study.toml"

WORKBOOKS = frozenset({".xlsx", ".xlsm", ".xlsb", ".xls"})
"""Endings of files that are looked into as workbooks; all but .xlsx are then refused with their repair."""

NEAR_MISS = 0.78
"""How alike, from 0 to 1, an unknown table and a known one must be for the unknown one to be a slip."""


def read_study(path: Path | str, mapping: ColumnMapping | None = None) -> Study:
    """
    Read and check a study.

    Parameters
    ----------
    path
        A folder with `study.toml` and CSV tables, or an .xlsx workbook.
    mapping
        What its columns are called; None = the mapping that lies beside it, if any.

    Returns
    -------
    study
        Frozen; its warnings are in `study.warnings`.

    Raises
    ------
    StudyError
        If anything is wrong; the error lists every fault with its place and repair.
    """
    return check_raw(read_raw(path, mapping)).sound()


def read_raw(path: Path | str, mapping: ColumnMapping | None = None) -> RawStudy:
    """
    Read a study without judging it.

    Parameters
    ----------
    path
        A folder with `study.toml` and CSV tables, or an .xlsx workbook.
    mapping
        What its columns are called; None = the mapping that lies beside it, if any.

    Returns
    -------
    raw
        Tables of text, columns renamed as the mapping says; what could not be read is among its faults.
    """
    path = Path(path)
    faults: tuple[Fault, ...] = ()
    if mapping is None:
        try:
            mapping = read_mapping(mapping_beside(path)) if mapping_beside(path).is_file() else ColumnMapping()
        except StudyError as error:
            mapping, faults = ColumnMapping(), error.faults
    raw = apply_mapping(_read_unmapped(path, mapping.sources), mapping)
    return replace(raw, faults=(*raw.faults, *faults)) if faults else raw


def _read_unmapped(path: Path, sources: Mapping[str, str]) -> RawStudy:
    if path.is_dir():
        return _read_folder(path, sources)
    if path.is_file() and path.suffix.lower() in WORKBOOKS:
        return _with_strangers(read_workbook(path, sources), "sheet")
    wrong = "there is no such folder or workbook" if not path.exists() else "neither a folder nor an .xlsx workbook"
    fault = Fault(
        table="study", value=str(path), wrong=wrong, repair="Give a folder of CSV tables, or an .xlsx workbook"
    )
    return RawStudy(tables={}, faults=(fault,), unreadable=frozenset({*TABLES, SETTINGS_FILE}))


def _read_folder(folder: Path, sources: Mapping[str, str]) -> RawStudy:
    tables: dict[str, RawTable] = {}
    faults: list[Fault] = []
    unreadable: set[str] = set()
    known: set[str] = set()
    for name in TABLES:
        named = (name, *(source for source, table in sources.items() if table == name))
        stem = next((stem for stem in named if (folder / f"{stem}.csv").exists()), None)
        if stem is None:
            continue
        known.add(f"{stem}.csv")
        result = read_csv(folder / f"{stem}.csv", name)
        faults += result.faults
        if result.table is None:
            unreadable.add(name)
        else:
            tables[name] = _from(result.table, "" if stem == name else stem)
    settings, fault = _read_toml(folder / SETTINGS_FILE)
    if fault is not None:
        faults.append(fault)
        unreadable.add(SETTINGS_FILE)
    strangers = tuple(
        file.stem for file in sorted(folder.iterdir()) if file.suffix.lower() == ".csv" if file.name not in known
    )
    raw = RawStudy(
        tables=tables, settings=settings, faults=tuple(faults), strangers=strangers, unreadable=frozenset(unreadable)
    )
    return _with_strangers(raw, "file")


def _from(table: RawTable, source: str) -> RawTable:
    return replace(table, form=replace(table.form, source=source))


def _with_strangers(raw: RawStudy, what: str) -> RawStudy:
    """Add faults for files or sheets whose name is a slip of a table that is not there, warnings for all others."""
    slips: dict[str, Fault] = {}
    strangers = []
    for name in raw.strangers:
        near = nearest(name, TABLES, NEAR_MISS)
        if near and near not in raw.tables and near not in raw.unreadable:
            wrong = f"the {what} {name!r} looks like a slip of the table {near!r}"
            slips[near] = Fault(table=near, wrong=wrong, repair=f"Rename it to {near}, or to something less alike")
        else:
            wrong = f"the {what} is not a table of a study and was not read"
            strangers.append(Fault(table=name, wrong=wrong, repair="Nothing to do, unless it should be one"))
    return replace(
        raw,
        faults=(*raw.faults, *slips.values()),
        warnings=(*raw.warnings, *strangers),
        unreadable=raw.unreadable | set(slips),
    )


def _read_toml(file: Path) -> tuple[dict[str, object], Fault | None]:
    if not file.exists():
        wrong, repair = "the file is missing", 'Add it, with at least currency = "EUR" and unit = "t"'
        return {}, Fault(table=SETTINGS_FILE, wrong=wrong, repair=repair)
    try:
        return tomllib.loads(file.read_bytes().decode("utf-8-sig")), None
    except UnicodeDecodeError:
        return {}, Fault(table=SETTINGS_FILE, wrong="the file is not text in UTF-8", repair="Save it as UTF-8")
    except tomllib.TOMLDecodeError as error:
        wrong = f"the file is not TOML ({error})"
        repair = 'Write each setting on a line of its own, as in currency = "EUR"'
        return {}, Fault(table=SETTINGS_FILE, wrong=wrong, repair=repair)
    except OSError as error:
        wrong = f"the file cannot be read ({error.strerror})"
        return {}, Fault(table=SETTINGS_FILE, wrong=wrong, repair="Check that you may read it")
