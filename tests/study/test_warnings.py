"""What stops no plan but should be known: each warning comes where it is due, and only there."""

from __future__ import annotations

import re

import pytest

from tests.builders import TINY, TINY_SETTINGS, check_tables, tiny_goods, tiny_study, with_cells, without_column

NOWHERE = {"latitude": "", "longitude": ""}

WARNINGS = [
    ({"sites": without_column(TINY["sites"], "standing")}, r"^sites, standing: .*every row is taken as proposed"),
    ({"suppliers": without_column(TINY["suppliers"], "standing")}, r"^suppliers, standing: .*taken as offered"),
    (with_cells(TINY, "sites", {2: {"capacity": ""}}), r"^sites, row 2, column capacity: blank, taken as unlimited"),
    ({"sites": without_column(TINY["sites"], "capacity")}, r"^sites, capacity: .*every capacity is taken as unlim"),
    (with_cells(TINY, "suppliers", {3: {"capacity": ""}}), r"^suppliers, row 3, column capacity: blank, taken as unl"),
    (with_cells(TINY, "customers", {2: {"demand": "0"}}), r"^customers, row 2, column demand: .*'Vienna' needs noth"),
    (with_cells(TINY, "sites", {2: {"remark": "old"}}), r"^sites: .* does not know are carried along unused: remark\."),
    (
        with_cells(TINY, "sites", {3: {"residual_value": "500.5"}}),
        r"^sites, row 3, column residual_value, value '500.5': above the opening_charge \(500\), as if opening earned",
    ),
    ({"contacts": "name\nx\n"}, r"^contacts: the file is not a table of a study and was not read"),
    ({"goods": "good\n"}, r"^goods: the table has no rows and counts as absent"),
    ({"lanes": "origin,destination,road_km\nLinz,Vienna,700\n"}, r"^lanes, row 2, column road_km, value '700': .*Linz"),
]  # fmt: skip


@pytest.mark.parametrize(("changes", "message"), WARNINGS)
def test_one_warning(changes: dict[str, str], message: str) -> None:
    """Each warning is given once and the study is read all the same."""
    checked = check_tables({**TINY, **changes})
    assert checked.study is not None
    found = [str(warning) for warning in checked.warnings]
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]
    assert checked.study.warnings == checked.warnings


def test_blank_capacities_of_offers_and_their_suppliers() -> None:
    """With offers, a supplier is unlimited only where neither its own capacity nor the offer's is given."""
    tables = tiny_goods()
    blank = with_cells(tables, "offers", {3: {"capacity": ""}})
    assert check_tables(with_cells(blank, "suppliers", {2: {"capacity": "500"}})).warnings == ()
    assert check_tables(with_cells(tables, "suppliers", {2: {"capacity": ""}})).warnings == ()
    found = check_tables(with_cells(blank, "suppliers", {2: {"capacity": ""}})).warnings
    assert [(warning.table, warning.row) for warning in found] == [("offers", 3)]


@pytest.mark.parametrize(("road_km", "warned"), [("153", True), ("156", False), ("463", False), ("470", True)])
def test_road_distances_that_roads_cannot_have(road_km: str, warned: bool) -> None:  # noqa: FBT001  (a parameter)
    """
    Linz to Vienna is 155.27 km on the WGS84 ellipsoid (pyproj 3.7, Karney's method); the screen may be off by 0.6 %.

    A road shorter than that, or over three times as long (465.8 km), is worth a look.
    """
    checked = check_tables({**TINY, "lanes": f"origin,destination,road_km\nLinz,Vienna,{road_km}\n"})
    told = r"is (shorter than|over 3 times) the straight line, about 15[56] km by its coordinates"
    assert all(re.search(told, str(warning)) for warning in checked.warnings)
    assert bool(checked.warnings) is warned


def test_short_lanes_are_not_compared() -> None:
    """Two points in one town may be any number of times further apart by road."""
    tables = with_cells(TINY, "customers", {2: {"latitude": "48.31", "longitude": "14.29"}})
    assert check_tables({**tables, "lanes": "origin,destination,road_km\nLinz,Vienna,9\n"}).warnings == ()
    assert check_tables({**tables, "lanes": "origin,destination,road_km\nLinz,Vienna,10\n"}).warnings != ()


def test_a_site_that_no_inbound_lane_reaches() -> None:
    """Without coordinates a site needs an inbound lane, for a good that is offered, that is not barred."""
    tables = with_cells(TINY, "sites", {3: NOWHERE})
    out = "origin,destination,unit_cost,barred\nBrno,Graz,5,\n"
    found = [str(warning) for warning in check_tables({**tables, "lanes": out}).warnings]
    assert len(found) == 1
    assert re.search(r"sites, row 3, column site, value 'Brno': no inbound lane reaches site 'Brno'", found[0])
    assert check_tables({**tables, "lanes": f"{out}Szombathely,Brno,4,\n"}).warnings == ()
    assert len(check_tables({**tables, "lanes": f"{out}Szombathely,Brno,4,yes\n"}).warnings) == 1
    barred = "origin,destination,barred\nDeggendorf,Linz,yes\nSzombathely,Linz,yes\n"
    assert len(check_tables({**TINY, "lanes": barred}).warnings) == 1
    without_suppliers = {name: text for name, text in tables.items() if name != "suppliers"}
    assert check_tables({**without_suppliers, "lanes": out}).warnings == ()


def test_inbound_lanes_by_good() -> None:
    """A row with a good beats one without, and a supplier that does not offer the good does not count."""
    tables = with_cells(tiny_goods(), "sites", {3: NOWHERE})
    head = "origin,destination,good,unit_cost,barred\nBrno,Graz,,5,\n"
    assert len(check_tables({**tables, "lanes": f"{head}Szombathely,Brno,soil,4,\n"}).warnings) == 1
    assert check_tables({**tables, "lanes": f"{head}Szombathely,Brno,pots,4,\n"}).warnings == ()
    assert check_tables({**tables, "lanes": f"{head}Szombathely,Brno,,,yes\nSzombathely,Brno,pots,4,\n"}).warnings == ()


def test_a_supplier_without_offers() -> None:
    """With the table offers, a supplier that it does not name has nothing to sell."""
    tables = tiny_goods()
    tables["offers"] = tables["offers"].replace("Szombathely,pots,9,90\n", "")
    found = [str(warning) for warning in check_tables(tables).warnings]
    assert any(re.search(r"suppliers, row 3, .*'Szombathely' offers nothing", warning) for warning in found)


def test_rates_that_were_never_said() -> None:
    """Freight by distance at no cost is only taken as meant where the rate is typed."""
    for name in ("outbound_rate", "inbound_rate"):
        line = next(line for line in TINY_SETTINGS.splitlines() if line.startswith(name))
        found = [str(warning) for warning in check_tables(TINY, TINY_SETTINGS.replace(line, "")).warnings]
        assert len(found) == 1
        assert re.search(
            rf"study\.toml, {name}: .*taken as free of charge\. Add it; write 0 if freight costs", found[0]
        )
        assert check_tables(TINY, TINY_SETTINGS.replace(line, f"{name} = 0")).warnings == ()


def test_attributes_are_carried() -> None:
    """Unknown columns are kept with their row, in the lanes too."""
    lanes = "origin,destination,unit_cost,haulier\nLinz,Vienna,5,Nord\nLinz,Graz,6,\n"
    study = tiny_study({**with_cells(TINY, "sites", {2: {"remark": "old"}}), "lanes": lanes})
    assert [site.attributes for site in study.sites] == [{"remark": "old"}, {"remark": ""}]
    words, at = study.lanes.attributes["haulier"]
    assert [words[n] if n >= 0 else None for n in at.tolist()] == ["Nord", None]
    assert {str(warning)[:6] for warning in study.warnings} == {"sites:", "lanes:"}


def test_warnings_are_capped_and_counted() -> None:
    """Very many warnings of one table are counted, not listed."""
    rows = [f"C{n},48,16,{int(n == 0)}" for n in range(203)]
    found = check_tables({**TINY, "customers": "\n".join(["customer,latitude,longitude,demand", *rows])}).warnings
    assert len(found) == 201
    assert str(found[-1]).startswith("customers: 2 more warnings of this table are not listed")


@pytest.mark.parametrize(("row", "value"), [(3, "500"), (3, "0"), (2, "900")])
def test_what_is_got_back_at_most_once_is_no_news(row: int, value: str) -> None:
    """All of the opening charge may be got back; a running site opens no more."""
    assert check_tables(with_cells(TINY, "sites", {row: {"residual_value": value}})).warnings == ()
