"""Read a study from one .xlsx workbook: a sheet `study` with the settings, and a sheet for each table."""

from __future__ import annotations

import re
import warnings
from collections import defaultdict
from contextlib import ExitStack
from dataclasses import dataclass, field, replace
from itertools import islice, product
from typing import TYPE_CHECKING, Any

from openpyxl import load_workbook
from openpyxl.cell.cell import ERROR_CODES
from openpyxl.utils.cell import range_boundaries

from siting.errors import Fault
from siting.study.check_settings import settings_from_cells
from siting.study.columns import TABLES
from siting.study.gathering import MOST_LISTED
from siting.study.raw import Form, RawStudy, cell_text
from siting.study.records import RecordReader
from siting.study.workbook_guard import CORRUPT, RefusedError, inspect_workbook

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence
    from pathlib import Path

    from siting.study.raw import RawTable
    from siting.study.workbook_guard import Inspection

SETTINGS_SHEET = "study"

_NUMBER_LIKE = re.compile(r"[-+\u2212\s]*[0-9][0-9.,'\u2019\s]*([eE][-+]?[0-9]+)?")
"""A text cell that may be a number stored as text."""


@dataclass(slots=True)
class _Found:
    """What has been read so far."""

    tables: dict[str, RawTable] = field(default_factory=dict)
    settings: dict[str, object] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)
    names: list[str] = field(default_factory=list)
    """Names of all sheets, those of tables as ours."""
    unreadable: set[str] = field(default_factory=set)


def read_workbook(path: Path, sources: Mapping[str, str]) -> RawStudy:
    """
    Read a workbook as text.

    Parameters
    ----------
    path
        The file.
    sources
        Tables by the name of the sheet that holds them, where it has another name and no sheet has theirs.

    Returns
    -------
    raw
        Its tables and settings; where the file cannot be used, no table and one fault.
    """
    found = _Found()
    try:
        inspection = inspect_workbook(path)
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # openpyxl warns of looks and validations that it does not keep
            _read_sheets(path, found, inspection, sources)
    except RefusedError as refused:
        return _unusable(path, *refused.args)
    except OSError as error:
        return _unusable(path, f"the workbook cannot be read ({error.strerror})", "Check that you may read it")
    except Exception as error:  # noqa: BLE001  (openpyxl lets the errors of zip, zlib, XML and its own types through)
        return _unusable(path, f"the workbook is damaged ({type(error).__name__})", CORRUPT)
    if SETTINGS_SHEET not in found.names:
        wrong, repair = "the sheet is missing", "Add it, with the columns setting and value, and currency and unit"
        found.faults.append(Fault(table=SETTINGS_SHEET, wrong=wrong, repair=repair))
        found.unreadable.add(SETTINGS_SHEET)
    return RawStudy(
        tables=found.tables,
        settings=found.settings,
        settings_name=SETTINGS_SHEET,
        faults=tuple(found.faults),
        strangers=tuple(name for name in found.names if name not in TABLES and name != SETTINGS_SHEET),
        unreadable=frozenset(found.unreadable),
    )


def _unusable(path: Path, wrong: str, repair: str) -> RawStudy:
    fault = Fault(table=path.name, wrong=wrong, repair=repair)
    everything = frozenset({*TABLES, SETTINGS_SHEET})
    return RawStudy(tables={}, settings_name=SETTINGS_SHEET, faults=(fault,), unreadable=everything)


def _read_sheets(path: Path, found: _Found, inspection: Inspection, sources: Mapping[str, str]) -> None:
    with ExitStack() as stack:  # openpyxl closes no file that it fails to open as a workbook
        values = load_workbook(stack.enter_context(path.open("rb")), read_only=True, data_only=True)
        typed = None
        if inspection.formulas:
            typed = load_workbook(stack.enter_context(path.open("rb")), read_only=True)
        for sheet in values.worksheets:
            sheet.reset_dimensions()
            name = sources.get(sheet.title, sheet.title)
            if name in {*values.sheetnames, *found.names}:
                name = sheet.title
            found.names.append(name)
            if name in TABLES:
                _read_table(sheet, name, found, inspection)
            elif name == SETTINGS_SHEET:
                _read_settings(sheet, found)
            if typed is not None and (name in found.tables or name == SETTINGS_SHEET):
                typed[sheet.title].reset_dimensions()
                _check_formulas(sheet, typed[sheet.title], name, found)


@dataclass(slots=True)
class _Noted:
    """What the cells of a sheet are besides their text."""

    errors: list[tuple[int, int, str]] = field(default_factory=list)
    """Row, position of the column and text of cells that show an error."""
    text_cells: defaultdict[int, list[int]] = field(default_factory=lambda: defaultdict(list))
    """By position of the column: rows whose cell is a text that looks like a number."""


def _rows(sheet: Any, noted: _Noted) -> Iterator[list[str]]:  # noqa: ANN401  (openpyxl has no public type for these)
    for number, row in enumerate(sheet.iter_rows(values_only=True), start=1):
        texts = ["" if value is None else cell_text(value) for value in row]
        for at, value in enumerate(row):
            if isinstance(value, str):
                if value in _ERRORS:
                    noted.errors.append((number, at, value))
                elif _NUMBER_LIKE.fullmatch(value):
                    noted.text_cells[at].append(number)
        while texts and not texts[-1]:
            texts.pop()
        yield texts


def _read_table(sheet: Any, name: str, found: _Found, inspection: Inspection) -> None:  # noqa: ANN401  (as above)
    reader = RecordReader(name, TABLES[name].names, separator="")
    noted = _Noted()
    table = reader.read(_rows(sheet, noted))
    if table is None:
        repair = "Write the column names in its first row, or delete it"
        found.faults.append(Fault(table=name, wrong="the sheet is empty", repair=repair))
        found.unreadable.add(name)
        return
    part = str(sheet._worksheet_path).lstrip("/")  # noqa: SLF001  (openpyxl offers no public way to a sheet's part)
    form = Form(
        source="" if sheet.title == name else sheet.title,
        separator="",
        skipped=reader.skipped,
        hidden=sheet.sheet_state != "visible" or part in inspection.hidden_rows,
        text_cells={
            reader.header[at]: frozenset(rows) for at, rows in noted.text_cells.items() if at < len(reader.header)
        },
    )
    found.tables[name] = replace(table, form=form)
    found.faults += reader.faults
    for row, at, text in noted.errors[:MOST_LISTED]:
        wrong = "the cell shows an error of a formula"
        found.faults += _in_known_column(
            name, reader.header, at, row, text, wrong, "Repair the formula, or type the value"
        )
    covered = _covered(inspection.merged.get(part, set()), reader, table)
    for row, at, corner in islice(covered, MOST_LISTED):
        wrong = f"the cell is merged with {corner}, so that only that one holds a value"
        found.faults += _in_known_column(
            name, reader.header, at, row, "", wrong, "Unmerge the cells and fill in each of them"
        )


def _covered(merged: set[str], reader: RecordReader, table: RawTable) -> Iterator[tuple[int, int, str]]:
    """Yield row and position of each cell below the header that a merged cell with a value covers, and that cell."""
    places = {row: place for place, row in enumerate(table.rows.tolist())} if merged else {}
    for name in sorted(merged):
        left, top, right, bottom = (number or 0 for number in range_boundaries(name))
        header = reader.header[left - 1] if left <= len(reader.header) else ""
        cells = table.column(header)
        if cells is None or top not in places or not cells[places[top]].as_py():
            continue
        columns = range(left - 1, min(right, len(reader.header)))
        corner = name.partition(":")[0]
        for row, at in product(range(top, bottom + 1), columns):
            if (row, at) != (top, left - 1):
                yield row, at, corner


_ERRORS = frozenset(ERROR_CODES)


def _in_known_column(  # noqa: PLR0913, PLR0917  (the fields of a fault)
    table: str, header: Sequence[str], at: int, row: int, text: str, wrong: str, repair: str
) -> list[Fault]:
    """Return a fault where the column at a position is one the program uses."""
    known = TABLES[table].names if table in TABLES else ("setting", "value")
    if at >= len(header) or header[at] not in known:
        return []
    return [Fault(table=table, row=row, column=header[at], value=text, wrong=wrong, repair=repair)]


def _check_formulas(values: Any, typed: Any, name: str, found: _Found) -> None:  # noqa: ANN401  (as above)
    """Note formulas whose result is not in the file: they would read as blank."""
    header: list[str] = []
    for number, (row, formulas) in enumerate(
        zip(values.iter_rows(values_only=True), typed.iter_rows(), strict=True), 1
    ):
        if not header:
            header = [cell_text(value) for value in row] if any(value is not None for value in row) else []
            continue
        for at, (value, cell) in enumerate(zip(row, formulas, strict=True)):
            if value is None and cell.data_type == "f":
                wrong = "the result of the formula is not in the file"
                repair = "Open the workbook in a spreadsheet program, let it calculate, and save"
                found.faults += _in_known_column(name, header, at, number, str(cell.value), wrong, repair)


def _read_settings(sheet: Any, found: _Found) -> None:  # noqa: ANN401  (as above)
    """Read the sheet `study`: one setting a row, those of `[solve]` as ``solve.gap``."""
    rows = list(sheet.iter_rows(values_only=True))
    filled = [(number, row) for number, row in enumerate(rows, start=1) if any(value is not None for value in row)]
    header = [cell_text(value) for value in filled[0][1]] if filled else []
    if "setting" not in header or "value" not in header:
        wrong = "the sheet does not have the columns setting and value"
        found.faults.append(Fault(table=SETTINGS_SHEET, wrong=wrong, repair="Write setting and value in its first row"))
        found.unreadable.add(SETTINGS_SHEET)
        return
    name_at, value_at = header.index("setting"), header.index("value")
    cells: dict[str, object] = {}
    for number, row in filled[1:]:
        name, value = (
            cell_text(row[name_at] if name_at < len(row) else None),
            row[value_at] if value_at < len(row) else None,
        )
        if value is None:
            continue
        if not name or name in cells:
            wrong = "the setting is there more than once" if name else "a value without the name of its setting"
            repair = "Keep one of the rows" if name else "Write the name in the column setting, or clear the value"
            found.faults.append(
                Fault(table=SETTINGS_SHEET, row=number, column=name, value=cell_text(value), wrong=wrong, repair=repair)
            )
        elif isinstance(value, str) and value in _ERRORS:
            wrong, repair = "the cell shows an error of a formula", "Repair the formula, or type the value"
            found.faults.append(Fault(table=SETTINGS_SHEET, column=name, value=value, wrong=wrong, repair=repair))
        else:
            cells[name] = value
    found.settings = settings_from_cells(cells)
