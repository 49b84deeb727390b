"""A messy workbook in a real browser: from its upload through confirmed names and a mended fault to a plan."""

from __future__ import annotations

import io
import re
from typing import TYPE_CHECKING

import pytest
from openpyxl import Workbook

from siting.study.read import read_study
from tests.browse.running import running
from tests.browser.chromium import Watched, chromium, chromium_path
from tests.browser.test_pages import goes_to, heading, map_of, press, says, type_into_cell

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path

    from playwright.sync_api import Browser

chromium_path()

PATIENCE_MS = 60_000
LATITUDE_PX = 170.0
"""How far right of the table's left edge the middle of the second column is."""

STANDORTE: list[list[str | float]] = [
    [],
    [],
    ["Standort", "Breitengrad", "Längengrad", "Status", "Jahreskosten", "Kapazität"],
    [],
    ["Linz", "98,30639", "14,28611", "running", "1.000,50", "100"],
    ["Brno", "49,19522", "16,60796", "proposed", "800,25", "unlimited"],
    [],
]
KUNDENLISTE: list[list[str | float]] = [
    ["Kunde", "Breitengrad", "Längengrad", "Menge"],
    ["Wien", "48,20849", "16,37208", "40,5"],
    [],
    ["München", "48,13743", "11,57549", "20,25"],
    [],
    ["Praha", "50,08804", "14,42076", "30"],
    ["Graz", "47,06667", "15,45", "10"],
]
SETTINGS: list[list[str | float]] = [["setting", "value"], ["currency", "EUR"], ["unit", "t"], ["outbound_rate", 0.2]]


SHEETS: dict[str, list[list[str | float]]] = {"Standorte": STANDORTE, "Kundenliste": KUNDENLISTE, "study": SETTINGS}


def messy_workbook() -> bytes:
    """Return a workbook of other headers and sheet names, numbers as text with decimal commas, and blank rows."""
    book, held = Workbook(), io.BytesIO()
    del book["Sheet"]
    for name, rows in SHEETS.items():
        sheet = book.create_sheet(name)
        for at, cells in enumerate(rows, start=1):
            for column, cell in enumerate(cells, start=1):
                sheet.cell(at, column, cell)
    book.save(held)
    return held.getvalue()


@pytest.fixture
def browser() -> Iterator[Browser]:
    """Run a browser."""
    with chromium() as browser:
        yield browser


def test_from_upload_to_a_plan(browser: Browser, tmp_path: Path) -> None:
    """Upload, confirm the names that are proposed, mend the one fault, run: the plan serves what the workbook says."""
    with running(folder=tmp_path) as server:
        context = browser.new_context(viewport={"width": 1366, "height": 768})
        context.set_default_timeout(PATIENCE_MS)
        watched = Watched(context, server=server.url)
        page = context.new_page()
        page.goto(server.url)
        map_of(page)
        press(page, "Open another study")
        page.get_by_test_id("stPopoverBody").locator('input[type="file"]').set_input_files(
            {
                "name": "Daten 2026.xlsx",
                "mimeType": "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet",
                "buffer": messy_workbook(),
            }
        )
        says(page, "Daten 2026.xlsx")
        press(page, "Open these files")
        says(page, "2 tables may be there under other names")
        press(page, "Read these tables")
        says(page, "10 columns may be ours under other names")
        press(page, "Use these names")
        says(page, "To mend before a plan can be made: 1 fault in sites")
        says(page, "row 5, latitude '98.30639': out of range")
        type_into_cell(page, LATITUDE_PX, "48,30639")
        says(page, "2 sites (1 running), 4 customers, 1 good; 101 t a year to serve")
        goes_to(page, "Plan")
        press(page, "Run")
        says(page, "How sure is this?")
        assert re.match(r"Run \d of 2 sites .* EUR a year", heading(page).inner_text())
        goes_to(page, "Share")
        with page.expect_download() as download:
            press(page, "The study as a workbook")
        download.value.save_as(tmp_path / "study.xlsx")
        assert not watched.outside
        context.close()
    study = read_study(tmp_path / "study.xlsx")
    assert [(row.site, row.latitude, row.yearly_charge) for row in study.sites] == [
        ("Linz", 48.30639, 1000.5),
        ("Brno", 49.19522, 800.25),
    ]
    assert [row.demand for row in study.customers] == [40.5, 20.25, 30.0, 10.0]
