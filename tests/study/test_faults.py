"""Every fault a study can have: one broken cell at a time, the message matched."""

from __future__ import annotations

import re

import pytest

from tests.builders import TINY, TINY_SETTINGS, check_tables, tiny_goods, with_cells, without_column

GOODS = tiny_goods()


def faults_of(tables: dict[str, str], settings: str = TINY_SETTINGS) -> list[str]:
    """Return the faults as they are shown."""
    return [str(fault) for fault in check_tables(tables, settings).faults]


def test_the_tiny_studies_are_sound() -> None:
    """Every other test starts from a study without a fault or a warning."""
    for tables in (TINY, GOODS):
        checked = check_tables(tables)
        assert checked.study is not None
        assert checked.faults == checked.warnings == ()


CELLS = [
    # one cell of the tiny study: table, row, column, value typed, what is said
    ("sites", 2, "site", "", r"sites, row 2, column site: blank\. Fill it in: name of the site, used once\."),
    ("sites", 2, "site", "Linz ", r"sites, row 2, column site, value 'Linz ': .*ends with a blank\. Write 'Linz'\."),
    ("sites", 2, "site", "Li\nnz", r"sites, row 2, column site, .*a line break or an unusual blank\. Retype the name"),
    ("sites", 2, "site", "Li\u00a0nz", r"sites, row 2, column site, .*an unusual blank\. Retype the name"),
    ("sites", 2, "place", "a\x0bb", r"sites, row 2, column place, .*a control character\. Retype the text"),
    ("sites", 2, "remark", "a\x00b", r"sites, row 2, column remark, .*a control character\. Retype the text"),
    ("sites", 3, "site", "Linz", r"sites, row 3, column site, value 'Linz': the same site is already in row 2\. Give"),
    ("customers", 5, "customer", "Vienna", r"customers, row 5, .* the same customer is already in row 2"),
    ("suppliers", 3, "supplier", "Deggendorf", r"suppliers, row 3, .* the same supplier is already in row 2"),
    (
        "customers",
        2,
        "demand",
        "abc",
        r"customers, row 2, column demand, value 'abc': not a number\. Write a number such",
    ),
    (
        "customers",
        2,
        "demand",
        "",
        r"customers, row 2, column demand: blank, and there is no table demands\. .*0 if that",
    ),
    ("customers", 2, "demand", " ", r"customers, row 2, column demand, value ' ': only blanks\. Clear the cell"),
    ("customers", 2, "demand", "-1", r"column demand, value '-1': negative\. Write a number of at least 0"),
    ("customers", 2, "demand", "nan", r"column demand, value 'nan': not a finite number"),
    ("customers", 2, "demand", "inf", r"column demand, value 'inf': not a finite number"),
    ("customers", 2, "demand", "1e999", r"column demand, value '1e999': not a finite number"),
    ("customers", 2, "demand", "1,250", r"thousands separator\. Write 1250, or 1\.250 if a decimal point is meant"),
    ("customers", 2, "demand", "12 %", r"percent sign\. Write the number without %"),
    ("customers", 2, "demand", "12 t", r"column demand, value '12 t': not a number"),
    ("customers", 2, "demand", "12 EUR", r"unit or currency beside it\. Write the number alone"),
    ("customers", 2, "demand", "€12", r"unit or currency beside it"),
    ("customers", 2, "demand", ".5", r"not written as a plain number\. Write 0\.5\."),
    ("customers", 2, "demand", "5.", r"not written as a plain number\. Write 5\."),
    ("customers", 2, "demand", "0x10", r"value '0x10': not a number"),
    ("customers", 2, "demand", "1_000", r"value '1_000': not a number"),
    ("customers", 2, "demand", "\u0661\u0662", r"not a number"),  # Arabic-Indic digits
    ("customers", 2, "demand", "unlimited", r"only a capacity can be unlimited"),
    ("sites", 2, "capacity", "Unlimited", r"not spelt as expected\. Write unlimited"),
    ("sites", 2, "capacity", "inf", r"not a finite number\. Write unlimited"),
    ("sites", 2, "capacity", "-5", r"sites, row 2, column capacity, value '-5': negative"),
    ("customers", 2, "reach_km", "0", r"column reach_km, value '0': out of range \(above 0\)\. Write a number above 0"),
    ("customers", 2, "single_source", "maybe", r"neither yes nor no\. Write yes or no"),
    ("sites", 2, "standing", "", r"column standing: blank\. Write one of running, proposed"),
    ("suppliers", 2, "standing", "", r"column standing: blank\. Write one of signed, offered"),
    (
        "sites",
        2,
        "standing",
        "Running",
        r"not a standing\. Write 'running' if that is meant; allowed are running, prop",
    ),
    ("sites", 2, "ruling", "open!", r"column ruling, value 'open!': not a ruling\. Write"),
    ("suppliers", 2, "ruling", "xyz", r"not a ruling\. Write one of free, pinned-signed, pinned-unsigned"),
    ("sites", 3, "yearly_charge", "", r"row 3, column yearly_charge: blank at a proposed site.*type 0 if it is 0"),
    ("suppliers", 3, "unit_price", "", r"row 3, column unit_price: blank beside rows with a price.*type 0 if it is 0"),
    (
        "sites",
        2,
        "least_throughput",
        "100.5",
        r"least_throughput is above the capacity \(100\)\. Write at most 100, or",
    ),
    (
        "suppliers",
        3,
        "least_yearly",
        "91",
        r"suppliers, row 3, column least_yearly, value '91': .*above the capacity \(90\)",
    ),
    ("sites", 2, "latitude", "", r"sites, row 2, column latitude: blank, although longitude is given"),
    ("sites", 2, "longitude", "", r"sites, row 2, column longitude: blank, although latitude is given"),
    ("sites", 2, "latitude", "90.1", r"sites, row 2, column latitude, value '90.1': out of range .*from -90 to 90\)"),
    (
        "sites",
        2,
        "latitude",
        "148.30639",
        r"column latitude, value '148.30639': out of range .*from -90 to 90\)\. Write dec",
    ),
    (
        "sites",
        2,
        "longitude",
        "180.5",
        r"sites, row 2, column longitude, value '180.5': out of range .*from -180 to 180",
    ),
    ("sites", 2, "latitude", "N48", r"column latitude, value 'N48': not a number"),
]


@pytest.mark.parametrize(("table", "row", "column", "value", "message"), CELLS)
def test_one_broken_cell_is_one_fault(table: str, row: int, column: str, value: str, message: str) -> None:
    """Each kind of broken cell is reported once, with its place, its value and its repair."""
    found = faults_of(with_cells(TINY, table, {row: {column: value}}))
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]
    assert found[0].startswith(f"{table}, row {row}, column {column}")


MIXED = [
    # two cells of one column, whose decimal marks contradict one another, and what is said of the first
    ("1,250,000.5", "0,5", r"thousands separator\. Write 1250000\.5\."),
    ("1.250,5", "0.5", r"thousands separator\. Write 1250\.5"),
    ("1.250.000", "0.5", r"thousands separator\. Write 1250000"),
    ("1\u00a0250,5", "0.5", r"thousands separator\. Write 1250\.5\."),
    ("1'250.5", "0,5", r"thousands separator\. Write 1250\.5\."),
    ("12,5", "0.5", r"decimal comma\. Write 12\.5\."),
    (" 12.5", "0,5", r"a blank stands before or after the number\. Write 12\.5\."),
    ("+12.5", "0,5", r"not written as a plain number\. Write 12\.5\."),
]


@pytest.mark.parametrize(("value", "other", "message"), MIXED)
def test_numbers_of_a_column_that_contradicts_itself(value: str, other: str, message: str) -> None:
    """Where one column has decimal points and decimal commas nothing is turned: each odd cell is refused by itself."""
    found = faults_of(with_cells(TINY, "customers", {2: {"demand": value}, 3: {"demand": other}}))
    assert len(found) == 1 + ("," in other), found
    assert found[0].startswith("customers, row 2, column demand")
    assert re.search(message, found[0]), found[0]


ACCEPTED = [
    ("customers", 2, "demand", "0"),
    ("customers", 2, "demand", "1250.50"),
    ("customers", 2, "demand", "1e1"),
    ("customers", 2, "demand", "1E-3"),
    ("customers", 2, "reach_km", "0.001"),
    ("customers", 2, "single_source", "TRUE"),
    ("customers", 2, "single_source", "0"),
    ("sites", 2, "least_throughput", "100"),
    ("sites", 2, "closing_charge", "-3"),
    ("sites", 2, "capacity", "unlimited"),
    ("suppliers", 3, "least_yearly", "90"),
    ("sites", 2, "latitude", "-90"),
    ("sites", 2, "longitude", "180"),
    ("sites", 2, "yearly_charge", ""),
]


@pytest.mark.parametrize(("table", "row", "column", "value"), ACCEPTED)
def test_values_at_the_limits_are_accepted(table: str, row: int, column: str, value: str) -> None:
    """Numbers in every plain spelling, limits met exactly, sale proceeds, and blanks that have a default."""
    assert faults_of(with_cells(TINY, table, {row: {column: value}})) == []


def test_coordinates_out_of_range_and_zero_are_faults() -> None:
    """A pair out of range, and the point 0, 0, are never taken for places."""
    found = faults_of(with_cells(TINY, "sites", {2: {"latitude": "-91", "longitude": "-181"}}))
    assert len(found) == 2
    assert re.search(r"column latitude, value '-91': out of range \(degrees from -90 to 90\)", found[0])
    found = faults_of(with_cells(TINY, "customers", {3: {"latitude": "0", "longitude": "0.0"}}))
    assert len(found) == 1
    assert re.search(r"customers, row 3, column latitude, value '0': .* both 0, a point in the sea", found[0])
    assert faults_of(with_cells(TINY, "customers", {3: {"latitude": "0"}})) == []


def test_a_place_is_missing_where_no_lane_stands_in() -> None:
    """A place needs coordinates, or at least one lane that gives it a distance or a cost."""
    nowhere = {"latitude": "", "longitude": ""}
    for table, row, name in (("sites", 2, "Linz"), ("suppliers", 2, "Deggendorf"), ("customers", 2, "Vienna")):
        found = faults_of(with_cells(TINY, table, {row: nowhere}))
        assert len(found) == 1
        assert re.search(
            rf"{table}, row {row}, column latitude: \w+ '{name}' has no coordinates, and no lane", found[0]
        )
    tables = with_cells(TINY, "customers", {2: nowhere})
    assert faults_of({**tables, "lanes": "origin,destination,unit_cost\nLinz,Vienna,12\n"}) == []
    assert faults_of({**tables, "lanes": "origin,destination,road_km\nLinz,Vienna,184\n"}) == []
    found = faults_of({**tables, "lanes": "origin,destination,unit_cost,barred\nLinz,Vienna,12,yes\n"})
    assert re.search(r"customer 'Vienna' has no coordinates", found[0])


TABLES = [
    # whole tables: what is changed, what is said
    ({"customers": None}, r"^customers: the table is missing or has no rows\. Add it"),
    ({"customers": "customer,demand\n"}, r"^customers: the table is missing or has no rows"),
    ({"sites": None, "suppliers": None}, r"^sites: neither sites nor suppliers are there"),
    ({"offers": "supplier,good\nA,goods\n", "suppliers": None}, r"^offers: the table is there without suppliers"),
    ({"sizes": "site,size,capacity\nA,b,1\n", "sites": None}, r"^sizes: the table is there without sites"),
    (
        {"customers": without_column(TINY["customers"], "demand")},
        r"^customers, demand: the column is missing, and there",
    ),
    (
        {"sites": without_column(TINY["sites"], "site")},
        r"^sites, site: the column is missing\. Add it: name of the site",
    ),
    (
        {"sites": TINY["sites"].replace("capacity", "capcity")},
        r"unknown column 'capcity', .* slip of 'capacity'\. Rename",
    ),
    (
        {"sites": TINY["sites"].replace("latitude", "lat")},
        r"unknown column 'lat', which looks like a slip of 'latitude'",
    ),
    ({"sites": TINY["sites"].replace("capacity", "Capacity")}, r"unknown column 'Capacity', .* slip of 'capacity'"),
    ({"sites": TINY["sites"].replace("ruling", "standing")}, r"^sites, standing: the column is there more than once"),
    ({"sites": TINY["sites"].replace("ruling", "")}, r"^sites, row 1: a column with cells in it has no name"),
    ({"demnds": "customer,good,demand\n"}, r"^demands: the file 'demnds' looks like a slip of the table 'demands'"),
    (
        {"demands": "customer,good,demand\nVienna,goods,1\n"},
        r"^customers, demand: demand is said here \(first in row 2\) a",
    ),
    ({"goods": "good\na\nb\n"}, r"^customers, demand: there are several goods, so that the demand of a customer"),
    ({"customers": TINY["customers"].replace(",Vienna", "")[:9]}, r"^customers: "),
    (
        {"sites": TINY["sites"].replace("Linz,48.30639", "Linz,,48.30639")},
        r"^sites, row 2: the row has 11 cells, the hea",
    ),
    ({"sites": TINY["sites"].replace(",100,0\n", ",100\n")}, r"^sites, row 2: the row has 9 cells, the header has 10"),
]


@pytest.mark.parametrize(("changes", "message"), TABLES)
def test_faults_of_whole_tables(changes: dict[str, str | None], message: str) -> None:
    """Missing, superfluous and misspelt tables and columns, demand said twice or nowhere, ragged rows."""
    tables = {name: text for name, text in {**TINY, **changes}.items() if text is not None}
    found = faults_of(tables)
    assert any(re.search(message, fault) for fault in found), found


LINKS = [
    # the study with all nine tables: table, row, cells, what is said
    (
        "sizes",
        2,
        {"site": "Brnno"},
        r"sizes, row 2, column site, value 'Brnno': no such site in sites\. Write 'Brno' if",
    ),
    ("sizes", 2, {"capacity": ""}, r"sizes, row 2, column capacity: blank\. Write a number, 0 .* or unlimited"),
    ("sizes", 2, {"least_throughput": "60.5"}, r"sizes, row 2, .*least_throughput is above the capacity \(60\)"),
    ("sizes", 3, {"size": "small"}, r"sizes, row 3, column size, .*site 'Brno' and size 'small' are together .* row 2"),
    ("sizes", 2, {"standing": "running"}, r"sizes, row 2, column standing, .*site 'Brno' is not running in sites"),
    (
        "sites",
        3,
        {"capacity": "5"},
        r"sites, row 3, column capacity, value '5': site 'Brno' has sizes, so that capacity",
    ),
    ("sites", 3, {"yearly_charge": "0"}, r"sites, row 3, column yearly_charge, value '0': site 'Brno' has sizes"),
    (
        "sites",
        3,
        {"standing": "running"},
        r"sizes, standing: site 'Brno' is running, but none of its sizes is\. Write ru",
    ),
    (
        "demands",
        2,
        {"customer": "Wien"},
        r"demands, row 2, column customer, value 'Wien': no such customer in customers",
    ),
    (
        "demands",
        2,
        {"good": "pot"},
        r"demands, row 2, column good, value 'pot': no such good in goods\. Write 'pots' if",
    ),
    ("demands", 2, {"demand": ""}, r"demands, row 2, column demand: blank\. Write a number, 0 if that is meant"),
    (
        "demands",
        4,
        {"customer": "Vienna"},
        r"demands, row 4, .*customer 'Vienna' and good 'pots' are together .* row 2",
    ),
    ("offers", 2, {"supplier": "Nobody"}, r"offers, row 2, column supplier, value 'Nobody': no such supplier in supp"),
    ("offers", 2, {"good": "stone"}, r"offers, row 2, column good, value 'stone': no such good in goods"),
    (
        "offers",
        3,
        {"good": "pots"},
        r"offers, row 3, column good, .*supplier 'Deggendorf' and good 'pots' are together",
    ),
    ("offers", 3, {"unit_price": ""}, r"offers, row 3, column unit_price: blank beside rows with a price"),
    ("offers", 3, {"least_yearly": "61"}, r"offers, row 3, .*least_yearly is above the capacity \(60\)"),
    (
        "suppliers",
        2,
        {"unit_price": "10"},
        r"suppliers, row 2, column unit_price, value '10': prices are said by the tab",
    ),
    ("goods", 2, {"load": "0"}, r"goods, row 2, column load, value '0': out of range \(above 0\)"),
    (
        "lanes",
        2,
        {"origin": "Lintz"},
        r"lanes, row 2, column origin, value 'Lintz': neither a site nor .*Write 'Linz' if",
    ),
    ("lanes", 2, {"destination": "X"}, r"lanes, row 2, column destination, value 'X': neither a site nor a customer"),
    ("lanes", 2, {"origin": ""}, r"lanes, row 2, column origin: blank"),
    ("lanes", 2, {"good": "pens"}, r"lanes, row 2, column good, value 'pens': not a good of the study"),
    (
        "lanes",
        2,
        {"leg": "outbond"},
        r"lanes, row 2, column leg, value 'outbond': not a leg\. Write 'outbound' if that",
    ),
    (
        "lanes",
        2,
        {"leg": "direct"},
        r"lanes, row 2, column leg, value 'direct': .*direct runs from .*\. Write outbound",
    ),
    (
        "lanes",
        2,
        {"destination": "Brno"},
        r"lanes, row 2, column destination, value 'Brno': these two names fit no leg",
    ),
    ("lanes", 2, {"destination": "Linz"}, r"a lane cannot lead from a place to itself"),
    ("lanes", 2, {"road_km": "184 km"}, r"lanes, row 2, column road_km, value '184 km': not a number"),
    ("lanes", 2, {"road_km": "-1"}, r"lanes, row 2, column road_km, value '-1': negative"),
    ("lanes", 2, {"unit_cost": "1e999"}, r"lanes, row 2, column unit_cost, value '1e999': not a finite number"),
    ("lanes", 2, {"unit_cost": "unlimited"}, r"only a capacity can be unlimited"),
    ("lanes", 2, {"barred": "x"}, r"lanes, row 2, column barred, value 'x': neither yes nor no"),
    ("lanes", 3, {"origin": "Linz", "destination": "Vienna"}, r"lanes, row 3, column destination, .*already in row 2"),
    ("rules", 2, {"rule": ""}, r"rules, row 2, column rule: blank\. Write one of one_of, not_together"),
    ("rules", 2, {"rule": "atmost"}, r"rules, row 2, column rule, value 'atmost': not a rule\. Write 'at_most'"),
    ("rules", 2, {"members": ""}, r"rules, row 2, column members: blank"),
    ("rules", 2, {"members": "Linz;;Brno"}, r"a name is missing between two semicolons"),
    ("rules", 2, {"members": "Linz;Bruno"}, r"'Bruno' is neither a site nor a supplier\. Write 'Brno' if"),
    ("rules", 2, {"members": "Linz;Linz"}, r"'Linz' is there more than once"),
    ("rules", 2, {"number": ""}, r"rules, row 2, column number: at_most needs a number"),
    (
        "rules",
        2,
        {"number": "1.5"},
        r"rules, row 2, column number, value '1.5': not a whole number\. Write a whole .* 2",
    ),
    ("rules", 2, {"number": "-1"}, r"rules, row 2, column number, value '-1': negative"),
    ("rules", 2, {"rule": "at_least", "number": "3"}, r"at_least asks for more than the 2 members"),
    ("rules", 2, {"rule": "one_of"}, r"rules, row 2, column number, value '2': one_of takes no number\. Clear"),
    ("rules", 3, {"members": "Brno"}, r"rules, row 3, column members, value 'Brno': needs needs at least two members"),
]


@pytest.mark.parametrize(("table", "row", "cells", "message"), LINKS)
def test_faults_between_tables(table: str, row: int, cells: dict[str, str], message: str) -> None:
    """Names that no table defines, repeated pairs, and rows that contradict other tables, one fault each."""
    found = faults_of(with_cells(GOODS, table, {row: cells}))
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]


def test_two_running_sizes_are_one_too_many() -> None:
    """A running site with sizes has exactly one running size."""
    tables = with_cells(GOODS, "sites", {3: {"standing": "running"}})
    assert faults_of(with_cells(tables, "sizes", {2: {"standing": "running"}})) == []
    found = faults_of(with_cells(tables, "sizes", {2: {"standing": "running"}, 3: {"standing": "running"}}))
    assert len(found) == 1
    assert re.search(r"sizes, row 3, column standing, value 'running': row 2 is already the running size", found[0])


def test_a_leg_must_be_said_where_names_fit_more_than_one() -> None:
    """Site and customer of one name make a lane ambiguous, and only then the leg is needed."""
    tables = with_cells(TINY, "customers", {2: {"customer": "Linz"}})
    head = "origin,destination,leg,unit_cost\n"
    found = faults_of({**tables, "lanes": f"{head}Deggendorf,Linz,,5\n"})
    assert len(found) == 1
    assert re.search(
        r"lanes, row 2, column leg: .* more than one leg\. Write inbound or direct in the column", found[0]
    )
    both = f"{head}Deggendorf,Linz,inbound,5\nDeggendorf,Linz,direct,5\nLinz,Linz,outbound,1\n"
    assert faults_of({**tables, "lanes": both}) == []


def test_a_good_named_twice() -> None:
    """Each good has one row."""
    found = faults_of({**GOODS, "goods": GOODS["goods"] + "pots,1,1\n"})
    assert len(found) == 1
    assert re.search(r"goods, row 4, column good, value 'pots': the same good is already in row 2", found[0])


def test_a_good_that_nobody_offers() -> None:
    """A demanded good needs an offer; one that nobody demands does not."""
    tables = {**GOODS, "offers": GOODS["offers"].replace("Deggendorf,soil,12,60\n", "")}
    found = faults_of(tables)
    assert len(found) == 1
    assert re.search(r"offers, good, value 'soil': customers need good 'soil', but no supplier offers it", found[0])
    unwanted = with_cells(tables, "demands", {3: {"demand": "0"}, 5: {"demand": "0"}})
    assert faults_of(unwanted) == []


def test_a_study_in_which_nobody_needs_anything() -> None:
    """Some demand must be above 0."""
    tables = with_cells(TINY, "customers", {row: {"demand": "0"} for row in (2, 3, 4, 5)})
    assert faults_of(tables) == ["customers, demand: no customer needs anything. Write a demand above 0."]


def test_a_lane_with_neither_cost_nor_distance() -> None:
    """A listed lane that coordinates cannot price either says nothing."""
    nowhere = {"latitude": "", "longitude": ""}
    lanes = "origin,destination,unit_cost\nLinz,Vienna,5\nBrno,Vienna,\n"
    found = faults_of({**with_cells(TINY, "customers", {2: nowhere}), "lanes": lanes})
    assert len(found) == 1
    assert re.search(
        r"lanes, row 3, column unit_cost: the lane Brno to Vienna has neither road_km nor unit_cost", found[0]
    )


@pytest.mark.parametrize(
    ("row", "reach", "setting"),
    [
        ("Linz,Vienna,5", "300", ""),
        ("Linz,Vienna,5", "", "service_km = 100\nservice_share = 0.5\n"),
        ("Linz,Vienna,5", "", "emission_kg_per_tkm = 0.06\ncarbon_price_per_t = 80\n"),
    ],
)
def test_a_lane_without_distance_where_one_is_asked_for(row: str, reach: str, setting: str) -> None:
    """A reach, a service distance or a carbon price needs the distance of every lane it bears on."""
    tables = with_cells(TINY, "customers", {2: {"latitude": "", "longitude": "", "reach_km": reach}})
    tables["lanes"] = f"origin,destination,unit_cost\n{row}\n"
    found = faults_of(tables, TINY_SETTINGS + setting)
    assert len(found) == 1
    assert re.search(r"lanes, row 2, column road_km: the lane Linz to Vienna has no distance, but", found[0])
    tables["lanes"] = f"origin,destination,unit_cost,road_km\n{row},184\n"
    assert faults_of(tables, TINY_SETTINGS + setting) == []


def test_all_faults_of_all_tables_come_at_once() -> None:
    """Reading never stops at the first fault; tables come in order, rows in order."""
    tables = with_cells(TINY, "customers", {5: {"demand": "x"}, 3: {"reach_km": "0"}})
    tables = with_cells(tables, "sites", {2: {"capacity": "1;5"}})
    tables = with_cells(tables, "suppliers", {3: {"standing": "no"}})
    found = check_tables(tables, TINY_SETTINGS.replace('"EUR"', '"EURO"')).faults
    places = [(fault.table, fault.row, fault.column) for fault in found]
    assert places == [
        ("study.toml", None, "currency"),
        ("sites", 2, "capacity"),
        ("customers", 3, "reach_km"),
        ("customers", 5, "demand"),
        ("suppliers", 3, "standing"),
    ]


def test_an_unreadable_table_hides_no_other_fault_and_causes_none() -> None:
    """Tables that refer to one that cannot be read are not blamed for it, their own faults are still told."""
    tables = {**GOODS, "goods": GOODS["goods"].replace(",", "|")}
    found = faults_of(with_cells(tables, "demands", {2: {"demand": "x"}}))
    assert len(found) == 2
    assert re.search(r"^goods: the columns are not separated by commas, semicolons or tabs\. Save", found[0])
    assert re.search(r"^demands, row 2, column demand, value 'x': not a number", found[1])


def test_faults_of_one_table_are_capped_and_counted() -> None:
    """Of very many faults the first are listed and the others counted, in the lanes and elsewhere."""
    rows = [f"C{n},48,16,x" for n in range(203)]
    found = faults_of({**TINY, "customers": "\n".join(["customer,latitude,longitude,demand", *rows])})
    assert len(found) == 201
    assert found[-1] == "customers: 3 more faults of this table are not listed. Repair those listed and check again."
    lanes = "\n".join(["origin,destination,unit_cost", *(f"Linz,Nowhere{n},x" for n in range(300))])
    found = faults_of({**TINY, "lanes": lanes})
    assert len(found) == 201
    assert found[-1].startswith("lanes: 400 more faults of this table are not listed")


def test_missing_tables_are_told_once() -> None:
    """Lanes to customers that are not there are not listed one by one beside the missing table."""
    tables = {**TINY, "lanes": "origin,destination,road_km\nLinz,Vienna,184\nLinz,Munich,200\n"}
    without = {name: text for name, text in tables.items() if name != "customers"}
    assert [fault.split(":")[0] for fault in faults_of(without)] == ["customers"]
    without = {name: text for name, text in tables.items() if name in {"customers", "lanes"}}
    assert [fault.split(":")[0] for fault in faults_of(without)] == ["sites"]


def test_a_missing_column_of_names_is_told_once() -> None:
    """Sites without names cannot be looked up in sizes: their blank charges are not faults of their own."""
    tables = {**GOODS, "sites": without_column(GOODS["sites"], "site")}
    assert [fault.split(":")[0] for fault in faults_of(tables)] == ["sites, site"]


@pytest.mark.parametrize(
    ("table", "row", "cells", "typed"),
    [
        ("sites", 2, {"least_throughput": "100.50"}, "100.50"),
        ("suppliers", 2, {"unit_price": "10.2500001"}, "10.2500001"),
    ],
)
def test_values_are_shown_as_typed(table: str, row: int, cells: dict[str, str], typed: str) -> None:
    """Neither rounded nor rewritten, so that they can be searched for."""
    tables = TINY if table == "sites" else GOODS
    assert [fault.value for fault in check_tables(with_cells(tables, table, {row: cells})).faults] == [typed]


def test_what_is_got_back_is_spread_over_the_years_too() -> None:
    """A residual_value alone asks for interest_rate and life_years; at a running site it is not used."""
    tables = with_cells(TINY, "sites", {2: {"closing_charge": "0"}, 3: {"opening_charge": "0"}})
    tables = with_cells(tables, "suppliers", {2: {"dropping_charge": "0"}, 3: {"signing_charge": "0"}})
    settings = TINY_SETTINGS.replace("interest_rate = 0.08\nlife_years = 10\n", "")
    assert faults_of(tables, settings) == []
    assert faults_of(with_cells(tables, "sites", {2: {"residual_value": "50"}}), settings) == []
    found = faults_of(with_cells(tables, "sites", {3: {"residual_value": "50"}}), settings)
    assert len(found) == 2
    assert re.search(r"interest_rate: .* sites row 3 has a one-off residual_value of 50\. Add it", found[0])
