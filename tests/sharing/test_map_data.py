"""What the map says and draws is what the plan holds."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from siting.plan.plan import Plan, SiteVerdict, SupplierVerdict
from siting.plan.service import BAND_EDGES_KM
from siting.sharing import map_facts
from siting.sharing.looks import NO_BREAK, Formats
from siting.sharing.map_data import Json, band_of, plan_json
from siting.sharing.map_given import given_json
from siting.study.tables import Leg, Study
from tests.sharing.map_cases import hand_case


@pytest.fixture(scope="module")
def case() -> tuple[Study, Plan, Json]:
    """Return the hand-worked study, its plan and their map."""
    study, plan = hand_case()
    return study, plan, plan_json(study, plan, headline="Run 2 of 4 sites: 37.33 M EUR a year.")


def facts_of(payload: Json, table: str, name: str) -> dict[str, str]:
    """Return the cells of one row by their heads, spaces plain."""
    heads = payload[f"{table}_heads"]
    row = next(row for row in payload[f"{table}s"] if row["name"] == name)
    return {head: fact.replace(NO_BREAK, " ") for head, fact in zip(heads, row["facts"], strict=True)}


def test_sites_have_the_plans_verdict_and_level(case: tuple[Study, Plan, Json]) -> None:
    """Verdict, utilisation and throughput are the plan's own numbers; only open sites are drawn as active."""
    _, plan, payload = case
    assert [site["name"] for site in payload["sites"]] == [line.site for line in plan.sites]
    for site, line in zip(payload["sites"], plan.sites, strict=True):
        assert site["key"] == line.verdict.value
        assert site["level"] == line.utilisation
        assert site["throughput"] == line.throughput
        assert site["active"] == (line.verdict in {SiteVerdict.KEEP, SiteVerdict.OPEN})


def test_suppliers_have_the_plans_verdict_and_volume(case: tuple[Study, Plan, Json]) -> None:
    """Every supplier of the table is there, with the plan's volume."""
    _, plan, payload = case
    for supplier, line in zip(payload["suppliers"], plan.suppliers, strict=True):
        assert (supplier["name"], supplier["key"], supplier["volume"]) == (line.supplier, line.verdict, line.volume)
        assert supplier["active"] == (line.verdict in {SupplierVerdict.STAY, SupplierVerdict.SIGN})


def test_no_volume_is_dropped_from_the_lanes(case: tuple[Study, Plan, Json]) -> None:
    """Each lane's loads by good are its flows times the good's load, and all flows are in one lane."""
    study, plan, payload = case
    loads = {good.good: good.load for good in study.all_goods}
    tables = {
        "outbound": ("sites", "customers"),
        "inbound": ("suppliers", "sites"),
        "direct": ("suppliers", "customers"),
    }
    drawn = {}
    for lane in payload["lanes"]:
        start, end = tables[lane["leg"]]
        for good, load in zip(study.all_goods, lane["load"], strict=True):
            if load:
                names = payload[start][lane["from"]]["name"], payload[end][lane["to"]]["name"]
                drawn[lane["leg"], *names, good.good] = load
    assert drawn == {(f.leg.value, f.origin, f.destination, f.good): f.amount * loads[f.good] for f in plan.flows}


def test_lanes_are_sorted_so_that_small_ones_lie_on_top(case: tuple[Study, Plan, Json]) -> None:
    """The largest lane comes first."""
    volumes = [sum(lane["load"]) for lane in case[2]["lanes"]]
    assert volumes == sorted(volumes, reverse=True)
    assert len(volumes) == 8


def test_customers_have_their_demand_and_distance_band(case: tuple[Study, Plan, Json]) -> None:
    """Loads by good are demand times load; the band is that of the plan's average km."""
    study, plan, payload = case
    vienna = payload["customers"][0]
    assert vienna["load"] == [100.0, 60.0]
    for customer, line in zip(payload["customers"], plan.customers, strict=True):
        assert customer["band"] == (None if line.km is None else band_of(line.km))
        assert customer["beyond"] == (line.km is not None and line.km > (study.settings.service_km or 0))
        assert sum(customer["load"]) == pytest.approx(line.load)


@pytest.mark.parametrize("edge", BAND_EDGES_KM[1:])
def test_a_band_holds_its_upper_edge(edge: float) -> None:
    """Just below and at an edge a customer is in the lower band, just above it in the next."""
    i = BAND_EDGES_KM.index(edge)
    assert [band_of(edge - 1e-9), band_of(edge), band_of(edge + 1e-9)] == [i - 1, i - 1, i]


def test_the_first_band_holds_no_distance_at_all() -> None:
    """A customer at the site's door is in the first band."""
    assert band_of(0.0) == 0


def test_bands_show_the_plans_shares(case: tuple[Study, Plan, Json]) -> None:
    """Each band with load is in the legend with the plan's share, no other is."""
    _, plan, payload = case
    shares = [f"{100 * band.share:.1f}".removesuffix(".0") for band in plan.service.bands if band.load]
    assert [band["share"].replace(f"{NO_BREAK}%", "") for band in payload["bands"]] == shares


def test_a_kept_site_tells_all_its_numbers_with_units(case: tuple[Study, Plan, Json]) -> None:
    """Linz moves to its large size: 80 of 120 t of load, three customers, charges a year and once."""
    _, plan, payload = case
    line = next(line for line in plan.sites if line.site == "Linz")
    assert facts_of(payload, "site", "Linz") == {
        "Verdict": "keep",
        "Place": "",
        "Size": "large",
        "Throughput": "80 t of load a year",
        "Capacity": "120 t of load a year",
        "Utilisation": "66.7 %",
        "Customers served": "2",
        "Charge": f"{line.charge:,.0f} EUR a year",
        "One-off": "4,000 EUR once",
        "Ruling": "",
        "Note": line.note,
    }


def test_a_closed_site_tells_what_closing_costs(case: tuple[Study, Plan, Json]) -> None:
    """Graz closes for 1,500 EUR once, spread over the years; it has no throughput to show."""
    facts = facts_of(case[2], "site", "Graz")
    assert facts["Verdict"] == "close"
    assert facts["One-off"] == "1,500 EUR once"
    assert facts["Charge"].endswith(" EUR a year")
    assert facts["Throughput"] == facts["Utilisation"] == facts["Customers served"] == ""


def test_a_split_customer_tells_who_brings_what(case: tuple[Study, Plan, Json]) -> None:
    """Vienna takes pots from two sites and trees from one."""
    facts = facts_of(case[2], "customer", "Vienna")
    assert facts["Demand"] == "pots 100 t, trees 20 t a year"
    assert "Brno (pots 70 t, trees 20 t a year)" in facts["Served by"]
    assert "Linz (pots 30 t a year)" in facts["Served by"]
    assert facts["Road distance"].endswith(("partly given", "not known"))
    assert facts["Marginal cost, not for pricing"] == "pots 12.50 EUR per t, trees 12.50 EUR per t"


def test_a_lane_tells_distance_volume_and_cost(case: tuple[Study, Plan, Json]) -> None:
    """The direct lane from Orchard to Ostrava has a given distance of 420 km."""
    _, plan, payload = case
    lane = next(lane for lane in payload["lanes"] if lane["leg"] == "direct")
    flow = next(flow for flow in plan.flows if flow.leg is Leg.DIRECT)
    facts = dict(zip(payload["lane_heads"], lane["facts"], strict=True))
    assert {key: fact.replace(NO_BREAK, " ") for key, fact in facts.items()} == {
        "Leg": "direct",
        "Road distance": "420 km, given",
        "Volume": "pots 40 t a year",
        "Cost": f"{flow.cost:,.0f} EUR a year",
        "Tariff": "",
    }


def test_a_lane_tells_its_tariff(case: tuple[Study, Plan, Json]) -> None:
    """The tariff that prices it, each once; blank where none does."""
    study, plan, _ = case
    formats = Formats(currency="EUR", unit="t")
    flows = [replace(flow, tariff=name) for flow, name in zip(plan.flows, ("Road", "Road", "Truck", ""), strict=False)]
    assert map_facts.lane_facts(study, formats, flows)[-1] == "Road, Truck"


@pytest.mark.parametrize(
    ("kms", "given", "text"),
    [
        ((142.4, 142.4), (False, False), "142 km, estimated"),
        ((142.4, 150.0), (True, False), "142 to 150 km, partly given"),
        ((142.4, None), (True, False), "not known"),
    ],
)
def test_distances_say_what_they_rest_on(
    case: tuple[Study, Plan, Json], kms: tuple[float | None, ...], given: tuple[bool, ...], text: str
) -> None:
    """Given, estimated, mixed and missing distances each read differently."""
    study, plan, _ = case
    flows = [replace(plan.flows[0], km=km, km_given=known) for km, known in zip(kms, given, strict=True)]
    formats = formats_of(study)
    assert map_facts.distance_text(formats, flows).replace(NO_BREAK, " ") == text


def formats_of(study: Study) -> Formats:
    """Return the formats of the study in English."""
    return Formats(currency=study.settings.currency, unit=study.settings.unit)


def test_one_good_needs_no_name_and_no_load(case: tuple[Study, Plan, Json]) -> None:
    """In a study without goods, amounts are plain and capacities are in the study's unit."""
    study = replace(case[0], goods=(), demands=(), offers=())
    formats = formats_of(study)
    assert map_facts.load_unit(study) == "t"
    assert map_facts.goods_text(study, formats, {"goods": 40.0}).replace(NO_BREAK, " ") == "40 t a year"


def test_the_map_carries_words_sources_and_fingerprint(case: tuple[Study, Plan, Json]) -> None:
    """Headline, cautions, attribution and the first characters of the fingerprint are all there."""
    _, plan, payload = case
    assert payload["headline"].replace(NO_BREAK, " ") == "Run 2 of 4 sites: 37.33 M EUR a year."
    assert f"37.33{NO_BREAK}M{NO_BREAK}EUR" in payload["headline"]
    assert payload["fingerprint"] == plan.fingerprint[:12]
    assert payload["attribution"] == "Made with Natural Earth; places: GeoNames, CC BY 4.0"
    assert any("a proof is about the model" in caution.lower() for caution in payload["cautions"])


def test_what_has_no_coordinates_is_counted(case: tuple[Study, Plan, Json]) -> None:
    """A row without coordinates is in the tables but not on the map, and a note says how many there are."""
    study, plan, _ = case
    bare = replace(study, sites=(replace(study.sites[0], latitude=None, longitude=None), *study.sites[1:]))
    payload = plan_json(bare, plan, headline="Here.")
    assert payload["sites"][0]["spot"] is None
    assert payload["notes"][0] == "1 site has no coordinates and so no place on the map; the tables below list all."
    assert len(payload["sites"]) == len(study.sites)


def test_a_study_without_any_coordinates_has_no_base(case: tuple[Study, Plan, Json]) -> None:
    """Then there is nothing to draw, but the verdicts and tables remain."""
    study, plan, _ = case
    tables: dict[str, Any] = {
        name: tuple(replace(row, latitude=None, longitude=None) for row in getattr(study, name))
        for name in ("sites", "suppliers", "customers")
    }
    payload = plan_json(replace(study, **tables), plan, headline="Here.")
    assert payload["base"] is None
    assert [site["name"] for site in payload["sites"]] == [row.site for row in study.sites]


def test_towns_at_a_site_are_not_named_twice(case: tuple[Study, Plan, Json]) -> None:
    """Brno is a site, so the town's own label is left out; Bratislava is neither and stays."""
    towns = {town[0] for town in case[2]["base"]["towns"]}
    assert "Brno" not in towns
    assert "Bratislava" in towns


def test_a_city_is_named_on_a_map_of_itself(case: tuple[Study, Plan, Json]) -> None:
    """Two sites in Vienna, 8 km from its centre: the map of the city still says Vienna."""
    north, south = (replace(case[0].sites[1], latitude=at, longitude=16.4) for at in (48.28, 48.13))
    one_city = replace(case[0], sites=(north, replace(south, site="Other")), sizes=(), suppliers=(), customers=())
    assert "Vienna" in {town[0] for town in given_json(one_city)["base"]["towns"]}


def test_the_given_map_shows_standings(case: tuple[Study, Plan, Json]) -> None:
    """Sites and suppliers by standing, no lanes, and a headline that counts what was given."""
    study, _, _ = case
    payload = given_json(study, fingerprint="0123456789abcdef")
    assert [site["key"] for site in payload["sites"]] == [row.standing.value for row in study.sites]
    assert [supplier["key"] for supplier in payload["suppliers"]] == [row.standing.value for row in study.suppliers]
    assert payload["lanes"] == []
    assert payload["fingerprint"] == "0123456789ab"
    assert payload["headline"].replace(NO_BREAK, " ") == (
        "Given: 4 sites (2 running, 2 proposed), 3 suppliers (2 signed, 1 offered), "
        "4 customers that need 340 t of load a year."
    )
    assert facts_of(payload, "site", "Linz")["Capacity"] == "60 to 120 t of load a year"


def test_a_unit_of_any_length_leaves_room_for_numbers(case: tuple[Study, Plan, Json]) -> None:
    """24 characters of a unit are shown whole, of 25 the last two give way to an ellipsis."""
    settings = case[0].settings
    units = [replace(case[0], settings=replace(settings, unit="u" * length)) for length in (24, 25)]
    assert [map_facts.unit_shown(study) for study in units] == ["u" * 24, "u" * 23 + "\N{HORIZONTAL ELLIPSIS}"]
