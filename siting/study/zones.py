"""
Put many customers together into few zones, each at its demand-weighted centre.

Rules: a zone needs what its customers need, good by good. Single-sourced customers and others are never in one zone,
and, where tariffs or circuity go by country, nor are two countries. A zone's reach is the shortest of its customers'
reaches, its drop_size the one that keeps the number of deliveries. Customers that need nothing are left out.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.errors import DataFileError
from siting.study.clusters import degrees_of, k_means, unit_vectors
from siting.study.countries import country_key
from siting.study.tables import CustomerRow, DemandRow
from siting.study.zone_lanes import zone_lanes

if TYPE_CHECKING:
    from collections.abc import Hashable, Sequence

    from siting.arrays import Floats, Positions
    from siting.study.tables import Study

BY_SPHERE, BY_PLACE = "sphere", "place"

KEPT_APART = 2
"""Parts of a group's key, from the first, that zones never cross: single sourcing, country."""

NO_ZONE = -1
"""In `Zoned.zone`: the customer needs nothing and is in no zone."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Zoned:
    """A study of zones."""

    study: Study
    """Not checked: a zone may lack what its customers lacked."""
    zone: Positions
    """(customers,) position in the zones, which are the customers of `study`, or `NO_ZONE`."""
    notes: tuple[str, ...]
    """What was left out or put together, in words."""


def zone_study(study: Study, *, count: int | None = None, by: str = BY_SPHERE) -> Zoned:
    """
    Return a study whose customers are zones of the customers of another.

    Parameters
    ----------
    study
        Checked.
    count
        Most zones; None = one for each group that `by` gives (not by sphere).
    by
        `sphere`: by where customers are. `place`: all of one place are together. Else the name of a column of
        `customers` the program does not know, such as a postcode: all with the same text are together, or, as in
        `postcode:2`, with the same first letters. Where this gives more groups than `count`, near ones go together.

    Returns
    -------
    zoned
        Zones are named after their customer of most load and how many others there are.

    Raises
    ------
    DataFileError
        If `count` is missing or below 1, there is no such column, or a customer to be put together has no coordinates.
    """
    if (count is None and by == BY_SPHERE) or (count is not None and count < 1):
        msg = f"the number of zones is {count}; give a whole number of at least 1, such as --zones 150"
        raise DataFileError(msg)
    load = _loads(study)
    needed = np.flatnonzero(load > 0).astype(np.int32)
    zone = np.full(len(study.customers), NO_ZONE, dtype=np.int32)
    zone[needed] = _put_together(study, needed, _groups(study, needed, by), load[needed], count)
    rows = [needed[at] for at in _members(zone[needed])]
    centres = degrees_of(_centres(study, needed, load[needed], zone[needed]))
    zoner = _Zoner(study, load)
    customers = tuple(
        zoner.row(at, members, *centre) for at, (members, *centre) in enumerate(zip(rows, *centres, strict=True))
    )
    lanes = zone_lanes(
        study.lanes,
        tuple(row.customer for row in study.customers),
        zone,
        load,
        tuple(row.customer for row in customers),
    )
    columns = {name: header for name, header in study.columns.items() if name not in {"customers", "demands"}}
    columns["lanes"] = ("origin", "destination", "leg")  # a zone may be called as a site is
    zoned = replace(
        study,
        customers=customers,
        demands=_demands(study, customers, zone),
        lanes=lanes.table,
        columns=columns,
        warnings=(),
    )
    return Zoned(study=zoned, zone=zone, notes=tuple(_notes(study, rows, needed.size, lanes.dropped)))


def _loads(study: Study) -> Floats:
    """Return (customers,) load a year; a good without load counts its units, so that its customers are not lost."""
    at = {row.customer: position for position, row in enumerate(study.customers)}
    per_unit = {row.good: row.load or 1.0 for row in study.all_goods}
    load = np.zeros(len(study.customers))
    for need in study.all_demands:
        load[at[need.customer]] += need.demand * per_unit[need.good]
    return load


def _groups(study: Study, needed: Positions, by: str) -> list[tuple[Hashable, ...]]:
    """Return what customers that stay together have in common."""
    rows = [study.customers[at] for at in needed.tolist()]
    apart = _apart(study, rows)
    if by == BY_SPHERE:
        missing = next((row for row in rows if row.latitude is None or row.longitude is None), None)
        if missing is not None:
            msg = (
                f"customer {missing.customer!r} has no coordinates to group by. Write them, find them with siting "
                "locate, or group with --by place or by a column such as postcode:2"
            )
            raise DataFileError(msg)
        return [(*key, row.latitude, row.longitude) for key, row in zip(apart, rows, strict=True)]
    if by == BY_PLACE:
        places = [(country_key(row.country), row.place.strip().casefold()) for row in rows]
        # customers without a place stay on their own
        named = [(place, "") if place[1] else (place, row.customer) for place, row in zip(places, rows, strict=True)]
        return [(*key, *place) for key, place in zip(apart, named, strict=True)]
    column, _, letters = by.partition(":")
    if not any(column in row.attributes for row in rows) or (letters and not letters.isdecimal()):
        there = sorted({name for row in rows for name in row.attributes})
        known = f"the columns to group by are {', '.join(there)}" if there else "customers has no column of that kind"
        msg = f"{by!r} is neither sphere nor place nor a column of customers, with :LETTERS after it or not; {known}"
        raise DataFileError(msg)
    cut = int(letters) if letters else None
    texts = [row.attributes.get(column, "").strip()[:cut] for row in rows]
    return [(*key, text, "" if text else row.customer) for key, text, row in zip(apart, texts, rows, strict=True)]


def _apart(study: Study, rows: Sequence[CustomerRow]) -> list[tuple[Hashable, ...]]:
    """Return what keeps customers apart whatever they are grouped by."""
    by_country = bool(study.circuity) or any(row.from_country or row.to_country for row in study.tariffs)
    return [(study.is_single_sourced(row), country_key(row.country) if by_country else "") for row in rows]


def _numbered(keys: Sequence[Hashable]) -> Positions:
    numbers: dict[Hashable, int] = {}
    return np.array([numbers.setdefault(key, len(numbers)) for key in keys], dtype=np.int32)


def _members(zone: Positions) -> list[Positions]:
    order = np.argsort(zone, kind="stable")
    return np.split(order, np.flatnonzero(np.diff(zone[order])) + 1)


def _put_together(
    study: Study, needed: Positions, groups: list[tuple[Hashable, ...]], load: Floats, count: int | None
) -> Positions:
    """Return the zone of each customer: its group's, or, of more groups than `count`, that of near ones together."""
    number = _numbered(groups)
    weight: Floats = np.bincount(number, weights=load).astype(np.float64)
    if count is None or weight.size <= count:
        return number
    centres = _centres(study, needed, load, number)
    lost = np.isnan(centres[number, 0])
    if lost.any():
        name = study.customers[int(needed[np.argmax(lost)])].customer
        msg = (
            f"customer {name!r} has no coordinates, so that its group cannot be put together with others. Write them, "
            "find them with siting locate, or leave --zones out"
        )
        raise DataFileError(msg)
    first = np.unique(number, return_index=True)[1]
    strata = _numbered([groups[at][:KEPT_APART] for at in first.tolist()])
    label = np.zeros(weight.size, dtype=np.int32)
    for stratum, most in enumerate(_shared_out(count, strata, weight)):
        here = np.flatnonzero(strata == stratum)
        label[here] = k_means(centres[here], weight[here], most)
    return _numbered(list(zip(strata[number].tolist(), label[number].tolist(), strict=True)))


def _shared_out(count: int, strata: Positions, weight: Floats) -> list[int]:
    """Return how many zones each stratum gets: one, and the others by load, none more than it has groups."""
    sizes = np.bincount(strata)
    share = np.bincount(strata, weights=weight)
    zones = np.ones(sizes.size, dtype=np.int64)
    while zones.sum() < count and (zones < sizes).any():
        zones[int(np.argmax(np.where(zones < sizes, share / zones, -1.0)))] += 1
    return [int(most) for most in zones]


def _centres(study: Study, needed: Positions, load: Floats, number: Positions) -> Floats:
    """Return (groups, 3) weighted means of unit vectors, of length 1; NaN where no customer has coordinates."""
    rows = [study.customers[at] for at in needed.tolist()]
    places = [(row.latitude, row.longitude) for row in rows]
    degrees = np.array([(np.nan, np.nan) if None in place else place for place in places], dtype=np.float64)
    known = np.isfinite(degrees[:, 0])
    vectors = unit_vectors(*np.where(known, degrees.T, 0.0)) * (known * load)[:, None]
    count = int(number.max()) + 1
    sums = np.stack([np.bincount(number, weights=axis, minlength=count) for axis in vectors.T], axis=1)
    length = np.linalg.norm(sums, axis=1, keepdims=True)
    means: Floats = np.divide(sums, length, out=np.full(sums.shape, np.nan), where=length > 0)
    return means


class _Zoner:
    """Makes the rows of zones."""

    def __init__(self, study: Study, load: Floats) -> None:
        self._study, self._load = study, load
        self._taken = {row.customer for row in study.customers}
        self._by_good = bool(study.demands)

    def row(self, number: int, members: Positions, latitude: float, longitude: float) -> CustomerRow:
        """Return the row of one zone, whose centre is given."""
        rows, load = [self._study.customers[at] for at in members.tolist()], self._load[members]
        largest = rows[int(np.argmax(load))]
        if len(rows) == 1:
            alone: CustomerRow = replace(largest, row=number + 2, attributes={})
            return alone
        is_known = not np.isnan(latitude)
        countries: dict[str, float] = {}
        for row, held in zip(rows, load.tolist(), strict=True):
            countries[row.country] = countries.get(row.country, 0.0) + held
        reaches = [row.reach_km for row in rows if row.reach_km is not None]
        return CustomerRow(
            customer=self._name(largest.customer, len(rows) - 1),
            place=largest.place,
            country=max(countries, key=countries.__getitem__),
            latitude=float(latitude) if is_known else None,
            longitude=float(longitude) if is_known else None,
            demand=None if self._by_good else sum(row.demand or 0.0 for row in rows),
            reach_km=min(reaches, default=None),
            single_source=largest.single_source,
            drop_size=self._drop_size(rows, load),
            row=number + 2,
        )

    def _name(self, largest: str, others: int) -> str:
        name = f"{largest} +{others}"
        while name in self._taken:
            name += "'"
        self._taken.add(name)
        return name

    def _drop_size(self, rows: Sequence[CustomerRow], load: Floats) -> float | None:
        """Return the load of a delivery that keeps their number; None where the settings say it, or nothing does."""
        default = self._study.settings.drop_size
        sizes = [default if row.drop_size is None else row.drop_size for row in rows]
        if all(row.drop_size is None for row in rows) or None in sizes:
            return None
        return float(load.sum() / (load / np.array(sizes, dtype=np.float64)).sum())


def _demands(study: Study, customers: tuple[CustomerRow, ...], zone: Positions) -> tuple[DemandRow, ...]:
    if not study.demands:
        return ()
    at = {row.customer: int(held) for row, held in zip(study.customers, zone, strict=True)}
    sums: dict[tuple[int, str], float] = {}
    for need in study.all_demands:
        key = at[need.customer], need.good
        sums[key] = sums.get(key, 0.0) + need.demand
    return tuple(
        DemandRow(customer=customers[number].customer, good=good, demand=demand, row=row)
        for row, ((number, good), demand) in enumerate(sorted(sums.items()), start=2)
    )


def _notes(study: Study, zones: Sequence[Positions], needed: int, dropped: int) -> list[str]:
    """Return what was put together and what was left out."""
    notes = [f"{needed:,} customers in {len(zones):,} zones, the largest of {max(map(len, zones)):,} customers."]
    if needed < len(study.customers):
        notes.append(f"{len(study.customers) - needed:,} customers that need nothing are left out.")
    if any(row.reach_km is not None for row in study.customers):
        notes.append("A zone's reach_km is the shortest of its customers', measured from the zone's centre.")
    if any(map(study.is_single_sourced, study.customers)):
        notes.append("Single-sourced customers are in zones of their own, each taking all its goods from one origin.")
    if dropped:
        notes.append(
            f"{dropped:,} rows of lanes are left out: not every customer of the zone has a row of that origin and good."
        )
    return notes
