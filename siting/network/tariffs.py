"""
Which tariff prices a lane, and what it charges per unit of load.

On each lane every tariff offers its most particular row that fits: one that names the leg beats one that does not, then
the country of the destination, then that of the origin, then the greatest from_size that one delivery reaches. The
cheapest tariff prices the lane; of equally cheap ones the first by name.

One delivery costs max(rate x quantity, minimum), quantity being what the basis says; per unit of load that is divided
by the delivery's load. So freight stays linear in the amount: every delivery of a lane has the same size, and is not
declared larger than it is to reach a cheaper break.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.study.countries import country_key
from siting.study.tables import Leg, TariffBasis

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.arrays import Floats, Positions
    from siting.network.lanes import FoundLanes
    from siting.study.tables import CustomerRow, SiteRow, Study, SupplierRow, TariffRow

NO_TARIFF = -1
"""In `LegLanes.tariff`: no tariff fits, the rates of the settings price the lane."""

OWN_COST = -2
"""In `LegLanes.tariff`: `lanes.unit_cost` prices the lane."""

_NO_ROW = -1


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TariffPrices:
    """What tariffs charge on the lanes of one leg; every array of shape (lanes,)."""

    tariff: Positions
    """Position in `tariff_names`, or `NO_TARIFF` where no tariff fits."""
    per_load: Floats
    """Money per unit of load; NaN where no tariff fits."""


def tariff_names(study: Study) -> tuple[str, ...]:
    """
    Return the names of a study's tariffs.

    Parameters
    ----------
    study
        Checked.

    Returns
    -------
    names
        Sorted, each once.
    """
    return tuple(sorted({row.tariff for row in study.tariffs}))


def delivery_sizes(leg: Leg, study: Study) -> Floats:
    """
    Return the load of one delivery to each destination of a leg.

    Parameters
    ----------
    leg
        Inbound goes at `inbound_size`, the others at the customer's drop_size or that of the settings.
    study
        Checked.

    Returns
    -------
    size
        Shape (destinations,), load; NaN where none is said.
    """
    settings = study.settings
    if leg is Leg.INBOUND:
        sizes = [settings.inbound_size] * len(study.sites)
    else:
        sizes = [settings.drop_size if row.drop_size is None else row.drop_size for row in study.customers]
    return np.array([np.nan if size is None else size for size in sizes], dtype=np.float64)


def price_by_tariff(leg: Leg, lanes: FoundLanes, study: Study) -> TariffPrices:
    """
    Return what the cheapest tariff charges on each lane.

    Parameters
    ----------
    leg
        Of the lanes.
    lanes
        Those that exist; one without a distance fits no tariff.
    study
        Checked: rows of one tariff never fit the same lane equally well, and sizes are there where rows go by them.

    Returns
    -------
    prices
        Whether or not `lanes.unit_cost` takes precedence.
    """
    tariff = np.full(len(lanes), NO_TARIFF, dtype=np.int32)
    if not study.tariffs:
        return TariffPrices(tariff=tariff, per_load=np.full(len(lanes), np.nan))
    size = delivery_sizes(leg, study)[lanes.destination]
    best = np.full(len(lanes), np.inf)
    groups = _Groups(leg, lanes, study, size)
    for at, name in enumerate(tariff_names(study)):
        rows = [row for row in study.tariffs if row.tariff == name and row.leg in {None, leg}]
        price = _prices(rows, groups.chosen(rows), lanes.km, size)
        cheaper = price < best
        tariff[cheaper], best[cheaper] = at, price[cheaper]
    return TariffPrices(tariff=tariff, per_load=np.where(tariff == NO_TARIFF, np.nan, best))


def _prices(rows: Sequence[TariffRow], chosen: Positions, km: Floats, size: Floats) -> Floats:
    """Return money per unit of load on each lane at its chosen row; NaN where none is chosen."""
    if not rows:
        return np.full(chosen.shape, np.nan)
    rate, minimum, fixed_size = (
        np.array(column, dtype=np.float64)[chosen]
        for column in zip(*((row.rate, row.minimum, _truck(row)) for row in rows), strict=True)
    )
    by_km = np.array([row.basis in {TariffBasis.PER_UNIT_KM, TariffBasis.PER_TRUCK_KM} for row in rows])[chosen]
    by_load = np.array([row.basis in {TariffBasis.PER_UNIT_KM, TariffBasis.PER_UNIT} for row in rows])[chosen]
    moved = np.where(np.isnan(fixed_size), size, fixed_size)
    rated = rate * np.where(by_km, km, 1.0)
    with np.errstate(invalid="ignore"):
        price = np.maximum(np.where(by_load, rated, rated / moved), np.where(minimum > 0, minimum / moved, 0.0))
    price[chosen == _NO_ROW] = np.nan
    return price


def _truck(row: TariffRow) -> float:
    return np.nan if row.truck_load is None else row.truck_load * (1.0 if row.fill is None else row.fill)


class _Groups:
    """Lanes put together by what decides which rows may fit, distances aside: countries and the breaks reached."""

    def __init__(self, leg: Leg, lanes: FoundLanes, study: Study, size: Floats) -> None:
        starts, stops = _ends(leg, study)
        self._from, from_at = _countries(starts)
        self._to, to_at = _countries(stops)
        self._breaks = sorted({row.from_size for row in study.tariffs})
        reached = np.searchsorted(self._breaks, np.nan_to_num(size), side="right")
        code = (from_at[lanes.origin] * len(self._to) + to_at[lanes.destination]) * (len(self._breaks) + 1) + reached
        self._codes, self._group = np.unique(code, return_inverse=True)
        self._order = np.argsort(self._group, kind="stable")
        self._starts = np.searchsorted(self._group[self._order], np.arange(self._codes.size + 1))
        self._km = lanes.km

    def chosen(self, rows: Sequence[TariffRow]) -> Positions:
        """Return the position in `rows`, all of one tariff, of the one that prices each lane; `_NO_ROW` where none."""
        edges = np.unique([edge for row in rows for edge in (row.from_km, row.to_km or 0.0)])
        band = np.searchsorted(edges, self._km, side="left")
        chosen = np.full(self._km.shape, _NO_ROW, dtype=np.int32)
        for number, code in enumerate(self._codes.tolist()):
            pair, reached = divmod(code, len(self._breaks) + 1)
            start, stop = divmod(pair, len(self._to))
            size = self._breaks[reached - 1] if reached else -1.0
            fitting = [
                at
                for at, row in enumerate(rows)
                if row.from_size <= size
                and country_key(row.from_country) in {"", self._from[start]}
                and country_key(row.to_country) in {"", self._to[stop]}
            ]
            fitting.sort(key=lambda at: _particular(rows[at]))
            of_band = np.full(edges.size + 1, _NO_ROW, dtype=np.int32)
            for at in fitting:  # the most particular comes last and stays
                low, high = rows[at].from_km, rows[at].to_km
                first = np.searchsorted(edges, low, side="right") if low > 0 else 0
                last = edges.size if high is None else np.searchsorted(edges, high, side="left")
                of_band[first : last + 1] = at
            here = self._order[self._starts[number] : self._starts[number + 1]]
            chosen[here] = of_band[band[here]]
        chosen[np.isnan(self._km)] = _NO_ROW
        return chosen


def _particular(row: TariffRow) -> tuple[bool, bool, bool, float]:
    return row.leg is not None, bool(row.to_country.strip()), bool(row.from_country.strip()), row.from_size


def _ends(leg: Leg, study: Study) -> tuple[Sequence[SiteRow | SupplierRow], Sequence[SiteRow | CustomerRow]]:
    starts = study.sites if leg is Leg.OUTBOUND else study.suppliers
    return starts, study.sites if leg is Leg.INBOUND else study.customers


def _countries(rows: Sequence[SiteRow | SupplierRow | CustomerRow]) -> tuple[list[str], Positions]:
    """Return the different countries, and each row's position among them as int64."""
    keys = [country_key(row.country) for row in rows]
    at = {key: position for position, key in enumerate(dict.fromkeys(keys))}
    return list(at) or [""], np.array([at[key] for key in keys], dtype=np.int64)
