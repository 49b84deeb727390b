"""
The tables of a study as frozen, typed rows, and the study that holds them.

Amounts are in the study's unit per planning year, money in the study's currency. A row's `row` is its number in the
user's spreadsheet (the header is row 1). Blank means the default, except where a field is None: then blank is kept.
Lanes are held as columns, since there may be millions.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from enum import StrEnum
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.arrays import Flags, Floats, Positions
    from siting.errors import Fault
    from siting.study.settings import Settings

IMPLIED_GOOD = "goods"
"""Name of the only good of a study without a `goods` table."""


class SiteStanding(StrEnum):
    """What a site is now."""

    RUNNING = "running"
    PROPOSED = "proposed"


class SiteRuling(StrEnum):
    """What the analyst imposes on a site."""

    FREE = "free"
    PINNED_OPEN = "pinned-open"
    PINNED_SHUT = "pinned-shut"


class SupplierStanding(StrEnum):
    """What a supplier is now."""

    SIGNED = "signed"
    OFFERED = "offered"


class SupplierRuling(StrEnum):
    """What the analyst imposes on a supplier."""

    FREE = "free"
    PINNED_SIGNED = "pinned-signed"
    PINNED_UNSIGNED = "pinned-unsigned"


class Leg(StrEnum):
    """Which part of the way a lane is."""

    INBOUND = "inbound"
    """Supplier to site."""
    OUTBOUND = "outbound"
    """Site to customer."""
    DIRECT = "direct"
    """Supplier straight to customer (drop shipment)."""


class RuleKind(StrEnum):
    """What a rule asks of its members; a site member holds when open, a supplier member when signed."""

    ONE_OF = "one_of"
    """Exactly one."""
    NOT_TOGETHER = "not_together"
    """At most one."""
    TOGETHER = "together"
    """All or none."""
    NEEDS = "needs"
    """The first only if all the others."""
    AT_MOST = "at_most"
    """At most `number`."""
    AT_LEAST = "at_least"
    """At least `number`."""


class TariffBasis(StrEnum):
    """What a tariff's rate is paid for; load is amount times the good's load."""

    PER_UNIT_KM = "per_unit_km"
    """Per unit of load and road km."""
    PER_UNIT = "per_unit"
    """Per unit of load."""
    PER_DELIVERY = "per_delivery"
    """Per delivery, whatever its load."""
    PER_TRUCK = "per_truck"
    """Per truck, of which `truck_load` times `fill` is used."""
    PER_TRUCK_KM = "per_truck_km"
    """Per truck and road km."""


NO_ATTRIBUTES: Mapping[str, str] = {}


@dataclass(frozen=True, slots=True, kw_only=True)
class SiteRow:
    """One row of `sites`."""

    site: str
    place: str = ""
    country: str = ""
    latitude: float | None = None
    longitude: float | None = None
    standing: SiteStanding = SiteStanding.PROPOSED
    ruling: SiteRuling = SiteRuling.FREE
    opening_charge: float = 0.0
    """One-off money, paid when a proposed site opens."""
    yearly_charge: float = 0.0
    """Money a year while open."""
    closing_charge: float = 0.0
    """One-off money, paid when a running site closes; negative = sale proceeds."""
    capacity: float | None = None
    """Load a year; None = blank, `math.inf` = typed `unlimited`."""
    least_throughput: float = 0.0
    """Least load a year while open."""
    handling_rate: float = 0.0
    """Money per unit of load."""
    residual_value: float = 0.0
    """One-off money got back after life_years."""
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    """Columns the program does not know, as typed."""
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class CustomerRow:
    """One row of `customers`."""

    customer: str
    place: str = ""
    country: str = ""
    latitude: float | None = None
    longitude: float | None = None
    demand: float | None = None
    """Amount a year; None where `demands` holds it."""
    reach_km: float | None = None
    """Greatest road km to the customer; None = any."""
    single_source: bool | None = None
    """None = as the settings say."""
    drop_size: float | None = None
    """Load of one delivery; None = as the settings say."""
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class SupplierRow:
    """One row of `suppliers`."""

    supplier: str
    place: str = ""
    country: str = ""
    latitude: float | None = None
    longitude: float | None = None
    standing: SupplierStanding = SupplierStanding.OFFERED
    ruling: SupplierRuling = SupplierRuling.FREE
    signing_charge: float = 0.0
    """One-off money, paid when an offered supplier is signed."""
    dropping_charge: float = 0.0
    """One-off money, paid when a signed supplier is dropped."""
    yearly_charge: float = 0.0
    """Money a year while signed."""
    capacity: float | None = None
    """Load a year over all goods; None = blank, `math.inf` = typed `unlimited`."""
    least_yearly: float = 0.0
    """Least load a year over all goods while signed."""
    unit_price: float = 0.0
    """Money per unit of each good, where `offers` is absent."""
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class SizeRow:
    """One row of `sizes`: a size a site may have, at most one of them open."""

    site: str
    size: str
    standing: SiteStanding = SiteStanding.PROPOSED
    opening_charge: float = 0.0
    yearly_charge: float = 0.0
    capacity: float = math.inf
    least_throughput: float = 0.0
    residual_value: float = 0.0
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class GoodRow:
    """One row of `goods`."""

    good: str
    weight_t: float = 1.0
    """Tonnes per unit; emissions and service share go by it."""
    load: float = 1.0
    """Capacity used by one unit."""
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class DemandRow:
    """One row of `demands`: units of a good a customer needs a year."""

    customer: str
    good: str
    demand: float
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class OfferRow:
    """One row of `offers`: a good a supplier offers. Capacity and least volume in the good's own unit."""

    supplier: str
    good: str
    unit_price: float = 0.0
    """Money per unit of the good."""
    capacity: float | None = None
    """Units a year; None = blank, `math.inf` = typed `unlimited`."""
    least_yearly: float = 0.0
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleRow:
    """One row of `rules`."""

    rule: RuleKind
    members: tuple[str, ...]
    """Names of sites or suppliers; a name is never both."""
    number: int | None = None
    """For `at_most` and `at_least`."""
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class TariffRow:
    """
    One row of `tariffs`: what a tariff charges where it applies.

    A row applies where the leg and the countries it names are those of the lane, the road distance is above `from_km`
    (0 includes 0) and at most `to_km`, and one delivery is at least `from_size`.
    """

    tariff: str
    basis: TariffBasis
    rate: float
    """Money per what `basis` says."""
    leg: Leg | None = None
    """None = every leg."""
    from_country: str = ""
    """Of the origin; "" = any."""
    to_country: str = ""
    """Of the destination; "" = any."""
    from_km: float = 0.0
    to_km: float | None = None
    """None = without limit."""
    from_size: float = 0.0
    """Load of one delivery from which the row applies."""
    minimum: float = 0.0
    """Least money for one delivery, or for one truck."""
    truck_load: float | None = None
    """Load a full truck holds; only where the basis is per truck."""
    fill: float | None = None
    """Share of the truck that is used, in (0, 1]; None = 1; only where the basis is per truck."""
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class CircuityRow:
    """One row of `circuity`: road distance over straight-line distance within a country, or between two."""

    country: str
    circuity: float
    other_country: str = ""
    """"" = within the country."""
    source: str = ""
    """Where the factor comes from."""
    attributes: Mapping[str, str] = field(default_factory=lambda: NO_ATTRIBUTES)
    row: int = 0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LaneTable:
    """
    The `lanes` table as columns, all of shape (rows,).

    `origin`, `destination` and `good` are positions in `names` (-1 in `good` = every good); `leg` is a position in
    `LEGS`, resolved on reading also where the user left it blank.
    """

    LEGS = (Leg.INBOUND, Leg.OUTBOUND, Leg.DIRECT)

    names: tuple[str, ...]
    origin: Positions
    destination: Positions
    good: Positions
    leg: Positions
    road_km: Floats
    """NaN = blank."""
    unit_cost: Floats
    """Freight in money per unit: of the good where the row names one, else of load. NaN = blank."""
    barred: Flags
    row: Positions
    """Row in the user's spreadsheet."""
    attributes: Mapping[str, tuple[tuple[str, ...], Positions]] = field(default_factory=dict)
    """Columns the program does not know: their different texts, and each row's position among them (-1 = blank)."""

    def __len__(self) -> int:
        """Return the number of rows."""
        return int(self.origin.shape[0])


def no_lanes() -> LaneTable:
    """Return an empty `lanes` table."""
    none = np.zeros(0, dtype=np.int32)
    return LaneTable(
        names=(),
        origin=none,
        destination=none,
        good=none,
        leg=none,
        road_km=np.zeros(0),
        unit_cost=np.zeros(0),
        barred=np.zeros(0, dtype=np.bool_),
        row=none,
    )


@dataclass(frozen=True, kw_only=True, eq=False)
class Study:
    """One decision problem: its settings and tables, checked. Make one with `read_study`; derive with `replace`."""

    settings: Settings
    sites: tuple[SiteRow, ...] = ()
    customers: tuple[CustomerRow, ...] = ()
    suppliers: tuple[SupplierRow, ...] = ()
    sizes: tuple[SizeRow, ...] = ()
    goods: tuple[GoodRow, ...] = ()
    """Empty = the table is absent; use `all_goods`."""
    demands: tuple[DemandRow, ...] = ()
    """Empty = the table is absent; use `all_demands`."""
    offers: tuple[OfferRow, ...] = ()
    """Empty = the table is absent; use `all_offers`."""
    lanes: LaneTable = field(default_factory=no_lanes)
    rules: tuple[RuleRow, ...] = ()
    tariffs: tuple[TariffRow, ...] = ()
    """Empty = the table is absent; freight then goes at the rates of the settings."""
    circuity: tuple[CircuityRow, ...] = ()
    """Empty = the table is absent; the factor of the settings then holds everywhere."""
    columns: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """Header of each table as given, so that it is written back as it was read."""
    warnings: tuple[Fault, ...] = ()
    """What the analyst should know about the tables; no warning stops a plan."""

    @cached_property
    def all_goods(self) -> tuple[GoodRow, ...]:
        """The goods, or the one implied good (weight 1, load 1) where the table is absent."""
        return self.goods or (GoodRow(good=IMPLIED_GOOD),)

    @cached_property
    def all_demands(self) -> tuple[DemandRow, ...]:
        """The demand of each customer and good above 0, from `demands` or from `customers` (then the only good)."""
        if self.demands:
            return tuple(row for row in self.demands if row.demand > 0)
        good = self.all_goods[0].good
        return tuple(
            DemandRow(customer=row.customer, good=good, demand=row.demand, row=row.row)
            for row in self.customers
            if row.demand is not None and row.demand > 0
        )

    @cached_property
    def all_offers(self) -> tuple[OfferRow, ...]:
        """The offers, or every supplier offering every good at its unit_price where the table is absent."""
        return self.offers or tuple(
            OfferRow(supplier=row.supplier, good=good.good, unit_price=row.unit_price, capacity=math.inf, row=row.row)
            for row in self.suppliers
            for good in self.all_goods
        )

    @cached_property
    def options(self) -> tuple[SizeRow, ...]:
        """
        Every way a site may be open, in the order of `sites`: its sizes, or itself as one size named "".

        Capacities are resolved: blank is `math.inf`.
        """
        sizes: dict[str, list[SizeRow]] = {}
        for size in self.sizes:
            sizes.setdefault(size.site, []).append(size)
        return tuple(option for row in self.sites for option in sizes.get(row.site) or [_as_size(row)])

    def is_single_sourced(self, customer: CustomerRow) -> bool:
        """Return whether the customer takes all its goods from one origin."""
        return self.settings.single_source if customer.single_source is None else customer.single_source


def _as_size(row: SiteRow) -> SizeRow:
    return SizeRow(
        site=row.site,
        size="",
        standing=row.standing,
        opening_charge=row.opening_charge,
        yearly_charge=row.yearly_charge,
        capacity=math.inf if row.capacity is None else row.capacity,
        least_throughput=row.least_throughput,
        residual_value=row.residual_value,
        row=row.row,
    )
