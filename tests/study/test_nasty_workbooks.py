"""Workbooks as people and programs make them, each with the exact outcome."""

from __future__ import annotations

import datetime as dt
import time
import tracemalloc
import zipfile
from typing import TYPE_CHECKING, Any

import pytest
from openpyxl import load_workbook
from openpyxl.chart import BarChart

from siting.study import workbook_guard as guard
from siting.study.check import Checked, check_raw
from siting.study.fingerprint import fingerprint
from siting.study.read import read_raw
from siting.study.write import SHEET_ROWS, write_workbook
from tests.builders import TINY, tiny_goods, tiny_study

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

    Change = Callable[[Any], object]


@pytest.fixture
def book(tmp_path: Path) -> Path:
    """Return the tiny study as a workbook."""
    write_workbook(tiny_study(), tmp_path / "study.xlsx")
    return tmp_path / "study.xlsx"


def read(path: Path) -> Checked:
    """Return a workbook read and checked."""
    return check_raw(read_raw(path))


def edited(path: Path, change: Change) -> Checked:
    """Return a workbook read and checked after a change with openpyxl."""
    opened = load_workbook(path)
    change(opened)
    opened.save(path)
    return read(path)


def put(cell: str, value: object) -> Change:
    """Return the change of one cell of `customers`: columns are customer, latitude, longitude, demand, reach_km."""
    return lambda opened: opened["customers"].__setitem__(cell, value)


def title(opened: Any) -> None:  # noqa: ANN401  (openpyxl's workbook)
    """Put a merged title above the header."""
    opened["customers"].insert_rows(1, 2)
    opened["customers"]["A1"] = "Customers of this year"
    opened["customers"].merge_cells("A1:E1")


def gaps(opened: Any) -> None:  # noqa: ANN401  (as above)
    """Put blank rows between and below the customers."""
    opened["customers"].insert_rows(3, 2)
    opened["customers"]["A40"] = None
    opened["customers"]["A41"].number_format = "0.00"


def all_text(opened: Any) -> None:  # noqa: ANN401  (as above)
    """Store every demand as text."""
    for row in range(2, 6):
        cell = opened["customers"].cell(row, 4)
        cell.value = str(cell.value)


SAME = [
    # a change that leaves the study as it is, and what is said of it
    (lambda _: None, []),
    (
        title,
        ["customers: read without 1 row above the header. Nothing to do if that is right; otherwise correct the s"],
    ),
    (gaps, []),
    (all_text, ["customers: read demand from texts that hold numbers, the first in row 2. Nothing to do"]),
    (put("D2", "40,0"), ["customers: read demand with decimal commas, such as '40,0' in row 2 as 40.0. Nothing to do"]),
    (
        put("D2", " 40 "),
        ["customers: read demand with blanks, signs or separators of thousands, such as ' 40 ' in row"],
    ),
    (put("B2", "48,20849"), ["customers: read latitude with decimal commas, such as '48,20849' in row 2 as 48.20849"]),
    (put("B2", "48.20849"), ["customers: read latitude from texts that hold numbers, the first in row 2"]),
    (
        lambda opened: setattr(opened["customers"], "sheet_state", "hidden"),
        ["customers: read although the sheet or some of its rows are hidden. Nothing to do if that is right"],
    ),
    (
        lambda opened: setattr(opened["customers"], "sheet_state", "veryHidden"),
        ["customers: read although the sheet or some of its rows are hidden"],
    ),
    (
        lambda opened: setattr(opened["customers"].row_dimensions[3], "hidden", True),
        ["customers: read although the sheet or some of its rows are hidden"],
    ),
    (lambda opened: opened["customers"].merge_cells("G2:H4"), []),
    (lambda opened: opened["customers"].merge_cells("A20:E20"), []),
    (lambda opened: setattr(opened["customers"]["D2"], "number_format", "0%"), []),
    (lambda opened: setattr(opened["customers"].cell(SHEET_ROWS, 1), "number_format", "0.00"), []),
    (lambda opened: setattr(opened["customers"].cell(2, 16_384), "number_format", "0.00"), []),
    (
        lambda opened: opened.create_sheet("Notes").append(["read me"]),
        ["Notes: the sheet is not a table of a study and was not read. Nothing to do, unless it should be one."],
    ),
    (lambda opened: opened.create_chartsheet("Chart").add_chart(BarChart()), []),
]


@pytest.mark.parametrize(("change", "said"), SAME)
def test_what_does_not_change_the_study_is_seen_through(book: Path, change: Change, said: list[str]) -> None:
    """The study is the same, and a warning says what was seen through."""
    checked = edited(book, change)
    assert checked.faults == ()
    assert fingerprint(checked.sound()) == fingerprint(tiny_study())
    found = [str(warning) for warning in checked.warnings]
    assert len(found) == len(said), found
    for each, expected in zip(found, said, strict=True):
        assert each.startswith(expected)


def merged(cells: str) -> Change:
    """Return the change that merges cells of `customers`."""
    return lambda opened: opened["customers"].merge_cells(cells)


REFUSED = [
    # a change and the faults it causes
    (put("D2", "1.234"), ["customers, row 2, column demand, value '1.234': 1.234 could be 1234 or 1.234, and nothing"]),
    (
        put("D2", "1,234"),
        ["customers, row 2, column demand, value '1,234': not a number, since it has a thousands sep"],
    ),
    (put("D2", dt.date(2024, 5, 12)), ["customers, row 2, column demand, value '2024-05-12T00:00:00': a date or time"]),
    (
        put("D2", dt.time(12, 30)),
        ["customers, row 2, column demand, value '12:30:00': a date or time, which spreadshee"],
    ),
    (put("D2", "8 %"), ["customers, row 2, column demand, value '8 %': not a number, since it has a percent sign"]),
    (
        put("D2", "=1+1"),
        ["customers, row 2, column demand, value '=1+1': the result of the formula is not in the file"],
    ),
    (put("D2", "#REF!"), ["customers, row 2, column demand, value '#REF!': the cell shows an error of a formula"]),
    (put("D2", value=True), ["customers, row 2, column demand, value 'yes': not a number"]),
    (put("H3", "x"), ["customers, row 3: a cell has no column name above it. Name its column or clear it"]),
    (
        merged("D2:D3"),
        ["customers, row 3, column demand: the cell is merged with D2, so that only that one holds a val"],
    ),
    (
        merged("A2:A4"),
        [
            "customers, row 3, column customer: the cell is merged with A2, so that only that one holds a value. U",
            "customers, row 4, column customer: the cell is merged with A2",
        ],
    ),
    (
        merged("D2:E3"),
        [
            "customers, row 2, column reach_km: the cell is merged with D2",
            "customers, row 3, column demand: the cell is merged with D2",
            "customers, row 3, column reach_km: the cell is merged with D2",
        ],
    ),
    (
        lambda opened: opened["customers"].delete_rows(1, 9),
        ["customers: the sheet is empty. Write the column names in"],
    ),
    (
        lambda opened: setattr(opened["customers"], "title", "Customers"),
        ["customers: the sheet 'Customers1' looks like a slip of the table 'customers'. Rename it to customers, or to"],
    ),
]


@pytest.mark.parametrize(("change", "faults"), REFUSED)
def test_what_is_wrong_or_can_be_read_in_two_ways_is_refused(book: Path, change: Change, faults: list[str]) -> None:
    """The faults, their places and their repairs; nothing guessed."""
    found = [str(fault) for fault in edited(book, change).faults]
    assert len(found) == len(faults), found
    for said, expected in zip(found, faults, strict=True):
        assert said.startswith(expected), said


def test_a_number_beside_texts_keeps_its_value(book: Path) -> None:
    """A cell that holds the number 1.234 is certain, even where texts of its column have decimal commas."""

    def change(opened: Any) -> None:  # noqa: ANN401  (as above)
        opened["customers"]["D2"], opened["customers"]["D3"] = 1.234, "2,5"

    checked = edited(book, change)
    assert checked.faults == ()
    assert [row.demand for row in checked.sound().customers[:2]] == [1.234, 2.5]


def test_cached_results_of_formulas_are_read(book: Path) -> None:
    """A spreadsheet program keeps the result beside the formula; written here as such a program writes it."""
    with zipfile.ZipFile(book) as archive:
        members = {name: archive.read(name) for name in archive.namelist()}
        name = next(each for each, held in members.items() if b"<v>20.0</v>" in held or b"<v>20</v>" in held)
    text = members[name].replace(b"<v>20.0</v>", b"<v>20</v>").replace(b"<v>20</v>", b"<f>5*5</f><v>25</v>", 1)
    rewrite(book, members | {name: text})
    assert read(book).sound().customers[1].demand == 25.0


def rewrite(path: Path, members: dict[str, bytes], method: int = zipfile.ZIP_DEFLATED) -> None:
    """Write the parts of a workbook."""
    with zipfile.ZipFile(path, "w", method) as archive:
        for name, held in members.items():
            archive.writestr(name, held)


def with_parts(path: Path, **parts: bytes) -> None:
    """Add parts to a workbook, or replace them; names have __ for / and _ for the dot of the ending."""
    with zipfile.ZipFile(path) as archive:
        members = {name: archive.read(name) for name in archive.namelist()}
    rewrite(path, members | {".".join(name.replace("__", "/").rsplit("_", 1)): held for name, held in parts.items()})


def one_fault(path: Path) -> str:
    """Return the only fault of a workbook that cannot be used."""
    found = [str(fault) for fault in read(path).faults]
    assert len(found) == 1, found
    return found[0].removeprefix("study.xlsx: ")


def test_macros_are_refused(book: Path) -> None:
    """Whatever the file is called: a part with macros, a sheet of macros, or the type of such a file."""
    whole = book.read_bytes()
    for part in ("xl__vbaProject_bin", "xl__macrosheets__sheet1_xml"):
        book.write_bytes(whole)
        with_parts(book, **{part: b"x"})
        assert one_fault(book) == "the workbook holds macros. Save it as .xlsx, which has none."
    book.write_bytes(whole)
    with zipfile.ZipFile(book) as archive:
        types = archive.read("[Content_Types].xml")
    typed = types.replace(b"spreadsheetml.sheet.main", b"sheet.macroEnabled.main")
    with_parts(book, **{"[Content_Types]_xml": typed})
    assert one_fault(book) == "the workbook is meant for macros. Save it as .xlsx, which has none."


def test_other_formats_are_refused_with_what_to_do(book: Path, tmp_path: Path) -> None:
    """The binary workbook, the one of before 2007, and one whose parts are marked as encrypted."""
    whole = book.read_bytes()
    with_parts(book, xl__workbook_bin=b"x")
    assert one_fault(book) == "the workbook is in the binary .xlsb format. Save it as .xlsx."
    old = tmp_path / "study.xls"
    old.write_bytes(bytes.fromhex("d0cf11e0a1b11ae1") + b"\0" * 600)
    assert "in the .xls format of before 2007. Save it as .xlsx without a password" in str(read(old).faults[0])
    place = whole.index(b"PK\x01\x02") + 8
    book.write_bytes(whole[:place] + bytes([whole[place] | 1]) + whole[place + 1 :])
    assert one_fault(book) == "the workbook is protected by a password. Save it as .xlsx without a password."


def test_bombs_are_refused_before_they_are_unpacked(book: Path) -> None:
    """A part that is packed far tighter than a table can be is not unpacked: little time, little memory."""
    with_parts(book, xl__worksheets__sheet9_xml=b"<" + b" " * int(guard.BOMB_BYTES))
    tracemalloc.start()
    start = time.perf_counter()
    fault = one_fault(book)
    taken, most = time.perf_counter() - start, tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert fault.startswith("the workbook is packed tighter than any table can be, so that it may be meant to fill the")
    assert taken < 1.0
    assert most < 5_000_000


def test_unusual_packing_is_refused(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Methods of packing that spreadsheet programs never use, and very many parts; as many as allowed are read."""
    with zipfile.ZipFile(book) as archive:
        members = {name: archive.read(name) for name in archive.namelist()}
    monkeypatch.setattr(guard, "MOST_PARTS", len(members))
    assert read(book).faults == ()
    monkeypatch.setattr(guard, "MOST_PARTS", len(members) - 1)
    assert one_fault(book).startswith("the workbook is not packed as spreadsheet programs do. Open it in")
    monkeypatch.undo()
    rewrite(book, members, zipfile.ZIP_LZMA)
    assert one_fault(book).startswith("the workbook is not packed as spreadsheet programs do")


def test_a_part_that_is_held_whole_is_limited(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Sheets are streamed, every other part is held in memory, so that its size counts for more."""
    with zipfile.ZipFile(book) as archive:
        size = max(each.file_size for each in archive.infolist() if "/worksheets/" not in each.filename)
    monkeypatch.setattr(guard, "MOST_WHOLE_BYTES", size)
    assert read(book).faults == ()
    monkeypatch.setattr(guard, "MOST_WHOLE_BYTES", size - 1)
    assert one_fault(book).startswith("the workbook is packed tighter than any table can be")


def test_rows_beyond_what_a_sheet_has_are_refused(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """As many rows as allowed are read, one more is not; nor is a row that would have to be held in memory whole."""
    with zipfile.ZipFile(book) as archive:
        names = [each for each in archive.namelist() if "/worksheets/" in each]
        most = max(archive.read(each).count(b"<row") for each in names)
    monkeypatch.setattr(guard, "MOST_ROWS", most)
    assert read(book).faults == ()
    monkeypatch.setattr(guard, "MOST_ROWS", most - 1)
    assert one_fault(book).startswith("a sheet has more or longer rows than a sheet can have. Open it in a spreadsheet")
    monkeypatch.undo()
    long = b"".join(b'<c r="A9"><v>%d</v></c>' % number for number in range(guard.MOST_ROW_BYTES // 20))
    with_parts(book, xl__worksheets__sheet1_xml=b'<worksheet><sheetData><row r="9">' + long)
    assert one_fault(book).startswith("a sheet has more or longer rows than a sheet can have")


def test_very_many_merged_ranges_are_refused(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """As many as allowed are looked at, one more is refused."""
    edited(book, lambda opened: [opened["customers"].merge_cells(f"J{row}:K{row}") for row in range(2, 5)])
    monkeypatch.setattr(guard, "MOST_MERGED", 3)
    assert read(book).faults == ()
    monkeypatch.setattr(guard, "MOST_MERGED", 2)
    assert one_fault(book) == "a sheet has more than 2 merged ranges. Unmerge all cells."


def test_a_sheet_of_all_rows_a_sheet_can_have(book: Path) -> None:
    """1,048,576 rows of which nearly all are blank are read in seconds and in little memory."""
    with zipfile.ZipFile(book) as archive:
        names = {name: archive.read(name) for name in archive.namelist()}
    name = next(each for each, held in names.items() if b"reach_km" in held and "worksheets" in each)
    blank = b"".join(b'<row r="%d" s="0" customFormat="1"/>' % row for row in range(64, SHEET_ROWS + 1, 64))
    rewrite(book, names | {name: names[name].replace(b"</sheetData>", blank + b"</sheetData>")})
    start = time.perf_counter()
    checked = read(book)
    assert time.perf_counter() - start < 60.0
    assert checked.warnings == ()
    assert fingerprint(checked.sound()) == fingerprint(tiny_study())


def test_all_tables_of_a_workbook_take_other_marks(tmp_path: Path) -> None:
    """The lanes, read column by column, and the tables read row by row are turned alike."""
    write_workbook(tiny_study(tiny_goods()), tmp_path / "study.xlsx")

    def change(opened: Any) -> None:  # noqa: ANN401  (as above)
        opened["lanes"]["F3"], opened["sizes"]["F2"] = "35,5", "60,0"

    checked = edited(tmp_path / "study.xlsx", change)
    assert fingerprint(checked.sound()) == fingerprint(tiny_study(tiny_goods()))
    assert [warning.table for warning in checked.warnings] == ["sizes", "lanes"]


def test_text_files_beside_a_workbook_form_are_the_same(book: Path) -> None:
    """The workbook of the tests holds what its text files hold."""
    assert read(book).sound().columns["customers"] == tuple(TINY["customers"].partition("\n")[0].split(","))
