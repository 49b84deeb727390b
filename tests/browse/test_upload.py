"""Uploads: a workbook or tables in memory, names that are never paths, doubt that is refused."""

from __future__ import annotations

import tempfile
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from siting.browse.upload import read_upload
from siting.errors import StudyError
from siting.study.check import check_raw
from siting.study.fingerprint import fingerprint
from siting.study.write import write_workbook
from tests.builders import TINY, TINY_SETTINGS

if TYPE_CHECKING:
    from siting.study.tables import Study

FILES = [("study.toml", TINY_SETTINGS.encode()), *((f"{name}.csv", text.encode()) for name, text in TINY.items())]


def test_tables_and_settings_make_the_study(tiny: Study) -> None:
    """Several CSV files with study.toml are the study that the folder is."""
    assert fingerprint(check_raw(read_upload(FILES)).sound()) == fingerprint(tiny)


def test_a_workbook_makes_the_study(tiny: Study, tmp_path: Path) -> None:
    """One .xlsx, whatever it is called, is the same study."""
    write_workbook(tiny, tmp_path / "book.xlsx")
    raw = read_upload([("Netz 2027.XLSX", (tmp_path / "book.xlsx").read_bytes())])
    assert fingerprint(check_raw(raw).sound()) == fingerprint(tiny)


@pytest.mark.parametrize(
    "name", ["../../sites.csv", "C:\\temp\\sites.csv", "/etc/sites.csv", "a\\..\\sites.csv", "\0sites.csv"]
)
def test_names_are_never_paths(name: str) -> None:
    """Whatever folders a name speaks of, only its last part counts, and nothing is written anywhere else."""
    files = [(name if old == "sites.csv" else old, content) for old, content in FILES]
    assert check_raw(read_upload(files)).study is not None


@pytest.mark.parametrize("name", ["..", ".", "", "/", "\\", " . "])
def test_names_that_are_no_names(name: str) -> None:
    """A name without any letter is taken as some file that is not a table."""
    assert check_raw(read_upload([*FILES, (name, b"x")])).study is not None


def test_a_very_long_name() -> None:
    """A name longer than any file system takes is shortened, not an error."""
    assert check_raw(read_upload([*FILES, ("x" * 5000 + ".csv", b"a\n1\n")])).study is not None


def test_nothing_stays_on_the_disk() -> None:
    """The files are gone once they are read, also where they are refused."""
    before = set(Path(tempfile.gettempdir()).glob("siting-upload-*"))
    read_upload(FILES)
    read_upload([("book.xlsx", b"not a workbook")])
    assert set(Path(tempfile.gettempdir()).glob("siting-upload-*")) <= before


def test_a_broken_workbook_is_a_fault() -> None:
    """Bytes that are no workbook are a fault, not a crash."""
    assert read_upload([("book.xlsx", b"PK\x03\x04 not a workbook")]).faults


def test_a_workbook_among_tables_is_refused() -> None:
    """Which of the two counts is not guessed."""
    with pytest.raises(StudyError, match=r"book\.xlsx.*a workbook together with other files\. Give the workbook alone"):
        read_upload([*FILES, ("book.xlsx", b"")])


def test_two_files_of_one_name_are_refused() -> None:
    """Two tables called sites.csv, from two folders, are refused by name."""
    with pytest.raises(StudyError, match=r"sites\.csv.*2 files have this name\. Give each table once"):
        read_upload([*FILES, ("other/sites.csv", b"site\nWels\n")])


def test_no_file_is_an_empty_study() -> None:
    """Nothing uploaded has no tables and is told what is missing."""
    raw = read_upload([])
    assert raw.tables == {}
    assert check_raw(raw).faults


def test_a_sheet_of_another_name_is_read_as_told() -> None:
    """Told which table a file is, the upload is the study; untold, the file is a stranger."""
    renamed = [("Kunden.csv" if name == "customers.csv" else name, content) for name, content in FILES]
    assert "Kunden" in read_upload(renamed).strangers
    told = read_upload(renamed, {"Kunden": "customers"})
    assert told.strangers == ()
    assert [row.customer for row in check_raw(told).sound().customers] == ["Vienna", "Munich", "Prague", "Graz"]
