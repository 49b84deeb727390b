"""Check where things are: coordinates, lanes that stand in for them, and lanes that do not fit them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from siting.study.coordinates import PLACED, check_coordinates, rough_km
from siting.study.gathering import MOST_LISTED
from siting.study.tables import LaneTable, Leg

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from siting.arrays import Flags, Floats
    from siting.study.check_lanes import ParsedLanes
    from siting.study.draft import Draft

LEAST_RATIO, GREATEST_RATIO = 0.994, 3.0
"""Road over straight-line distance, outside of which a lane is worth a look; `rough_km` may be 0.6 % too long."""

NEAR_KM = 10.0
"""Lanes with both distances below this are not compared: towns are no points."""

_INBOUND, _OUTBOUND, _DIRECT = (LaneTable.LEGS.index(leg) for leg in (Leg.INBOUND, Leg.OUTBOUND, Leg.DIRECT))


def check_places(draft: Draft, parsed: ParsedLanes) -> None:
    """
    Note every fault of coordinates, and of lanes that lack them or contradict them.

    Parameters
    ----------
    draft
        The tables; lanes aside.
    parsed
        The lanes; rows at fault are passed over.
    """
    are_sound = check_coordinates(draft)
    if not draft.is_sound(*PLACED) or "lanes" in draft.unreadable:
        return
    ends = _Ends(draft, parsed.table, ~parsed.hurt)
    _check_missing(draft, ends)
    _check_empty_lanes(draft, ends)
    _check_distances(draft, ends)
    if are_sound:  # else a lane may seem too long or too short for a slip that is told already
        _check_ratio(draft, ends)
    _check_reached(draft, ends)
    _check_rates(draft, ends)


@dataclass(frozen=True)
class _Ends:
    """Lanes with what is known of both ends; arrays of shape (rows,) unless said otherwise."""

    draft: Draft
    lanes: LaneTable
    sound: Flags
    """True where the row has no fault."""

    @cached_property
    def says(self) -> Flags:
        """True where the row gives a distance or a cost and is not barred."""
        flags: Flags = ~self.lanes.barred & ~(np.isnan(self.lanes.road_km) & np.isnan(self.lanes.unit_cost))
        return flags

    @cached_property
    def straight_km(self) -> Floats:
        """Straight-line km that coordinates give; NaN where an end has none."""
        origin, destination = self._coordinates
        return rough_km(origin[0], origin[1], destination[0], destination[1])

    @cached_property
    def _coordinates(self) -> tuple[Floats, Floats]:
        """(2, rows) latitude and longitude of origin and of destination."""
        held = {table: self._of_names(table) for table in PLACED}
        origin = np.where(
            self.lanes.leg == _OUTBOUND, held["sites"][:, self.lanes.origin], held["suppliers"][:, self.lanes.origin]
        )
        at = self.lanes.destination
        return origin, np.where(self.lanes.leg == _INBOUND, held["sites"][:, at], held["customers"][:, at])

    def _of_names(self, table: str) -> Floats:
        """(2, names + 1) latitude and longitude of each name as a row of ``table``; NaN where it has none."""
        known = self.located(table)
        nowhere = (np.nan, np.nan)
        return np.array([*(known.get(name, nowhere) for name in self.lanes.names), nowhere]).T

    def located(self, table: str) -> dict[str, tuple[float, float]]:
        """Return latitude and longitude of each row that has both."""
        return {
            getattr(row, PLACED[table]): (row.latitude, row.longitude)
            for row in self.draft.tables[table].rows
            if row.latitude is not None and row.longitude is not None
        }

    def named(self, table: str, chosen: Flags) -> set[str]:
        """Return the names of a table's rows that are at an end of the chosen lanes."""
        leg, lanes = self.lanes.leg, self.lanes
        starts = {"sites": leg == _OUTBOUND, "suppliers": leg != _OUTBOUND, "customers": np.zeros_like(chosen)}[table]
        stops = {"sites": leg == _INBOUND, "suppliers": np.zeros_like(chosen), "customers": leg != _INBOUND}[table]
        used = [*np.unique(lanes.origin[chosen & starts]), *np.unique(lanes.destination[chosen & stops])]
        return {lanes.names[at] for at in used}

    def note(self, chosen: Flags, tell: Callable[[int], None]) -> int:
        """Call ``tell`` with the position of each chosen row up to the cap, and return how many are left."""
        places = np.flatnonzero(chosen)
        for place in places[:MOST_LISTED].tolist():
            tell(place)
        return max(0, places.size - MOST_LISTED)

    def pair(self, place: int) -> str:
        """Return the lane in words."""
        lanes = self.lanes
        return f"{lanes.names[lanes.origin[place]]} to {lanes.names[lanes.destination[place]]}"


def _check_missing(draft: Draft, ends: _Ends) -> None:
    """Note places without coordinates that no lane stands in for."""
    for table, key in PLACED.items():
        served = ends.named(table, ends.sound & ends.says)
        for row in draft.tables[table].rows:
            name = getattr(row, key)
            if not name or row.latitude is not None or row.longitude is not None or name in served:
                continue
            if draft.gathering.hurt(table, row.row, "latitude", "longitude"):
                continue
            wrong = f"{key} {name!r} has no coordinates, and no lane gives it a distance or a cost"
            repair = "Write latitude and longitude, or its lanes with road_km or unit_cost"
            draft.gathering.fault(table, row.row, "latitude", "", wrong, repair)


def _check_empty_lanes(draft: Draft, ends: _Ends) -> None:
    """Note lanes that have neither distance nor cost, nor coordinates to estimate them from."""
    lanes = ends.lanes
    empty = ends.sound & ~lanes.barred & ~ends.says & np.isnan(ends.straight_km)

    def tell(place: int) -> None:
        wrong = f"the lane {ends.pair(place)} has neither road_km nor unit_cost, and no coordinates at both ends"
        repair = "Write one of them, or the coordinates"
        draft.gathering.fault("lanes", int(lanes.row[place]), "unit_cost", "", wrong, repair)

    draft.gathering.count_more("lanes", faults=ends.note(empty, tell))


def _check_distances(draft: Draft, ends: _Ends) -> None:
    """Note lanes without any distance where a reach, a service distance or a carbon price asks for one."""
    lanes, settings = ends.lanes, draft.settings
    asked = np.zeros(len(lanes), dtype=np.bool_)
    to_customer = lanes.leg != _INBOUND
    if settings.service_km is not None:
        asked |= to_customer
    if settings.carbon_price_per_t:
        asked |= True
    reached = {row.customer for row in draft.customers.rows if row.reach_km is not None}
    asked |= to_customer & np.array([*(name in reached for name in lanes.names), False])[lanes.destination]
    bare = ends.sound & asked & ~lanes.barred & ~np.isnan(lanes.unit_cost)
    bare &= np.isnan(lanes.road_km) & np.isnan(ends.straight_km)

    def tell(place: int) -> None:
        wrong = f"the lane {ends.pair(place)} has no distance, but the study sets a reach, service_km or a carbon price"
        repair = "Write road_km, or the coordinates of both ends"
        draft.gathering.fault("lanes", int(lanes.row[place]), "road_km", "", wrong, repair)

    draft.gathering.count_more("lanes", faults=ends.note(bare, tell))


def _check_ratio(draft: Draft, ends: _Ends) -> None:
    """Warn of road distances shorter than the straight line, or over three times as long."""
    lanes = ends.lanes
    known = ends.sound & ~np.isnan(lanes.road_km) & ~np.isnan(ends.straight_km)
    far = np.fmax(lanes.road_km, ends.straight_km) >= NEAR_KM
    low, high = LEAST_RATIO * ends.straight_km, GREATEST_RATIO * ends.straight_km
    odd = known & far & ((lanes.road_km < low) | (lanes.road_km > high))

    def tell(place: int) -> None:
        how = "shorter than" if lanes.road_km[place] < low[place] else f"over {GREATEST_RATIO:g} times"
        line = f"{ends.straight_km[place]:.0f} km by its coordinates"
        wrong = f"the lane {ends.pair(place)} is {how} the straight line, about {line}"
        typed = f"{lanes.road_km[place]:g}"
        repair = "Check road_km and both coordinates"
        draft.gathering.warn("lanes", int(lanes.row[place]), "road_km", typed, wrong, repair)

    draft.gathering.count_more("lanes", warnings=ends.note(odd, tell))


def _check_reached(draft: Draft, ends: _Ends) -> None:
    """Warn of sites that no inbound lane reaches."""
    if not draft.suppliers.there or not draft.sites.there:
        return
    reached = {site for goods in _inbound(draft, ends) for site in goods}
    for site in draft.sites.rows:
        if site.site and site.site not in reached and not draft.gathering.hurt("sites", site.row, "site", "latitude"):
            wrong = f"no inbound lane reaches site {site.site!r}, so that it can only stay empty"
            repair = "Write its coordinates, or inbound lanes to it, unless that is meant"
            draft.gathering.warn("sites", site.row, "site", site.site, wrong, repair)


def _inbound(draft: Draft, ends: _Ends) -> Iterator[set[str]]:
    """Yield, for each good, the sites that an inbound lane reaches with it; a row with a good beats one without."""
    lanes = ends.lanes
    sites, suppliers = ends.located("sites"), ends.located("suppliers")
    site_at = {name: at for at, name in enumerate(dict.fromkeys(row.site for row in draft.sites.rows))}
    supplier_at = {name: at for at, name in enumerate(dict.fromkeys(row.supplier for row in draft.suppliers.rows))}
    by_coordinates = np.outer([name in suppliers for name in supplier_at], [name in sites for name in site_at])
    from_at = np.array([*(supplier_at.get(name, -1) for name in lanes.names), -1], dtype=np.int32)
    to_at = np.array([*(site_at.get(name, -1) for name in lanes.names), -1], dtype=np.int32)
    exists = ~lanes.barred & (ends.says | ~np.isnan(ends.straight_km))
    inbound = ends.sound & (lanes.leg == _INBOUND)
    names = np.array([*site_at, ""], dtype=object)
    for good in draft.names["goods"]:
        lane_exists = by_coordinates.copy()
        at = lanes.names.index(good) if good in lanes.names else -1
        for rows in (inbound & (lanes.good < 0), inbound & (lanes.good == at) & (at >= 0)):
            lane_exists[from_at[lanes.origin[rows]], to_at[lanes.destination[rows]]] = exists[rows]
        yield set(names[:-1][(lane_exists & _offering(draft, good, supplier_at)[:, None]).any(axis=0)])


def _offering(draft: Draft, good: str, supplier_at: dict[str, int]) -> Flags:
    """Return, of shape (suppliers,), which offer the good."""
    if not draft.offers.there:
        return np.ones(len(supplier_at), dtype=np.bool_)
    offering = {row.supplier for row in draft.offers.rows if row.good == good}
    return np.array([name in offering for name in supplier_at], dtype=np.bool_)


def _check_rates(draft: Draft, ends: _Ends) -> None:
    """Warn where distances cost nothing because a rate was never said."""
    located = {table: bool(ends.located(table)) for table in PLACED}
    priced_by_km = ends.sound & ~ends.lanes.barred & np.isnan(ends.lanes.unit_cost) & ~np.isnan(ends.lanes.road_km)
    needs = {
        "outbound_rate": (located["sites"] and located["customers"])
        or bool((priced_by_km & (ends.lanes.leg != _INBOUND)).any()),
        "inbound_rate": (located["suppliers"] and located["sites"])
        or bool((priced_by_km & (ends.lanes.leg == _INBOUND)).any()),
    }
    place = draft.settings_name
    which = "on lanes that no tariff fits" if draft.has("tariffs") else "by distance"
    for name, is_needed in needs.items():
        if is_needed and name not in draft.given_settings and place not in draft.unreadable:
            wrong = f"the setting is missing: freight {which} is taken as free of charge"
            draft.gathering.warn(place, None, name, "", wrong, "Add it; write 0 if freight costs nothing")
