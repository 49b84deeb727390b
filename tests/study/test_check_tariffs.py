"""The table `tariffs`: what is refused, what is warned of, and that it is written as it was read."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import pytest

from siting.study.fingerprint import fingerprint
from siting.study.read import read_study
from siting.study.tables import Leg, TariffBasis, TariffRow
from siting.study.write import write_study, write_workbook
from tests.builders import TINY, TINY_SETTINGS, check_tables, tiny_study, with_cells

if TYPE_CHECKING:
    from pathlib import Path

HEADER = "tariff,leg,from_country,to_country,from_km,to_km,from_size,basis,rate,minimum,truck_load,fill"
SIZES = TINY_SETTINGS + "drop_size = 2\ninbound_size = 20\n"


def tariffs(*rows: str) -> dict[str, str]:
    """Return the tiny tables with these rows of tariffs."""
    return {**TINY, "tariffs": "\n".join([HEADER, *rows])}


def faults_of(tables: dict[str, str], settings: str = SIZES) -> list[str]:
    """Return the faults as they are shown."""
    return [str(fault) for fault in check_tables(tables, settings).faults]


FAULTS = [
    ("Road,,,,0,100,0,per_mile,1,,,", r"tariffs, row 2, column basis, value 'per_mile': not a basis"),
    ("Road,,,,0,100,0,per_unit,,,,", r"tariffs, row 2, column rate: blank\. Write a number, 0 if that is meant"),
    (",,,,0,100,0,per_unit,1,,,", r"tariffs, row 2, column tariff: blank"),
    ("Road,,,,0,100,0,per_unit,-1,,,", r"column rate, value '-1': negative"),
    ("Road,,,,100,100,0,per_unit,1,,,", r"column to_km, value '100': not above from_km \(100\)"),
    ("Road,,,,100,99,0,per_unit,1,,,", r"column to_km, value '99': not above from_km \(100\)"),
    ("Road,,,,0,0,0,per_unit,1,,,", r"column to_km, value '0': out of range \(above 0\)"),
    ("Road,,,,,,,per_truck,400,,,", r"column truck_load: blank, although the rate is paid per truck\. Write the load"),
    ("Road,,,,,,,per_truck_km,1,,,", r"column truck_load: blank, although the rate is paid per truck km"),
    ("Road,,,,,,,per_unit,4,,24,", r"column truck_load, value '24': only per_truck and per_truck_km have a truck_load"),
    ("Road,,,,,,,per_unit,4,,,0.8", r"column fill, value '0\.8': only per_truck and per_truck_km have a fill"),
    ("Road,,,,,,,per_truck,400,,24,0", r"column fill, value '0': out of range"),
    ("Road,,,,,,,per_truck,400,,24,1.01", r"column fill, value '1\.01': a share is a fraction"),
]


@pytest.mark.parametrize(("row", "message"), FAULTS)
def test_a_row_that_makes_no_sense_is_refused(row: str, message: str) -> None:
    """One fault each, at its cell, with its repair."""
    found = faults_of(tariffs(row))
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]


@pytest.mark.parametrize("row", ["Road,,,,99,100,0,per_unit,1,,,", "Road,,,,,,,per_truck,400,,24,1"])
def test_limits_that_are_met_pass(row: str) -> None:
    """A band of one kilometre and a full truck are sound."""
    assert faults_of(tariffs(row)) == []


@pytest.mark.parametrize(
    ("second", "overlaps"),
    [
        ("Road,,,,100,200,0,per_unit,1,,,", False),
        ("Road,,,,99.9,200,0,per_unit,1,,,", True),
        ("Road,,,,0,,0,per_unit,1,,,", True),
        ("Road,,,,0,100,5,per_unit,1,,,", False),
        ("Road,outbound,,,0,100,0,per_unit,1,,,", False),
        ("Road,,,CZ,0,100,0,per_unit,1,,,", False),
        ("Rail,,,,0,100,0,per_unit,1,,,", False),
    ],
)
def test_bands_of_one_zone_may_not_overlap(second: str, *, overlaps: bool) -> None:
    """Two rows of a tariff that fit one lane equally well leave its price open; bands may touch."""
    found = faults_of(tariffs("Road,,,,0,100,0,per_unit,2,,,", second))
    assert bool(found) is overlaps
    assert all("the same lanes fit row " in fault for fault in found)


def test_a_band_inside_another_is_found_behind_a_third() -> None:
    """0 to 500 holds 10 to 20 and 30 to 40, though these two do not touch."""
    rows = ("Road,,,,0,500,0,per_unit,2,,,", "Road,,,,10,20,0,per_unit,2,,,", "Road,,,,30,40,0,per_unit,2,,,")
    assert [fault.row for fault in check_tables(tariffs(*rows), SIZES).faults] == [3, 4]


def test_countries_overlap_by_meaning() -> None:
    """AT and Austria are one country."""
    found = faults_of(tariffs("Road,,,AT,0,100,0,per_unit,2,,,", "Road,,,Austria,0,100,0,per_unit,2,,,"))
    assert len(found) == 1
    assert "the same lanes fit row 2" in found[0]


@pytest.mark.parametrize(
    ("row", "settings", "message"),
    [
        ("Road,outbound,,,,,,per_delivery,40,,,", "", r"is not said for customer 'Vienna'\. Set drop_size"),
        ("Road,outbound,,,,,5,per_unit,4,,,", "", r"is not said for customer 'Vienna'"),
        ("Road,outbound,,,,,,per_unit,4,30,,", "", r"is not said for customer 'Vienna'"),
        ("Road,inbound,,,,,,per_delivery,40,,,", "drop_size = 2\n", r"is not said for inbound\. Set inbound_size"),
        ("Road,,,,,,,per_delivery,40,,,", "drop_size = 2\n", r"is not said for inbound"),
        ("Road,outbound,,,,,,per_unit,4,,,", "", ""),
        ("Road,,,,,,,per_truck,400,90,24,0.8", "", ""),
        ("Road,outbound,,,,,,per_delivery,40,,,", "drop_size = 2\n", ""),
    ],
)
def test_rows_that_go_by_size_need_one(row: str, settings: str, message: str) -> None:
    """A charge by delivery, a minimum and a weight break need the size; a rate by load or by truck does not."""
    found = faults_of(tariffs(row), TINY_SETTINGS + settings)
    assert len(found) == bool(message)
    assert all(re.search(message, fault) for fault in found)


def test_customers_may_have_sizes_of_their_own() -> None:
    """Where every customer has a drop_size, the settings need none; where one has not, it is named."""
    tables = tariffs("Road,outbound,,,,,,per_delivery,40,,,")
    sized = with_cells(tables, "customers", {row: {"drop_size": "3"} for row in (2, 3, 4, 5)})
    assert faults_of(sized, TINY_SETTINGS) == []
    assert "'Munich'" in faults_of(with_cells(sized, "customers", {3: {"drop_size": ""}}), TINY_SETTINGS)[0]
    found = faults_of(with_cells(sized, "customers", {3: {"drop_size": "0"}}), TINY_SETTINGS)
    assert re.search(r"customers, row 3, column drop_size, value '0': out of range \(above 0\)", found[0])


def test_sizes_that_nothing_goes_by_are_warned_of() -> None:
    """drop_size of customers and inbound_size mean nothing without a charge or tariffs."""
    checked = check_tables(with_cells(TINY, "customers", {2: {"drop_size": "3"}}), TINY_SETTINGS + "inbound_size = 9\n")
    assert checked.faults == ()
    assert [warning.column for warning in checked.warnings] == ["inbound_size", "drop_size"]
    charged = TINY_SETTINGS + "drop_charge = 40\ndrop_size = 2\n"
    assert check_tables(with_cells(TINY, "customers", {2: {"drop_size": "3"}}), charged).warnings == ()


def test_drop_size_alone_is_enough_for_tariffs_only() -> None:
    """Without tariffs a drop_size without drop_charge is a slip; with them a drop_charge still needs its size."""
    alone = TINY_SETTINGS + "drop_size = 2\n"
    assert "drop_size is set without drop_charge" in faults_of(dict(TINY), alone)[0]
    row = "Road,,,,,,,per_unit,4,,,"
    assert faults_of(tariffs(row), alone) == []
    assert "drop_charge is set without drop_size" in faults_of(tariffs(row), TINY_SETTINGS + "drop_charge = 2\n")[0]


def test_a_country_without_places_is_warned_of() -> None:
    """A zone that no place is in is most often a slip of the pen; the code and the name of a country are one."""
    tables = with_cells(tariffs("Road,,Osterreich,Czechia,,,,per_unit,4,,,"), "customers", {4: {"country": "CZ"}})
    warnings = check_tables(tables, SIZES).warnings
    assert [(warning.column, warning.value) for warning in warnings] == [("from_country", "Osterreich")]
    assert "no place of the study has this country" in str(warnings[0])


def test_missing_rates_are_told_of_lanes_outside_the_tariffs() -> None:
    """With tariffs, the rates of the settings matter where none fits."""
    without = SIZES.replace("outbound_rate = 0.2\n", "")
    warnings = check_tables(tariffs("Road,,,,,,,per_unit,4,,,"), without).warnings
    assert "freight on lanes that no tariff fits is taken as free of charge" in str(warnings[0])


def test_writing_and_reading_change_nothing(tmp_path: Path) -> None:
    """Rows, sizes and fingerprint survive a folder and a workbook; another rate is another fingerprint."""
    rows = ("Road,outbound,AT,Czechia,0,100,1.5,per_delivery,40,30,,", "Truck,,,,100,,,per_truck_km,1.2,300,24,0.8")
    study = tiny_study(with_cells(tariffs(*rows), "customers", {2: {"drop_size": "3"}}), SIZES)
    assert study.tariffs[0] == TariffRow(
        tariff="Road", leg=Leg.OUTBOUND, from_country="AT", to_country="Czechia", to_km=100.0, from_size=1.5,
        basis=TariffBasis.PER_DELIVERY, rate=40.0, minimum=30.0, row=2,
    )  # fmt: skip
    assert study.tariffs[1].fill == 0.8
    write_study(study, tmp_path / "study")
    write_workbook(study, tmp_path / "study.xlsx")
    for again in (read_study(tmp_path / "study"), read_study(tmp_path / "study.xlsx")):
        assert again.tariffs == study.tariffs
        assert again.customers == study.customers
        assert again.settings == study.settings
        assert fingerprint(again) == fingerprint(study)
    other = tiny_study(tariffs(rows[0], rows[1].replace("1.2", "1.3")), SIZES)
    assert fingerprint(other) != fingerprint(tiny_study(tariffs(*rows), SIZES))
