"""A study written is the study read: folder, workbook, fingerprint."""

from __future__ import annotations

import csv
from dataclasses import replace
from typing import TYPE_CHECKING

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from siting.errors import StudyError
from siting.study import write as writing
from siting.study.fingerprint import fingerprint
from siting.study.read import read_study
from siting.study.settings import Settings, SolveSettings
from siting.study.tables import CustomerRow, SiteRow, SiteStanding, SizeRow, Study
from siting.study.write import write_study, write_workbook
from tests.builders import TINY, TINY_SETTINGS, tiny_goods, tiny_study, with_cells

if TYPE_CHECKING:
    from pathlib import Path

TABLES = ("sites", "customers", "suppliers", "sizes", "goods", "demands", "offers", "rules")

HOSTILE = '=HYPERLINK("http://x.example"),\'=\n@A'


def both_ways(study: Study, folder: Path) -> tuple[Study, Study]:
    """Return the study written and read again, as a folder and as a workbook."""
    write_study(study, folder / "study")
    write_workbook(study, folder / "study.xlsx")
    return read_study(folder / "study"), read_study(folder / "study.xlsx")


@pytest.mark.parametrize("tables", [TINY, tiny_goods()])
def test_writing_and_reading_change_nothing(tmp_path: Path, tables: dict[str, str]) -> None:
    """Rows, settings, warnings, headers and fingerprint survive both forms."""
    added = 'single_source = true\nmost_sites = 2\n[solve]\ngap = 0.001\nengine = "cbc"\n'
    with_blank = with_cells(tables, "sites", {2: {"capacity": "", "remark": 'old, "town"'}})
    study = tiny_study(with_blank, TINY_SETTINGS + added)
    assert study.warnings
    for again in both_ways(study, tmp_path):
        for table in TABLES:
            assert getattr(again, table) == getattr(study, table), table
        assert again.settings == study.settings
        assert again.warnings == study.warnings
        assert fingerprint(again) == fingerprint(study)
        assert again.columns == study.columns


def test_hostile_texts_are_written_safe_and_read_back(tmp_path: Path) -> None:
    """No cell of a written table starts as a formula, and the names come back as they were."""
    tables = with_cells(TINY, "sites", {2: {"place": HOSTILE, "=cmd": "+1+1"}, 3: {"place": "-5.2", "=cmd": "'=x"}})
    study = tiny_study(with_cells(tables, "customers", {2: {"customer": "@Vienna"}}))
    for again in both_ways(study, tmp_path):
        assert again.sites == study.sites
        assert again.customers[0].customer == "@Vienna"
        assert again.sites[0].attributes == {"=cmd": "+1+1"}
        assert fingerprint(again) == fingerprint(study)
    with (tmp_path / "study" / "sites.csv").open(encoding="utf-8", newline="") as file:
        cells = [cell for record in csv.reader(file, strict=True) for cell in record]
    assert "-5.2" in cells
    assert [cell for cell in cells if cell.startswith(("=", "+", "@", "\t", "\r"))] == []


@settings(max_examples=25, deadline=None)
@given(
    names=st.lists(
        st.text(st.characters(codec="utf-8", categories=["L", "N", "P", "S"]), min_size=1), min_size=1, unique=True
    ),
    charge=st.floats(min_value=0, allow_infinity=False, allow_nan=False),
)
def test_any_names_and_numbers_survive(
    tmp_path_factory: pytest.TempPathFactory, names: list[str], charge: float
) -> None:
    """Whatever printable names and finite charges a study has, both forms keep them to the last bit."""
    study = Study(
        settings=Settings(currency="EUR", unit="t", interest_rate=0.1, life_years=5.0, outbound_rate=0.1),
        sites=tuple(
            SiteRow(
                site=name, latitude=48.0, longitude=14.0, opening_charge=charge, yearly_charge=charge, capacity=charge
            )
            for name in names
        ),
        customers=(CustomerRow(customer="C", latitude=48.0, longitude=15.0, demand=1.0),),
    )
    for again in both_ways(study, tmp_path_factory.mktemp("any")):
        assert [replace(site, row=0) for site in again.sites] == list(study.sites)
        assert fingerprint(again) == fingerprint(study)


def test_a_study_made_in_memory_writes_what_it_holds(tmp_path: Path) -> None:
    """Without a header to follow, the compulsory columns and those that hold something are written."""
    study = Study(
        settings=Settings(currency="EUR", unit="t"),
        sites=(SiteRow(site="A", latitude=48.0, longitude=14.0, standing=SiteStanding.RUNNING),),
        sizes=(SizeRow(site="A", size="s", standing=SiteStanding.RUNNING, capacity=5.0),),
        customers=(CustomerRow(customer="C", latitude=48.0, longitude=15.0, demand=1.0),),
    )
    write_study(study, tmp_path)
    assert (tmp_path / "sites.csv").read_text(
        "utf-8"
    ) == '"site","latitude","longitude","standing"\n"A",48,14,"running"\n'
    assert {file.name for file in tmp_path.iterdir()} == {"study.toml", "sites.csv", "sizes.csv", "customers.csv"}
    assert fingerprint(read_study(tmp_path)) == fingerprint(study)


def test_a_changed_study_gets_the_columns_it_needs(tmp_path: Path) -> None:
    """A value in a column that the header lacks adds the column; tables that are gone are deleted."""
    study = tiny_study(tiny_goods())
    write_study(study, tmp_path)
    changed = replace(
        study,
        rules=(),
        customers=tuple(replace(row, single_source=True) for row in study.customers),
        sites=tuple(replace(row, handling_rate=3.5) for row in study.sites),
    )
    write_study(changed, tmp_path)
    again = read_study(tmp_path)
    assert not (tmp_path / "rules.csv").exists()
    assert [row.handling_rate for row in again.sites] == [3.5, 3.5]
    assert fingerprint(again) == fingerprint(changed)


def test_a_sheet_holds_no_more_rows_than_the_format_allows(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A table that does not fit is refused with the way out; one that just fits is written."""
    study = tiny_study()
    monkeypatch.setattr(writing, "SHEET_ROWS", 5)
    write_workbook(study, tmp_path / "study.xlsx")
    monkeypatch.setattr(writing, "SHEET_ROWS", 4)
    with pytest.raises(
        StudyError, match=r"customers: 4 rows are more than a sheet can hold \(3\)\. Write the study as a f"
    ):
        write_workbook(study, tmp_path / "study.xlsx")


def _shuffled(text: str) -> str:
    head, *rows = text.splitlines()
    return "\n".join([head, *reversed(rows)])


def test_the_fingerprint_ignores_order_and_spelling() -> None:
    """Rows in another order, numbers spelt differently and blank attributes leave it alone."""
    tables = tiny_goods()
    base = fingerprint(tiny_study(tables))
    assert fingerprint(tiny_study({name: _shuffled(text) for name, text in tables.items()})) == base
    assert fingerprint(tiny_study(with_cells(tables, "demands", {2: {"demand": "4.0e1"}}))) == base
    assert fingerprint(tiny_study(with_cells(tables, "sites", {2: {"remark": ""}}))) == base
    assert len(base) == 64


CHANGES = [
    ("sites", 2, {"yearly_charge": "1001"}),
    ("sites", 2, {"remark": "x"}),
    ("sites", 2, {"ruling": "pinned-open"}),
    ("customers", 2, {"reach_km": "900"}),
    ("customers", 2, {"single_source": "no"}),
    ("suppliers", 2, {"capacity": "1"}),
    ("sizes", 2, {"size": "tiny"}),
    ("goods", 2, {"load": "1.01"}),
    ("demands", 2, {"demand": "41"}),
    ("offers", 2, {"unit_price": "10.5"}),
    ("rules", 2, {"number": "1"}),
    ("lanes", 2, {"road_km": "185"}),
    ("lanes", 3, {"unit_cost": "35"}),
    ("lanes", 3, {"barred": "yes"}),
    ("lanes", 2, {"good": "pots"}),
    ("lanes", 2, {"destination": "Munich"}),
    ("lanes", 2, {"haulier": "Nord"}),
    ("rules", 3, {"members": "Szombathely;Brno"}),
]


@pytest.mark.parametrize(("table", "row", "cells"), CHANGES)
def test_the_fingerprint_notices_every_change(table: str, row: int, cells: dict[str, str]) -> None:
    """One changed cell of any table, attributes included, changes it."""
    tables = tiny_goods()
    assert fingerprint(tiny_study(with_cells(tables, table, {row: cells}))) != fingerprint(tiny_study(tables))


def test_the_fingerprint_covers_the_settings() -> None:
    """Settings count, those of `[solve]` too."""
    study = tiny_study()
    for changed in (replace(study.settings, circuity=1.4), replace(study.settings, solve=SolveSettings(gap=0.0))):
        assert fingerprint(replace(study, settings=changed)) != fingerprint(study)
