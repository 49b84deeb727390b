"""
What the map says about each site, supplier, customer and lane, in words with units.

Each function returns the cells of one row under the heads listed here; an empty cell is left out of a tooltip and shown
as a dash in a table.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from siting.sharing.looks import NO_BREAK, label, shortened
from siting.study.tables import SiteRuling, SupplierRuling

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.plan.plan import CustomerLine, Flow, SiteLine, SupplierLine
    from siting.sharing.looks import Formats
    from siting.study.tables import CustomerRow, SiteRow, Study, SupplierRow

NAME_LENGTH = 160
"""Characters of a name that are shown; longer ones end in a mark and their full length."""

UNIT_LENGTH = 24
"""Characters of a unit that are shown."""

SITE_HEADS = (
    "Verdict",
    "Place",
    "Size",
    "Throughput",
    "Capacity",
    "Utilisation",
    "Customers served",
    "Charge",
    "One-off",
    "Ruling",
    "Note",
)
SUPPLIER_HEADS = (
    "Verdict",
    "Place",
    "Volume",
    "Capacity",
    "Utilisation",
    "Charge",
    "One-off",
    "Ruling",
    "Note",
)
CUSTOMER_HEADS = (
    "Place",
    "Demand",
    "Served by",
    "Road distance",
    "Cost to serve",
    "Marginal cost, not for pricing",
)
LANE_HEADS = ("Leg", "Road distance", "Volume", "Cost", "Tariff")

GIVEN_SITE_HEADS = (
    "Standing",
    "Place",
    "Capacity",
    "Yearly charge",
    "Opening charge",
    "Closing charge",
    "Handling",
    "Ruling",
)
GIVEN_SUPPLIER_HEADS = ("Standing", "Place", "Capacity", "Yearly charge", "Signing charge", "Dropping charge", "Ruling")
GIVEN_CUSTOMER_HEADS = ("Place", "Demand", "Reach")


def name_shown(name: str) -> str:
    """Return the name as typed, visibly shortened where it is very long."""
    return shortened(name, NAME_LENGTH)


def unit_shown(study: Study) -> str:
    """Return the study's unit as typed, cut where it is no unit's length."""
    return label(study.settings.unit, UNIT_LENGTH)


def load_unit(study: Study) -> str:
    """Return the unit that capacities and throughputs are in: the study's, or its `of load` where goods differ."""
    differ = any(good.load != 1.0 for good in study.all_goods)
    unit = unit_shown(study)
    return f"{unit} of load" if differ else unit


def load_text(study: Study, formats: Formats, load: float) -> str:
    """Return an amount of load with its unit."""
    return f"{formats.number(load)}{NO_BREAK}{load_unit(study).replace(' ', NO_BREAK)}"


def goods_text(study: Study, formats: Formats, amounts: Mapping[str, float]) -> str:
    """Return amounts a year, each with its good where there are several."""
    if len(study.all_goods) == 1:
        return f"{formats.amount(sum(amounts.values()))} a year"
    parts = [f"{name_shown(good)} {formats.amount(amount)}" for good, amount in amounts.items() if amount]
    return f"{', '.join(parts)} a year" if parts else ""


def place_text(row: SiteRow | SupplierRow | CustomerRow, name: str) -> str:
    """Return place and country, or nothing where they only repeat the name."""
    text = ", ".join(part for part in (row.place, row.country) if part)
    return "" if text == name else name_shown(text)


def _capacity_text(study: Study, formats: Formats, capacity: float | None) -> str:
    if capacity is None or math.isinf(capacity):
        return "unlimited"
    return f"{load_text(study, formats, capacity)} a year"


def _once(formats: Formats, money: float) -> str:
    return f"{formats.money(money)} once" if money else ""


def site_facts(study: Study, formats: Formats, row: SiteRow, line: SiteLine, *, is_open: bool) -> list[str]:
    """Return the cells of a site in a plan, under `SITE_HEADS`."""
    level = line.utilisation
    return [
        line.verdict.value,
        place_text(row, row.site),
        name_shown(line.size),
        f"{load_text(study, formats, line.throughput)} a year" if is_open else "",
        _capacity_text(study, formats, line.capacity) if is_open else "",
        formats.share(level) if level is not None else "",
        formats.number(line.customers) if is_open else "",
        formats.money_a_year(line.charge) if line.charge or is_open else "",
        _once(formats, line.one_off),
        "" if row.ruling is SiteRuling.FREE else row.ruling.value,
        name_shown(line.note),
    ]


def supplier_facts(
    study: Study, formats: Formats, row: SupplierRow, line: SupplierLine, *, is_signed: bool
) -> list[str]:
    """Return the cells of a supplier in a plan, under `SUPPLIER_HEADS`."""
    level = line.utilisation
    return [
        line.verdict.value,
        place_text(row, row.supplier),
        f"{load_text(study, formats, line.volume)} a year" if is_signed else "",
        _capacity_text(study, formats, line.capacity),
        formats.share(level) if level is not None and is_signed else "",
        formats.money_a_year(line.charge) if line.charge or is_signed else "",
        _once(formats, line.one_off),
        "" if row.ruling is SupplierRuling.FREE else row.ruling.value,
        name_shown(line.note),
    ]


def distance_text(formats: Formats, flows: Sequence[Flow]) -> str:
    """Return the road km of a lane's flows and whether they are given or estimated."""
    if any(flow.km is None for flow in flows):
        return "not known"
    far, near = max(flow.km or 0.0 for flow in flows), min(flow.km or 0.0 for flow in flows)
    given = {flow.km_given for flow in flows}
    basis = "partly given" if len(given) > 1 else ("given" if given.pop() else "estimated")
    text = formats.distance(far) if far == near else f"{formats.number(near)} to {formats.distance(far)}"
    return f"{text}, {basis}"


def customer_facts(  # noqa: PLR0913 - a customer's cells come from its row, its line and its flows
    study: Study,
    formats: Formats,
    row: CustomerRow,
    line: CustomerLine,
    *,
    demand: Mapping[str, float],
    served: Mapping[str, Sequence[Flow]],
) -> list[str]:
    """Return the cells of a customer in a plan, under `CUSTOMER_HEADS`; `served` holds its flows by origin."""
    several = len(served) > 1
    origins = [
        f"{name_shown(origin)} ({goods_text(study, formats, _by_good(served[origin]))})"
        if several
        else name_shown(origin)
        for origin in line.origins
        if origin in served
    ]
    flows = [flow for part in served.values() for flow in part]
    marginal = [
        f"{'' if len(study.all_goods) == 1 else name_shown(good) + ' '}{formats.money(money)} per {unit_shown(study)}"
        for good, money in line.marginal_cost.items()
    ]
    return [
        place_text(row, row.customer),
        goods_text(study, formats, demand),
        ", ".join(origins),
        distance_text(formats, flows) if flows else "",
        formats.money_a_year(line.cost_to_serve) if flows else "",
        ", ".join(marginal),
    ]


def _by_good(flows: Sequence[Flow]) -> dict[str, float]:
    amounts: dict[str, float] = {}
    for flow in flows:
        amounts[flow.good] = amounts.get(flow.good, 0.0) + flow.amount
    return amounts


def lane_facts(study: Study, formats: Formats, flows: Sequence[Flow]) -> list[str]:
    """Return the cells of one lane, all its goods together, under `LANE_HEADS`."""
    return [
        flows[0].leg.value,
        distance_text(formats, flows),
        goods_text(study, formats, _by_good(flows)),
        formats.money_a_year(sum(flow.cost for flow in flows)),
        ", ".join(name_shown(name) for name in dict.fromkeys(flow.tariff for flow in flows) if name),
    ]


def given_site_facts(study: Study, formats: Formats, row: SiteRow) -> list[str]:
    """Return the cells of a site as given, under `GIVEN_SITE_HEADS`; a site with sizes shows their range."""
    sizes = [option for option in study.options if option.site == row.site]
    charges = [option.yearly_charge for option in sizes]
    openings = [option.opening_charge for option in sizes if option.opening_charge]
    least, most = min(option.capacity for option in sizes), max(option.capacity for option in sizes)
    capacity = _capacity_text(study, formats, most)
    return [
        row.standing.value,
        place_text(row, row.site),
        capacity if least == most else f"{formats.number(least)} to {capacity}",
        _range(formats, charges, "a year"),
        _range(formats, openings, "once"),
        _once(formats, row.closing_charge),
        f"{formats.money(row.handling_rate)} per {load_unit(study)}" if row.handling_rate else "",
        "" if row.ruling is SiteRuling.FREE else row.ruling.value,
    ]


def _range(formats: Formats, money: Sequence[float], when: str) -> str:
    if not money:
        return ""
    low, high = min(money), max(money)
    text = formats.money(high) if low == high else f"{formats.number(low)} to {formats.money(high)}"
    return f"{text} {when}"


def given_supplier_facts(study: Study, formats: Formats, row: SupplierRow) -> list[str]:
    """Return the cells of a supplier as given, under `GIVEN_SUPPLIER_HEADS`."""
    return [
        row.standing.value,
        place_text(row, row.supplier),
        "" if row.capacity is None else _capacity_text(study, formats, row.capacity),
        formats.money_a_year(row.yearly_charge),
        _once(formats, row.signing_charge),
        _once(formats, row.dropping_charge),
        "" if row.ruling is SupplierRuling.FREE else row.ruling.value,
    ]


def given_customer_facts(study: Study, formats: Formats, row: CustomerRow, demand: Mapping[str, float]) -> list[str]:
    """Return the cells of a customer as given, under `GIVEN_CUSTOMER_HEADS`."""
    return [
        place_text(row, row.customer),
        goods_text(study, formats, demand),
        "" if row.reach_km is None else formats.distance(row.reach_km),
    ]
