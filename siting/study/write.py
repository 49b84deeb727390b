"""Write a study as it was read: a folder of CSV tables with `study.toml`, or one .xlsx workbook."""

from __future__ import annotations

import math
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import tomli_w
from openpyxl import Workbook
from openpyxl.cell import WriteOnlyCell

from siting.cells import safe_cell, write_csv
from siting.errors import Fault, StudyError
from siting.study.columns import (
    SETTING_DEFAULTS,
    SETTINGS,
    SIZED_COLUMNS,
    SOLVE_DEFAULTS,
    SOLVE_SETTINGS,
    TABLES,
    TableSpec,
)
from siting.study.parse import UNLIMITED

if TYPE_CHECKING:
    from collections.abc import Iterator

    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.study.tables import LaneTable, Study

Cell = str | float | None

SHEET_ROWS = 1_048_576
"""Rows of an .xlsx sheet, header included."""

_CHUNK_ROWS = 65_536


def write_study(study: Study, folder: Path | str) -> None:
    """
    Write a study as a folder of CSV tables with `study.toml`.

    Parameters
    ----------
    study
        A checked study.
    folder
        Made where it is missing. Tables of an earlier study in it are replaced or deleted.
    """
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    values = settings_to_write(study)
    solve = {name.removeprefix("solve."): value for name, value in values.items() if name.startswith("solve.")}
    top: dict[str, object] = {name: value for name, value in values.items() if not name.startswith("solve.")}
    text = tomli_w.dumps({**top, "solve": solve} if solve else top)
    (folder / "study.toml").write_text(text, encoding="utf-8", newline="\n")
    for name in TABLES:
        file = folder / f"{name}.csv"
        if len(getattr(study, name)):
            header = header_to_write(study, name)
            write_csv(file, header, rows_to_write(study, name, header))
        else:
            file.unlink(missing_ok=True)


def write_workbook(study: Study, path: Path | str) -> None:
    """
    Write a study as one .xlsx workbook: a sheet `study` with the settings and a sheet for each table.

    Parameters
    ----------
    study
        A checked study.
    path
        File to write; it is replaced.

    Raises
    ------
    StudyError
        If a table has more rows than a sheet can hold.
    """
    counts = {name: len(getattr(study, name)) for name in TABLES}
    repair = "Write the study as a folder of CSV tables"
    faults = [
        Fault(table=name, wrong=f"{count} rows are more than a sheet can hold ({SHEET_ROWS - 1})", repair=repair)
        for name, count in counts.items()
        if count >= SHEET_ROWS
    ]
    if faults:
        raise StudyError(faults)
    book = Workbook(write_only=True)
    sheet = book.create_sheet("study")
    sheet.append(["setting", "value"])
    for name, value in settings_to_write(study).items():
        sheet.append([name, _in_sheet(sheet, ("yes" if value else "no") if isinstance(value, bool) else value)])
    for name in (name for name, count in counts.items() if count):
        header = header_to_write(study, name)
        sheet = book.create_sheet(name)
        sheet.append([safe_cell(column) for column in header])
        for row in rows_to_write(study, name, header):
            sheet.append([_in_sheet(sheet, value) for value in row])
    book.save(Path(path))


def settings_to_write(study: Study) -> dict[str, str | float | bool]:
    """Return the settings that differ from their default, `[solve]` ones as ``solve.gap``, and the compulsory ones."""
    settings = study.settings
    values = {
        column.name: getattr(settings, column.name)
        for column in SETTINGS
        if column.required or getattr(settings, column.name) != SETTING_DEFAULTS[column.name]
    }
    solve = {
        f"solve.{column.name}": getattr(settings.solve, column.name)
        for column in SOLVE_SETTINGS
        if getattr(settings.solve, column.name) != SOLVE_DEFAULTS[column.name]
    }
    return values | solve


def header_to_write(study: Study, table: str) -> tuple[str, ...]:
    """
    Return the columns a table is written with.

    Parameters
    ----------
    study
        A checked study.
    table
        Name of a table that has rows.

    Returns
    -------
    header
        The header as it was read, then every other column that holds something; for a table that was never read, its
        compulsory columns (`standing` too) and every column that holds something.
    """
    spec = TABLES[table]
    read = tuple(name for name in study.columns.get(table, ()) if name)
    filled = _filled_lanes(study.lanes) if table == "lanes" else _filled(spec, getattr(study, table))
    if not read:
        filled |= {column.name for column in spec.columns if column.required or not column.blank}
    known = (*spec.names, *sorted(filled))
    return tuple(dict.fromkeys([*read, *(name for name in known if name in filled)]))


def rows_to_write(study: Study, table: str, header: tuple[str, ...]) -> Iterator[list[Cell]]:
    """Yield the cells of a table in the order of ``header``; None is blank."""
    if table == "lanes":
        yield from _lane_rows(study.lanes, header)
        return
    names = TABLES[table].names
    sized = {size.site for size in study.sizes} if table == "sites" else set()
    for row in getattr(study, table):
        blank = SIZED_COLUMNS if sized and row.site in sized else ()
        yield [
            None if name in blank else _cell(getattr(row, name)) if name in names else row.attributes.get(name, "")
            for name in header
        ]


def _cell(value: object) -> Cell:
    if value is None or isinstance(value, StrEnum):
        return None if value is None else str(value)
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, tuple):
        return ";".join(value)
    if isinstance(value, int | float):
        return UNLIMITED if math.isinf(value) else float(value)
    return str(value)


def _in_sheet(sheet: Any, value: Cell) -> Any:  # noqa: ANN401  (openpyxl's cells have no common type)
    if isinstance(value, str):
        return safe_cell(value) or None
    if value is None or float(f"{value:.16g}") == value:
        return value
    cell = WriteOnlyCell(sheet, repr(value))  # openpyxl writes 16 digits, which would lose the last bit
    cell.data_type = "n"
    return cell


def _filled(spec: TableSpec, rows: tuple[object, ...]) -> set[str]:
    """Return the columns in which any row differs from the default, and the attributes."""
    filled = {name for name in spec.names if any(getattr(row, name) != spec.default(name) for row in rows)}
    return filled | {name for row in rows for name in row.attributes}  # type: ignore[attr-defined]


def _filled_lanes(lanes: LaneTable) -> set[str]:
    filled = {"origin", "destination", *lanes.attributes}
    if (lanes.good >= 0).any():
        filled.add("good")
    if _is_ambiguous(lanes):
        filled.add("leg")
    for name, held in (("road_km", ~np.isnan(lanes.road_km)), ("unit_cost", ~np.isnan(lanes.unit_cost))):
        if held.any():
            filled.add(name)
    if lanes.barred.any():
        filled.add("barred")
    return filled


def _is_ambiguous(lanes: LaneTable) -> bool:
    """Return whether a name starts or ends lanes of different legs, so that the legs must be written."""
    legs = {leg: at for at, leg in enumerate(lanes.LEGS)}
    sites = set(lanes.destination[lanes.leg == legs[lanes.LEGS[0]]].tolist())
    sites |= set(lanes.origin[lanes.leg == legs[lanes.LEGS[1]]].tolist())
    others = set(lanes.origin[lanes.leg != legs[lanes.LEGS[1]]].tolist())
    others |= set(lanes.destination[lanes.leg != legs[lanes.LEGS[0]]].tolist())
    return not sites.isdisjoint(others)


def _lane_rows(lanes: LaneTable, header: tuple[str, ...]) -> Iterator[list[Cell]]:
    names = np.array([*lanes.names, None], dtype=object)
    legs = np.array([*(str(leg) for leg in lanes.LEGS), None], dtype=object)
    barred = np.array(["", "yes"], dtype=object)
    attributes = {name: (np.array([*words, None], dtype=object), at) for name, (words, at) in lanes.attributes.items()}
    for start in range(0, len(lanes), _CHUNK_ROWS):
        part = slice(start, start + _CHUNK_ROWS)
        columns = {
            "origin": names[lanes.origin[part]],
            "destination": names[lanes.destination[part]],
            "good": names[lanes.good[part]],
            "leg": legs[lanes.leg[part]],
            "road_km": _blanked(lanes.road_km[part]),
            "unit_cost": _blanked(lanes.unit_cost[part]),
            "barred": barred[lanes.barred[part].astype(np.int8)],
            **{name: words[at[part]] for name, (words, at) in attributes.items()},
        }
        yield from (list(row) for row in zip(*(columns[name].tolist() for name in header), strict=True))


def _blanked(numbers: Floats) -> NDArray[np.object_]:
    """Return numbers as objects, None for NaN."""
    objects = numbers.astype(object)
    objects[np.isnan(numbers)] = None
    return objects
