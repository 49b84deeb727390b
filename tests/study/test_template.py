"""The workbook to fill in: every table, its notes and lists, and examples that are easily taken out."""

from __future__ import annotations

import io
from typing import TYPE_CHECKING

import pytest
from openpyxl import load_workbook
from openpyxl.utils import get_column_letter

from siting import cli
from siting.study.check import check_raw
from siting.study.columns import SETTINGS, SOLVE_SETTINGS, TABLES, Kind
from siting.study.read import read_raw, read_study
from siting.study.template import column_note, write_template
from siting.study.words import study_sentence

if TYPE_CHECKING:
    from pathlib import Path


@pytest.fixture
def template(tmp_path: Path) -> Path:
    """Write a template with examples."""
    write_template(tmp_path / "template.xlsx")
    return tmp_path / "template.xlsx"


def test_the_template_is_a_study_without_fault(template: Path) -> None:
    """Its examples hang together: sites of both standings, sizes, goods, offers, lanes of two legs and a rule."""
    study = read_study(template)
    assert study.warnings == ()
    assert study_sentence(study).startswith(
        "Greenhouse and orchard supplies: 4 sites (3 running), 2 suppliers (2 signed), 6 customers, 2 goods;"
    )
    assert all(len(getattr(study, name)) for name in TABLES)


def test_the_sheets_are_the_tables_and_nothing_else(template: Path) -> None:
    """One sheet `study` for the settings, one for each table with all its columns, headers frozen, none hidden."""
    book = load_workbook(template)
    assert book.sheetnames == ["study", *TABLES]
    for name, spec in TABLES.items():
        assert tuple(cell.value for cell in book[name][1]) == spec.names
        assert book[name].freeze_panes == "B2"
        assert book[name].sheet_state == "visible"
    settings = [row[0].value for row in book["study"].iter_rows(min_row=2)]
    assert settings == [column.name for column in SETTINGS] + [f"solve.{column.name}" for column in SOLVE_SETTINGS]
    assert book["study"].freeze_panes == "C2"


def test_every_column_has_a_note(template: Path) -> None:
    """The note says meaning, unit, what may be typed, and what a blank means."""
    book = load_workbook(template)
    for name, spec in TABLES.items():
        for column, cell in zip(spec.columns, book[name][1], strict=True):
            assert cell.comment is not None
            assert column_note(column, spec.default(column.name)) in cell.comment.text
    sites = TABLES["sites"]
    notes = {column.name: column_note(column, sites.default(column.name)) for column in sites.columns}
    assert notes["standing"] == (
        "What the site is now.\nOne of: running, proposed.\nMust be filled in where the column is there."
    )
    assert notes["ruling"].endswith("One of: free, pinned-open, pinned-shut.\nBlank means free.")
    assert notes["yearly_charge"] == (
        "Paid every year while open.\nUnit: money a year.\nA number of at least 0.\nBlank means 0."
    )
    assert notes["capacity"].endswith("A number of at least 0, or unlimited.")
    assert notes["latitude"].endswith("A number from -90 to 90.")
    assert notes["site"].endswith("Must be filled in.")
    assert column_note(SETTINGS[-3], default=False).endswith("yes or no.\nBlank means no.")


def test_choices_are_offered_and_numbers_are_held_to_their_range(template: Path) -> None:
    """A list for each column of choices, down to the last row, and a range for each number that has one."""
    book = load_workbook(template)
    for name, spec in TABLES.items():
        rules = {str(rule.sqref).split("2:")[0]: rule for rule in book[name].data_validations.dataValidation}
        for at, column in enumerate(spec.columns, start=1):
            rule = rules.get(get_column_letter(at))
            if column.choices or column.kind is Kind.YES_NO:
                assert rule is not None
                assert rule.type == "list"
                assert rule.formula1 == '"' + ",".join(column.choices or ("yes", "no")) + '"'
                assert str(rule.sqref).endswith("1048576")
            elif column.kind in {Kind.NUMBER, Kind.WHOLE} and column.low is not None and not column.unlimited:
                assert rule is not None
                assert rule.type == ("decimal" if column.kind is Kind.NUMBER else "whole")
            else:
                assert rule is None


def test_examples_are_selected_by_one_name_and_then_deleted(template: Path) -> None:
    """Each sheet names its example rows; cleared, the study lacks exactly its tables."""
    book = load_workbook(template)
    for name in TABLES:
        place = book.defined_names[f"examples_{name}"].attr_text
        last = int(place.rpartition("$")[2])
        assert place == f"{name}!$2:${last}"
        rows = list(book[name].iter_rows(min_row=2, max_row=last))
        assert all(cell.font.italic for row in rows for cell in row if cell.value is not None)
        assert f"Choose examples_{name} in the name box" in book[name]["A1"].comment.text
        for row in rows:
            for cell in row:
                cell.value = None
    book.save(template)
    checked = check_raw(read_raw(template))
    assert [str(fault).partition(".")[0] for fault in checked.faults] == [
        "sites: neither sites nor suppliers are there, so that there is nothing to decide",
        "customers: the table is missing or has no rows",
    ]


def test_a_template_without_examples_asks_for_what_is_missing(tmp_path: Path) -> None:
    """The settings without a default, the customers, and something to decide."""
    write_template(tmp_path / "empty.xlsx", examples=False)
    checked = check_raw(read_raw(tmp_path / "empty.xlsx"))
    assert [(fault.table, fault.column) for fault in checked.faults] == [
        ("study", "currency"), ("study", "unit"), ("sites", ""), ("customers", "")
    ]  # fmt: skip
    assert not load_workbook(tmp_path / "empty.xlsx").defined_names
    held = io.BytesIO()
    write_template(held, examples=False)
    assert load_workbook(held).sheetnames == ["study", *TABLES]


def test_the_command_writes_one_and_overwrites_nothing(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """It says what to do next, and refuses a file that is there or that is no workbook."""
    file = tmp_path / "mine.xlsx"
    assert cli.main(["template", str(file)]) == 0
    assert f"Fill it in, then: siting check {file}" in capsys.readouterr().out
    assert study_sentence(read_study(file)).startswith("Greenhouse and orchard supplies: 4 sites (3 running)")
    assert cli.main(["template", str(file)]) == 2
    assert "the file is already there and may hold your data" in capsys.readouterr().out
    assert cli.main(["template", str(tmp_path / "mine.csv")]) == 2
    assert "a template is an .xlsx workbook. Give it a name that ends in .xlsx" in capsys.readouterr().out
    assert cli.main(["template", str(tmp_path / "bare.xlsx"), "--empty"]) == 0
    assert len(check_raw(read_raw(tmp_path / "bare.xlsx")).faults) == 4
