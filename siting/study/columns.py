"""
One declaration of every table's columns and every setting: used to read, to check, to write and to explain them.

Defaults are not repeated here: they are those of the row types in `tables` and of `settings`.
"""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

from siting.study.settings import ENGINES, Settings, SolveSettings
from siting.study.tables import (
    CircuityRow,
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
    SupplierRow,
    SupplierRuling,
    SupplierStanding,
    TariffBasis,
    TariffRow,
)

if TYPE_CHECKING:
    from collections.abc import Mapping

ONE_OFF = "money, once"
YEARLY = "money a year"
LOAD = "load a year"
DEGREES = "degrees, WGS84"


class Kind(StrEnum):
    """What a cell or a setting holds."""

    NAME = "name"
    """Text that identifies something; never blank, no blanks around it."""
    TEXT = "text"
    NUMBER = "number"
    WHOLE = "whole number"
    CHOICE = "choice"
    YES_NO = "yes or no"
    NAMES = "names"
    """Names separated by semicolons."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column of a table, or one setting."""

    name: str
    kind: Kind
    meaning: str
    """One line for the analyst."""
    unit: str = ""
    required: bool = False
    """The column or setting must be there and no cell may be blank."""
    blank: bool = True
    """Whether a cell may be blank where the column is there."""
    low: float | None = None
    high: float | None = None
    low_open: bool = False
    """Whether `low` itself is refused."""
    high_open: bool = False
    """Whether `high` itself is refused."""
    fraction: bool = False
    """A share that people like to type in per cent."""
    unlimited: bool = False
    """Whether the word `unlimited` may be typed."""
    choices: tuple[str, ...] = ()
    """What may be typed; empty = anything of the kind."""
    enum: type[StrEnum] | None = None
    """Type of the choices, where they have one of their own."""
    pair: str = ""
    """Column that the range is judged together with, in `coordinates`: latitude and longitude may be swapped."""


@dataclass(frozen=True, slots=True, kw_only=True)
class TableSpec:
    """One table: what it means, its columns and what identifies a row."""

    name: str
    meaning: str
    columns: tuple[Column, ...]
    key: tuple[str, ...]
    """Columns that together occur once only; empty = rows may repeat."""
    row_type: type | None
    """Row type in `tables`; None for `lanes`, which are held as columns."""

    @property
    def names(self) -> tuple[str, ...]:
        """Names of all columns, in order."""
        return tuple(column.name for column in self.columns)

    def column(self, name: str) -> Column:
        """Return the column of that name."""
        return next(column for column in self.columns if column.name == name)

    def default(self, name: str) -> object:
        """Return what a blank cell of the column means, as the row type holds it; None where nothing is said."""
        return defaults(self.row_type).get(name) if self.row_type else None


def defaults(row_type: type) -> dict[str, object]:
    """Return the default of each field of a row type or of the settings that has one."""
    return {
        field.name: field.default for field in dataclasses.fields(row_type) if field.default is not dataclasses.MISSING
    }


def _name(name: str, meaning: str) -> Column:
    return Column(name=name, kind=Kind.NAME, meaning=meaning, required=True)


def _amount(  # noqa: PLR0913  (each is a word of a column's declaration)
    name: str, meaning: str, unit: str, *, low_open: bool = False, unlimited: bool = False, required: bool = False
) -> Column:
    return Column(
        name=name,
        kind=Kind.NUMBER,
        meaning=meaning,
        unit=unit,
        low=0.0,
        low_open=low_open,
        unlimited=unlimited,
        required=required,
    )


def _fraction(name: str, meaning: str) -> Column:
    return Column(name=name, kind=Kind.NUMBER, meaning=meaning, low=0.0, high=1.0, high_open=True, fraction=True)


def _choice(name: str, meaning: str, choices: type[StrEnum], *, blank: bool = True, required: bool = False) -> Column:
    words = tuple(str(choice) for choice in choices)
    return Column(
        name=name, kind=Kind.CHOICE, meaning=meaning, choices=words, enum=choices, blank=blank, required=required
    )


def _place(what: str) -> tuple[Column, ...]:
    return (
        Column(name="place", kind=Kind.TEXT, meaning=f"Town or address of the {what}; coordinates win over it"),
        Column(name="country", kind=Kind.TEXT, meaning=f"Country of the {what}"),
        Column(
            name="latitude",
            kind=Kind.NUMBER,
            meaning="Degrees north; with longitude, distances are estimated where `lanes` gives none",
            unit=DEGREES,
            low=-90.0,
            high=90.0,
            pair="longitude",
        ),
        Column(
            name="longitude",
            kind=Kind.NUMBER,
            meaning="Degrees east",
            unit=DEGREES,
            low=-180.0,
            high=180.0,
            pair="latitude",
        ),
    )


_OPENING = _amount("opening_charge", "Paid when a proposed site opens", ONE_OFF)
_YEARLY = _amount("yearly_charge", "Paid every year while open", YEARLY)
_LEAST = _amount("least_throughput", "Least load that must pass while open", LOAD)
_RESIDUAL = _amount("residual_value", "Got back after life_years", ONE_OFF)

SITES = TableSpec(
    name="sites",
    meaning="Depots, warehouses or plants that run or could be opened",
    key=("site",),
    row_type=SiteRow,
    columns=(
        _name("site", "Name of the site, used once"),
        *_place("site"),
        _choice("standing", "What the site is now", SiteStanding, blank=False),
        _choice("ruling", "What you impose on the site", SiteRuling),
        _OPENING,
        _YEARLY,
        Column(
            name="closing_charge",
            kind=Kind.NUMBER,
            meaning="Paid when a running site closes; negative = sale proceeds",
            unit=ONE_OFF,
        ),
        _amount("capacity", "Most load that can pass; `unlimited` may be typed", LOAD, unlimited=True),
        _LEAST,
        _amount("handling_rate", "Cost of moving one unit of load through the site", "money per load"),
        _RESIDUAL,
    ),
)

CUSTOMERS = TableSpec(
    name="customers",
    meaning="Who must be served",
    key=("customer",),
    row_type=CustomerRow,
    columns=(
        _name("customer", "Name of the customer, used once"),
        *_place("customer"),
        _amount("demand", "What the customer needs, unless `demands` says it by good", "units a year"),
        Column(
            name="reach_km",
            kind=Kind.NUMBER,
            meaning="Greatest road distance it may be served from; blank = any",
            unit="km",
            low=0.0,
            low_open=True,
        ),
        Column(
            name="single_source",
            kind=Kind.YES_NO,
            meaning="Whether all its goods come from one origin; blank = as the settings say",
        ),
        _amount("drop_size", "Load of one delivery; blank = as the settings say", "load per delivery", low_open=True),
    ),
)

SUPPLIERS = TableSpec(
    name="suppliers",
    meaning="Where goods are bought",
    key=("supplier",),
    row_type=SupplierRow,
    columns=(
        _name("supplier", "Name of the supplier, used once"),
        *_place("supplier"),
        _choice("standing", "What the supplier is now", SupplierStanding, blank=False),
        _choice("ruling", "What you impose on the supplier", SupplierRuling),
        _amount("signing_charge", "Paid when an offered supplier is signed", ONE_OFF),
        _amount("dropping_charge", "Paid when a signed supplier is dropped", ONE_OFF),
        _amount("yearly_charge", "Paid every year while signed", YEARLY),
        _amount("capacity", "Most load over all goods; `unlimited` may be typed", LOAD, unlimited=True),
        _amount("least_yearly", "Least load over all goods while signed", LOAD),
        _amount("unit_price", "Price of one unit of each good, unless `offers` says it by good", "money per unit"),
    ),
)

SIZES = TableSpec(
    name="sizes",
    meaning="Sizes a site may have, at most one of them open",
    key=("site", "size"),
    row_type=SizeRow,
    columns=(
        _name("site", "A site of `sites`"),
        _name("size", "Name of the size, used once per site"),
        _choice("standing", "`running` for the size in place", SiteStanding),
        _OPENING,
        _YEARLY,
        _amount("capacity", "Most load that can pass; `unlimited` may be typed", LOAD, unlimited=True, required=True),
        _LEAST,
        _RESIDUAL,
    ),
)

GOODS = TableSpec(
    name="goods",
    meaning="What is moved; absent = one good",
    key=("good",),
    row_type=GoodRow,
    columns=(
        _name("good", "Name of the good, used once"),
        _amount("weight_t", "Weight of one unit", "tonnes per unit"),
        _amount("load", "Capacity that one unit uses", "load per unit", low_open=True),
    ),
)

DEMANDS = TableSpec(
    name="demands",
    meaning="Demand by customer and good; absent = `customers` says it",
    key=("customer", "good"),
    row_type=DemandRow,
    columns=(
        _name("customer", "A customer of `customers`"),
        _name("good", "A good of `goods`"),
        _amount("demand", "What the customer needs of the good", "units a year", required=True),
    ),
)

OFFERS = TableSpec(
    name="offers",
    meaning="Which supplier offers which good; absent = every supplier offers every good",
    key=("supplier", "good"),
    row_type=OfferRow,
    columns=(
        _name("supplier", "A supplier of `suppliers`"),
        _name("good", "A good of `goods`"),
        _amount("unit_price", "Price of one unit", "money per unit"),
        _amount("capacity", "Most units; `unlimited` may be typed", "units a year", unlimited=True),
        _amount("least_yearly", "Least units while signed", "units a year"),
    ),
)

LANES = TableSpec(
    name="lanes",
    meaning="What differs from the distances and rates that coordinates give",
    key=("origin", "destination", "good", "leg"),
    row_type=None,
    columns=(
        _name("origin", "A supplier or a site"),
        _name("destination", "A site or a customer"),
        Column(name="good", kind=Kind.TEXT, meaning="A good of `goods`; blank = every good"),
        _choice("leg", "Needed only where the two names fit more than one leg", Leg),
        _amount("road_km", "Road distance, in place of the estimate", "km"),
        _amount("unit_cost", "All freight, in place of rates and delivery charge", "money per unit"),
        Column(name="barred", kind=Kind.YES_NO, meaning="`yes` where nothing may move"),
    ),
)

RULES = TableSpec(
    name="rules",
    meaning="What sites and suppliers may or must be chosen together",
    key=(),
    row_type=RuleRow,
    columns=(
        _choice("rule", "What is asked of the members", RuleKind, required=True),
        Column(name="members", kind=Kind.NAMES, meaning="Sites or suppliers, separated by semicolons", required=True),
        Column(name="number", kind=Kind.WHOLE, meaning="For at_most and at_least", low=0.0),
    ),
)

TARIFFS = TableSpec(
    name="tariffs",
    meaning="Freight as it is quoted, in place of the rates and the delivery charge of the settings",
    key=(),
    row_type=TariffRow,
    columns=(
        _name("tariff", "Name of the tariff; its rows are its zones, distance bands and weight breaks"),
        _choice("leg", "Leg the row is for; blank = every leg", Leg),
        Column(name="from_country", kind=Kind.TEXT, meaning="Country of the origin; blank = any"),
        Column(name="to_country", kind=Kind.TEXT, meaning="Country of the destination; blank = any"),
        _amount("from_km", "Road distance above which the row applies", "km"),
        _amount("to_km", "Road distance up to which the row applies; blank = any", "km", low_open=True),
        _amount("from_size", "Least load of one delivery the row applies to", "load per delivery"),
        _choice("basis", "What the rate is paid for; units are units of load", TariffBasis, required=True),
        _amount("rate", "Price of what basis says", "money", required=True),
        _amount("minimum", "Least charge for one delivery, or for one truck", "money"),
        _amount("truck_load", "Load of a full truck; only where basis is per truck", "load per truck", low_open=True),
        Column(
            name="fill",
            kind=Kind.NUMBER,
            meaning="Share of the truck that is used, 80 % as 0.8; blank = all of it; only where basis is per truck",
            low=0.0,
            low_open=True,
            high=1.0,
            fraction=True,
        ),
    ),
)

CIRCUITY = TableSpec(
    name="circuity",
    meaning="Road distance over straight-line distance by country, in place of that of the settings",
    key=(),
    row_type=CircuityRow,
    columns=(
        _name("country", "A country, as a code such as AT or by name"),
        Column(name="other_country", kind=Kind.TEXT, meaning="Country at the other end; blank = within the country"),
        Column(
            name="circuity",
            kind=Kind.NUMBER,
            meaning="Road distance over straight-line distance where `lanes` gives none",
            low=1.0,
            high=5.0,
            required=True,
        ),
        Column(name="source", kind=Kind.TEXT, meaning="Where the factor comes from"),
    ),
)

SIZED_COLUMNS = ("opening_charge", "yearly_charge", "capacity", "least_throughput", "residual_value")
"""Columns of `sites` that stay blank where a site has sizes."""

ONE_OFF_CHARGES: Mapping[str, tuple[str, ...]] = {
    "sites": ("opening_charge", "closing_charge"),
    "suppliers": ("signing_charge", "dropping_charge"),
    "sizes": ("opening_charge",),
}
"""Columns of money paid once, by table."""

TABLES: Mapping[str, TableSpec] = {
    spec.name: spec
    for spec in (SITES, CUSTOMERS, SUPPLIERS, SIZES, GOODS, DEMANDS, OFFERS, LANES, RULES, TARIFFS, CIRCUITY)
}
"""Every table by name, in the order faults are listed and files are written."""

SETTINGS: tuple[Column, ...] = (
    Column(name="title", kind=Kind.TEXT, meaning="Name of the study, shown in headlines"),
    Column(name="currency", kind=Kind.NAME, meaning="ISO 4217 code of all money", required=True),
    Column(name="unit", kind=Kind.NAME, meaning="Name of the unit of all amounts, such as t", required=True),
    Column(
        name="circuity",
        kind=Kind.NUMBER,
        meaning="Road distance over straight-line distance where `lanes` gives none",
        low=1.0,
        high=5.0,
    ),
    _amount("outbound_rate", "Freight to customers", "money per load and km"),
    _amount("inbound_rate", "Freight from suppliers to sites", "money per load and km"),
    _amount("drop_charge", "Paid per delivery to a customer; needs drop_size", "money per delivery"),
    _amount("drop_size", "Load of one delivery; needs drop_charge", "load per delivery", low_open=True),
    _amount("inbound_size", "Load of one shipment to a site; only tariffs use it", "load per delivery", low_open=True),
    _fraction("interest_rate", "Interest a year, 8 % as 0.08"),
    _amount("life_years", "Years over which one-off charges are spread", "years", low_open=True),
    _amount("service_km", "Road distance that counts as good service; needs service_share", "km", low_open=True),
    _fraction("service_share", "Least share of all weight delivered within service_km, 90 % as 0.9"),
    Column(name="fewest_sites", kind=Kind.WHOLE, meaning="Least number of open sites", low=0.0),
    Column(name="most_sites", kind=Kind.WHOLE, meaning="Greatest number of open sites", low=0.0),
    _amount("one_off_budget", "Most one-off money that may be spent", ONE_OFF),
    Column(name="single_source", kind=Kind.YES_NO, meaning="Whether each customer takes all its goods from one origin"),
    _amount("emission_kg_per_tkm", "Emissions of freight; blank = not reported", "kg CO2e per tonne and km"),
    _amount("carbon_price_per_t", "Price of emissions; needs emission_kg_per_tkm", "money per tonne CO2e"),
)
"""Every setting, in the order it is written."""

SOLVE_SETTINGS: tuple[Column, ...] = (
    _fraction("gap", "Stop once the plan is proved this close to the best, 1 % as 0.01"),
    _amount("time_limit_s", "Seconds of solving after which the best plan so far is returned", "s", low_open=True),
    Column(name="engine", kind=Kind.CHOICE, meaning="Which engine solves", choices=ENGINES),
)
"""The settings of the section `[solve]`."""

SETTING_DEFAULTS: Mapping[str, object] = defaults(Settings)
SOLVE_DEFAULTS: Mapping[str, object] = defaults(SolveSettings)
