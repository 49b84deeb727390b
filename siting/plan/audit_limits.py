"""The audit's checks of what moves: demand, balance, capacities, least volumes, lanes, service, single sourcing."""

from __future__ import annotations

import math
from collections import defaultdict
from typing import TYPE_CHECKING

from siting.plan.audit_books import differs, exceeds, shown
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.plan.audit_books import Books


SMALL_NEED = 1e6
"""A need this many times smaller than all demand is allowed no more slack than a thousandth of itself."""


def check_limits(books: Books) -> Iterator[str]:
    """Yield every amount that breaks a limit of the tables."""
    for flow, what in books.strangers:
        yield f"flow of {flow.good} from {flow.origin} to {flow.destination}: {what} is in no table it could be from"
    yield from _lanes(books)
    yield from _demand(books)
    yield from _balance(books)
    yield from _sites(books)
    yield from _suppliers(books)
    yield from _offers(books)
    yield from _single_sourcing(books)
    yield from _service_share(books)


def _lanes(books: Books) -> Iterator[str]:
    """Yield flows on lanes that may not be used, at shut sites, from unsigned suppliers, or of no real amount."""
    unit, seen = books.study.settings.unit, set()
    for move in books.moves:
        flow, lane = move.flow, (move.flow.leg, move.flow.origin, move.flow.destination, move.flow.good)
        if lane in seen:
            yield f"{move.name} is listed more than once"
        seen.add(lane)
        if not (math.isfinite(flow.amount) and flow.amount > 0):
            yield f"{move.name} is {flow.amount} {unit}; a flow is above 0"
        if move.refusal:
            yield f"{move.name} ({shown(flow.amount)} {unit}) may not be: {move.refusal}"
        site = {Leg.INBOUND: flow.destination, Leg.OUTBOUND: flow.origin}.get(flow.leg)
        if site is not None and not books.is_open(site):
            amount = shown(flow.amount)
            yield f"{move.name}: {amount} {unit} move through site {site}, which is not open and pays no charge"
        if flow.leg is not Leg.OUTBOUND and not books.is_signed(flow.origin):
            amount = shown(flow.amount)
            yield f"{move.name}: {amount} {unit} come from supplier {flow.origin}, which is not signed"


def _demand(books: Books) -> Iterator[str]:
    """Yield customers and goods that get less or more than they need."""
    unit, whole = books.study.settings.unit, sum(books.demand.values())
    got: dict[tuple[str, str], float] = defaultdict(float)
    for move in books.deliveries:
        got[move.flow.destination, move.flow.good] += move.flow.amount
    for key in {**books.demand, **got}:
        need = books.demand.get(key, 0.0)
        if differs(got[key], need, min(whole, SMALL_NEED * need)):
            yield f"customer {key[0]} needs {shown(need)} {unit} of {key[1]} and gets {shown(got[key])}"


def _balance(books: Books) -> Iterator[str]:
    """Yield sites and goods where inflow is not outflow; without suppliers goods appear at the sites."""
    if not books.suppliers:
        return
    inflow: dict[tuple[str, str], float] = defaultdict(float)
    outflow: dict[tuple[str, str], float] = defaultdict(float)
    for move in books.moves:
        if move.flow.leg is Leg.INBOUND:
            inflow[move.flow.destination, move.flow.good] += move.flow.amount
        elif move.flow.leg is Leg.OUTBOUND:
            outflow[move.flow.origin, move.flow.good] += move.flow.amount
    whole = sum(books.demand.values())
    for key in {**inflow, **outflow}:
        if differs(inflow[key], outflow[key], whole):
            yield (
                f"site {key[0]} takes in {shown(inflow[key])} {books.study.settings.unit} of {key[1]} "
                f"and sends out {shown(outflow[key])}"
            )


def _sites(books: Books) -> Iterator[str]:
    """Yield sites above capacity, below their least throughput, or with wrong totals."""
    unit, out = books.study.settings.unit, books.load_of("origin", Leg.OUTBOUND)
    into = books.load_of("destination", Leg.INBOUND)
    served: dict[str, set[str]] = defaultdict(set)
    for move in books.moves:
        if move.flow.leg is Leg.OUTBOUND:
            served[move.flow.origin].add(move.flow.destination)
    for site, line in books.site_lines.items():
        option, load = books.option(site) if site in books.sites else None, out[site]
        if differs(line.throughput, load, books.all_load):
            yield f"site {site}: throughput is stated as {shown(line.throughput)} {unit}, the flows give {shown(load)}"
        if line.customers != len(served[site]):
            yield f"site {site}: {line.customers} customers are stated, the flows serve {len(served[site])}"
        if option is None:
            continue
        most, least = max(load, into[site]), option.least_throughput
        if exceeds(most, option.capacity, books.all_load):
            yield f"site {site}: {shown(most)} {unit} move through it, its capacity is {shown(option.capacity)}"
        if not books.of_today and exceeds(least, load, books.all_load):
            yield f"site {site}: {shown(load)} {unit} move through it, its least throughput is {shown(least)}"


def _suppliers(books: Books) -> Iterator[str]:
    """Yield suppliers above capacity, below their least volume, or with wrong totals; over all goods, in load."""
    unit, volume = books.study.settings.unit, books.load_of("origin", Leg.INBOUND, Leg.DIRECT)
    for name, row in books.suppliers.items():
        line, load = books.supplier_lines.get(name), volume[name]
        if line is not None and differs(line.volume, load, books.all_load):
            yield f"supplier {name}: volume is stated as {shown(line.volume)} {unit}, the flows give {shown(load)}"
        if row.capacity is not None and exceeds(load, row.capacity, books.all_load):
            yield f"supplier {name} delivers {shown(load)} {unit}, its capacity is {shown(row.capacity)}"
        if not books.of_today and books.is_signed(name) and exceeds(row.least_yearly, load, books.all_load):
            yield f"supplier {name} delivers {shown(load)} {unit}, its least yearly volume is {shown(row.least_yearly)}"


def _offers(books: Books) -> Iterator[str]:
    """Yield offers above capacity or below their least volume, in the good's own unit."""
    unit, whole = books.study.settings.unit, sum(books.demand.values())
    bought: dict[tuple[str, str], float] = defaultdict(float)
    for move in books.moves:
        if move.flow.leg is not Leg.OUTBOUND:
            bought[move.flow.origin, move.flow.good] += move.flow.amount
    for (supplier, good), offer in books.offers.items():
        amount, least = bought[supplier, good], offer.least_yearly
        if offer.capacity is not None and exceeds(amount, offer.capacity, whole):
            yield f"supplier {supplier} delivers {shown(amount)} {unit} of {good}, its offer is {shown(offer.capacity)}"
        if not books.of_today and books.is_signed(supplier) and exceeds(least, amount, whole):
            yield f"supplier {supplier} delivers {shown(amount)} {unit} of {good}, the least is {shown(least)}"


def _single_sourcing(books: Books) -> Iterator[str]:
    """Yield customers that must have one origin and have several."""
    origins: dict[str, set[tuple[Leg, str]]] = defaultdict(set)
    for move in books.deliveries:
        origins[move.flow.destination].add((move.flow.leg, move.flow.origin))
    for name, row in books.customers.items():
        if books.study.is_single_sourced(row) and len(origins[name]) > 1:
            listed = ", ".join(sorted(origin for _, origin in origins[name]))
            yield f"customer {name} must be served whole from one origin and is served from {listed}"


def service_share(books: Books) -> float | None:
    """Return the share of weight delivered within service_km; None where it is not set."""
    service_km = books.study.settings.service_km
    if service_km is None:
        return None
    whole = sum(move.tonnes for move in books.deliveries)
    near = sum(
        move.tonnes for move in books.deliveries if move.km is not None and not exceeds(move.km, service_km, service_km)
    )
    return near / whole if whole else 1.0


def _service_share(books: Books) -> Iterator[str]:
    """Yield a service share that is too low; today ignores it."""
    asked, reached = books.study.settings.service_share, service_share(books)
    if books.of_today or asked is None or reached is None:
        return
    if exceeds(asked, reached, 1.0):
        yield (
            f"{reached:.4%} of the weight is delivered within {shown(books.study.settings.service_km or 0.0)} km, "
            f"service_share asks for {asked:.4%}"
        )
