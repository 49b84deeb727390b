"""Columns of other names: proposed by name and by contents, confirmed in a file, remembered for the layout."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import pytest
from openpyxl import load_workbook

from siting import cli
from siting.errors import StudyError
from siting.study.check import check_raw
from siting.study.columns import TABLES
from siting.study.fingerprint import fingerprint
from siting.study.mapping import (
    ColumnMapping,
    Layout,
    apply_mapping,
    layout_hash,
    mapping_from,
    read_mapping,
    write_mapping,
)
from siting.study.propose import fold, propose_mapping, propose_sources
from siting.study.read import read_raw, read_study
from siting.study.synonyms import SYNONYMS
from siting.study.write import write_workbook
from tests.builders import TINY, tiny_goods, tiny_study, write_folder

if TYPE_CHECKING:
    from pathlib import Path

    from siting.study.raw import RawStudy

GERMAN = {
    "customers": {"customer": "Kunde", "latitude": "Breitengrad", "longitude": "L\u00e4nge", "reach_km": "Radius (km)"},
    "demands": {"customer": "ShipTo", "good": "Artikel", "demand": "Jahresmenge"},
    "sites": {"site": "Depot", "yearly_charge": "Fixkosten", "capacity": "Kapazit\u00e4t", "standing": "Status"},
    "lanes": {"origin": "Von", "destination": "Nach", "road_km": "Entfernung", "unit_cost": "Frachtkosten"},
    "goods": {"good": "Product", "weight_t": "Gewicht"},
}


def renamed(tables: dict[str, str], names: dict[str, dict[str, str]]) -> dict[str, str]:
    """Return tables with columns called otherwise."""
    result = dict(tables)
    for table, columns in names.items():
        header, _, rest = tables[table].partition("\n")
        given = [columns.get(name, name) for name in header.rstrip("\r").split(",")]
        result[table] = f"{','.join(given)}\n{rest}"
    return result


def read_renamed(folder: Path, names: dict[str, dict[str, str]]) -> RawStudy:
    """Return the tiny study, some columns called otherwise, as read."""
    return read_raw(write_folder(folder, renamed(dict(TINY), names)))


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Write the tiny study of all tables with German and English names of columns."""
    return write_folder(tmp_path / "study", renamed(tiny_goods(), GERMAN))


def test_names_of_the_trade_are_recognised(folder: Path) -> None:
    """Every renamed column is proposed as what it is, with its reasons, however names are written."""
    proposals = propose_mapping(read_raw(folder))
    found = {(each.table, each.typed): each.column for each in proposals}
    assert found == {(table, typed): ours for table, names in GERMAN.items() for ours, typed in names.items()}
    reasons = {each.typed: each.reasons for each in proposals}
    assert reasons["Kunde"] == ("the name is 'kunde'", "its texts all differ, as names do")
    assert reasons["Status"] == ("the name is 'status'", "its words are ours")
    assert reasons["ShipTo"] == ("the name is 'ship to'", "100% of its texts are in customers")
    assert reasons["Von"] == ("the name is 'von'", "100% of its texts are in suppliers and sites")


def test_contents_alone_are_recognised(tmp_path: Path) -> None:
    """Coordinates, names that all differ and names of another table are told without a telling name, less surely."""
    names = {
        "customers": {"customer": "c1", "latitude": "c2", "longitude": "c3", "demand": "c4"},
        "lanes": {"destination": "zzz"},
    }
    tables = {**TINY, "lanes": "origin,destination,unit_cost\nLinz,Vienna,3\nLinz,Graz,4\n"}
    proposals = propose_mapping(read_raw(write_folder(tmp_path, renamed(tables, names))))
    assert {each.typed: (each.column, each.confidence) for each in proposals} == {
        "c1": ("customer", 0.55), "c2": ("latitude", 0.65), "c3": ("longitude", 0.65), "zzz": ("destination", 0.85)
    }  # fmt: skip
    assert proposals[1].reasons == ("numbers with decimals from 47.0667 to 50.088, as latitudes are",)


def test_contents_overrule_a_name(tmp_path: Path) -> None:
    """A column called volume that holds words is no demand; one that is called nothing like ours stays alone."""
    tables = {
        **TINY,
        "customers": "customer,latitude,longitude,volume,remark\nVienna,48,16,large,a\nGraz,47,15,few,b\n",
    }
    assert propose_mapping(read_raw(write_folder(tmp_path, tables))) == ()


def test_nothing_is_applied_before_it_is_confirmed(folder: Path) -> None:
    """Reading alone renames nothing; the faults say what is missing."""
    faults = [str(fault) for fault in check_raw(read_raw(folder)).faults]
    assert any(fault.startswith("customers, customer: the column is missing") for fault in faults)


def test_what_is_confirmed_is_applied_and_said(folder: Path) -> None:
    """The study is then the same as with our names, and a warning a table says what was read as what."""
    raw = read_raw(folder)
    checked = check_raw(apply_mapping(raw, mapping_from(raw, propose_mapping(raw))))
    assert fingerprint(checked.sound()) == fingerprint(tiny_study(tiny_goods()))
    found = [str(warning) for warning in checked.warnings]
    assert len(found) == len(GERMAN)
    assert found[0].startswith(
        "sites: columns were read as mapping.toml says: 'Depot' as site, 'Status' as standing, 'F"
    )


def test_a_mapping_is_remembered_beside_the_study(folder: Path, tmp_path: Path) -> None:
    """In a folder as mapping.toml, beside a workbook with its name; another header is another layout."""
    raw = read_raw(folder)
    proposals = propose_mapping(raw)
    mapping = mapping_from(raw, proposals)
    write_mapping(mapping, folder / "mapping.toml", proposals)
    assert read_mapping(folder / "mapping.toml").layouts == mapping.layouts
    text = (folder / "mapping.toml").read_text(encoding="utf-8")
    assert "# 100%: the name is 'kunde'; its texts all differ, as names do\nKunde = \"customer\"" in text
    assert fingerprint(read_study(folder)) == fingerprint(tiny_study(tiny_goods()))
    customers = folder / "customers.csv"
    customers.write_text(customers.read_text(encoding="utf-8").replace("Kunde", "Kunden"), encoding="utf-8")
    with pytest.raises(StudyError, match="customers, customer: the column is missing"):
        read_study(folder)
    book = tmp_path / "mine.xlsx"
    write_workbook(tiny_study(), book)
    header = tiny_study().columns["customers"]
    (tmp_path / "mine.mapping.toml").write_text(
        f'[[layout]]\ntable = "customers"\nheader = "{layout_hash(header)}"\n'
        'columns = {reach_km = "single_source"}\n',
        encoding="utf-8",
    )
    with pytest.raises(
        StudyError, match=r"customers, single_source: mine\.mapping\.toml would give the table this col"
    ):
        read_study(book)


def test_a_mapping_settles_the_decimal_mark(tmp_path: Path) -> None:
    """Numbers that can be read in two ways are read as the analyst says; a column that proves its mark keeps it."""
    text = "customer,latitude,longitude,demand\nVienna,48.2,16.3,1.234\nGraz,47.1,15.4,2.345\n".replace(",", ";")
    folder = write_folder(tmp_path, {**TINY, "customers": text})
    raw = read_raw(folder)
    assert [fault.column for fault in check_raw(raw).faults] == ["demand", "demand"]
    mapping = mapping_from(raw, propose_mapping(raw))
    assert [(layout.table, dict(layout.columns)) for layout in mapping.layouts] == [("customers", {})]
    for word, demands in (("point", [1.234, 2.345]), ("comma", [1234.0, 2345.0])):
        write_mapping(mapping, folder / "mapping.toml")
        written = (folder / "mapping.toml").read_text(encoding="utf-8")
        (folder / "mapping.toml").write_text(written.replace('decimal = ""', f'decimal = "{word}"'), encoding="utf-8")
        checked = check_raw(read_raw(folder))
        assert [row.demand for row in checked.sound().customers] == demands
        assert [row.latitude for row in checked.sound().customers] == [48.2, 47.1]


WRONG = [
    ("x = 1\n", r"mapping\.toml, x: not a part of a mapping\. Delete it"),
    ("layout = 3\n", r"mapping\.toml, layout: not a list\. Write \[\[layout\]\]"),
    ("layout = [3]\n", r"mapping\.toml, layout, value '3': not a layout\. Write"),
    ("[[layout\n", r"mapping\.toml: the file is not TOML in UTF-8 \(.*\)\. Have it proposed again"),
    (
        '[[layout]]\ntable = "customer"\nheader = "x"\n',
        r"table, value 'customer': not a table\. Write 'customers' if th",
    ),
    (
        '[[layout]]\ntable = "sites"\n',
        r"header, value 'None': not the hash of a header\. Have the mapping proposed aga",
    ),
    ('[[layout]]\ntable = "sites"\nheader = "x"\nodd = 1\n', r"odd, value '1': not a part of a layout\. Delete it"),
    (
        '[[layout]]\ntable = "sites"\nheader = "x"\ndecimal = ","\n',
        r"decimal, value ',': not a decimal mark\. Write \"p",
    ),
    ('[[layout]]\ntable = "sites"\nheader = "x"\ncolumns = 1\n', r"columns, value '1': not a list of columns\. Write"),
    (
        '[[layout]]\ntable = "sites"\nheader = "x"\nsource = "goods"\n',
        r"source, value 'goods': not another name of a file",
    ),
    (
        '[[layout]]\ntable = "sites"\nheader = "x"\n[layout.columns]\nKap = "capcity"\n',
        r"mapping\.toml, Kap, value 'capcity': not a column of sites\. Write 'capacity' if that is meant, or write one",
    ),
]


@pytest.mark.parametrize(("text", "message"), WRONG)
def test_a_mapping_that_says_what_does_not_exist_is_refused(tmp_path: Path, text: str, message: str) -> None:
    """One fault each, when the mapping is named and when it lies beside the study."""
    folder = write_folder(tmp_path)
    (folder / "mapping.toml").write_text(text, encoding="utf-8")
    with pytest.raises(StudyError, match=message) as caught:
        read_mapping(folder / "mapping.toml")
    assert len(caught.value.faults) == 1
    assert any(re.search(message, str(fault)) for fault in check_raw(read_raw(folder)).faults)


def test_a_mapping_that_is_not_there(tmp_path: Path) -> None:
    """A named file must be there."""
    with pytest.raises(
        StudyError, match=r"none\.toml: the file cannot be read \(No such file or directory\)\. Check it"
    ):
        read_mapping(tmp_path / "none.toml")


def test_layouts_are_added_and_replaced(tmp_path: Path) -> None:
    """A later answer for the same header takes the place of the earlier one; others stay."""
    raw = read_renamed(tmp_path / "a", {"customers": {"customer": "Kunde"}})
    first = mapping_from(raw, propose_mapping(raw))
    other = mapping_from(read_renamed(tmp_path / "b", {"sites": {"site": "Depot"}}), ())
    both = ColumnMapping().with_layouts([*first.layouts, *other.layouts]).with_layouts(first.layouts)
    assert [layout.table for layout in both.layouts] == ["customers", "sites"]
    assert both.find("customers", raw.tables["customers"].header) == first.layouts[0]
    assert both.find("sites", raw.tables["customers"].header) is None


def test_words_are_folded() -> None:
    """Case, accents, brackets, humps and signs between words do not count."""
    assert fold("L\u00e4nge [Grad]") == "lange"
    assert fold("ShipTo-Name_2") == "ship to name 2"
    assert fold("Demand (t)") == "demand"


def test_synonyms_belong_to_columns_and_are_folded() -> None:
    """Every entry is a column of some table, and each word is written as names are compared."""
    known = {name for spec in TABLES.values() for name in spec.names}
    assert set(SYNONYMS) <= known
    assert all(fold(word) == word for words in SYNONYMS.values() for word in words)


def test_the_command_proposes_and_checks(folder: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """`--propose-mapping` writes a file and lists its lines, never over another; `--mapping` checks with it."""
    file = tmp_path / "names.toml"
    assert cli.main(["check", str(folder), "--propose-mapping", str(file)]) == 0
    out = capsys.readouterr().out
    assert f"Read and correct it, then: siting check {folder} --mapping {file}" in out
    assert "customers, 'Kunde' as customer: 100%, the name is 'kunde'; its texts all differ, as names do" in out
    assert cli.main(["check", str(folder), "--propose-mapping", str(file)]) == 2
    assert "the file is already there and may hold your corrections" in capsys.readouterr().out
    assert cli.main(["check", str(folder)]) == 2
    assert cli.main(["check", str(folder), "--mapping", str(file)]) == 0
    capsys.readouterr()
    assert cli.main(["check", "demo", "--propose-mapping", str(tmp_path / "none.toml")]) == 0
    assert "there is nothing to propose" in capsys.readouterr().out
    assert not (tmp_path / "none.toml").exists()


def test_files_and_sheets_of_other_names_are_proposed_and_read(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """A file or sheet called as people call the table is proposed for it, and read once that is confirmed."""
    tables = dict(renamed(dict(TINY), {"customers": {"customer": "Kunde"}}))
    others = {"Kunden": tables.pop("customers"), "Lieferanten": tables.pop("suppliers")}
    folder = write_folder(tmp_path / "study", {**others, **tables})
    (folder / "Notes.csv").write_text("remark\nread me\n", encoding="utf-8")
    assert propose_sources(read_raw(folder)) == {"Kunden": "customers", "Lieferanten": "suppliers"}
    assert cli.main(["check", str(folder), "--propose-mapping", str(folder / "mapping.toml")]) == 0
    assert "'Kunden' as the table customers: by its name\n" in capsys.readouterr().out
    study = read_study(folder)
    assert fingerprint(study) == fingerprint(tiny_study())
    assert [str(warning).partition(". ")[0] for warning in study.warnings] == [
        "Notes: the file is not a table of a study and was not read",
        "customers: columns were read as mapping.toml says: 'Kunde' as customer",
        "customers: read from 'Kunden'",
        "suppliers: read from 'Lieferanten'",
    ]
    book = tmp_path / "mine.xlsx"
    write_workbook(tiny_study(), book)
    opened = load_workbook(book)
    opened["customers"].title = "Clients"
    opened.save(book)
    assert propose_sources(read_raw(book)) == {"Clients": "customers"}
    assert cli.main(["check", str(book), "--propose-mapping", str(tmp_path / "mine.mapping.toml")]) == 0
    study = read_study(book)
    assert fingerprint(study) == fingerprint(tiny_study())
    assert [str(warning).partition(". ")[0] for warning in study.warnings] == ["customers: read from 'Clients'"]


def test_a_table_of_our_name_wins(tmp_path: Path) -> None:
    """Where the table itself is there too, the other file is no part of the study."""
    folder = write_folder(tmp_path, {**TINY, "Kunden": "customer\nx\n"})
    mapping = ColumnMapping(layouts=(Layout(table="customers", header="", source="Kunden"),))
    assert fingerprint(read_study(folder, mapping)) == fingerprint(tiny_study())
    assert propose_sources(read_raw(folder)) == {}
