"""Text files as other programs, other countries and accidents make them, each with the exact outcome."""

from __future__ import annotations

import csv
import io
import itertools
from typing import TYPE_CHECKING

import pytest

from siting.study.check import Checked, check_raw
from siting.study.read import read_raw
from tests.builders import TINY, TINY_SETTINGS, check_tables, write_folder

if TYPE_CHECKING:
    from pathlib import Path

ROWS = [("Köln", 50.93333, 6.95, 1250.5), ("Aš", 50.22387, 12.19501, 20.0), ("Ulm", 48.39841, 9.99155, 1000000.25)]
"""Town coordinates from GeoNames (CC BY 4.0); the demands are invented."""

NEVER = "Nothing to do if that is right; otherwise save the file as CSV UTF-8 with commas and decimal points"


def read(folder: Path, customers: bytes) -> Checked:
    """Return the tiny study with another file of customers, read and checked."""
    write_folder(folder, TINY, TINY_SETTINGS.replace('unit = "t"', 'unit = "t"'))
    (folder / "customers.csv").write_bytes(customers)
    return check_raw(read_raw(folder))


def number(value: float, decimal: str, between: str) -> str:
    """Return a number with a decimal mark and something between its thousands."""
    whole, _, fraction = f"{value:,}".partition(".")
    fraction = fraction.removesuffix("0") if fraction == "0" else fraction
    return whole.replace(",", between) + (f"{decimal}{fraction}" if fraction else "")


def written(separator: str, decimal: str, between: str) -> str:
    """Return the three customers as a text file."""
    text = io.StringIO()
    writer = csv.writer(text, delimiter=separator)
    writer.writerow(["customer", "latitude", "longitude", "demand"])
    for name, latitude, longitude, demand in ROWS:
        writer.writerow(
            [name, *(number(value, decimal, "") for value in (latitude, longitude)), number(demand, decimal, between)]
        )
    return text.getvalue()


ENCODINGS = {
    "utf-8": "",
    "utf-8-sig": "",
    "utf-16": "as UTF-16",
    "utf-16-le": "as UTF-16",
    "utf-16-be": "as UTF-16",
    "cp1252": "as Windows-1252, which gives 'Köln'",
}
SEPARATORS = {",": "", ";": "with semicolons between cells", "\t": "with tabs between cells"}
WAYS = {",": "decimal commas", ".": "separators of thousands"}


@pytest.mark.parametrize(
    ("encoding", "separator", "decimal", "between"),
    [
        each
        for each in itertools.product(ENCODINGS, SEPARATORS, ",.", ["", ".", ",", " ", "'", "\u00a0"])
        if each[2] != each[3]
    ],
)
def test_every_way_to_write_the_same_table(
    tmp_path: Path, encoding: str, separator: str, decimal: str, between: str
) -> None:
    """Whatever encoding, separator and marks: the same customers, and one warning that says how they were read."""
    checked = read(tmp_path, written(separator, decimal, between).encode(encoding))
    assert checked.faults == ()
    customers = checked.sound().customers
    assert [(row.customer, row.latitude, row.longitude, row.demand) for row in customers] == ROWS
    said = [ENCODINGS[encoding], SEPARATORS[separator]]
    if decimal == ",":
        said += [f"{name} with decimal commas, such as" for name in ("latitude", "longitude", "demand")]
    elif between:
        said.append(
            f"demand with blanks, signs or separators of thousands, such as {number(1250.5, decimal, between)!r} in"
        )
    said = [each for each in said if each]
    found = [str(warning) for warning in checked.warnings]
    assert len(found) == bool(said), found
    for each in said:
        assert each in found[0]
    assert not said or found[0].endswith(f"{NEVER}.")


HEAD = "customer,latitude,longitude,demand\n"
THREE = ["A,48.2,16.3,{}\n", "B,48.3,16.4,{}\n", "C,48.4,16.5,{}\n"]


def three(*demands: str) -> str:
    """Return three customers with the given demands as typed."""
    return HEAD + "".join(row.format(demand) for row, demand in zip(THREE, demands, strict=True))


READ = [
    # what a file holds, the demands it is read to, what is said of it
    (three("1.234", "2", "3"), [1.234, 2, 3], None),
    (three("1.234", '"2,5"', "3"), [1234, 2.5, 3], "demand with decimal commas, such as '1.234' in row 2 as 1234"),
    (
        three('"1,234"', "2.5", "3"),
        [1234, 2.5, 3],
        "demand with blanks, signs or separators of thousands, such as '1,234' in row 2 as 1",
    ),
    (three('"1,234"', '"0,5"', "3"), [1.234, 0.5, 3], "demand with decimal commas, such as '1,234' in row 2 as 1.234"),
    (three("1.234.567", "1.234", "3"), [1234567, 1234, 3], "demand with decimal commas, such as '1.234.567' in row 2"),
    (three('"1,234,567"', "1.234", "3"), [1234567, 1.234, 3], "such as '1,234,567' in row 2 as 1234567"),
    (three("1.234.567,8".join('""'), "1", "3"), [1234567.8, 1, 3], "such as '1.234.567,8' in row 2 as 1234567.8"),
    (
        three("1 234", "2", "3"),
        [1234, 2, 3],
        "demand with blanks, signs or separators of thousands, such as '1 234' in",
    ),
    (three("1\u202f234", "2", "3"), [1234, 2, 3], r"such as '1\u202f234' in row 2 as 1234"),
    (three("1\u2019234", "2", "3"), [1234, 2, 3], "such as '1\u2019234' in row 2 as 1234"),
    (
        three(" 12", "2 ", "3"),
        [12, 2, 3],
        "demand with blanks, signs or separators of thousands, such as ' 12' in row 2",
    ),
    (three("+12", "2", "3"), [12, 2, 3], "such as '+12' in row 2 as 12"),
    (three('"1,5e3"', "2", "3"), [1500, 2, 3], "demand with decimal commas, such as '1,5e3' in row 2 as 1.5e3"),
    (three("1.5e3", "2", "3"), [1500, 2, 3], None),
    (three('"0,125"', "2", "3"), [0.125, 2, 3], "demand with decimal commas, such as '0,125' in row 2 as 0.125"),
    (three('"1234,567"', "2", "3"), [1234.567, 2, 3], "such as '1234,567' in row 2 as 1234.567"),
    ("sep=;\n" + three("1", "2", "3").replace(",", ";"), [1, 2, 3], "with semicolons between cells"),
    ("sep=,\r\n" + three("1", "2", "3"), [1, 2, 3], None),
    ("Customers 2024\n\n" + three("1", "2", "3"), [1, 2, 3], "without 1 row above the header"),
    ("Export,,,\nof May,,,\n" + three("1", "2", "3"), [1, 2, 3], "without 2 rows above the header"),
    ("Export of May\n" + three("1", "2", "3").replace(",", ";"), [1, 2, 3], "with semicolons between cells; without 1"),
    (three("1", "2", "3").replace("\n", "\r\n"), [1, 2, 3], None),
    (three("1", "2", "3").replace("\n", "\n,,,\n\n"), [1, 2, 3], None),
    (three("1", "2", "3").rstrip(), [1, 2, 3], None),
    (three("1", "2", "3").replace("48.2,", "48.123,"), [1, 2, 3], None),
    (three("1", "2", '"3,5"').replace("48.2,", "48.123,"), [1, 2, 3.5], "demand with decimal commas, such as '3,5' in"),
    (three("1", "2", "3").replace(",", ";").replace("48.2;", "48.123;"), [1, 2, 3], "with semicolons between cells"),
    (three("1.5", "2", "3").replace("A,", '"A;x",'), [1.5, 2, 3], None),
    (
        three("1", "2", "3").replace("16.3,", "\u221216.3,"),
        [1, 2, 3],
        "longitude with blanks, signs or separators of thousands, such as '\u221216.3' in row 2 as -16.3",
    ),
]


@pytest.mark.parametrize(("text", "demands", "said"), READ)
def test_what_can_be_read_in_one_way_only_is_read_and_said(
    tmp_path: Path, text: str, demands: list[float], said: str | None
) -> None:
    """One warning with an example where anything was turned, none for what the program itself could have written."""
    checked = read(tmp_path, text.encode())
    assert checked.faults == ()
    assert [row.demand for row in checked.sound().customers] == demands
    found = [str(warning) for warning in checked.warnings]
    assert len(found) == (said is not None), found
    if said is not None:
        assert found[0].startswith("customers: read ")
        assert said in found[0]


TWO_WAYS = "{0} could be {1} or {2}, and nothing in the column says which"
REFUSED = [
    # what a file holds, the faults
    (
        three('"1,234"', "2", "3"),
        ["row 2, column demand, value '1,234': not a number, since it has a thousands separat"],
    ),
    (
        three("1.234", "2", "3").replace(",", ";"),
        ["row 2, column demand, value '1.234': " + TWO_WAYS.format("1.234", "1234", "1.234")],
    ),
    (
        three("1.230", "2.000", "3").replace(",", "\t"),
        [
            "row 2, column demand, value '1.230': 1.230 could be 1230 or 1.23",
            "row 3, column demand, value '2.000': 2.0",
        ],
    ),
    (
        three("1.234", '"2,5"', "3.5"),
        [
            "row 2, column demand, value '1.234': " + TWO_WAYS.format("1.234", "1234", "1.234"),
            "row 3, column demand, value '2,5': not a number, since it has a decimal comma. Write 2.5.",
        ],
    ),
    (
        three("12.05.2024", "2", "3"),
        ["row 2, column demand, value '12.05.2024': a date or time, which spreadsheet prog"],
    ),
    (three("2024-05-12", "2", "3"), ["row 2, column demand, value '2024-05-12': a date or time"]),
    (three("12-May", "2", "3"), ["row 2, column demand, value '12-May': a date or time"]),
    (three("May-24", "2", "3"), ["row 2, column demand, value 'May-24': a date or time"]),
    (
        three("12/5/24", "2", "3"),
        ["row 2, column demand, value '12/5/24': a date or time, which spreadsheet programs ma"],
    ),
    (three("12:30", "2", "3"), ["row 2, column demand, value '12:30': a date or time"]),
    (
        three("8 %", "2", "3"),
        ["row 2, column demand, value '8 %': not a number, since it has a percent sign. Write the"],
    ),
    (three("8%", "2", "3"), ["row 2, column demand, value '8%': not a number, since it has a percent sign"]),
    (
        three("12 EUR", "2", "3"),
        ["row 2, column demand, value '12 EUR': not a number, since it has a unit or currency"],
    ),
    (three("#DIV/0!", "2", "3"), ["row 2, column demand, value '#DIV/0!': not a number"]),
    (three("12-", "2", "3"), ["row 2, column demand, value '12-': not a number"]),
    (
        three("1,2", "2", "3"),
        ["row 2: the row has 5 cells, the header has 4. Put texts that hold a comma in double quot"],
    ),
    (three("1", "2", "3").replace("A,", '"A,'), ["row 2: the row cannot be read"]),
    (three("1", "2", "3").replace("A,", '"A"x,'), ["row 2: the row cannot be read"]),
    (
        three("1", "2", "3").replace(",", "|"),
        ["the columns are not separated by commas, semicolons or tabs. Save the f"],
    ),
    (
        three("1;2", "2", "3").replace(",", ";"),
        ["row 2: the row has 5 cells, the header has 4. Put texts that hold a semicolon in double quotes, and keep"],
    ),
    ("", ["the file is empty. Write the column names in its first row"]),
    ("\n\n,,,\n", ["the file is empty"]),
    ("x;y\tz\nA;1\t2\n", ["the columns are separated in more ways than one. Save the file as CSV UTF-8"]),
    (
        three("1", "2", "3").replace("A,", "A\0,"),
        ["row 2, column customer, value 'A\\x00': the name holds a line break"],
    ),
    (three("1", "2", "3").replace("customer", "cust\0omer"), ["the file is not text in UTF-8, UTF-16 or Windows-1252"]),
    (
        three("1", "2", "3").replace("B,", "A,"),
        ["row 3, column customer, value 'A': the same customer is already in ro"],
    ),
    (three("1", "2", "3").replace("B,", ","), ["row 3, column customer: blank. Fill it in"]),
    (three("1", "2", "3").replace("demand", "Demand"), ["demand: unknown column 'Demand', which looks like a slip of"]),
    (
        three("1", "2", "3") + "Total,,,\n",
        [
            "row 5, column demand: blank, and there is no table demands",
            "row 5, column latitude: customer 'Total' has no",
        ],
    ),
]


@pytest.mark.parametrize(("text", "faults"), REFUSED)
def test_what_is_wrong_or_can_be_read_in_two_ways_is_refused(tmp_path: Path, text: str, faults: list[str]) -> None:
    """The faults, their places and their repairs; nothing guessed."""
    found = [str(fault) for fault in read(tmp_path, text.encode()).faults if fault.table == "customers"]
    assert len(found) == len(faults), found
    for said, expected in zip(found, faults, strict=True):
        assert said.removeprefix("customers, ").removeprefix("customers: ").startswith(expected), said


BYTES = [
    # bytes of a file and what is said of it, as a warning or as a fault
    (
        three("1", "2", "3").replace("A", "Łódź").encode("cp1250"),
        "neither UTF-8 nor Windows-1252, by which a cell would",
    ),
    (
        three("1", "2", "3").replace("A", "Győr").encode("cp1250"),
        "as Windows-1252, which gives 'Gyõr'. Nothing to do if",
    ),
    (three("1", "2", "3").encode() + b"\x81\xff", "the file is not text in UTF-8, UTF-16 or Windows-1252"),
    (
        b"\xef\xbb\xbf" + three("1", "2", "3").encode() + b"\xff",
        "the file is not text in UTF-8, UTF-16 or Windows-1252",
    ),
    (three("1", "2", "3").encode("utf-16")[:-1], "the file is not text in UTF-8, UTF-16 or Windows-1252"),
    (three("1", "2", "3").encode("utf-32"), "the file is not text in UTF-8, UTF-16 or Windows-1252"),
    (
        b"PK\x03\x04" + bytes(range(256)) * 4,
        "the file is a workbook or an archive, not CSV. Save the file as CSV UTF-8",
    ),
    (b"\x89PNG\r\n\x1a\n" + bytes(300), "the file is not text in UTF-8, UTF-16 or Windows-1252"),
    (three("1", "2", "3").encode() + b"x" * 200_000, "row 5: the row cannot be read (field larger than field limit"),
]


@pytest.mark.parametrize(("content", "said"), BYTES)
def test_bytes_that_are_no_or_another_text(tmp_path: Path, content: bytes, said: str) -> None:
    """One sentence each, with an example of the text where only a person can tell whether the encoding is right."""
    checked = read(tmp_path, content)
    found = [str(each) for each in (*checked.faults, *checked.warnings) if each.table == "customers"]
    assert len(found) == 1, found
    assert said in found[0]


def test_what_the_program_writes_is_read_without_a_word() -> None:
    """No file of the program's own form causes a note, whatever its numbers."""
    lanes = "origin,destination,road_km,unit_cost\nLinz,Vienna,184.125,1.234\nLinz,Graz,220.5,1e-05\n"
    checked = check_tables({**TINY, "lanes": lanes})
    assert checked.faults == checked.warnings == ()
    assert checked.sound().lanes.unit_cost.tolist() == [1.234, 1e-05]


def test_percent_signs_in_shares_are_read_and_said(tmp_path: Path) -> None:
    """A setting that is a share takes `8 %`; other settings refuse it, and so does `800 %`."""
    folder = write_folder(tmp_path, TINY, TINY_SETTINGS.replace("0.08", '"8 %"'))
    checked = check_raw(read_raw(folder))
    assert checked.sound().settings.interest_rate == 0.08
    assert [str(warning) for warning in checked.warnings] == [
        "study.toml, interest_rate, value '8 %': read as 0.08, since it has a percent sign. Write 0.08."
    ]
    for typed, said in (
        ('interest_rate = "800 %"', "a share is a fraction below 1, got 8"),
        ('interest_rate = "1,250 %"', "not a number, since it has a percent sign"),
        ('life_years = "8 %"', "not a number, since it has a percent sign. Write the number without %"),
        ('circuity = "1,3"', "not a number, since it has a decimal comma. Write 1.3"),
    ):
        line = next((each for each in TINY_SETTINGS.splitlines() if each.startswith(typed.split()[0])), "")
        settings = TINY_SETTINGS.replace(line, typed) if line else f"{TINY_SETTINGS}{typed}\n"
        found = [str(fault) for fault in check_raw(read_raw(write_folder(tmp_path, TINY, settings))).faults]
        assert len(found) == 1, found
        assert said in found[0]
