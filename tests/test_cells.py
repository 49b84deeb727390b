"""Text cells that no spreadsheet runs, and files of the form of RFC 4180."""

from __future__ import annotations

import csv
import math
from typing import TYPE_CHECKING

import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting.cells import is_plain_number, number_text, read_cell, safe_cell, write_csv

if TYPE_CHECKING:
    from pathlib import Path


@pytest.mark.parametrize(
    "text",
    [
        "=1+1",
        "+1+1",
        "-1+1",
        "@SUM(A1)",
        "\t=1",
        "\r=1",
        "\n=1",
        "-",
        "=cmd|' /C calc'!A0",
        "\uff1d1",
        "\uff0b1",
        "\uff20x",
    ],
)
def test_formulas_are_neutralised(text: str) -> None:
    """OWASP, CSV Injection: = + - @ tab and carriage return (line feed and full-width forms from memory)."""
    assert safe_cell(text) == "'" + text
    assert read_cell(safe_cell(text)) == text


@pytest.mark.parametrize(
    "text", ["", "Linz", "-5.2", "-3", "1e3", "'s-Hertogenbosch", "a=b", "'", "A-1", "x@y.example"]
)
def test_plain_text_and_plain_numbers_stay_as_they_are(text: str) -> None:
    """A number such as -5.2 must stay a number, and a quote in front of ordinary text is part of it."""
    assert safe_cell(text) == text
    assert read_cell(text) == text


@given(st.text(alphabet="'=+-@\t\r\n\uff1d aB1.e", max_size=8))
def test_reading_undoes_writing(text: str) -> None:
    """Whatever the text, also one that looks as if it had been made safe before."""
    assert read_cell(safe_cell(text)) == text
    assert is_plain_number(safe_cell(text)) or not safe_cell(text).startswith(("=", "+", "-", "@", "\t", "\r", "\n"))


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (1250.0, "1250"),
        (0.1, "0.1"),
        (-0.0, "0"),
        (1e22, "1e+22"),
        (math.inf, "unlimited"),
        (2.0**53, "9007199254740992.0"),
    ],
)
def test_numbers_are_written_shortest(value: float, text: str) -> None:
    """Whole numbers without a point; text that reads back to the same double."""
    assert number_text(value) == text


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_number_texts_read_back(value: float) -> None:
    """The text of a number is one the tables accept, and the same number."""
    text = number_text(value)
    assert is_plain_number(text)
    assert float(text) == value


def test_files_follow_rfc_4180(tmp_path: Path) -> None:
    """RFC 4180 (2005), section 2: CRLF ends each record, quotes are doubled, commas and line breaks are quoted."""
    file = tmp_path / "t.csv"
    rows: list[tuple[str, float | None]] = [
        ('Gy\u0151r, "Old" town', 1.5),
        ("two\nlines", None),
        ("=1+1", math.inf),
        ("A", -5.0),
    ]
    write_csv(file, ["name", "amount"], rows)
    assert file.read_bytes().decode() == (
        '"name","amount"\r\n"Gy\u0151r, ""Old"" town",1.5\r\n"two\nlines",""\r\n"\'=1+1","unlimited"\r\n"A",-5\r\n'
    )
    with file.open(encoding="utf-8", newline="") as text:
        records = list(csv.reader(text, strict=True))
    assert {len(record) for record in records} == {2}
    assert [read_cell(record[0]) for record in records[1:]] == [row[0] for row in rows]
