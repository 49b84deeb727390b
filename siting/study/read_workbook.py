"""Read a study from one .xlsx workbook: a sheet `study` with the settings, and a sheet for each table."""

from __future__ import annotations

import re
import warnings
import zipfile
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from openpyxl import load_workbook
from openpyxl.cell.cell import ERROR_CODES

from siting.errors import Fault
from siting.study.check_settings import settings_from_cells
from siting.study.columns import TABLES
from siting.study.gathering import MOST_LISTED
from siting.study.raw import RawStudy, cell_text
from siting.study.records import RecordReader

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence
    from pathlib import Path

    from siting.study.raw import RawTable

SETTINGS_SHEET = "study"

MOST_BYTES = 200_000_000
"""Size of the largest workbook read."""

MOST_UNPACKED_BYTES = 1_500_000_000
"""Size of the largest workbook read once it is unpacked; a million lanes take about 200 MB."""

_COMPOUND_FILE = bytes.fromhex("d0cf11e0a1b11ae1")
"""First bytes of encrypted workbooks and of the .xls format before 2007."""

_ENTITY = re.compile(rb"<!(DOCTYPE|ENTITY)")
_FORMULA = re.compile(rb"<f[ />]")
_BLOCK = 1 << 20
_OVERLAP = 16

_CORRUPT = "Open it in a spreadsheet program and save it again as .xlsx"


class _RefusedError(Exception):
    """The workbook cannot be used; the arguments are what is wrong and the repair."""


_UNPROTECTED = "Save it as .xlsx without a password"


@dataclass(slots=True)
class _Found:
    """What has been read so far."""

    tables: dict[str, RawTable] = field(default_factory=dict)
    settings: dict[str, object] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)
    names: list[str] = field(default_factory=list)
    """Names of all sheets."""
    unreadable: set[str] = field(default_factory=set)


def read_workbook(path: Path) -> tuple[RawStudy, tuple[str, ...]]:
    """
    Read a workbook as text.

    Parameters
    ----------
    path
        The file.

    Returns
    -------
    raw
        Its tables and settings; where the file cannot be used, no table and one fault.
    strangers
        Names of sheets that are no table.
    """
    found = _Found()
    try:
        formulas = _inspect(path)
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # openpyxl warns of looks and validations that it does not keep
            _read_sheets(path, found, formulas=formulas)
    except _RefusedError as refused:
        return _unusable(path, *refused.args), ()
    except OSError as error:
        return _unusable(path, f"the workbook cannot be read ({error.strerror})", "Check that you may read it"), ()
    except Exception as error:  # noqa: BLE001  (openpyxl lets the errors of zip, zlib, XML and its own types through)
        return _unusable(path, f"the workbook is damaged ({type(error).__name__})", _CORRUPT), ()
    if SETTINGS_SHEET not in found.names:
        wrong, repair = "the sheet is missing", "Add it, with the columns setting and value, and currency and unit"
        found.faults.append(Fault(table=SETTINGS_SHEET, wrong=wrong, repair=repair))
        found.unreadable.add(SETTINGS_SHEET)
    raw = RawStudy(
        tables=found.tables,
        settings=found.settings,
        settings_name=SETTINGS_SHEET,
        faults=tuple(found.faults),
        unreadable=frozenset(found.unreadable),
    )
    return raw, tuple(name for name in found.names if name not in TABLES and name != SETTINGS_SHEET)


def _unusable(path: Path, wrong: str, repair: str) -> RawStudy:
    fault = Fault(table=path.name, wrong=wrong, repair=repair)
    everything = frozenset({*TABLES, SETTINGS_SHEET})
    return RawStudy(tables={}, settings_name=SETTINGS_SHEET, faults=(fault,), unreadable=everything)


def _inspect(path: Path) -> bool:
    """Return whether the workbook has formulas, after refusing what must not be opened."""
    size = path.stat().st_size
    if size > MOST_BYTES:
        wrong = f"the workbook has {size / 1e6:.0f} MB, more than {MOST_BYTES / 1e6:.0f} MB"
        raise _RefusedError(wrong, "Give the study as a folder of CSV tables")
    with path.open("rb") as file:
        if file.read(len(_COMPOUND_FILE)) == _COMPOUND_FILE:
            wrong = "the workbook is protected by a password, or in the .xls format of before 2007"
            raise _RefusedError(wrong, _UNPROTECTED)
    if not zipfile.is_zipfile(path):
        wrong = "the file is not an .xlsx workbook, or is damaged"
        raise _RefusedError(wrong, _CORRUPT)
    with zipfile.ZipFile(path) as archive:
        members = archive.infolist()
        unpacked = sum(member.file_size for member in members)
        if unpacked > MOST_UNPACKED_BYTES:
            wrong = f"the workbook unpacks to {unpacked / 1e6:.0f} MB, more than {MOST_UNPACKED_BYTES / 1e6:.0f} MB"
            raise _RefusedError(wrong, "Give the study as a folder of CSV tables")
        if any(member.flag_bits & 1 for member in members):
            wrong = "the workbook is protected by a password"
            raise _RefusedError(wrong, _UNPROTECTED)
        has_formulas = False
        for member in members:
            if member.filename.endswith((".xml", ".rels")):
                has_formulas |= _inspect_member(archive, member)
    return has_formulas


def _inspect_member(archive: zipfile.ZipFile, member: zipfile.ZipInfo) -> bool:
    """Return whether a part of the workbook has formulas; refuse one that declares entities."""
    has_formulas = False
    kept = b""
    with archive.open(member) as part:
        while block := part.read(_BLOCK):
            text = kept + block
            if _ENTITY.search(text):
                wrong = "the workbook declares XML entities, which no spreadsheet program writes"
                raise _RefusedError(wrong, _CORRUPT)
            has_formulas = has_formulas or _FORMULA.search(text) is not None
            kept = text[-_OVERLAP:]
    return has_formulas


def _read_sheets(path: Path, found: _Found, *, formulas: bool) -> None:
    values = load_workbook(path, read_only=True, data_only=True)
    typed = load_workbook(path, read_only=True) if formulas else None
    try:
        for sheet in values.worksheets:
            sheet.reset_dimensions()
            found.names.append(sheet.title)
            if sheet.title in TABLES:
                _read_table(sheet, found)
            elif sheet.title == SETTINGS_SHEET:
                _read_settings(sheet, found)
            if typed is not None and (sheet.title in found.tables or sheet.title == SETTINGS_SHEET):
                typed[sheet.title].reset_dimensions()
                _check_formulas(sheet, typed[sheet.title], found)
    finally:
        values.close()
        if typed is not None:
            typed.close()


def _rows(sheet: Any) -> Iterator[list[str]]:  # noqa: ANN401  (openpyxl has no public type for read-only sheets)
    for row in sheet.iter_rows(values_only=True):
        texts = ["" if value is None else cell_text(value) for value in row]
        while texts and not texts[-1]:
            texts.pop()
        yield texts


def _read_table(sheet: Any, found: _Found) -> None:  # noqa: ANN401  (as above)
    name = sheet.title
    reader = RecordReader(name, may_be_short=True)
    errors: list[tuple[int, int, str]] = []
    table = reader.read(_noting_errors(_rows(sheet), errors))
    if table is None:
        repair = "Write the column names in its first row, or delete it"
        found.faults.append(Fault(table=name, wrong="the sheet is empty", repair=repair))
        found.unreadable.add(name)
        return
    found.tables[name] = table
    found.faults += reader.faults
    for row, at, text in errors[:MOST_LISTED]:
        wrong = "the cell shows an error of a formula"
        found.faults += _in_known_column(
            name, reader.header, at, row, text, wrong, "Repair the formula, or type the value"
        )


def _noting_errors(rows: Iterator[list[str]], errors: list[tuple[int, int, str]]) -> Iterator[list[str]]:
    for number, row in enumerate(rows, start=1):
        if not _ERRORS.isdisjoint(row):
            errors += [(number, at, text) for at, text in enumerate(row) if text in _ERRORS]
        yield row


_ERRORS = frozenset(ERROR_CODES)


def _in_known_column(  # noqa: PLR0913, PLR0917  (the fields of a fault)
    table: str, header: Sequence[str], at: int, row: int, text: str, wrong: str, repair: str
) -> list[Fault]:
    """Return a fault where the column at a position is one the program uses."""
    known = TABLES[table].names if table in TABLES else ("setting", "value")
    if at >= len(header) or header[at] not in known:
        return []
    return [Fault(table=table, row=row, column=header[at], value=text, wrong=wrong, repair=repair)]


def _check_formulas(values: Any, typed: Any, found: _Found) -> None:  # noqa: ANN401  (as above)
    """Note formulas whose result is not in the file: they would read as blank."""
    name = values.title
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
