"""Latitude and longitude swapped: a fault where the swapped place lies amid the others, never on a guess."""

from __future__ import annotations

import pytest

from tests.builders import TINY, TINY_SETTINGS, check_tables, with_cells

SYDNEY = """\
customer,latitude,longitude,demand
Sydney,-33.86785,151.20732,40
Newcastle,-32.92953,151.7801,20
Canberra,-35.28346,149.12807,30
"""
"""Coordinates from GeoNames (CC BY 4.0). Swapped, each is out of range."""
DEPOT = "site,latitude,longitude,standing,yearly_charge,capacity\nWollongong,-34.424,150.89345,proposed,9,unlimited\n"


def swapped(tables: dict[str, str], table: str, *rows: int) -> dict[str, str]:
    """Return the tables with latitude and longitude of some rows exchanged, their headings left alone."""
    lines = tables[table].splitlines()
    heads = lines[0].split(",")
    north, east = heads.index("latitude"), heads.index("longitude")
    for row in rows:
        cells = lines[row - 1].split(",")
        cells[north], cells[east] = cells[east], cells[north]
        lines[row - 1] = ",".join(cells)
    return {**tables, table: "\n".join(lines) + "\n"}


@pytest.mark.parametrize(
    ("table", "row", "typed", "other"),
    [
        ("customers", 2, "16.37208", "48.20849"),
        ("sites", 3, "16.60796", "49.19522"),
        ("suppliers", 2, "12.96068", "48.84085"),
    ],
)
def test_a_swapped_place_amid_the_others_is_a_fault_with_its_repair(
    table: str, row: int, typed: str, other: str
) -> None:
    """Vienna at 16 N, 48 E lies in Yemen; exchanged, amid the towns of Austria. The cell is shown as typed."""
    checked = check_tables(swapped(dict(TINY), table, row))
    assert checked.study is None
    assert [str(warning) for warning in checked.warnings] == []
    (fault,) = checked.faults
    assert (fault.table, fault.row, fault.column, fault.value) == (table, row, "latitude", typed)
    assert fault.wrong.endswith(f"km if swapped with longitude ({other})")
    assert fault.repair.startswith("Swap the two; if the place is right, clear both and give its lanes road_km or")


def test_a_whole_table_swapped_is_told_row_by_row() -> None:
    """The headings of two sites were exchanged; customers and suppliers are right."""
    checked = check_tables(swapped(dict(TINY), "sites", 2, 3))
    assert [(fault.table, fault.row) for fault in checked.faults] == [("sites", 2), ("sites", 3)]


def test_a_swapped_place_beyond_the_others_is_a_warning() -> None:
    """17.5 N, 45.5 E lies in Arabia; exchanged, in Slavonia, near the towns of Austria but beyond all of them."""
    tables = with_cells(TINY, "customers", {2: {"latitude": "17.5", "longitude": "45.5"}})
    checked = check_tables(tables)
    assert checked.faults == ()
    (warning,) = checked.warnings
    assert (warning.table, warning.row, warning.value) == ("customers", 2, "17.5")
    assert warning.repair == "Swap the two, unless the place is right"


def test_a_far_place_that_would_be_as_far_swapped_is_right() -> None:
    """A supplier in Morocco is no slip."""
    checked = check_tables(with_cells(TINY, "suppliers", {2: {"latitude": "33.5731", "longitude": "-7.5898"}}))
    assert checked.faults == checked.warnings == ()


def test_a_pair_that_fits_the_other_way_round_only_is_told_so() -> None:
    """Longitude 151 is no latitude; exchanged, the customer lies amid the others."""
    right = {"customers": SYDNEY, "sites": DEPOT}
    settings = TINY_SETTINGS
    assert check_tables(right, settings).faults == ()
    (fault,) = check_tables(swapped(right, "customers", 3), settings).faults
    assert str(fault) == (
        "customers, row 3, column latitude, value '151.7801': out of range; latitude and longitude (-32.92953) "
        "look swapped. Swap the two."
    )


def test_where_nothing_is_in_range_every_pair_looks_swapped() -> None:
    """All headings were exchanged: nothing is left to hold them against."""
    tables = swapped(swapped({"customers": SYDNEY, "sites": DEPOT}, "customers", 2, 3, 4), "sites", 2)
    found = check_tables(tables).faults
    assert len(found) == 4
    assert all("look swapped" in fault.wrong for fault in found)


def test_a_pair_out_of_range_that_would_not_be_amid_the_others_is_no_swap() -> None:
    """A digit too many before 48.20849: exchanged, Vienna would lie in the Pacific. The cell is shown as typed."""
    (fault,) = check_tables(with_cells(TINY, "customers", {2: {"latitude": "148.20849"}})).faults
    assert str(fault) == (
        "customers, row 2, column latitude, value '148.20849': out of range (degrees from -90 to 90). "
        "Write decimal degrees such as 48.2085."
    )


def test_a_lane_is_not_held_against_coordinates_that_are_wrong_already() -> None:
    """One slip, one message: the lane from the site at fault is given in full and right."""
    tables = with_cells(TINY, "sites", {2: {"latitude": "84.830639"}})
    lanes = {"lanes": "origin,destination,road_km\nLinz,Vienna,184\n"}
    assert [warning.table for warning in check_tables({**tables, **lanes}).warnings] == ["lanes"]
    tables = with_cells(TINY, "sites", {2: {"latitude": "98.30639"}})
    checked = check_tables({**tables, **lanes})
    assert [(fault.table, fault.row) for fault in checked.faults] == [("sites", 2)]
    assert checked.warnings == ()
