"""Settings: each wrong one is a fault with its repair, and those that need one another are held together."""

from __future__ import annotations

import re
import tempfile
from pathlib import Path

import pytest

from siting.study.check import check_raw
from siting.study.check_settings import settings_from_cells
from siting.study.raw import RawStudy, table_from_rows
from siting.study.read import read_raw
from siting.study.settings import SolveSettings
from tests.builders import (
    TINY,
    TINY_SETTINGS,
    check_tables,
    tiny_goods,
    tiny_study,
    with_cells,
    without_column,
    write_folder,
)


def faults_of(settings: str) -> list[str]:
    """Return the faults of the tiny study with other settings."""
    return [str(fault) for fault in check_tables(TINY, settings).faults]


ADDED = [
    ('circuity = "1.3"', r"study\.toml, circuity, value '1.3': a text, not a number\. Write 1\.3 without quotes"),
    ("circuity = true", r"circuity, value 'true': not a number\. Write a number such as 1\.25"),
    ("circuity = 0.99", r"circuity, value '0.99': out of range \(from 1 to 5\)"),
    ("circuity = 5.01", r"circuity, value '5.01': out of range"),
    ("circuity = nan", r"circuity, value 'nan': not a finite number"),
    ("most_sites = 1.5", r"most_sites, value '1.5': not a whole number"),
    ("fewest_sites = -1", r"fewest_sites, value '-1': negative"),
    (
        "most_sites = 1\nfewest_sites = 2",
        r"fewest_sites, value '2': fewest_sites is above most_sites \(1\)\. Write at most 1",
    ),
    ("fewest_sites = 3", r"fewest_sites, value '3': .*above the number of sites that may open \(2\)\. Write at most 2"),
    ("one_off_budget = inf", r"one_off_budget, value 'unlimited': not a finite number|one_off_budget, value 'inf'"),
    (f"one_off_budget = 1{'0' * 400}", r"one_off_budget, .*not a finite number"),
    (
        "drop_charge = 48",
        r"drop_charge, value '48': drop_charge is set without drop_size\. Set drop_size too, or delete",
    ),
    ("drop_size = 2.5", r"drop_size, value '2.5': drop_size is set without drop_charge"),
    ("drop_charge = 48\ndrop_size = 0", r"drop_size, value '0': out of range \(above 0\)"),
    ("service_km = 200", r"service_km, value '200': service_km is set without service_share"),
    ("service_share = 0.9", r"service_share, value '0.9': service_share is set without service_km"),
    ("service_km = 200\nservice_share = 90", r"service_share, value '90': .*Write 90 % as 0\.9\."),
    (
        "service_km = 200\nservice_share = 1",
        r"service_share, value '1': a share is a fraction below 1, got 1\. Write 1 % as 0\.01, or 0\.9999 where",
    ),
    ("carbon_price_per_t = 80", r"carbon_price_per_t, value '80': .*without emission_kg_per_tkm\. Set emission"),
    ("single_source = 2", r"single_source, value '2': neither true nor false\. Write true or false"),
    ('single_source = "maybe"', r"single_source, value 'maybe': neither yes nor no"),
    ("circuty = 1.2", r"circuty, value '1.2': unknown setting\. Write 'circuity' if that is meant, or delete it"),
    ("gap = 0.1", r"gap, value '0.1': unknown setting\. Write it below the line \[solve\]"),
    ("[solve]\nmost_sites = 2", r"solve\.most_sites, value '2': unknown setting\. Write it before the line \[solve\]"),
    ("[solve]\ngap = 1", r"solve\.gap, value '1': a share is a fraction below 1"),
    ("[solve]\ntime_limit_s = 0", r"solve\.time_limit_s, value '0': out of range \(above 0\)"),
    (
        '[solve]\nengine = "direkt"',
        r"solve\.engine, value 'direkt': not a engine\. Write 'direct'|value 'direkt': not an engine",
    ),
    (
        "[solve]\ntime_limit = 9",
        r"solve\.time_limit, value '9': unknown setting\. Write 'time_limit_s' if that is meant",
    ),
    ("solve = 3", r"solve, value '3': not a section\. Write \[solve\] on a line of its own"),
]


@pytest.mark.parametrize(("added", "message"), ADDED)
def test_wrong_settings(added: str, message: str) -> None:
    """Wrong types, values outside their range, unknown names and settings that lack their partner, one fault each."""
    found = faults_of(TINY_SETTINGS + added)
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]


CHANGED = [
    ('"EUR"', "12", r"currency, value '12': not a text\. Write it in quotes"),
    ('"EUR"', '"Euro"', r"currency, value 'Euro': not a currency code of ISO 4217"),
    ('"EUR"', '"HRK"', r"currency, value 'HRK': a currency code that was retired on 2023-01-\d\d\. Write the code of"),
    ('"EUR"', '"eur"', r"currency, value 'eur': not a currency code of ISO 4217\. Write 'EUR' if that is meant"),
    ('"t"', '""', r"unit: blank\. Fill it in: name of the unit of all amounts"),
    ('currency = "EUR"\n', "", r"currency: the setting is missing\. Add it: .* as in currency = \"EUR\""),
    ('unit = "t"\n', "", r"unit: the setting is missing"),
    ("0.08", "8", r"interest_rate, value '8': a share is a fraction below 1, got 8\. Write 8 % as 0\.08"),
    ("0.08", "1", r"interest_rate, value '1': a share is a fraction below 1"),
    ("0.08", "-0.1", r"interest_rate, value '-0.1': negative"),
    ("life_years = 10", "life_years = 0", r"life_years, value '0': out of range \(above 0\)"),
    (
        "life_years = 10\n",
        "",
        r"life_years: the setting is missing, but sites row 2 has a one-off closing_charge of 200",
    ),
    (
        "interest_rate = 0.08\n",
        "",
        r"interest_rate: the setting is missing, but sites row 2 .* as in interest_rate = 0\.08",
    ),
    ("0.08", "0,08", r"study\.toml: the file is not TOML \(.*\)\. Write each setting on a line of its own"),
]


@pytest.mark.parametrize(("old", "new", "message"), CHANGED)
def test_changed_settings(old: str, new: str, message: str) -> None:
    """Compulsory settings missing or refused."""
    found = faults_of(TINY_SETTINGS.replace(old, new))
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]


def test_limits_met_exactly_are_accepted() -> None:
    """Values at the edge of each range, and just inside it."""
    for added in (
        "circuity = 1", "circuity = 5", "most_sites = 0", "fewest_sites = 2", "one_off_budget = 0",
        "single_source = true", 'single_source = "yes"', "drop_charge = 48\ndrop_size = 0.001",
        "service_km = 1\nservice_share = 0.999", "service_km = 1\nservice_share = 0", "emission_kg_per_tkm = 0",
        "most_sites = 2.0",
        '[solve]\ngap = 0\ntime_limit_s = 0.5\nengine = "cbc"',
    ):  # fmt: skip
        assert faults_of(TINY_SETTINGS + added) == [], added
    assert faults_of(TINY_SETTINGS.replace("0.08", "0")) == []
    assert faults_of(TINY_SETTINGS.replace("0.08", "0.999")) == []


def test_interest_is_not_asked_for_without_one_off_charges() -> None:
    """Where every one-off charge is 0, nothing is annualised; each kind of charge alone brings the question back."""
    tables = dict(TINY)
    for column in ("opening_charge", "closing_charge"):
        tables["sites"] = without_column(tables["sites"], column)
    for column in ("signing_charge", "dropping_charge"):
        tables["suppliers"] = without_column(tables["suppliers"], column)
    settings = TINY_SETTINGS.replace("interest_rate = 0.08\nlife_years = 10\n", "")
    assert check_tables(tables, settings).faults == ()
    for table, column in (
        ("sites", "opening_charge"), ("sites", "closing_charge"), ("suppliers", "signing_charge"),
        ("suppliers", "dropping_charge"),
    ):  # fmt: skip
        found = check_tables(with_cells(tables, table, {3: {column: "1"}}), settings).faults
        assert [fault.column for fault in found] == ["interest_rate", "life_years"]
        assert f"{table} row 3 has a one-off {column} of 1" in found[0].wrong
    sizes = without_column(tiny_goods()["sizes"], "standing").replace("Brno", "Linz")
    cells = dict.fromkeys(("yearly_charge", "capacity", "least_throughput"), "")
    sized = with_cells({**tables, "sizes": sizes}, "sites", {2: {**cells, "standing": "proposed"}})
    found = check_tables(sized, settings).faults
    assert "sizes row 2 has a one-off opening_charge of 300" in found[0].wrong


def test_most_sites_below_the_pinned_ones() -> None:
    """Sites pinned open must fit under most_sites."""
    tables = with_cells(TINY, "sites", {2: {"ruling": "pinned-open"}, 3: {"ruling": "pinned-open"}})
    assert check_tables(tables, TINY_SETTINGS + "most_sites = 2").faults == ()
    found = [str(fault) for fault in check_tables(tables, TINY_SETTINGS + "most_sites = 1").faults]
    assert len(found) == 1
    assert re.search(
        r"most_sites, value '1': .*below the number of sites pinned open \(2\)\. Write at least 2", found[0]
    )


def test_fewest_sites_above_those_not_pinned_shut() -> None:
    """Sites pinned shut do not count towards fewest_sites."""
    tables = with_cells(TINY, "sites", {2: {"ruling": "pinned-shut"}})
    assert check_tables(tables, TINY_SETTINGS + "fewest_sites = 1").faults == ()
    found = [str(fault) for fault in check_tables(tables, TINY_SETTINGS + "fewest_sites = 2").faults]
    assert len(found) == 1
    assert re.search(r"above the number of sites that may open \(1\)", found[0])


def test_a_missing_settings_file_is_one_fault() -> None:
    """Without study.toml its settings are not reported one by one."""
    with tempfile.TemporaryDirectory() as name:
        folder = write_folder(Path(name))
        (folder / "study.toml").unlink()
        found = [str(fault) for fault in check_raw(read_raw(folder)).faults]
    assert len(found) == 1
    assert re.search(r"^study\.toml: the file is missing\. Add it, with at least currency", found[0])


def test_settings_are_typed() -> None:
    """Every setting arrives in the type its field has."""
    added = 'single_source = "yes"\nmost_sites = 2\n[solve]\ngap = 0\ntime_limit_s = 60\nengine = "direct"\n'
    settings = tiny_study(TINY, TINY_SETTINGS + added).settings
    assert settings.single_source is True
    assert settings.most_sites == 2
    assert isinstance(settings.life_years, float)
    assert settings.solve == SolveSettings(gap=0.0, time_limit_s=60.0, engine="direct")


def test_settings_typed_on_a_page() -> None:
    """Fields of a page are text: numbers are read as in a table, blank fields are left out."""
    cells = {
        "title": "T", "currency": "EUR", "unit": "t", "circuity": "1.25", "most_sites": "2", "single_source": "no",
        "service_km": "", "service_share": None, "solve.gap": "1e-3",
    }  # fmt: skip
    settings = settings_from_cells(cells)
    assert settings == {
        "title": "T", "currency": "EUR", "unit": "t", "circuity": 1.25, "most_sites": 2, "single_source": "no",
        "solve": {"gap": 1e-3},
    }  # fmt: skip
    table = table_from_rows(["customer", "demand"], [["A", 5.0], [None, None], ["B", float("nan")]])
    sites = table_from_rows(["site", "latitude"], [["S", "x"]])
    raw = RawStudy(tables={"customers": table, "sites": sites}, settings={**settings, "circuity": "1,25"})
    found = [str(fault) for fault in check_raw(raw).faults]
    assert found[0].startswith("study.toml, circuity, value '1,25': not a number")
    assert "sites, row 2, column latitude, value 'x': not a number. Write a number such as 1250 or 1250.5." in found
    assert any(fault.startswith("customers, row 4, column demand: blank") for fault in found)
