"""
Write a workbook to fill in: a sheet for each table, a note on each column, lists to choose from, a few example rows.

The example rows are part of the demo study, in italics. Each sheet has a name for them, such as `examples_sites`:
chosen in the name box of a spreadsheet program it selects them all, and one press of Delete clears them, since blank
rows are left out when the workbook is read. A template without examples can be had at once.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, BinaryIO

from openpyxl import Workbook
from openpyxl.comments import Comment
from openpyxl.styles import Alignment, Font, PatternFill
from openpyxl.utils import get_column_letter
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation

from siting.cells import number_text, safe_cell
from siting.study.columns import (
    SETTING_DEFAULTS,
    SETTINGS,
    SOLVE_DEFAULTS,
    SOLVE_SETTINGS,
    TABLES,
    Column,
    Kind,
    TableSpec,
)
from siting.study.demo import demo_folder
from siting.study.parse import range_words
from siting.study.published_circuity import FACTORS, SOURCE
from siting.study.read import read_study
from siting.study.tables import CircuityRow, Leg, TariffBasis, TariffRow, no_lanes
from siting.study.write import SHEET_ROWS, rows_to_write, settings_to_write

if TYPE_CHECKING:
    from siting.study.tables import Study

EXAMPLE_SITES = ("Linz", "Győr", "Graz", "Debrecen")
EXAMPLE_SUPPLIERS = ("Deggendorf", "Salzburg")
EXAMPLE_CUSTOMERS = ("Budapest", "Vienna", "Munich", "Brno", "Innsbruck", "Villach")
"""Rows of the demo study that are shown, with all that belongs to them in the other tables."""

EXAMPLE_LANES = 3

EXAMPLE_TARIFFS = (
    TariffRow(tariff="Groupage", leg=Leg.OUTBOUND, to_km=150, basis=TariffBasis.PER_DELIVERY, rate=110, row=2),
    TariffRow(
        tariff="Groupage", leg=Leg.OUTBOUND, from_km=150, basis=TariffBasis.PER_UNIT_KM, rate=0.24, minimum=110, row=3
    ),
    TariffRow(
        tariff="Full truck", leg=Leg.INBOUND, basis=TariffBasis.PER_TRUCK_KM, rate=1.25, truck_load=24, fill=0.85, row=4
    ),
)
"""Invented, since the demo study goes by rates."""

EXAMPLE_CIRCUITY = tuple(
    CircuityRow(country=code, circuity=FACTORS[code], source=SOURCE, row=row)
    for row, code in enumerate(("DE", "HU"), start=2)
)

SETTINGS_HEADER = ("setting", "value", "unit", "meaning")

_HEADER_FONT = Font(bold=True, color="FBFAF7")
_NEEDED, _OPTIONAL = PatternFill("solid", fgColor="0F766E"), PatternFill("solid", fgColor="475569")
_EXAMPLE_FONT = Font(italic=True, color="475569")
_EXAMPLE_FILL = PatternFill("solid", fgColor="F1EFE8")
_WIDTH, _WIDE = 16, 60
_NOTE_WIDTH_PX, _LINE_PX, _LINE_LETTERS = 300, 18, 42


def write_template(target: Path | str | BinaryIO, *, examples: bool = True) -> None:
    """
    Write a workbook to fill in.

    Parameters
    ----------
    target
        File to write, replaced where it is there; or an open one, such as a page's download.
    examples
        Whether to put a few rows of the demo study into it. With them it is read without a fault.
    """
    study = _examples(read_study(demo_folder()))
    book = Workbook()
    _settings_sheet(book.worksheets[0], study if examples else None)
    for spec in TABLES.values():
        sheet = book.create_sheet(spec.name)
        rows = list(rows_to_write(study, spec.name, spec.names)) if examples else []
        _table_sheet(sheet, spec, rows)
        if rows:
            name = f"examples_{spec.name}"
            book.defined_names[name] = DefinedName(name, attr_text=f"{spec.name}!$2:${len(rows) + 1}")
    book.save(Path(target) if isinstance(target, str) else target)


def column_note(column: Column, default: object, *, needed: bool | None = None) -> str:
    """
    Return what to know before filling in a column or a setting.

    Parameters
    ----------
    column
        The column or setting.
    default
        What a blank cell means; None where it means nothing in particular.
    needed
        Whether it must be filled in; by default as the column says.

    Returns
    -------
    note
        One line each: meaning, unit, what may be typed, what a blank means.
    """
    lines = [f"{column.meaning}."]
    if column.unit:
        lines.append(f"Unit: {column.unit}.")
    lines.append(_allowed_words(column))
    if column.required if needed is None else needed:
        lines.append("Must be filled in.")
    elif not column.blank:
        lines.append("Must be filled in where the column is there.")
    elif default not in {None, ""}:
        lines.append(f"Blank means {_default_word(default)}.")
    return "\n".join(line for line in lines if line)


def _default_word(default: object) -> str:
    if isinstance(default, bool):
        return "yes" if default else "no"
    return number_text(float(default)) if isinstance(default, int | float) else str(default)


def _allowed_words(column: Column) -> str:
    if column.choices:
        return f"One of: {', '.join(column.choices)}."
    if column.kind is Kind.YES_NO:
        return "yes or no."
    if column.kind not in {Kind.NUMBER, Kind.WHOLE}:
        return ""
    what = "A whole number" if column.kind is Kind.WHOLE else "A number"
    limits = f" {range_words(column)}" if column.low is not None else ""
    return f"{what}{limits}{', or unlimited' if column.unlimited else ''}."


def _examples(study: Study) -> Study:
    """Return the part of the demo study that is shown."""
    names = {*EXAMPLE_SITES, *EXAMPLE_SUPPLIERS}
    starts, ends = names, {*EXAMPLE_SITES, *EXAMPLE_CUSTOMERS}
    lanes = study.lanes
    shown = [
        place
        for place in range(len(lanes))
        if lanes.names[lanes.origin[place]] in starts and lanes.names[lanes.destination[place]] in ends
    ][:EXAMPLE_LANES]
    parts = {
        name: getattr(lanes, name)[shown]
        for name in ("origin", "destination", "good", "leg", "road_km", "unit_cost", "barred", "row")
    }
    return replace(
        study,
        sites=tuple(row for row in study.sites if row.site in EXAMPLE_SITES),
        suppliers=tuple(row for row in study.suppliers if row.supplier in EXAMPLE_SUPPLIERS),
        customers=tuple(row for row in study.customers if row.customer in EXAMPLE_CUSTOMERS),
        sizes=tuple(row for row in study.sizes if row.site in EXAMPLE_SITES),
        demands=tuple(row for row in study.demands if row.customer in EXAMPLE_CUSTOMERS),
        offers=tuple(row for row in study.offers if row.supplier in EXAMPLE_SUPPLIERS),
        rules=tuple(row for row in study.rules if names.issuperset(row.members)),
        tariffs=EXAMPLE_TARIFFS,
        circuity=EXAMPLE_CIRCUITY,
        lanes=replace(lanes if shown else no_lanes(), **parts, attributes={}),
    )


def _table_sheet(sheet: Any, spec: TableSpec, rows: list[list[Any]]) -> None:  # noqa: ANN401  (openpyxl has no common type for sheets)
    for at, column in enumerate(spec.columns, start=1):
        note = column_note(column, spec.default(column.name))
        if at == 1:
            note = f"{spec.meaning}.\n\n{note}"
            if rows:
                note += (
                    f"\n\nRows 2 to {len(rows) + 1}, in italics, are examples. Choose examples_{spec.name} in the name "
                    "box, left of the formula bar, and press Delete."
                )
        _head(sheet, at, column.name, note, needed=column.required or not column.blank)
        sheet.column_dimensions[get_column_letter(at)].width = _WIDTH
        _validate(sheet, column, f"{get_column_letter(at)}2:{get_column_letter(at)}{SHEET_ROWS}")
    sheet.freeze_panes = "B2"
    for number, row in enumerate(rows, start=2):
        for at, value in enumerate(row, start=1):
            _fill(sheet.cell(number, at), value, is_example=True)


def _settings_sheet(sheet: Any, study: Study | None) -> None:  # noqa: ANN401  (as above)
    values = settings_to_write(study) if study else {}
    known = {column.name: (column, SETTING_DEFAULTS.get(column.name)) for column in SETTINGS}
    known |= {f"solve.{column.name}": (column, SOLVE_DEFAULTS.get(column.name)) for column in SOLVE_SETTINGS}
    notes = ("Name of the setting.", "Fill in this column. Blank means the default.", "", "")
    sheet.title = "study"
    for at, (name, note) in enumerate(zip(SETTINGS_HEADER, notes, strict=True), start=1):
        _head(sheet, at, name, note, needed=name == "value")
    for row, (name, (column, default)) in enumerate(known.items(), start=2):
        sheet.cell(row, 1, name)
        _fill(sheet.cell(row, 2), values.get(name), is_example=study is not None)
        sheet.cell(row, 3, column.unit or None)
        cell = sheet.cell(row, 4, " ".join(column_note(column, default).split("\n")))
        cell.alignment = Alignment(wrap_text=True, vertical="top")
        _validate(sheet, column, f"B{row}")
    for letter, width in zip("ABCD", (_WIDTH + 8, _WIDTH + 8, _WIDTH + 12, _WIDE), strict=True):
        sheet.column_dimensions[letter].width = width
    sheet.freeze_panes = "C2"


def _head(sheet: Any, at: int, name: str, note: str, *, needed: bool) -> None:  # noqa: ANN401  (as above)
    cell = sheet.cell(1, at, name)
    cell.font, cell.fill = _HEADER_FONT, _NEEDED if needed else _OPTIONAL
    if note:
        lines = sum(1 + len(line) // _LINE_LETTERS for line in note.split("\n"))
        cell.comment = Comment(note, "siting", height=(lines + 1) * _LINE_PX, width=_NOTE_WIDTH_PX)


def _fill(cell: Any, value: object, *, is_example: bool) -> None:  # noqa: ANN401  (as above)
    if isinstance(value, bool):
        value = "yes" if value else "no"
    cell.value = safe_cell(value) or None if isinstance(value, str) else value
    if is_example and value is not None:
        cell.font, cell.fill = _EXAMPLE_FONT, _EXAMPLE_FILL


def _validate(sheet: Any, column: Column, cells: str) -> None:  # noqa: ANN401  (as above)
    """Let a spreadsheet program offer the choices of a column and refuse what is none of them, or no such number."""
    choices = ("yes", "no") if column.kind is Kind.YES_NO else column.choices
    if choices:
        rule = DataValidation(type="list", formula1=f'"{",".join(choices)}"', allow_blank=True)
    elif column.kind in {Kind.NUMBER, Kind.WHOLE} and column.low is not None and not column.unlimited:
        rule = DataValidation(
            type="whole" if column.kind is Kind.WHOLE else "decimal",
            operator="greaterThan" if column.low_open else "greaterThanOrEqual",
            formula1=f"{column.low:g}",
            allow_blank=True,
        )
        if column.high is not None:
            rule.operator, rule.formula2 = "between", f"{column.high:g}"
    else:
        return
    rule.errorTitle, rule.error = column.name[:32], _allowed_words(column)
    rule.showErrorMessage = True
    rule.add(cells)
    sheet.add_data_validation(rule)
