"""The map of what was given, before any plan: sites and suppliers by standing, customers by demand."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.sharing import looks, map_facts
from siting.sharing.map_data import demand_by_customer, dots_json, frame_json, loads_of, located, symbols_json
from siting.sharing.map_facts import name_shown
from siting.study.tables import SiteStanding, SupplierStanding

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.sharing.map_data import Json, Located
    from siting.study.tables import Study


def given_json(study: Study, *, headline: str | None = None, fingerprint: str = "", locale: str = "en") -> Json:
    """
    Return the map of what was given.

    Parameters
    ----------
    study
        A checked study.
    headline
        What stands above the map; None counts what the study holds.
    fingerprint
        Of the study; empty = not shown.
    locale
        Whose separators numbers carry.

    Returns
    -------
    payload
        Values for `json.dumps`, of the same form as `map_data.plan_json` but without lanes.
    """
    where = located(study, locale)
    demand = demand_by_customer(study)
    loads = {customer: loads_of(study, goods) for customer, goods in demand.items()}
    if headline is None:
        headline = _headline(where, sum(sum(load) for load in loads.values()))
    return {
        **frame_json(where, kind="given", headline=headline, fingerprint=fingerprint, notes=()),
        "warnings": [looks.shortened(str(warning), 400) for warning in study.warnings],
        "site_heads": map_facts.GIVEN_SITE_HEADS,
        "supplier_heads": map_facts.GIVEN_SUPPLIER_HEADS,
        "customer_heads": map_facts.GIVEN_CUSTOMER_HEADS,
        "lane_heads": (),
        "site_symbols": symbols_json(looks.SITE_STANDING_SYMBOLS.items()),
        "supplier_symbols": symbols_json(looks.SUPPLIER_STANDING_SYMBOLS.items()),
        "sites": [
            {
                "name": name_shown(row.site),
                "label": looks.label(row.site),
                "spot": where.spot(row),
                "key": row.standing.value,
                "active": row.standing is SiteStanding.RUNNING,
                "level": None,
                "level_text": "",
                "brief": facts[2] if row.standing is SiteStanding.RUNNING else "",
                "note": "" if row.ruling.value == "free" else row.ruling.value,
                "facts": facts,
            }
            for row in study.sites
            for facts in [map_facts.given_site_facts(study, where.formats, row)]
        ],
        "suppliers": [
            {
                "name": name_shown(row.supplier),
                "label": looks.label(row.supplier),
                "spot": where.spot(row),
                "key": row.standing.value,
                "active": row.standing is SupplierStanding.SIGNED,
                "brief": "",
                "note": "" if row.ruling.value == "free" else row.ruling.value,
                "facts": map_facts.given_supplier_facts(study, where.formats, row),
            }
            for row in study.suppliers
        ],
        "customers": _customers(where, demand, loads),
        "lanes": [],
        "legs": [],
        "dots": dots_json(where, (sum(load) for load in loads.values())),
        "bands": [],
        "service_km": study.settings.service_km,
        "service_text": "",
    }


def _customers(
    where: Located, demand: Mapping[str, Mapping[str, float]], loads: Mapping[str, list[float]]
) -> list[Json]:
    return [
        {
            "name": name_shown(row.customer),
            "spot": where.spot(row),
            "load": loads[row.customer],
            "band": 2,
            "beyond": False,
            "facts": map_facts.given_customer_facts(where.study, where.formats, row, demand[row.customer]),
        }
        for row in where.study.customers
    ]


def _headline(where: Located, load: float) -> str:
    """Return what the study holds, in one sentence."""
    study = where.study
    running = sum(row.standing is SiteStanding.RUNNING for row in study.sites)
    signed = sum(row.standing is SupplierStanding.SIGNED for row in study.suppliers)
    parts = []
    if study.sites:
        parts.append(f"{_count(len(study.sites), 'site')} ({running} running, {len(study.sites) - running} proposed)")
    if study.suppliers:
        offered = len(study.suppliers) - signed
        parts.append(f"{_count(len(study.suppliers), 'supplier')} ({signed} signed, {offered} offered)")
    need = map_facts.load_text(study, where.formats, load)
    verb = "needs" if len(study.customers) == 1 else "need"
    parts.append(f"{_count(len(study.customers), 'customer')} that {verb} {need} a year")
    return f"Given: {', '.join(parts)}."


def _count(number: int, word: str) -> str:
    return f"{number:,} {word if number == 1 else word + 's'}"
