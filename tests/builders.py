"""
A tiny study of two suppliers, two sites and four customers, as text that a test changes before it is read.

Town coordinates from GeoNames (CC BY 4.0), every other figure invented.
"""

from __future__ import annotations

import csv
import io
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING

from siting.study.check import Checked, check_raw
from siting.study.read import read_raw

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.study.tables import Study

    Tables = Mapping[str, str]

TINY: Tables = {
    "sites": """\
site,latitude,longitude,standing,ruling,opening_charge,yearly_charge,closing_charge,capacity,least_throughput
Linz,48.30639,14.28611,running,free,0,1000,200,100,0
Brno,49.19522,16.60796,proposed,free,500,800,0,unlimited,5
""",
    "suppliers": """\
supplier,latitude,longitude,standing,ruling,signing_charge,dropping_charge,yearly_charge,capacity,least_yearly,unit_price
Deggendorf,48.84085,12.96068,signed,free,0,50,300,unlimited,0,10
Szombathely,47.23088,16.62155,offered,free,80,0,250,90,5,9
""",
    "customers": """\
customer,latitude,longitude,demand,reach_km,single_source
Vienna,48.20849,16.37208,40,,
Munich,48.13743,11.57549,20,500,
Prague,50.08804,14.42076,30,,yes
Graz,47.06667,15.45,10,,no
""",
}
"""One good, demand in `customers`; reads without a fault or a warning."""

TINY_SETTINGS = """\
title = "Tiny"
currency = "EUR"
unit = "t"
outbound_rate = 0.2
inbound_rate = 0.1
interest_rate = 0.08
life_years = 10
"""

GOODS = "good,weight_t,load\npots,1,1\nsoil,1.5,2\n"
DEMANDS = "customer,good,demand\nVienna,pots,40\nMunich,soil,20\nPrague,pots,30\nGraz,soil,10\n"
OFFERS = """\
supplier,good,unit_price,capacity
Deggendorf,pots,10,unlimited
Deggendorf,soil,12,60
Szombathely,pots,9,90
"""
SIZES = """\
site,size,standing,opening_charge,yearly_charge,capacity
Brno,small,proposed,300,500,60
Brno,large,proposed,500,800,120
"""
LANES = """\
origin,destination,good,leg,road_km,unit_cost,barred
Linz,Vienna,,,184,,
Brno,Graz,,outbound,,35.5,no
Szombathely,Linz,pots,,,,yes
"""
RULES = "rule,members,number\nat_most,Linz;Brno,2\nneeds,Brno;Szombathely,\n"


def tiny_goods() -> dict[str, str]:
    """Return the tiny tables with two goods, demands and offers by good, sizes, lanes and rules: all nine tables."""
    tables = with_cells(TINY, "suppliers", {2: {"unit_price": ""}, 3: {"unit_price": ""}})
    tables["customers"] = without_column(tables["customers"], "demand")
    blank = dict.fromkeys(("opening_charge", "yearly_charge", "capacity", "least_throughput"), "")
    tables = with_cells(tables, "sites", {3: blank})
    return {
        **tables, "goods": GOODS, "demands": DEMANDS, "offers": OFFERS, "sizes": SIZES, "lanes": LANES, "rules": RULES,
    }  # fmt: skip


def with_cells(tables: Tables, table: str, changes: Mapping[int, Mapping[str, str]]) -> dict[str, str]:
    """Return the tables with cells changed, by row (the header is row 1) and column; unknown columns are added."""
    records = list(csv.reader(io.StringIO(tables[table])))
    for row, cells in changes.items():
        for column, value in cells.items():
            if column not in records[0]:
                records[0].append(column)
                for record in records[1:]:
                    record.append("")
            records[row - 1][records[0].index(column)] = value
    return {**tables, table: _text(records)}


def without_column(text: str, column: str) -> str:
    """Return a table without one of its columns."""
    records = list(csv.reader(io.StringIO(text)))
    at = records[0].index(column)
    return _text([record[:at] + record[at + 1 :] for record in records])


def _text(records: list[list[str]]) -> str:
    text = io.StringIO()
    csv.writer(text).writerows(records)
    return text.getvalue()


def write_folder(folder: Path, tables: Tables = TINY, settings: str = TINY_SETTINGS) -> Path:
    """Write tables and settings as the folder of a study, and return it."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "study.toml").write_text(settings, encoding="utf-8")
    for name, text in tables.items():
        (folder / f"{name}.csv").write_bytes(text.encode())
    return folder


def check_tables(tables: Tables = TINY, settings: str = TINY_SETTINGS) -> Checked:
    """Return what reading and checking makes of tables and settings."""
    with tempfile.TemporaryDirectory() as folder:
        return check_raw(read_raw(write_folder(Path(folder), tables, settings)))


def tiny_study(tables: Tables = TINY, settings: str = TINY_SETTINGS) -> Study:
    """Return the tiny study, or another given as text."""
    return check_tables(tables, settings).sound()
