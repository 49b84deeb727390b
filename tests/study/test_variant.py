"""Variants: files of named changes, applied to a study without touching it."""

from __future__ import annotations

import re
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest

from siting.errors import StudyError
from siting.study.fingerprint import fingerprint
from siting.study.variant import (
    CellChange,
    RowAdded,
    RowRemoved,
    Variant,
    read_variant,
    variant_names,
    variants_text,
    write_variant,
)
from siting.study.varying import vary
from tests.builders import TINY, TINY_SETTINGS, tiny_goods, tiny_study, with_cells

if TYPE_CHECKING:
    from pathlib import Path

    from siting.study.tables import Study

RENTS = """\
name = "Higher rents"
note = "Letters of March"

[settings]
outbound_rate = 0.25
[settings.solve]
gap = 0.001

[[change]]
table = "sites"
key = { site = "Linz" }
column = "yearly_charge"
value = 1250

[[add]]
table = "customers"
row = { customer = "Bratislava", latitude = 48.14, longitude = 17.11, demand = 12.5 }

[[remove]]
table = "customers"
key = { customer = "Graz" }
"""


def change(table: str, key: dict[str, str], column: str, value: str) -> Variant:
    """Return a variant of one cell."""
    return Variant(name="V", changes=(CellChange(table=table, key=key, column=column, value=value),))


def add(table: str, **row: str) -> Variant:
    """Return a variant of one row more."""
    return Variant(name="V", added=(RowAdded(table=table, row=row),))


def remove(table: str, **key: str) -> Variant:
    """Return a variant of one row less."""
    return Variant(name="V", removed=(RowRemoved(table=table, key=key),))


def faults_of(study: Study, *variants: Variant) -> str:
    """Return what is wrong with variants."""
    with pytest.raises(StudyError) as raised:
        vary(study, variants)
    return str(raised.value)


def test_a_file_is_read_written_and_read_again(tmp_path: Path) -> None:
    """What is read is what the file says, and what is written reads back equal."""
    (tmp_path / "rents.toml").write_text(RENTS, encoding="utf-8")
    variant = read_variant(tmp_path / "rents.toml")
    assert (variant.name, variant.note) == ("Higher rents", "Letters of March")
    assert variant.settings == {"outbound_rate": 0.25, "solve.gap": 0.001}
    assert variant.changes[0].value == "1250"
    assert variant.added[0].row["demand"] == "12.5"
    write_variant(variant, tmp_path / "again.toml")
    assert read_variant(tmp_path / "again.toml") == variant
    assert variant_names(variants_text([variant, change("sites", {"site": "A"}, "b", "c")])) == ("Higher rents", "V")


def test_every_kind_of_change_is_listed_and_made(tmp_path: Path) -> None:
    """Cells, rows and settings change as listed; the result equals the study read from tables changed by hand."""
    (tmp_path / "rents.toml").write_text(RENTS, encoding="utf-8")
    study = tiny_study()
    before = fingerprint(study)
    varied = vary(study, [read_variant(tmp_path / "rents.toml")])
    assert varied.lines == (
        "settings outbound_rate: 0.2 -> 0.25",
        "settings solve.gap: 0.0001 -> 0.001",
        "sites Linz yearly_charge: 1000 -> 1250",
        "customers Graz: removed",
        "customers Bratislava: added (latitude 48.14, longitude 17.11, demand 12.5)",
    )
    tables = with_cells(TINY, "sites", {2: {"yearly_charge": "1250"}})
    customers = tables["customers"].replace("Graz,47.06667,15.45,10,,no", "Bratislava,48.14,17.11,12.5,,")
    settings = TINY_SETTINGS.replace("outbound_rate = 0.2", "outbound_rate = 0.25") + "[solve]\ngap = 0.001\n"
    by_hand = tiny_study({**tables, "customers": customers}, settings)
    assert fingerprint(varied.study) == fingerprint(by_hand)
    assert fingerprint(study) == before
    assert varied.study.warnings == ()


def test_no_variant_is_the_study_itself() -> None:
    """Nothing to apply returns the very study."""
    study = tiny_study()
    assert vary(study, []).study is study


def test_undoing_a_variant_gives_the_study_back() -> None:
    """Variants stack: a second that takes back what the first did leaves the study of the beginning, and says so."""
    study = tiny_study(tiny_goods())
    there = replace(change("sizes", {"site": "Brno", "size": "small"}, "capacity", "75"), name="there")
    back = replace(change("sizes", {"site": "Brno", "size": "small"}, "capacity", "60"), name="back")
    varied = vary(study, [there, back])
    assert fingerprint(varied.study) == fingerprint(study)
    assert fingerprint(vary(study, [there]).study) != fingerprint(study)
    assert varied.lines == ("sizes Brno / small capacity: 60 -> 75", "sizes Brno / small capacity: 75 -> 60")
    assert "variant 'there' has changed this cell already" in str(varied.study.warnings[0])


def test_lanes_are_shared_until_one_is_touched() -> None:
    """Without a change of lanes their arrays are the study's; with one, the others keep their numbers and places."""
    study = tiny_study(tiny_goods())
    assert vary(study, [change("sites", {"site": "Linz"}, "yearly_charge", "1")]).study.lanes is study.lanes
    key = {"origin": "Linz", "destination": "Vienna"}
    varied = vary(study, [change("lanes", key, "road_km", "200")])
    lanes = varied.study.lanes
    assert varied.lines == ("lanes Linz / Vienna road_km: 184 -> 200",)
    assert lanes.road_km.tolist()[0] == 200
    assert np.array_equal(lanes.row, study.lanes.row)
    assert np.array_equal(lanes.unit_cost, study.lanes.unit_cost, equal_nan=True)
    assert study.lanes.road_km.tolist()[0] == 184


def test_lanes_are_added_and_removed() -> None:
    """A lane added and one removed are as if the table had been typed so."""
    study = tiny_study(tiny_goods())
    added = RowAdded(table="lanes", row={"origin": "Brno", "destination": "Prague", "unit_cost": "12"})
    removed = RowRemoved(table="lanes", key={"origin": "Linz", "destination": "Vienna"})
    varied = vary(study, [Variant(name="V", added=(added,), removed=(removed,))])
    tables = tiny_goods()
    text = tables["lanes"].replace("Linz,Vienna,,,184,,\n", "Brno,Prague,,,,12,\n")
    assert fingerprint(varied.study) == fingerprint(tiny_study({**tables, "lanes": text}))
    assert varied.lines == ("lanes Linz / Vienna: removed", "lanes Brno / Prague: added (unit_cost 12)")


def test_what_belongs_to_a_row_goes_with_it() -> None:
    """A customer's demands and lanes, a site's sizes and a supplier's offers go with the row removed."""
    study = tiny_study({name: text for name, text in tiny_goods().items() if name != "rules"})
    customer = vary(study, [remove("customers", customer="Graz")])
    assert customer.lines == ("customers Graz: removed, with rows that belong to it: 1 of demands, 1 of lanes",)
    assert [row.customer for row in customer.study.demands] == ["Vienna", "Munich", "Prague"]
    assert len(customer.study.lanes) == len(study.lanes) - 1
    site = vary(study, [remove("sites", site="Brno")])
    assert site.lines == ("sites Brno: removed, with rows that belong to it: 2 of sizes, 1 of lanes",)
    assert site.study.sizes == ()
    supplier = vary(study, [remove("suppliers", supplier="Szombathely")])
    assert supplier.lines == ("suppliers Szombathely: removed, with rows that belong to it: 1 of offers, 1 of lanes",)


def test_a_column_the_study_never_had_takes_its_default_elsewhere() -> None:
    """Changing a cell of a column that is not there gives all other rows what its absence meant."""
    tables = {**TINY, "customers": "customer,latitude,longitude,demand\nVienna,48.2,16.37,40\nGraz,47.07,15.45,10\n"}
    study = tiny_study(tables)
    varied = vary(study, [change("customers", {"customer": "Graz"}, "reach_km", "400")])
    assert [row.reach_km for row in varied.study.customers] == [None, 400.0]
    assert varied.lines == ("customers Graz reach_km: blank -> 400",)


def test_a_table_the_study_never_had_can_be_added_to() -> None:
    """Rules, absent before, hold from the first row on."""
    varied = vary(tiny_study(), [add("rules", rule="at_most", members="Linz;Brno", number="1")])
    assert [str(row.rule) for row in varied.study.rules] == ["at_most"]
    assert varied.lines == ("rules at_most / Linz;Brno: added (number 1)",)


def test_a_rule_is_found_by_what_it_asks_of_whom() -> None:
    """Rules have no name: their words single them out."""
    study = tiny_study(tiny_goods())
    varied = vary(study, [change("rules", {"rule": "at_most"}, "number", "1")])
    assert varied.study.rules[0].number == 1


def test_a_blank_clears_a_cell_and_a_setting() -> None:
    """Blank text takes a limit away."""
    study = tiny_study(settings=TINY_SETTINGS + "most_sites = 1\n")
    variant = replace(change("customers", {"customer": "Munich"}, "reach_km", ""), settings={"most_sites": ""})
    varied = vary(study, [variant])
    assert varied.study.settings.most_sites is None
    assert varied.study.customers[1].reach_km is None
    assert varied.lines == ("settings most_sites: 1 -> blank", "customers Munich reach_km: 500 -> blank")


@pytest.mark.parametrize(
    ("variant", "value"),
    [
        (change("sites", {"site": "Linz"}, "yearly_charge", "1000"), "1000"),
        (change("sites", {"site": "Linz"}, "yearly_charge", "1e3"), "1e3"),
        (Variant(name="V", settings={"outbound_rate": 0.2}), "0.2"),
        (Variant(name="V", settings={"most_sites": ""}), ""),
    ],
)
def test_a_change_that_changes_nothing_is_a_warning(variant: Variant, value: str) -> None:
    """What says what is there already is passed over, with a warning that names it."""
    varied = vary(tiny_study(), [variant])
    (warning,) = varied.study.warnings
    assert warning.table == "variant 'V'"
    assert warning.value == value
    assert warning.wrong == "changes nothing"
    assert varied.lines == ()


LINZ = {"site": "Linz"}
WRONG_VARIANTS: list[tuple[Variant, str]] = [
    (
        change("sites", LINZ, "yearly_charge", "much"),
        "variant 'V', change 1 (sites Linz yearly_charge), value 'much': not a number. Write a number such as 1250",
    ),
    (
        change("sites", LINZ, "yearly_charge", "-1"),
        "variant 'V', change 1 (sites Linz yearly_charge), value '-1': negative. Write a number of at least 0.",
    ),
    (
        change("sites", LINZ, "capacity", "-1"),
        "variant 'V', change 1 (sites Linz capacity), value '-1': negative.",
    ),
    (
        change("sites", {"site": "Brno"}, "yearly_charge", ""),
        "variant 'V', change 1 (sites Brno yearly_charge): blank at a proposed site",
    ),
    (
        change("suppliers", {"supplier": "Szombathely"}, "capacity", "4"),
        "variant 'V', change 1 (suppliers Szombathely capacity), column least_yearly, value '5': least_yearly is above",
    ),
    (
        change("sites", {"site": "Lintz"}, "yearly_charge", "1"),
        "change 1 (sites Lintz yearly_charge): the table has no such row. Write 'Linz' if that is meant",
    ),
    (
        change("sites", LINZ, "yearly_charg", "1"),
        "change 1 (sites Linz yearly_charg), value '1': no such column. Write 'yearly_charge' if that is meant",
    ),
    (
        change("sites", LINZ, "site", "Wels"),
        "value 'Wels': site names the row and cannot be changed. Remove the row and add another.",
    ),
    (
        change("sites", {"place": "Linz"}, "yearly_charge", "1"),
        "value 'place': the key has a column that names no row.",
    ),
    (
        change("demands", {"customer": "Vienna", "good": "pots"}, "demand", "1"),
        "change 1 (demands Vienna / pots demand): the table has no such row. Check the key, or add the row",
    ),
    (
        Variant(name="V", changes=change("sites", LINZ, "capacity", "9").changes * 2),
        "change 2 (sites Linz capacity), value '9': the same cell as change 1. Keep one of the two.",
    ),
    (
        replace(change("sites", LINZ, "capacity", "9"), removed=(RowRemoved(table="sites", key=LINZ),)),
        "remove 1 (sites Linz): change 1 changes the row. Keep one of the two.",
    ),
    (
        Variant(name="V", removed=(RowRemoved(table="sites", key=LINZ),) * 2),
        "remove 2 (sites Linz): the table has no such row.",
    ),
    (
        add("customers", customer="Vienna", demand="1"),
        "add 1 (customers Vienna): the table has this row already. Change its cells instead of adding it.",
    ),
    (
        add("sites", latitude="48.1"),
        "add 1 (sites ): the row has no site. Write the whole row, site too.",
    ),
    (
        add("sites", site="Wels", standing="proposed", yearly_charge="1", capacit="3", latitude="48", longitude="14"),
        "add 1 (sites Wels), value 'capacit': no such column. Write 'capacity' if that is meant",
    ),
    (
        add("sites", site="Wels", standing="planned", yearly_charge="1", latitude="48", longitude="14"),
        "add 1 (sites Wels), column standing, value 'planned': not a standing.",
    ),
    (
        add("customers", customer="Wels", demand="4"),
        "add 1 (customers Wels), column latitude: ",
    ),
    (
        Variant(name="V", settings={"circuity": 0.5}),
        "variant 'V', settings circuity, value '0.5': out of range (from 1 to 5).",
    ),
    (
        Variant(name="V", settings={"circuit": 1.5}),
        "variant 'V', settings circuit, value '1.5': unknown setting. Write 'circuity' if that is meant",
    ),
    (
        Variant(name="V", settings={"circuit": ""}),
        "variant 'V', settings circuit: unknown setting. Write 'circuity' if that is meant",
    ),
    (
        Variant(name="V", settings={"interest_rate": ""}),
        "variant 'V', settings interest_rate: the setting is missing, but sites row 2 has a one-off closing_charge",
    ),
]


@pytest.mark.parametrize(("variant", "said"), WRONG_VARIANTS)
def test_a_variant_that_does_not_fit_names_its_change(variant: Variant, said: str) -> None:
    """The place of each fault is the variant's change that led to it."""
    assert said in faults_of(tiny_study(), variant)


WRONG_LANES: list[tuple[Variant, str]] = [
    (
        change("lanes", {"origin": "Linz", "destination": "Vienna"}, "road_km", "far"),
        "variant 'V', change 1 (lanes Linz / Vienna road_km), value 'far': not a number.",
    ),
    (
        change("lanes", {"origin": "Linz", "destination": "Graz"}, "road_km", "9"),
        "change 1 (lanes Linz / Graz road_km): the table has no such row. Check the key, or add the row with [[add]].",
    ),
    (
        change("lanes", {"destination": "Linz"}, "barred", "perhaps"),
        "value 'perhaps': neither yes nor no. Write yes or no.",
    ),
    (
        change("lanes", {"leg": "outbound"}, "road_km", "9"),
        "change 1 (lanes outbound road_km): the key fits 2 rows. Add origin or destination or good to it.",
    ),
    (
        add("lanes", origin="Linz", destination="Vienna", road_km="9"),
        "column destination, value 'Vienna': the same lane is already in row 2. Change that row instead of adding one.",
    ),
    (
        add("lanes", origin="Linz", destination="Wien", road_km="9"),
        "add 1 (lanes Linz / Wien), column destination, value 'Wien': neither a site nor a customer of the study.",
    ),
    (
        remove("sites", site="Brno"),
        "with variant 'V': rules, row 2, column members",
    ),
]


@pytest.mark.parametrize(("variant", "said"), WRONG_LANES)
def test_lanes_and_rules_meet_the_same_checks(variant: Variant, said: str) -> None:
    """Lanes touched are checked like lanes read; a rule that names what was removed is a fault of the variant."""
    assert said in faults_of(tiny_study(tiny_goods()), variant)


def test_two_variants_of_one_name_are_refused() -> None:
    """The names tell variants apart in every list of changes."""
    said = faults_of(tiny_study(), *[change("sites", LINZ, "capacity", text) for text in ("90", "95")])
    assert "variant 'V': two variants have this name. Give each its own, or leave one out." in said


def test_all_faults_come_at_once() -> None:
    """Two changes that do not fit are both listed."""
    changes = (
        CellChange(table="sites", key={"site": "A"}, column="capacity", value="1"),
        CellChange(table="sites", key={"site": "B"}, column="capacity", value="1"),
    )
    assert faults_of(tiny_study(), Variant(name="V", changes=changes)).startswith("2 faults in the study:")


WRONG_FILES = [
    ("name = ", "the file is not TOML"),
    ("", "name: the variant has no name. Add one"),
    ('name = "V"\n', "the variant holds no change. Add a [[change]], [[add]], [[remove]] or [settings]."),
    ("name = 3\n[settings]\na = 1\n", "name, value '3': not a text. Write it in quotes"),
    ('nam = "V"\n', "nam: unknown entry. Write 'name' if that is meant"),
    ('name = "V"\nsettings = 3\n', "settings, value '3': not a section. Write [settings] on a line of its own."),
    ('name = "V"\n[settings]\nsolve = 3\n', "settings solve, value '3': not a section."),
    ('name = "V"\nchange = 3\n', "change: not a list of entries. Write [[change]] on a line of its own before each."),
    ('name = "V"\n[[remove]]\ntable = "sites"\n', "remove 1 key: missing. Add it, as in key = "),
    ('name = "V"\n[[remove]]\ntable = "site"\nkey = {a = 1}\n', "remove 1 table, value 'site': no such table."),
    ('name = "V"\n[[remove]]\ntable = 3\nkey = {a = 1}\n', "remove 1 table, value '3': not a text."),
    ('name = "V"\n[[remove]]\ntable = "sites"\nkey = "Linz"\n', "remove 1 key, value 'Linz': no cells. Write it as in"),
    ('name = "V"\n[[remove]]\ntable = "sites"\nkey = {a = [1]}\n', "remove 1 key a, value '[1]': not a cell."),
    ('name = "V"\n[[remove]]\ntable = "sites"\nkey = {a = 1}\nrow = 1\n', "remove 1 row: unknown part."),
]


@pytest.mark.parametrize(("text", "said"), WRONG_FILES)
def test_a_file_that_is_no_variant_is_refused(tmp_path: Path, text: str, said: str) -> None:
    """Every slip of the form is named with its repair."""
    (tmp_path / "v.toml").write_text(text, encoding="utf-8")
    with pytest.raises(StudyError, match=re.escape(said)):
        read_variant(tmp_path / "v.toml")


def test_a_file_that_cannot_be_read_is_refused(tmp_path: Path) -> None:
    """A missing file, a folder and a file that is not UTF-8 are named."""
    with pytest.raises(StudyError, match="there is no such file"):
        read_variant(tmp_path / "missing.toml")
    with pytest.raises(StudyError, match="the file cannot be read"):
        read_variant(tmp_path)
    (tmp_path / "v.toml").write_bytes(b'name = "\xe4"')
    with pytest.raises(StudyError, match="not text in UTF-8"):
        read_variant(tmp_path / "v.toml")
