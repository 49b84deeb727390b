"""
All that the map draws and says, as plain values ready for JSON.

Numbers that place, size or fill a symbol are the plan's own, unrounded; everything a reader reads is text made by
`looks.Formats`. Nothing here is HTML: the page builds it from text only.
"""

from __future__ import annotations

import math
import re
from bisect import bisect_left
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from siting.plan.freight_words import circuity_words
from siting.plan.plan import SiteVerdict, SupplierVerdict
from siting.plan.service import BAND_EDGES_KM
from siting.plan.words import CAUTIONS
from siting.sharing import looks, map_facts
from siting.sharing.backdrop import ATTRIBUTION, backdrop, box_around
from siting.sharing.map_facts import name_shown

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from siting.plan.plan import Flow, Plan
    from siting.sharing.backdrop import Box
    from siting.sharing.looks import Formats, Symbol
    from siting.study.tables import CustomerRow, SiteRow, Study, SupplierRow

Json = dict[str, Any]
"""Values for `json.dumps`."""

LEGS = ("outbound", "inbound", "direct")
OPEN_VERDICTS = frozenset({SiteVerdict.KEEP, SiteVerdict.OPEN})
SIGNED_VERDICTS = frozenset({SupplierVerdict.STAY, SupplierVerdict.SIGN})
FINGERPRINT_LENGTH = 12
"""Characters of the fingerprint that the map shows."""
TOWN_NEAR_KM = 12.0
"""A town this near to a site or supplier is not named: the symbol's own label says where it is."""
TOWN_NEAR_SHARE = 0.02
"""The same as a share of the box's width, which counts where it is less: within a city, its name stays."""
KM_PER_DEGREE = 111.2


@dataclass(frozen=True, slots=True)
class Located:
    """The rows of a study with the box around those that have coordinates; None where none has."""

    study: Study
    formats: Formats
    box: Box | None

    def spot(self, row: SiteRow | SupplierRow | CustomerRow) -> list[float] | None:
        """Return latitude and longitude within the box, None where the row has none."""
        if row.latitude is None or row.longitude is None or self.box is None:
            return None
        return [row.latitude, self.box.longitude(row.longitude)]


def located(study: Study, locale: str) -> Located:
    """Return the study with its box and number formats."""
    rows: list[SiteRow | SupplierRow | CustomerRow] = [*study.sites, *study.suppliers, *study.customers]
    spots = [(row.latitude, row.longitude) for row in rows if row.latitude is not None and row.longitude is not None]
    box = box_around([spot[0] for spot in spots], [spot[1] for spot in spots]) if spots else None
    formats = looks.Formats(currency=study.settings.currency, unit=map_facts.unit_shown(study), locale=locale)
    return Located(study, formats, box)


def base_json(where: Located) -> Json | None:
    """Return outlines, town names and extent; None where nothing has coordinates."""
    if where.box is None:
        return None
    behind, box = backdrop(where.box), where.box
    near_km = min(TOWN_NEAR_KM, TOWN_NEAR_SHARE * box.width * KM_PER_DEGREE)
    rows: list[SiteRow | SupplierRow] = [*where.study.sites, *where.study.suppliers]
    symbols = [spot for row in rows if (spot := where.spot(row))]
    towns = [
        [place.name, place.latitude, place.longitude]
        for place in behind.places
        if all(_apart_km(place.latitude, place.longitude, *spot) > near_km for spot in symbols)
    ]
    return {
        "box": [box.south, box.west, box.north, box.east],
        "wide": [behind.box.south, behind.box.west, behind.box.north, behind.box.east],
        "decimals": behind.decimals,
        "land": behind.land,
        "lakes": behind.lakes,
        "borders": behind.borders,
        "towns": towns,
    }


def _apart_km(latitude: float, longitude: float, latitude_b: float, longitude_b: float) -> float:
    """Return roughly how far two spots near each other are apart."""
    east = (longitude - longitude_b) * math.cos(math.radians(latitude))
    return math.hypot(east, latitude - latitude_b) * KM_PER_DEGREE


def missing_notes(where: Located) -> list[str]:
    """Return a note on the rows that have no coordinates and so are not drawn; none where all have."""
    study = where.study
    tables: list[tuple[Sequence[SiteRow | SupplierRow | CustomerRow], str]] = [
        (study.sites, "site"),
        (study.suppliers, "supplier"),
        (study.customers, "customer"),
    ]
    counts = [(sum(where.spot(row) is None for row in rows), word) for rows, word in tables]
    parts = [f"{count} {word if count == 1 else word + 's'}" for count, word in counts if count]
    if not parts:
        return []
    verb = "has" if sum(count for count, _ in counts) == 1 else "have"
    return [f"{', '.join(parts)} {verb} no coordinates and so no place on the map; the tables below list all."]


def symbols_json(symbols: Iterable[tuple[str, Symbol]]) -> list[Json]:
    """Return the symbols in the order of the legend."""
    return [{"key": str(key), **symbol.as_json()} for key, symbol in symbols]


def dots_json(where: Located, loads: Iterable[float]) -> Json:
    """Return how customers are sized: the load of the largest dot and two samples for the legend."""
    return {
        "largest": looks.LARGEST_DOT_PX,
        "smallest": looks.SMALLEST_DOT_PX,
        **_scale(where, max(loads, default=0.0), (1.0, 0.1)),
    }


def _scale(where: Located, most: float, parts: Sequence[float]) -> Json:
    """Return the largest load and round samples of parts of it, each with its text."""
    values = [_round_down(most * part) for part in parts if most > 0]
    samples = [[value, where.formats.amount(value)] for value in values]
    return {"most": most, "samples": samples}


def _round_down(value: float) -> float:
    """Return the largest of 1, 2 or 5 times a power of ten that is at most the value; 0 for 0."""
    if value <= 0:
        return 0.0
    power = 10.0 ** math.floor(math.log10(value))
    return max(step * power for step in (1.0, 2.0, 5.0) if step * power <= value * (1 + 1e-12))


def demand_by_customer(study: Study) -> dict[str, dict[str, float]]:
    """Return each customer's units of each good a year."""
    demand: dict[str, dict[str, float]] = {row.customer: {} for row in study.customers}
    for row in study.all_demands:
        goods = demand.setdefault(row.customer, {})
        goods[row.good] = goods.get(row.good, 0.0) + row.demand
    return demand


def loads_of(study: Study, amounts: Mapping[str, float]) -> list[float]:
    """Return the load of the amounts, one number a good in the order of the study."""
    return [amounts.get(good.good, 0.0) * good.load for good in study.all_goods]


def frame_json(where: Located, *, kind: str, headline: str, fingerprint: str, notes: Sequence[str]) -> Json:
    """Return what every map carries whatever it shows: words, colours, base."""
    study = where.study
    return {
        "kind": kind,
        "title": name_shown(study.settings.title),
        "headline": shortened_headline(headline),
        "fingerprint": fingerprint[:FINGERPRINT_LENGTH],
        "notes": [*missing_notes(where), *notes],
        "cautions": list(CAUTIONS),
        "attribution": ATTRIBUTION,
        "goods": [name_shown(good.good) for good in study.all_goods],
        "amounts_text": f"Amounts here: {map_facts.load_unit(study)} a year.",
        "base": base_json(where),
        "shades": list(looks.BAND_SHADES),
        "colours": {"paper": looks.PAPER, "slate": looks.SLATE, "shut": looks.SHUT, "ink": looks.INK},
    }


def shortened_headline(headline: str) -> str:
    """Return the headline at a length that leaves room for the map, numbers beside the words they belong to."""
    bound = re.sub(r"(?<=[\w(]) (?=\d)|(?<=\d) (?=[A-Z%])|(?<= M) (?=[A-Z]{3}\b)", looks.NO_BREAK, headline)
    return looks.shortened(bound, 400)


def plan_json(study: Study, plan: Plan, *, headline: str, locale: str = "en") -> Json:
    """
    Return the map of a plan.

    Parameters
    ----------
    study
        The study that the plan answers.
    plan
        Its verdicts and flows are drawn.
    headline
        One sentence, the answer.
    locale
        Whose separators numbers carry.

    Returns
    -------
    payload
        Values for `json.dumps`; `sites`, `suppliers` and `customers` in the order of the tables, lanes by position.
    """
    where = located(study, locale)
    demand = demand_by_customer(study)
    lanes = _lanes(where, plan)
    scales = {
        leg: {"widest": looks.WIDEST_LINE_PX, "hair": looks.HAIR_LINE_PX, **_leg_scale(where, lanes, leg)}
        for leg in LEGS
    }
    return {
        **frame_json(
            where, kind="plan", headline=headline, fingerprint=plan.fingerprint, notes=_distance_notes(where, plan)
        ),
        "warnings": [looks.shortened(warning, 400) for warning in plan.warnings],
        "site_heads": map_facts.SITE_HEADS,
        "supplier_heads": map_facts.SUPPLIER_HEADS,
        "customer_heads": map_facts.CUSTOMER_HEADS,
        "lane_heads": map_facts.LANE_HEADS,
        "site_symbols": symbols_json(looks.SITE_SYMBOLS.items()),
        "supplier_symbols": symbols_json(looks.SUPPLIER_SYMBOLS.items()),
        "sites": _sites(where, plan),
        "suppliers": _suppliers(where, plan),
        "customers": _customers(where, plan, demand),
        "lanes": lanes,
        "legs": [
            {"leg": leg, "colour": looks.LEG_LINES[leg][0], "dashes": looks.LEG_LINES[leg][1], **scales[leg]}
            for leg in LEGS
        ],
        "dots": dots_json(where, (sum(loads_of(study, goods)) for goods in demand.values())),
        "bands": _bands(where, plan),
        "service_km": study.settings.service_km,
        "service_text": _service_text(where, plan),
    }


def _leg_scale(where: Located, lanes: Sequence[Json], leg: str) -> Json:
    loads = [sum(lane["load"]) for lane in lanes if lane["leg"] == leg]
    most = max(loads, default=0.0)
    hair = most * looks.HAIR_LINE_PX / looks.WIDEST_LINE_PX
    text = f"up to {where.formats.amount(hair)}" if hair else ""
    return {**_scale(where, most, (1.0,)), "hair_text": text}


def _sites(where: Located, plan: Plan) -> list[Json]:
    lines = {line.site: line for line in plan.sites}
    sites: list[Json] = []
    for row in where.study.sites:
        line = lines[row.site]
        is_open = line.verdict in OPEN_VERDICTS
        level = line.utilisation
        brief = ""
        if is_open:
            volume = map_facts.load_text(where.study, where.formats, line.throughput)
            capacity = "" if line.capacity is None else f"{where.formats.number(line.throughput)} of "
            held = volume if line.capacity is None else map_facts.load_text(where.study, where.formats, line.capacity)
            brief = f"{capacity}{held}"
        elif line.one_off:
            brief = f"{where.formats.money(line.one_off)} once"
        sites.append(
            {
                "name": name_shown(row.site),
                "label": looks.label(row.site),
                "spot": where.spot(row),
                "key": line.verdict.value,
                "active": is_open,
                "level": level,
                "level_text": "" if level is None else where.formats.share(level),
                "throughput": line.throughput,
                "brief": brief,
                "note": name_shown(line.note),
                "facts": map_facts.site_facts(where.study, where.formats, row, line, is_open=is_open),
            }
        )
    return sites


def _suppliers(where: Located, plan: Plan) -> list[Json]:
    lines = {line.supplier: line for line in plan.suppliers}
    suppliers: list[Json] = []
    for row in where.study.suppliers:
        line = lines[row.supplier]
        is_signed = line.verdict in SIGNED_VERDICTS
        brief = map_facts.load_text(where.study, where.formats, line.volume) if is_signed else ""
        if not is_signed and line.one_off:
            brief = f"{where.formats.money(line.one_off)} once"
        suppliers.append(
            {
                "name": name_shown(row.supplier),
                "label": looks.label(row.supplier),
                "spot": where.spot(row),
                "key": line.verdict.value,
                "active": is_signed,
                "volume": line.volume,
                "brief": brief,
                "note": name_shown(line.note),
                "facts": map_facts.supplier_facts(where.study, where.formats, row, line, is_signed=is_signed),
            }
        )
    return suppliers


def _customers(where: Located, plan: Plan, demand: Mapping[str, Mapping[str, float]]) -> list[Json]:
    study = where.study
    lines = {line.customer: line for line in plan.customers}
    served: dict[str, dict[str, list[Flow]]] = {}
    for flow in plan.flows:
        if flow.leg.value != "inbound":
            served.setdefault(flow.destination, {}).setdefault(flow.origin, []).append(flow)
    customers: list[Json] = []
    for row in study.customers:
        line = lines[row.customer]
        limit = study.settings.service_km
        customers.append(
            {
                "name": name_shown(row.customer),
                "spot": where.spot(row),
                "load": loads_of(study, demand[row.customer]),
                "band": None if line.km is None else band_of(line.km),
                "beyond": limit is not None and line.km is not None and line.km > limit,
                "facts": map_facts.customer_facts(
                    study,
                    where.formats,
                    row,
                    line,
                    demand=demand[row.customer],
                    served=served.get(row.customer, {}),
                ),
            }
        )
    return customers


def band_of(km: float) -> int:
    """Return the position of the distance band, which holds its upper edge; the first holds 0 km as well."""
    return max(bisect_left(BAND_EDGES_KM, km) - 1, 0)


def _lanes(where: Located, plan: Plan) -> list[Json]:
    """Return one entry a lane, all its goods together, largest first so that small ones are drawn on top."""
    study = where.study
    position = {
        "site": {row.site: i for i, row in enumerate(study.sites)},
        "supplier": {row.supplier: i for i, row in enumerate(study.suppliers)},
        "customer": {row.customer: i for i, row in enumerate(study.customers)},
    }
    ends = {"outbound": ("site", "customer"), "inbound": ("supplier", "site"), "direct": ("supplier", "customer")}
    lanes: dict[tuple[str, str, str], list[Flow]] = {}
    for flow in plan.flows:
        lanes.setdefault((flow.leg.value, flow.origin, flow.destination), []).append(flow)
    entries: list[Json] = []
    for (leg, origin, destination), flows in lanes.items():
        amounts: dict[str, float] = {}
        for flow in flows:
            amounts[flow.good] = amounts.get(flow.good, 0.0) + flow.amount
        start, end = ends[leg]
        entries.append(
            {
                "leg": leg,
                "from": position[start][origin],
                "to": position[end][destination],
                "load": loads_of(study, amounts),
                "facts": map_facts.lane_facts(study, where.formats, flows),
            }
        )
    entries.sort(key=lambda entry: -sum(entry["load"]))
    return entries


def _bands(where: Located, plan: Plan) -> list[Json]:
    """Return the text of each distance band, its share of load where known, and its shade's position."""
    shares = {band_of(band.above_km + 1e-9): band for band in plan.service.bands}
    uppers = (*BAND_EDGES_KM[1:], None)
    bands: list[Json] = []
    number, distance = where.formats.number, where.formats.distance
    for i, (lower, upper) in enumerate(zip(BAND_EDGES_KM, uppers, strict=True)):
        band = shares.get(i)
        if band is not None and band.load == 0:
            continue
        text = f"over {distance(lower)}" if upper is None else f"{number(lower)} to {distance(upper)}"
        share = "" if band is None else where.formats.share(band.share)
        bands.append({"band": i, "text": text, "share": share})
    return bands


def _service_text(where: Located, plan: Plan) -> str:
    limit, share = where.study.settings.service_km, plan.service.share_within
    if limit is None:
        return ""
    reached = "" if share is None else f" ({where.formats.share(share)} of weight within)"
    return f"over {where.formats.distance(limit)} away{reached}"


def _distance_notes(where: Located, plan: Plan) -> list[str]:
    notes = []
    if plan.service.average_km is not None:
        average = where.formats.distance(plan.service.average_km)
        notes.append(f"Customers are {average} by road from what serves them, on average by load.")
    if plan.service.estimated_share:
        share = where.formats.share(plan.service.estimated_share)
        circuity = circuity_words(where.study)
        notes.append(f"Distances of {share} of the load are estimated: straight line times {circuity}.")
    return notes
