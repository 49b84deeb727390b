"""Check the `tariffs` table: bands that fit together, trucks that have a load, deliveries that have a size."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from siting.cells import number_text
from siting.study.countries import country_key
from siting.study.tables import Leg, TariffBasis

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.study.draft import Draft
    from siting.study.tables import TariffRow

BY_TRUCK = frozenset({TariffBasis.PER_TRUCK, TariffBasis.PER_TRUCK_KM})
"""Bases whose delivery is a truck, filled as the row says."""

_LEG_ENDS = {
    Leg.INBOUND: ("suppliers", "sites"),
    Leg.OUTBOUND: ("sites", "customers"),
    Leg.DIRECT: ("suppliers", "customers"),
}


def check_tariffs(draft: Draft) -> None:
    """Note every fault of the tariffs, and sizes of deliveries that nothing uses."""
    for at, row in enumerate(draft.tariffs.rows):
        if not draft.gathering.hurt("tariffs", row.row, "basis"):
            _check_truck(draft, at, row)
            _check_size(draft, row)
        _check_band(draft, row)
    _check_overlaps(draft)
    _check_countries(draft)
    _check_idle_sizes(draft)


def needs_size(row: TariffRow) -> bool:
    """
    Return whether a row can be priced only where the size of one delivery is known.

    Parameters
    ----------
    row
        Of `tariffs`.

    Returns
    -------
    needed
        False where the charge is in proportion to the load, or where a truck is paid for; weight breaks need it always.
    """
    if row.from_size > 0:
        return True
    return row.basis not in BY_TRUCK and (row.basis is TariffBasis.PER_DELIVERY or row.minimum > 0)


def _check_truck(draft: Draft, at: int, row: TariffRow) -> None:
    gathering = draft.gathering
    if row.basis in BY_TRUCK:
        if row.truck_load is None and not gathering.hurt("tariffs", row.row, "truck_load"):
            wrong = f"blank, although the rate is paid {row.basis.replace('_', ' ')}"
            gathering.fault("tariffs", row.row, "truck_load", "", wrong, "Write the load of a full truck")
        return
    for column in ("truck_load", "fill"):
        typed = draft.tariffs.typed(at, column)
        if typed and not gathering.hurt("tariffs", row.row, column):
            wrong = f"only per_truck and per_truck_km have a {column}, the basis here is {row.basis}"
            gathering.fault("tariffs", row.row, column, typed, wrong, "Clear the cell, or change basis")


def _check_size(draft: Draft, row: TariffRow) -> None:
    """Note a row that needs the size of a delivery where none is said."""
    if not needs_size(row):
        return
    settings, gathering = draft.settings, draft.gathering
    legs = [leg for leg, ends in _LEG_ENDS.items() if all(map(draft.has, ends)) and row.leg in {None, leg}]
    wrong = "the row goes by the size of one delivery, which"
    if Leg.INBOUND in legs and settings.inbound_size is None:
        repair = "Set inbound_size in the settings, or write outbound or direct in leg"
        gathering.fault("tariffs", row.row, "basis", str(row.basis), f"{wrong} is not said for inbound", repair)
    without = [customer.customer for customer in draft.customers.rows if customer.drop_size is None]
    if set(legs) - {Leg.INBOUND} and settings.drop_size is None and without:
        repair = "Set drop_size in the settings, or fill the column drop_size of customers"
        gathering.fault(
            "tariffs", row.row, "basis", str(row.basis), f"{wrong} is not said for customer {without[0]!r}", repair
        )


def _check_band(draft: Draft, row: TariffRow) -> None:
    if row.to_km is None or row.to_km > row.from_km or draft.gathering.hurt("tariffs", row.row, "from_km", "to_km"):
        return
    wrong = f"not above from_km ({number_text(row.from_km)}), so that no lane fits the row"
    draft.gathering.fault("tariffs", row.row, "to_km", number_text(row.to_km), wrong, "Write a greater distance")


def _zone(row: TariffRow) -> tuple[object, ...]:
    return row.tariff, row.leg, country_key(row.from_country), country_key(row.to_country), row.from_size


def _check_overlaps(draft: Draft) -> None:
    """Note rows of one tariff that apply to the same lanes, so that neither can be preferred."""
    zones: dict[tuple[object, ...], list[TariffRow]] = {}
    for row in draft.tariffs.rows:
        if row.tariff and not draft.gathering.hurt("tariffs", row.row, "leg", "from_km", "to_km", "from_size"):
            zones.setdefault(_zone(row), []).append(row)
    for rows in zones.values():
        rows.sort(key=lambda row: (row.from_km, row.row))
        last = rows[0]
        for row in rows[1:]:
            upper = math.inf if last.to_km is None else last.to_km
            if row.from_km < upper:
                wrong = f"the same lanes fit row {last.row} of the tariff already"
                repair = "Let the bands of one zone and from_size follow each other: from_km = to_km of the one before"
                draft.gathering.fault("tariffs", row.row, "from_km", number_text(row.from_km), wrong, repair)
            if (math.inf if row.to_km is None else row.to_km) > upper:
                last = row


def _check_countries(draft: Draft) -> None:
    """Warn of countries that no place of the study is in: a slip of the pen leaves a zone without lanes."""
    named = list(_countries(draft))
    there = countries_of(draft) if named else set()
    for row, column, country in named:
        if country_key(country) not in there:
            wrong = "no place of the study has this country, so that no lane fits the row"
            repair = "Write it as in sites, suppliers or customers; codes such as AT and names both do"
            draft.gathering.warn("tariffs", row.row, column, country, wrong, repair)


def countries_of(draft: Draft) -> set[str]:
    """
    Return the countries that places of a study are in.

    Parameters
    ----------
    draft
        The study while it is checked.

    Returns
    -------
    keys
        As `country_key` gives them.
    """
    tables = (draft.sites, draft.suppliers, draft.customers)
    return {country_key(row.country) for table in tables for row in table.rows if row.country.strip()}


def _countries(draft: Draft) -> Iterator[tuple[TariffRow, str, str]]:
    for row in draft.tariffs.rows:
        for column in ("from_country", "to_country"):
            if getattr(row, column).strip():
                yield row, column, getattr(row, column)


def _check_idle_sizes(draft: Draft) -> None:
    """Warn of sizes of deliveries that no charge goes by."""
    if draft.has("tariffs"):
        return
    if draft.settings.inbound_size is not None:
        wrong = "only tariffs go by it, and the study has none"
        draft.gathering.warn(
            draft.settings_name, None, "inbound_size", number_text(draft.settings.inbound_size), wrong,
            "Add the table tariffs, or delete the setting",
        )  # fmt: skip
    sized = any(row.drop_size is not None for row in draft.customers.rows)
    if sized and not draft.settings.drop_charge:
        wrong = "nothing goes by it: the study has neither a drop_charge nor tariffs"
        draft.gathering.warn("customers", None, "drop_size", "", wrong, "Set drop_charge, or add the table tariffs")
