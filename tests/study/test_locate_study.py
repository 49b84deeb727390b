"""Coordinates filled into a study, choices made by the user, and coordinates that do not fit."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.errors import DataFileError
from siting.study.choices import read_choices, write_choices
from siting.study.gazetteer import Town
from siting.study.locate import Match
from siting.study.locate_study import LocatedStudy, furthest_apart_km, locate_study
from siting.study.near_towns import placed_oddly
from siting.study.raw import RawStudy, table_from_rows
from siting.study.read import read_study
from siting.study.write_raw import write_raw

if TYPE_CHECKING:
    from pathlib import Path

HEADER = ["customer", "place", "country", "latitude", "longitude", "demand", "note"]
ROWS = [
    ["A", "Graz", "AT", "", "", "4", "x"],
    ["B", "Frankfurt", "DE", "", "", "5", ""],
    ["C", "Nowhereville", "AT", "", "", "6", ""],
    ["D", "Linz", "AT", "48.3", "14.3", "7", ""],
    ["E", "Linz", "AT", "48.3", "", "8", ""],
    ["Brno", "", "CZ", "", "", "9", ""],
    ["F", "Insbruck", "AT", "", "", "1", ""],
]
MAIN = Town(name="Frankfurt am Main", country="DE", latitude=50.1155, longitude=8.6842, population=650_000)


def raw_of(rows: list[list[str]] = ROWS, header: list[str] = HEADER) -> RawStudy:
    """Return a study of customers as read."""
    site = table_from_rows(["site", "latitude", "longitude"], [["Wels", "48.16", "14.03"]])
    settings: dict[str, object] = {"currency": "EUR", "unit": "t"}
    return RawStudy(tables={"sites": site, "customers": table_from_rows(header, rows)}, settings=settings)


def column(located: LocatedStudy, name: str) -> list[str]:
    """Return the cells of a column of customers."""
    cells = located.raw.tables["customers"].column(name)
    assert cells is not None
    return [str(cell) for cell in cells.to_pylist()]


def test_blank_coordinates_are_filled_and_nothing_else_is_touched() -> None:
    """Exact, by the row's own name, near-spelling; ambiguous and unknown stay blank; a half-filled pair is a fault."""
    located = locate_study(raw_of())
    assert [(row.name, row.found.match, row.by_name) for row in located.rows] == [
        ("A", Match.EXACT, False),
        ("B", Match.AMBIGUOUS, False),
        ("C", Match.UNKNOWN, False),
        ("Brno", Match.EXACT, True),
        ("F", Match.NEAR, False),
    ]
    assert column(located, "latitude") == ["47.06730", "", "", "48.3", "48.3", "49.19520", "47.26270"]
    assert column(located, "longitude")[1:5] == ["", "", "14.3", ""]
    for name in ("customer", "place", "country", "demand", "note"):
        assert column(located, name) == [row[HEADER.index(name)] for row in ROWS]
    assert located.rows[0].row == 2


def test_columns_that_are_missing_are_added() -> None:
    """Without latitude and longitude the table gets them, unless nothing was found."""
    header = ["customer", "place", "country", "demand"]
    located = locate_study(raw_of([["A", "Graz", "AT", "4"]], header))
    assert located.raw.tables["customers"].header == (*header, "latitude", "longitude")
    nothing = locate_study(raw_of([["A", "Nowhereville", "AT", "4"]], header))
    assert nothing.raw.tables["customers"].header == tuple(header)


def test_choices_and_a_server_come_in_where_they_are_asked_for() -> None:
    """A choice decides an ambiguous place; the server is asked only for what is not known here."""
    asked: list[tuple[str, str]] = []

    def online(place: str, country: str) -> Town | None:
        asked.append((place, country))
        return Town(name="There", country="AT", latitude=47.5, longitude=13.5, population=0)

    located = locate_study(raw_of(), choices={("Frankfurt", "DE"): MAIN}, online=online)
    assert asked == [("Nowhereville", "AT")]
    matches = {row.name: (row.found.match, row.found.confidence) for row in located.rows}
    assert matches["B"] == (Match.CHOSEN, 1.0)
    assert matches["C"] == (Match.ONLINE, 0.5)
    assert column(located, "latitude")[1:3] == ["50.11550", "47.50000"]


def test_a_located_study_is_written_and_read(tmp_path: Path) -> None:
    """Faults of the tables aside, what was located is a study."""
    located = locate_study(raw_of([["A", "Graz", "AT", "", "", "4", ""]]))
    write_raw(located.raw, tmp_path / "mine")
    (customer,) = read_study(tmp_path / "mine").customers
    assert (customer.latitude, customer.longitude, customer.demand) == (47.0673, 15.442, 4.0)


def test_candidates_go_out_and_a_mark_comes_back(tmp_path: Path) -> None:
    """Marked with yes or x, kept when written again, and each place once."""
    file = tmp_path / "choices.csv"
    rows = locate_study(raw_of([*ROWS, ROWS[1]])).rows
    assert write_choices(file, rows, {}) == 1
    assert read_choices(file) == {}
    text = file.read_text(encoding="utf-8")
    assert text.count("Frankfurt am Main") == 1
    file.write_text(text.replace('"DE","","Frankfurt am Main"', '"DE","x","Frankfurt am Main"'), encoding="utf-8")
    chosen = read_choices(file)
    assert chosen["Frankfurt", "DE"].population == 650_000
    located = locate_study(raw_of(), choices=chosen)
    assert write_choices(file, located.rows, chosen) == 0
    assert read_choices(file) == chosen


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("place,country\n", r"the columns choose, town, town_country, latitude, longitude, population are missing"),
        ("X,DE,maybe,Y,DE,1,2,3\n", r"row 2: 'maybe' under choose is neither yes nor blank"),
        ("X,DE,yes,Y,DE,1,2,3\nX,DE,yes,Z,DE,1,2,3\n", r"row 3: 'X' is chosen twice"),
        ("X,DE,yes,Y,DE,north,2,3\n", r"row 2: latitude, longitude or population is no number"),
    ],
)
def test_a_spoilt_file_of_choices_is_refused(tmp_path: Path, text: str, message: str) -> None:
    """With its row and the repair."""
    header = (
        "" if text.startswith("place") else "place,country,choose,town,town_country,latitude,longitude,population\n"
    )
    (tmp_path / "choices.csv").write_text(header + text, encoding="utf-8")
    with pytest.raises(DataFileError, match=message):
        read_choices(tmp_path / "choices.csv")


ODD = [
    (("Linz", "AT", 48.3, 14.3), ""),
    (("", "", 48.3, 14.3), ""),
    (("Linz", "AT", 48.3, 14.8), r"km from Linz, which the row names; the coordinates count"),
    (("", "AT", 50.08, 14.43), r"km from the nearest town of Austria, which the row names"),
    (("", "AT", 14.3, 48.3), r"Swap latitude and longitude, which look exchanged"),
    (("", "", 45.0, -35.0), r"km from the nearest town, perhaps in the sea"),
    (("", "Atlantis", 48.3, 14.3), ""),
    (("", "AT", 48.57, 13.46), ""),  # Passau, in Germany, a stone's throw from Austria
]


@pytest.mark.parametrize(("row", "message"), ODD)
def test_coordinates_that_do_not_fit_are_warned_of(row: tuple[str, str, float, float], message: str) -> None:
    """Far from the place named, in another country, swapped, or in the sea; near a border nothing is said."""
    found = placed_oddly("customers", [(7, *row)])
    assert len(found) == bool(message)
    assert all(warning.row == 7 and message in f"{warning.wrong}. {warning.repair}" for warning in found)


def test_given_coordinates_are_checked_when_a_study_is_located() -> None:
    """They are kept, whatever is odd about them."""
    located = locate_study(raw_of([["A", "Graz", "AT", "15.44", "47.07", "4", ""]]))
    assert column(located, "latitude") == ["15.44"]
    assert [(warning.table, warning.row) for warning in located.warnings] == [("customers", 2)]


def test_how_far_apart_candidates_are() -> None:
    """Frankfurt am Main and Frankfurt (Oder) are some 480 km apart."""
    found = next(row.found for row in locate_study(raw_of()).rows if row.name == "B")
    assert furthest_apart_km(found.candidates) == pytest.approx(480, abs=15)
