"""
The audit's own reading of the `tariffs` table: which tariff prices a lane and what it charges, one lane at a time.

Shares no code with the network.
"""

from __future__ import annotations

import math
from collections import defaultdict
from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.study.countries import country_key
from siting.study.tables import Leg

if TYPE_CHECKING:
    from siting.study.tables import Study, TariffRow


@dataclass(frozen=True, slots=True, kw_only=True)
class Haul:
    """A lane as far as tariffs ask about it."""

    leg: Leg
    origin: str
    destination: str
    km: float | None
    """Road km; None where nothing gives it, and then no tariff fits."""


class TariffBook:
    """The tariffs of a study, looked up lane by lane."""

    def __init__(self, study: Study) -> None:
        self._rows = study.tariffs
        sites = {row.site: row.country for row in study.sites}
        suppliers = {row.supplier: row.country for row in study.suppliers}
        customers = {row.customer: row.country for row in study.customers}
        self._countries = {
            Leg.INBOUND: (suppliers, sites),
            Leg.OUTBOUND: (sites, customers),
            Leg.DIRECT: (suppliers, customers),
        }
        self._drop = {row.customer: row.drop_size or study.settings.drop_size for row in study.customers}
        self._inbound_size = study.settings.inbound_size
        self._by_ends: dict[tuple[Leg, str, str], dict[str, list[TariffRow]]] = {}

    def delivery_size(self, leg: Leg, destination: str) -> float | None:
        """
        Return the load of one delivery.

        Parameters
        ----------
        leg
            Inbound shipments have one size throughout.
        destination
            A site or a customer.

        Returns
        -------
        size
            None where the study does not say it.
        """
        return self._inbound_size if leg is Leg.INBOUND else self._drop[destination]

    def charges(self, haul: Haul) -> dict[str, float]:
        """
        Return what each tariff that fits charges.

        Parameters
        ----------
        haul
            The lane.

        Returns
        -------
        charges
            Money per unit of load, by tariff; the cheapest is the one that counts.
        """
        if haul.km is None or not self._rows:
            return {}
        found = {}
        size = self.delivery_size(haul.leg, haul.destination)
        for tariff, rows in self._between(haul).items():
            fitting = [row for row in rows if _in_band(row, haul.km) and (size or 0.0) >= row.from_size]
            if fitting:
                found[tariff] = _per_load(max(fitting, key=_rank), haul.km, size)
        return found

    def _between(self, haul: Haul) -> dict[str, list[TariffRow]]:
        """Return the rows, by tariff, whose leg and countries are those of a lane."""
        origins, destinations = self._countries[haul.leg]
        ends = haul.leg, country_key(origins[haul.origin]), country_key(destinations[haul.destination])
        if ends not in self._by_ends:
            held: dict[str, list[TariffRow]] = defaultdict(list)
            for row in self._rows:
                wanted = row.leg or haul.leg, country_key(row.from_country), country_key(row.to_country)
                if all(want in {"", end} for want, end in zip(wanted, ends, strict=True)):
                    held[row.tariff].append(row)
            self._by_ends[ends] = held
        return self._by_ends[ends]


def _in_band(row: TariffRow, km: float) -> bool:
    above = km > row.from_km or km == row.from_km == 0
    return above and (row.to_km is None or km <= row.to_km)


def _rank(row: TariffRow) -> tuple[int, float]:
    named = 4 * (row.leg is not None) + 2 * bool(row.to_country.strip()) + bool(row.from_country.strip())
    return named, row.from_size


def _per_load(row: TariffRow, km: float, size: float | None) -> float:
    """Return money per unit of load at one row."""
    truck = row.basis in {"per_truck", "per_truck_km"}
    moved = (row.truck_load or math.nan) * (row.fill or 1.0) if truck else size
    quantity = km if row.basis in {"per_unit_km", "per_truck_km"} else 1.0
    if row.basis in {"per_unit", "per_unit_km"}:
        if not row.minimum:
            return row.rate * quantity
        quantity *= moved or math.nan
    return max(row.rate * quantity, row.minimum) / (moved or math.nan)
