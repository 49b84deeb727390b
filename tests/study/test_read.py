"""Folders and workbooks as people have them: encodings, line breaks, blank rows, formulas, damage."""

from __future__ import annotations

import re
import zipfile
from typing import TYPE_CHECKING, Any

import pytest
from openpyxl import Workbook, load_workbook

from siting.errors import StudyError
from siting.study import workbook_guard as reading
from siting.study.check import check_raw
from siting.study.fingerprint import fingerprint
from siting.study.read import read_raw, read_study
from siting.study.write import write_workbook
from tests.builders import TINY, TINY_SETTINGS, tiny_goods, tiny_study, write_folder

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path


def faults_of(path: Path) -> list[str]:
    """Return the faults of a folder or workbook."""
    return [str(fault) for fault in check_raw(read_raw(path)).faults]


def test_a_study_is_read_from_a_folder(tmp_path: Path) -> None:
    """Cells arrive typed, blank cells as their default, rows with their spreadsheet number."""
    study = read_study(write_folder(tmp_path))
    brno = study.sites[1]
    assert (brno.site, brno.row, brno.yearly_charge, brno.capacity) == ("Brno", 3, 800.0, float("inf"))
    assert [customer.single_source for customer in study.customers] == [None, None, True, False]
    assert [customer.reach_km for customer in study.customers] == [None, 500.0, None, None]
    assert study.columns["sites"][:2] == ("site", "latitude")


def test_a_byte_order_mark_is_no_part_of_the_first_column(tmp_path: Path) -> None:
    """UTF-8 with and without byte order mark read alike."""
    folder = write_folder(tmp_path)
    plain = fingerprint(read_study(folder))
    for file in folder.iterdir():
        file.write_bytes(b"\xef\xbb\xbf" + file.read_bytes())
    assert fingerprint(read_study(folder)) == plain


@pytest.mark.parametrize("ending", ["\r\n", "\n"])
@pytest.mark.parametrize("last", [True, False])
def test_line_ends(tmp_path: Path, ending: str, last: bool) -> None:  # noqa: FBT001  (a parameter)
    """RFC 4180: the last record may lack its line end; LF alone, as many programs write it, is read too."""
    tables = {
        name: text.replace("\n", ending) if last else text.rstrip().replace("\n", ending) for name, text in TINY.items()
    }
    assert fingerprint(read_study(write_folder(tmp_path, tables))) == fingerprint(tiny_study())


def test_rows_are_numbered_as_a_spreadsheet_does(tmp_path: Path) -> None:
    """Blank rows count, a cell with line breaks stays in one row."""
    head, *rows = TINY["customers"].splitlines()
    text = "\n".join(
        [f"{head},place", f'{rows[0]},"two\nlines"', "", ",,,,,,", f"{rows[1].replace(',20,', ',x,')},a", ""]
    )
    found = faults_of(write_folder(tmp_path, {**TINY, "customers": text}))
    assert found == ["customers, row 5, column demand, value 'x': not a number. Write a number such as 1250 or 1250.5."]


def test_rows_before_the_header_count(tmp_path: Path) -> None:
    """The header is the first row that is not blank."""
    text = "\n\n" + TINY["customers"].replace(",40,", ",x,")
    assert faults_of(write_folder(tmp_path, {**TINY, "customers": text}))[0].startswith(
        "customers, row 4, column demand"
    )


def test_trailing_blank_cells_are_harmless(tmp_path: Path) -> None:
    """Spreadsheets leave commas of cells that were once filled."""
    text = "\n".join(f"{line},," for line in TINY["customers"].splitlines())
    assert fingerprint(read_study(write_folder(tmp_path, {**TINY, "customers": text}))) == fingerprint(tiny_study())


OTHER_FILES: list[tuple[Callable[[str], bytes], str]] = [
    (
        lambda text: text.encode("utf-32"),
        r"^customers: the file is not text in UTF-8, UTF-16 or Windows-1252\. Save the",
    ),
    (
        lambda text: text.replace(",", "|").encode(),
        r"^customers: the columns are not separated by commas, semicolons or",
    ),
    (lambda _: b"", r"^customers: the file is empty\. Write the column names in its first row"),
    (lambda _: b"\n\n", r"^customers: the file is empty"),
    (
        lambda text: text.replace("Graz", '"Graz').encode(),
        r"^customers, row 5: the row cannot be read \(.*\)\. Double each",
    ),
    (lambda text: text.replace("Graz", '"Gr"az').encode(), r"^customers, row 5: the row cannot be read"),
    (lambda text: text.encode() + b"x" * 200_000, r"^customers, row 6: the row cannot be read \(field larger"),
]


@pytest.mark.parametrize(("broken", "message"), OTHER_FILES)
def test_files_of_another_form_are_refused_in_one_sentence(
    tmp_path: Path, broken: Callable[[str], bytes], message: str
) -> None:
    """Other encodings and separators, empty files and broken quotes: one fault each, nothing guessed."""
    folder = write_folder(tmp_path)
    (folder / "customers.csv").write_bytes(broken(TINY["customers"]))
    found = faults_of(folder)
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]


def test_a_path_that_is_no_study(tmp_path: Path) -> None:
    """A missing path and a file that is neither folder nor workbook are one fault each."""
    with pytest.raises(StudyError, match=r"there is no such folder or workbook\. Give a folder of CSV tables"):
        read_study(tmp_path / "absent")
    (tmp_path / "notes.txt").write_text("x", encoding="utf-8")
    with pytest.raises(
        StudyError, match=r"1 fault in the study:\n  study, value .*neither a folder nor an \.xlsx workbook"
    ):
        read_study(tmp_path / "notes.txt")


def test_the_error_lists_every_fault_and_keeps_the_warnings(tmp_path: Path) -> None:
    """The error of `read_study` holds faults and warnings, and counts the faults."""
    tables = {
        **TINY,
        "sites": TINY["sites"].replace(",100,0", ",,0"),
        "customers": TINY["customers"].replace("40", "x"),
    }
    with pytest.raises(StudyError, match=r"^1 fault in the study:\n  customers, row 2") as caught:
        read_study(write_folder(tmp_path, tables))
    assert len(caught.value.faults) == 1
    assert [warning.column for warning in caught.value.warnings] == ["capacity"]


@pytest.fixture
def book(tmp_path: Path) -> Path:
    """Return the tiny study with all nine tables as a workbook."""
    write_workbook(tiny_study(tiny_goods()), tmp_path / "study.xlsx")
    return tmp_path / "study.xlsx"


def edit(path: Path, change: Callable[[Any], None]) -> None:
    """Change a workbook with openpyxl."""
    opened = load_workbook(path)
    change(opened)
    opened.save(path)


def test_folder_and_workbook_are_one_study(book: Path, tmp_path: Path) -> None:
    """CSV and workbook of one study give the same rows, settings and fingerprint."""
    from_folder = read_study(write_folder(tmp_path / "folder", tiny_goods()))
    from_book = read_study(book)
    for table in ("sites", "customers", "suppliers", "sizes", "goods", "demands", "offers", "rules", "settings"):
        assert getattr(from_book, table) == getattr(from_folder, table), table
    assert fingerprint(from_book) == fingerprint(from_folder)
    assert from_book.columns == from_folder.columns


def test_folder_and_workbook_have_the_same_faults(book: Path, tmp_path: Path) -> None:
    """The same wrong cells give the same faults, row for row, apart from where the settings live."""
    tables = tiny_goods()
    tables["demands"] = tables["demands"].replace("pots,40", "pots,x").replace("Graz", "Grats")
    tables["lanes"] = tables["lanes"].replace("184", "-3")
    folder = write_folder(tmp_path / "folder", tables, TINY_SETTINGS.replace("0.08", "8"))

    def change(opened: Any) -> None:  # noqa: ANN401  (openpyxl's workbook)
        opened["demands"]["C2"], opened["demands"]["A5"], opened["lanes"]["E2"] = "x", "Grats", -3
        for row in opened["study"].iter_rows():
            if row[0].value == "interest_rate":
                row[1].value = 8

    edit(book, change)
    assert len(faults_of(book)) == 4
    assert faults_of(book) == [fault.replace("study.toml", "study") for fault in faults_of(folder)]


def test_cells_of_a_workbook(book: Path) -> None:
    """Numbers typed as text, whole numbers as names, booleans and blank rows read as in CSV."""

    def change(opened: Any) -> None:  # noqa: ANN401
        opened["demands"]["C2"] = "40"
        opened["lanes"]["G4"] = True
        opened["sites"].insert_rows(3)
        for sheet, cell in (("customers", "A2"), ("demands", "A2"), ("lanes", "B2")):
            opened[sheet][cell] = 101.0

    edit(book, change)
    study = read_study(book)
    assert study.customers[0].customer == "101"
    assert study.demands[0].demand == 40.0
    assert [site.row for site in study.sites] == [2, 4]
    assert study.lanes.barred.tolist() == [False, False, True]


def test_a_formula_without_a_result_is_a_fault(book: Path) -> None:
    """A formula never calculated would read as blank; openpyxl writes formulas without results."""
    edit(book, lambda opened: opened["lanes"].__setitem__("F2", "=1+1"))
    found = faults_of(book)
    assert len(found) == 1
    assert re.search(
        r"lanes, row 2, column unit_cost, value '=1\+1': the result of the formula is not in the fi", found[0]
    )


def test_an_error_in_a_cell_is_a_fault(book: Path) -> None:
    """Error values are told apart from text, once; beside the known columns they are harmless."""

    def change(opened: Any) -> None:  # noqa: ANN401
        opened["demands"]["C2"] = "#N/A"
        opened["goods"]["D1"], opened["goods"]["D2"] = "remark", "#REF!"
        opened["study"]["B2"] = "#DIV/0!"

    edit(book, change)
    found = faults_of(book)
    assert len(found) == 2
    assert re.search(r"study, title, value '#DIV/0!': the cell shows an error of a formula", found[0])
    assert re.search(
        r"demands, row 2, column demand, value '#N/A': the cell shows an error of a formula\. Repair", found[1]
    )


def test_settings_sheet(book: Path) -> None:
    """The sheet `study` needs its two columns, and each setting once."""
    edit(book, lambda opened: opened["study"].append(["unit", "kg"]))
    assert re.search(r"^study, row \d+, column unit, value 'kg': .*more than once\. Keep one", faults_of(book)[0])
    edit(book, lambda opened: opened["study"].append([None, "kg"]))
    assert any(re.search(r"a value without the name of its setting", fault) for fault in faults_of(book))
    edit(book, lambda opened: opened["study"].__setitem__("A1", "name"))
    assert faults_of(book) == [
        "study: the sheet does not have the columns setting and value. Write setting and value in its first row."
    ]
    edit(book, lambda opened: opened.remove(opened["study"]))
    assert re.search(r"^study: the sheet is missing\. Add it, with the columns setting and value", faults_of(book)[0])


def test_sheets_that_are_no_tables(book: Path) -> None:
    """A sheet whose name is a slip of a table's is a fault, any other a warning; an empty table sheet is a fault."""
    edit(book, lambda opened: opened.create_sheet("notes"))
    assert [str(warning) for warning in read_study(book).warnings] == [
        "notes: the sheet is not a table of a study and was not read. Nothing to do, unless it should be one."
    ]
    edit(book, lambda opened: setattr(opened["rules"], "title", "Rules"))
    assert re.search(r"^rules: the sheet 'Rules1?' looks like a slip of the table 'rules'", faults_of(book)[0])
    edit(book, lambda opened: opened["offers"].delete_rows(1, 9))
    assert any(re.search(r"^offers: the sheet is empty", fault) for fault in faults_of(book))


def test_a_cell_beside_the_columns_of_a_sheet(book: Path) -> None:
    """A value right of the last column has no name."""
    edit(book, lambda opened: opened["goods"].__setitem__("F3", "x"))
    found = faults_of(book)
    assert len(found) == 1
    assert re.search(r"goods, row 3: a cell has no column name above it", found[0])


def _replace_member(book: Path, name: str, content: bytes) -> None:
    with zipfile.ZipFile(book) as old:
        members = {member: old.read(member) for member in old.namelist()}
    members[name] = content
    with zipfile.ZipFile(book, "w", zipfile.ZIP_DEFLATED) as new:
        for member, held in members.items():
            new.writestr(member, held)


def test_an_encrypted_or_old_workbook_is_refused(book: Path) -> None:
    """Password-protected workbooks are compound files, as were those before 2007."""
    book.write_bytes(bytes.fromhex("d0cf11e0a1b11ae1") + b"\0" * 600)
    found = faults_of(book)
    assert len(found) == 1
    assert re.search(r"study\.xlsx: the workbook is protected by a password, or in the \.xls format", found[0])


def test_a_damaged_workbook_is_refused(book: Path) -> None:
    """Not a zip file, cut short, a broken part, no workbook inside: one sentence each, never a traceback."""
    whole = book.read_bytes()
    for broken in (b"site,place\n", b"", whole[: len(whole) // 2]):
        book.write_bytes(broken)
        found = faults_of(book)
        assert len(found) == 1
        assert re.search(r"study\.xlsx: the file is not an \.xlsx workbook, or is damaged\. Open it in", found[0])
    book.write_bytes(whole)
    _replace_member(book, "xl/worksheets/sheet2.xml", b"<worksheet><sheetData><row>")
    assert re.search(r"^study\.xlsx: the workbook is damaged \(\w+\)", faults_of(book)[0])
    with zipfile.ZipFile(book, "w") as archive:
        archive.writestr("hello.txt", "x")
    assert re.search(r"^study\.xlsx: the workbook is damaged \(KeyError\)", faults_of(book)[0])


def test_a_zip_bomb_is_refused_before_it_is_unpacked(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A small file that unpacks to more than the limit is not opened; just within the limit it is."""
    with zipfile.ZipFile(book) as archive:
        size = sum(member.file_size for member in archive.infolist())
    monkeypatch.setattr(reading, "MOST_UNPACKED_BYTES", size)
    assert faults_of(book) == []
    monkeypatch.setattr(reading, "MOST_UNPACKED_BYTES", size - 1)
    assert re.search(
        r"the workbook unpacks to \d+ MB, more than \d+ MB\. Give the study as a folder", faults_of(book)[0]
    )


def test_a_huge_workbook_is_refused(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Size on disk is looked at first; the limit itself is accepted."""
    monkeypatch.setattr(reading, "MOST_BYTES", book.stat().st_size)
    assert faults_of(book) == []
    monkeypatch.setattr(reading, "MOST_BYTES", book.stat().st_size - 1)
    assert re.search(r"the workbook has \d+ MB, more than \d+ MB\. Give the study as a folder", faults_of(book)[0])


def test_xml_entities_are_refused(book: Path) -> None:
    """No spreadsheet program declares entities; whoever does means harm (exponential expansion)."""
    text = b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "aaaa">]><worksheet>&a;</worksheet>'
    _replace_member(book, "xl/worksheets/sheet2.xml", text)
    assert re.search(r"study\.xlsx: the workbook declares XML entities", faults_of(book)[0])


def test_an_empty_workbook(tmp_path: Path) -> None:
    """A workbook without any of the sheets says what is missing."""
    Workbook().save(tmp_path / "study.xlsx")
    found = faults_of(tmp_path / "study.xlsx")
    assert any(fault.startswith("study: the sheet is missing") for fault in found)
    assert any(fault.startswith("customers: the table is missing") for fault in found)
