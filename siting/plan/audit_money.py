"""The audit's checks of what a plan states: money, distances, emissions, proof and saving, from the tables."""

from __future__ import annotations

import math
from collections import defaultdict
from itertools import pairwise
from typing import TYPE_CHECKING

from siting.plan.audit_books import RELATIVE, differs, shown
from siting.plan.audit_limits import service_share
from siting.plan.audit_verdicts import every_one_once, opening_yearly, spread
from siting.plan.plan import CostLine
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from siting.plan.audit_books import Books, Move
    from siting.plan.plan import Band, CustomerLine


def check_money(books: Books) -> Iterator[str]:
    """Yield every stated amount of money that the tables do not give."""
    lines = lines_from_tables(books)
    currency, scale = books.study.settings.currency, sum(map(abs, lines.values()))
    for line, right in lines.items():
        stated = books.plan.cost_lines.get(line)
        if stated is None:
            yield f"cost line {line} is missing"
        elif differs(stated, right, scale):
            yield f"cost line {line} is stated as {shown(stated)} {currency} a year, the tables give {shown(right)}"
    total, cost = sum(lines.values()), books.plan.proof.cost
    if differs(books.plan.cost, total, scale):
        yield f"the cost lines add up to {shown(books.plan.cost)} {currency} a year, the tables give {shown(total)}"
    if cost is None or differs(cost, total, scale):
        yield f"the cost is stated as {shown(cost or 0.0)} {currency} a year, the tables give {shown(total)}"
    for move in books.moves:
        yield from _flow(move, currency)
    yield from _customers(books, scale)
    yield from _emissions(books)


def lines_from_tables(books: Books) -> dict[CostLine, float]:
    """Return every cost line, money a year, priced from the tables with the plan's verdicts and flows."""
    settings, lines = books.study.settings, dict.fromkeys(CostLine, 0.0)
    for site, row in books.sites.items():
        option = books.option(site)
        if option is not None:
            lines[CostLine.SITES] += option.yearly_charge
            lines[CostLine.OPENING] += 0.0 if option.standing == "running" else opening_yearly(settings, option)
        elif site in books.running:
            lines[CostLine.CLOSING] += spread(settings, row.closing_charge)
    for supplier, buys in books.suppliers.items():
        if books.is_signed(supplier):
            lines[CostLine.SUPPLIERS] += buys.yearly_charge
            lines[CostLine.SIGNING] += 0.0 if supplier in books.signed else spread(settings, buys.signing_charge)
        elif supplier in books.signed:
            lines[CostLine.DROPPING] += spread(settings, buys.dropping_charge)
    freight = {Leg.INBOUND: CostLine.INBOUND, Leg.OUTBOUND: CostLine.OUTBOUND, Leg.DIRECT: CostLine.DIRECT}
    for move in books.moves:
        lines[freight[move.flow.leg]] += move.freight
        lines[CostLine.DELIVERY] += move.delivery
        lines[CostLine.CARBON] += move.carbon
        lines[CostLine.HANDLING if move.flow.leg is Leg.OUTBOUND else CostLine.GOODS] += move.own
    return lines


def _flow(move: Move, currency: str) -> Iterator[str]:
    """Yield a flow whose cost or distance is not what the tables give."""
    flow = move.flow
    parts = abs(move.freight) + abs(move.delivery) + abs(move.own) + abs(move.carbon)
    if differs(flow.cost, move.cost, parts):
        yield f"{move.name} is stated to cost {shown(flow.cost)} {currency} a year, the tables give {shown(move.cost)}"
    if (flow.km is None) is not (move.km is None):
        yield f"{move.name}: road km is stated as {flow.km}, the tables give {move.km}"
    elif flow.km is not None and move.km is not None and differs(flow.km, move.km, move.km):
        yield f"{move.name} is stated to be {shown(flow.km)} km long, the tables give {shown(move.km)}"
    if flow.km is not None and flow.km_given is not move.km_given:
        yield f"{move.name}: its distance is {'given' if move.km_given else 'estimated'}, the plan says otherwise"
    named = move.tariffs.get(flow.tariff)
    if bool(flow.tariff) is not bool(move.tariffs) or (
        flow.tariff and (named is None or differs(named, move.freight, parts))
    ):
        right = min(move.tariffs, key=move.tariffs.__getitem__, default="")
        yield f"{move.name} is stated to go by tariff {flow.tariff!r}, the tables give {right!r}"


def _customers(books: Books, scale: float) -> Iterator[str]:
    """Yield customers whose line is not what the flows give."""
    yield from every_one_once("customer", (line.customer for line in books.plan.customers), books.customers)
    moves: dict[str, list[Move]] = defaultdict(list)
    for move in books.deliveries:
        moves[move.flow.destination].append(move)
    inbound = _average_inbound(books)
    for line in books.plan.customers:
        if line.customer in books.customers:
            yield from _customer(books, line, moves[line.customer], inbound, scale)
    variable = sum(move.cost for move in books.moves)
    stated = sum(line.cost_to_serve for line in books.plan.customers)
    if differs(stated, variable, scale):
        yield (
            f"the costs to serve add up to {shown(stated)} {books.study.settings.currency} a year, "
            f"everything that is not a charge to {shown(variable)}"
        )


def _average_inbound(books: Books) -> dict[tuple[str, str], float]:
    """Return the average inbound cost per unit of each site and good."""
    amount: dict[tuple[str, str], float] = defaultdict(float)
    money: dict[tuple[str, str], float] = defaultdict(float)
    for move in books.moves:
        if move.flow.leg is Leg.INBOUND:
            amount[move.flow.destination, move.flow.good] += move.flow.amount
            money[move.flow.destination, move.flow.good] += move.cost
    return {key: money[key] / units for key, units in amount.items() if units > 0}


def _customer(
    books: Books, line: CustomerLine, moves: list[Move], inbound: Mapping[tuple[str, str], float], scale: float
) -> Iterator[str]:
    """Yield what is wrong with one customer's line."""
    name, unit, currency = line.customer, books.study.settings.unit, books.study.settings.currency
    load: dict[str, float] = defaultdict(float)
    cost = 0.0
    for move in moves:
        load[move.flow.origin] += move.load
        cost += move.cost
        if move.flow.leg is Leg.OUTBOUND:
            cost += move.flow.amount * inbound.get((move.flow.origin, move.flow.good), 0.0)
    whole = sum(load.values())
    if differs(line.load, whole, whole):
        yield f"customer {name}: load is stated as {shown(line.load)} {unit}, the flows give {shown(whole)}"
    if set(line.origins) != set(load) or len(line.origins) != len(load):
        stated, right = (", ".join(origins) or "nowhere" for origins in (line.origins, load))
        yield f"customer {name}: served from {right}, stated as {stated}"
    elif len(load) > 1 and any(load[more] < load[less] - RELATIVE * whole for more, less in pairwise(line.origins)):
        yield f"customer {name}: its origins are not listed most load first"
    if differs(line.cost_to_serve, cost, scale):
        stated = f"{shown(line.cost_to_serve)} {currency} a year"
        yield f"customer {name}: cost to serve is stated as {stated}, the tables give {shown(cost)}"
    yield from _average(f"customer {name}", line.km, average_km(moves))
    if line.marginal_cost and books.study.is_single_sourced(books.customers[name]):
        yield f"customer {name} is single-sourced, for which no marginal cost is defined"
    for good, value in line.marginal_cost.items():
        if (name, good) not in books.demand or not math.isfinite(value):
            yield f"customer {name}: a marginal cost of {value} is stated for {good}"


def average_km(moves: list[Move]) -> float | None:
    """Return the average road km by load; None where nothing moves or a lane has no distance."""
    load, total = 0.0, 0.0
    for move in moves:
        if move.km is None:
            return None
        load += move.load
        total += move.load * move.km
    return total / load if load > 0 else None


def _average(who: str, stated: float | None, right: float | None) -> Iterator[str]:
    """Yield a wrong average distance."""
    if (stated is None) is not (right is None) or (
        stated is not None and right is not None and differs(stated, right, right)
    ):
        yield f"{who}: the average distance is stated as {stated} km, the flows give {right}"


def check_service(books: Books) -> Iterator[str]:
    """Yield wrong averages, bands and shares."""
    service, deliveries = books.plan.service, books.deliveries
    average = average_km(deliveries)
    yield from _average("the plan", service.average_km, average)
    whole = sum(move.load for move in deliveries)
    known = [move for move in deliveries if move.km is not None]
    guessed = sum(move.load for move in known if not move.km_given)
    shares = {
        "within service_km": (service.share_within, service_share(books)),
        "over estimated distances": (service.estimated_share, guessed / whole if known and whole > 0 else None),
    }
    for what, (stated, right) in shares.items():
        if (stated is None) is not (right is None) or (
            stated is not None and right is not None and differs(stated, right, 1.0)
        ):
            yield f"the share delivered {what} is stated as {stated}, the flows give {right}"
    if (average is not None) is not bool(service.bands):
        yield "distance bands are stated exactly where every used lane has a distance"
    yield from _bands(service.bands, known, whole)


def _bands(bands: tuple[Band, ...], moves: list[Move], whole: float) -> Iterator[str]:
    """Yield bands that do not follow on each other or hold another load than the flows."""
    for before, after in pairwise(bands):
        if before.to_km != after.above_km:
            yield f"the distance band above {shown(after.above_km)} km does not follow on the one before"
    for at, band in enumerate(bands):
        upper = math.inf if band.to_km is None else band.to_km
        load = least = 0.0
        for move in moves:
            km = move.km or 0.0
            inside = band.above_km < km <= upper or (at == 0 and km <= band.above_km)
            on_edge = math.isclose(km, band.above_km, rel_tol=RELATIVE) or math.isclose(km, upper, rel_tol=RELATIVE)
            load += move.load if inside or on_edge else 0.0
            least += move.load if inside and not on_edge else 0.0
        right = min(max(band.load, least), load)
        if differs(band.load, right, whole) or differs(band.share, band.load / whole, 1.0):
            stated = f"{shown(band.load)} ({band.share:.2%})"
            yield f"the distance band above {shown(band.above_km)} km is stated to hold {stated}, not {shown(right)}"
    if bands and differs(sum(band.share for band in bands), 1.0, 1.0):
        yield "the distance bands do not add up to 100 %"


def _emissions(books: Books) -> Iterator[str]:
    """Yield wrong emissions: tonnes CO2e are reported exactly where a factor is set and all distances are known."""
    reported = books.study.settings.emission_kg_per_tkm is not None and all(move.km is not None for move in books.moves)
    right = sum(move.kg_co2e for move in books.moves) / 1000.0 if reported else None
    stated = books.plan.tonnes_co2e
    if (stated is None) is not (right is None) or (
        stated is not None and right is not None and differs(stated, right, right)
    ):
        yield f"emissions are stated as {stated} t CO2e a year, the tables give {right}"
