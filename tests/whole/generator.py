"""
Random small studies with every feature switched on and off, for Hypothesis.

Numbers are whole or quarters, so that limits are met exactly as often as not, and sums are exact. Every draw shrinks
towards the plain study: one site, one customer, one lane, nothing else.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, TypeVar

from hypothesis import strategies as st

from siting.study.settings import Settings
from siting.study.tables import (
    CustomerRow,
    DemandRow,
    GoodRow,
    Leg,
    OfferRow,
    RuleKind,
    RuleRow,
    SiteRow,
    SiteRuling,
    SiteStanding,
    SizeRow,
    Study,
    SupplierRow,
    SupplierRuling,
    SupplierStanding,
)
from tests.building import LaneRow, lane_table

if TYPE_CHECKING:
    from collections.abc import Sequence

T = TypeVar("T")

FEATURES = (
    "suppliers",
    "suppliers only",
    "direct lanes",
    "sizes",
    "goods",
    "offers",
    "coordinates",
    "overrides",
    "bars",
    "reach",
    "rules",
    "pins",
    "counts",
    "budget",
    "service",
    "single sourcing",
    "least volumes",
    "running",
    "closing charges",
    "opening charges",
    "residual values",
    "carbon",
    "handling",
    "deliveries",
    "prices",
    "fractions",
)
"""What can be switched on."""


@dataclass(frozen=True, slots=True)
class Drawer:
    """Draws numbers for one study."""

    draw: st.DrawFn
    on: frozenset[str]

    def pick(self, options: Sequence[T]) -> T:
        """Return one of the options; the first is the plainest."""
        return self.draw(st.sampled_from(options))

    def flag(self, feature: str) -> bool:
        """Return a yes or no that is no where the feature is off."""
        return feature in self.on and self.draw(st.booleans())

    def number(self, low: int, high: int) -> float:
        """Return a whole number, or a quarter where fractions are on."""
        if "fractions" in self.on:
            return self.draw(st.integers(4 * low, 4 * high)) / 4
        return float(self.draw(st.integers(low, high)))

    def charge(self, feature: str, high: int) -> float:
        """Return a charge that is 0 where the feature is off."""
        return self.number(0, high) if feature in self.on else 0.0

    def capacity(self, high: int = 40) -> float:
        """Return a capacity that is often unlimited."""
        return math.inf if self.draw(st.booleans()) else self.number(4, high)

    def least(self, capacity: float) -> float:
        """Return a least volume within a capacity."""
        return min(self.number(0, 8), capacity) if self.flag("least volumes") else 0.0

    def degrees(self) -> tuple[float | None, float | None]:
        """Return a latitude and a longitude in Central Europe."""
        if "coordinates" not in self.on:
            return None, None
        return 46.0 + 0.5 * self.draw(st.integers(0, 6)), 10.0 + 0.5 * self.draw(st.integers(0, 6))

    @property
    def distances(self) -> bool:
        """Whether every lane must have a distance."""
        return bool(self.on & {"reach", "service", "carbon"})

    def km(self) -> float:
        """Return road km on the scale of the study."""
        return float(self.draw(st.integers(0, 20)) * (25 if "coordinates" in self.on else 1))


@st.composite
def studies(draw: st.DrawFn, on: Sequence[str] = (), rarity: int = 2) -> Study:
    """Return a study with the features of `on` and any others, each with a chance of 1 in `rarity` + 1."""
    drawn = {name for name in FEATURES if name in on or draw(st.integers(0, rarity)) == rarity}
    d = Drawer(draw, frozenset(_consistent(drawn)))
    goods = _goods(d)
    sites, sizes = _sites(d)
    suppliers = _suppliers(d)
    customers, demands = _customers(d, goods)
    study = Study(
        settings=_settings(d, len(sites)),
        sites=sites,
        sizes=sizes,
        suppliers=suppliers,
        customers=customers,
        goods=goods,
        demands=demands,
        offers=_offers(d, suppliers, goods),
        lanes=lane_table(_lanes(d, sites, suppliers, customers, goods)),
        rules=_rules(d, [*(row.site for row in sites), *(row.supplier for row in suppliers)]),
    )
    return _annualised(d, study)


def _consistent(on: set[str]) -> set[str]:
    """Return the features with those that they need, and without those that make no sense beside them."""
    on = set(on)
    if "residual values" in on:
        on.add("opening charges")
    if "closing charges" in on:
        on.add("running")
    if on & {"offers", "direct lanes", "prices", "suppliers only"}:
        on.add("suppliers")
    if "suppliers only" in on:
        on |= {"direct lanes"}
        on -= {"sizes", "handling", "counts"}
    return on


def _goods(d: Drawer) -> tuple[GoodRow, ...]:
    if "goods" not in d.on:
        return ()
    first = GoodRow(good="G1")
    return first, GoodRow(good="G2", load=d.pick((1.0, 2.0, 0.5)), weight_t=d.pick((1.0, 0.5, 3.0)))


def _sites(d: Drawer) -> tuple[tuple[SiteRow, ...], tuple[SizeRow, ...]]:
    sites: list[SiteRow] = []
    sizes: list[SizeRow] = []
    count = 0 if "suppliers only" in d.on else d.draw(st.integers(1, 4))
    for name in (f"S{n + 1}" for n in range(count)):
        standing = SiteStanding.RUNNING if d.flag("running") else SiteStanding.PROPOSED
        latitude, longitude = d.degrees()
        row = SiteRow(
            site=name,
            latitude=latitude,
            longitude=longitude,
            standing=standing,
            ruling=d.pick(tuple(SiteRuling)) if d.flag("pins") else SiteRuling.FREE,
            closing_charge=_closing(d, standing),
            handling_rate=d.charge("handling", 3),
        )
        if d.flag("sizes"):
            running = d.pick((0, 1)) if standing is SiteStanding.RUNNING else -1
            sizes += [_size(d, name, f"size {n + 1}", is_running=n == running) for n in range(2)]
        else:
            size = _size(d, name, "", is_running=False)
            row = replace(
                row,
                opening_charge=size.opening_charge,
                yearly_charge=size.yearly_charge,
                capacity=size.capacity,
                least_throughput=size.least_throughput,
                residual_value=size.residual_value,
            )
        sites.append(row)
    return tuple(sites), tuple(sizes)


def _closing(d: Drawer, standing: SiteStanding) -> float:
    if standing is SiteStanding.PROPOSED or "closing charges" not in d.on:
        return 0.0
    return float(d.draw(st.integers(0, 60))) - 20.0 * d.draw(st.integers(0, 1))


def _size(d: Drawer, site: str, size: str, *, is_running: bool) -> SizeRow:
    opening, capacity = d.charge("opening charges", 60), d.capacity()
    return SizeRow(
        site=site,
        size=size,
        standing=SiteStanding.RUNNING if is_running else SiteStanding.PROPOSED,
        opening_charge=opening,
        yearly_charge=d.number(0, 30),
        capacity=capacity,
        least_throughput=d.least(capacity),
        residual_value=min(d.charge("residual values", 20), opening),
    )


def _suppliers(d: Drawer) -> tuple[SupplierRow, ...]:
    rows = []
    count = d.draw(st.integers(1, 2)) if "suppliers" in d.on else 0
    for n in range(count):
        latitude, longitude = d.degrees()
        standing = SupplierStanding.SIGNED if d.flag("running") else SupplierStanding.OFFERED
        capacity = d.capacity()
        rows.append(
            SupplierRow(
                supplier=f"K{n + 1}",
                latitude=latitude,
                longitude=longitude,
                standing=standing,
                ruling=d.pick(tuple(SupplierRuling)) if d.flag("pins") else SupplierRuling.FREE,
                signing_charge=d.charge("opening charges", 40),
                dropping_charge=d.charge("closing charges", 40) if standing is SupplierStanding.SIGNED else 0.0,
                yearly_charge=d.number(0, 15),
                capacity=capacity,
                least_yearly=d.least(capacity),
                unit_price=0.0 if "offers" in d.on else d.charge("prices", 6),
            )
        )
    return tuple(rows)


def _customers(d: Drawer, goods: tuple[GoodRow, ...]) -> tuple[tuple[CustomerRow, ...], tuple[DemandRow, ...]]:
    customers: list[CustomerRow] = []
    demands: list[DemandRow] = []
    for n in range(d.draw(st.integers(1, 4))):
        latitude, longitude = d.degrees()
        row = CustomerRow(
            customer=f"C{n + 1}",
            latitude=latitude,
            longitude=longitude,
            demand=None if goods else _demand(d, n == 0),
            reach_km=max(d.km(), 1.0) if d.flag("reach") else None,
            single_source=d.pick((None, True, False)) if "single sourcing" in d.on else None,
        )
        customers.append(row)
        for position, good in enumerate(goods):
            amount = _demand(d, n == 0 and position == 0)
            if amount or d.draw(st.booleans()):
                demands.append(DemandRow(customer=row.customer, good=good.good, demand=amount))
    return tuple(customers), tuple(demands)


def _demand(d: Drawer, is_first: bool) -> float:  # noqa: FBT001 - one call a line reads better without the name
    return d.number(1 if is_first else 0, 9)


def _offers(d: Drawer, suppliers: tuple[SupplierRow, ...], goods: tuple[GoodRow, ...]) -> tuple[OfferRow, ...]:
    """Return offers in which every good is offered by the first supplier at least."""
    if "offers" not in d.on:
        return ()
    rows = []
    for n, supplier in enumerate(suppliers):
        for good in goods or (GoodRow(good="goods"),):
            if n and d.draw(st.booleans()):
                continue
            capacity = d.capacity()
            rows.append(
                OfferRow(
                    supplier=supplier.supplier,
                    good=good.good,
                    unit_price=d.charge("prices", 6),
                    capacity=capacity,
                    least_yearly=d.least(capacity),
                )
            )
    return tuple(rows)


def _settings(d: Drawer, sites: int) -> Settings:
    values: dict[str, object] = {}
    if "coordinates" in d.on:
        values |= {
            "outbound_rate": d.draw(st.integers(1, 4)) / 128,
            "inbound_rate": d.draw(st.integers(0, 3)) / 128,
            "circuity": d.pick((1.0, 1.25)),
        }
    else:
        values |= {"outbound_rate": d.number(0, 1), "inbound_rate": d.number(0, 1)}
    if "deliveries" in d.on:
        values |= {"drop_charge": d.number(1, 8), "drop_size": d.pick((1.0, 2.0, 4.0))}
    if "service" in d.on:
        values |= {"service_km": max(d.km(), 1.0), "service_share": d.pick((0.0, 0.25, 0.5, 0.75, 0.9375))}
    if "carbon" in d.on:
        values |= {"emission_kg_per_tkm": d.pick((0.125, 1.0)), "carbon_price_per_t": d.pick((0.0, 64.0, 256.0))}
    if "single sourcing" in d.on:
        values["single_source"] = d.draw(st.booleans())
    if "budget" in d.on:
        values["one_off_budget"] = float(d.draw(st.integers(0, 100)))
    if "counts" in d.on:
        fewest = d.draw(st.integers(0, sites))
        values |= {"fewest_sites": fewest, "most_sites": d.draw(st.integers(fewest, sites))}
    return Settings(title="random", currency="EUR", unit="t", **values)  # type: ignore[arg-type]  # one of each kind


def _annualised(d: Drawer, study: Study) -> Study:
    """Return the study with an interest rate and a life where any money is paid once."""
    once = [
        *(value for row in study.options for value in (row.opening_charge, row.residual_value)),
        *(row.closing_charge for row in study.sites),
        *(value for row in study.suppliers for value in (row.signing_charge, row.dropping_charge)),
    ]
    if not any(once):
        return study
    rate, years = d.pick((0.0, 0.25, 0.08)), d.pick((1.0, 4.0, 10.0))
    return replace(study, settings=replace(study.settings, interest_rate=rate, life_years=years))


def _lanes(
    d: Drawer,
    sites: tuple[SiteRow, ...],
    suppliers: tuple[SupplierRow, ...],
    customers: tuple[CustomerRow, ...],
    goods: tuple[GoodRow, ...],
) -> list[LaneRow]:
    site_names = [row.site for row in sites]
    supplier_names = [row.supplier for row in suppliers]
    customer_names = [row.customer for row in customers]
    legs = [(Leg.INBOUND, supplier_names, site_names), (Leg.OUTBOUND, site_names, customer_names)]
    if "direct lanes" in d.on:
        legs.append((Leg.DIRECT, supplier_names, customer_names))
    rows: list[LaneRow] = []
    for leg, origins, destinations in legs:
        for origin in origins:
            for destination in destinations:
                rows += _pair(d, LaneRow(leg=leg, origin=origin, destination=destination), goods)
    return rows


def _pair(d: Drawer, bare: LaneRow, goods: tuple[GoodRow, ...]) -> list[LaneRow]:
    """Return the rows of one origin and destination: none, one for every good, and one for a single good."""
    rows = []
    is_left_to_coordinates = "coordinates" in d.on and bare.leg is not Leg.DIRECT
    if not (is_left_to_coordinates or d.draw(st.integers(0, 7)) == 7) or d.flag("overrides"):
        rows.append(_override(d, bare))
    if goods and d.flag("overrides"):
        rows.append(_override(d, replace(bare, good=d.pick(goods).good)))
    return rows


def _override(d: Drawer, bare: LaneRow) -> LaneRow:
    row = bare
    if "bars" in d.on and d.draw(st.integers(0, 3)) == 3:
        row = replace(row, barred=True)
    given = d.pick(("cost", "both", "km"))
    if given != "km":
        row = replace(row, unit_cost=d.number(0, 9))
    if given != "cost" or (d.distances and "coordinates" not in d.on):
        row = replace(row, road_km=d.km())
    return row


def _rules(d: Drawer, names: list[str]) -> tuple[RuleRow, ...]:
    if "rules" not in d.on:
        return ()
    rows = []
    for _ in range(d.draw(st.integers(1, 2))):
        kind = d.pick(tuple(RuleKind))
        counted = kind in {RuleKind.AT_MOST, RuleKind.AT_LEAST}
        if len(names) == 1 and not counted:
            continue
        members = d.draw(st.permutations(names))[: d.draw(st.integers(1 if counted else 2, len(names)))]
        number = d.draw(st.integers(0, len(members))) if counted else None
        rows.append(RuleRow(rule=kind, members=tuple(members), number=number))
    return tuple(rows)
