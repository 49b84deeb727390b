"""The three legs of a study: who may send what to whom, and what is added to the freight."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.network.circuity import countries_of, factors_between
from siting.network.freight import price_lanes
from siting.network.lanes import EDGE, LegEnds, Places, find_lanes, within_reach
from siting.network.parties import or_unlimited
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.arrays import Flags, Floats, Positions
    from siting.network.freight import LegLanes
    from siting.network.lanes import FoundLanes
    from siting.network.parties import Parties
    from siting.study.tables import CustomerRow, SiteRow, Study, SupplierRow


def inbound_lanes(study: Study, parties: Parties) -> LegLanes:
    """
    Return the lanes from suppliers to sites: offered goods only, priced with their price.

    Parameters
    ----------
    study
        Checked.
    parties
        Of the study.

    Returns
    -------
    lanes
        None where the study has no suppliers. Inbound has no reach and no delivery charge.
    """
    starts = _End(names=parties.suppliers, rows=study.suppliers, takes=parties.offered)
    stops = _End(names=parties.sites, rows=study.sites, takes=parties.every_good(len(parties.sites)))
    ends = _ends(Leg.INBOUND, study, parties, starts, stops)
    lanes = find_lanes(ends, study.lanes, listed_only=False)
    return price_lanes(Leg.INBOUND, lanes, study, parties, parties.offer_price[lanes.origin, lanes.good])


def outbound_lanes(study: Study, parties: Parties) -> LegLanes:
    """
    Return the lanes from sites to customers: demanded goods only, within reach, priced with handling.

    Parameters
    ----------
    study
        Checked.
    parties
        Of the study.

    Returns
    -------
    lanes
        Those of single-sourced customers only from sites whose largest option holds them whole.
    """
    starts = _End(names=parties.sites, rows=study.sites, takes=parties.every_good(len(parties.sites)))
    ends = _ends(Leg.OUTBOUND, study, parties, starts, _customers(study, parties))
    lanes = find_lanes(ends, study.lanes, listed_only=False)
    lanes = within_reach(lanes, _reach(study))
    unlimited = np.full((len(parties.sites), len(parties.goods)), np.inf)
    lanes = _holding_whole(lanes, parties, parties.largest(), unlimited)
    handling = np.array([row.handling_rate for row in study.sites], dtype=np.float64)
    added = handling[lanes.origin] * parties.load[lanes.good]
    return price_lanes(Leg.OUTBOUND, lanes, study, parties, added)


def direct_lanes(study: Study, parties: Parties) -> LegLanes:
    """
    Return the lanes straight from suppliers to customers: only what `lanes` lists, offered and demanded.

    Parameters
    ----------
    study
        Checked.
    parties
        Of the study.

    Returns
    -------
    lanes
        Within reach, at the outbound rate, with deliveries and price; those of single-sourced customers only from
        suppliers that can deliver them whole.
    """
    starts = _End(names=parties.suppliers, rows=study.suppliers, takes=parties.offered)
    ends = _ends(Leg.DIRECT, study, parties, starts, _customers(study, parties))
    lanes = find_lanes(ends, study.lanes, listed_only=True)
    lanes = within_reach(lanes, _reach(study))
    lanes = _holding_whole(lanes, parties, parties.supplier_capacity, parties.offer_capacity)
    return price_lanes(Leg.DIRECT, lanes, study, parties, parties.offer_price[lanes.origin, lanes.good])


def _holding_whole(lanes: FoundLanes, parties: Parties, capacity: Floats, good_capacity: Floats) -> FoundLanes:
    """
    Return the lanes without those of single-sourced customers whose origin cannot be their only one.

    `capacity` of shape (origins,) is load a year, `good_capacity` of shape (origins, goods) units a year. An origin
    stays if it holds the customer's whole load and has a lane for every good the customer needs.
    """
    asked = parties.single_source[lanes.destination]
    if not asked.any():
        return lanes
    whole = parties.demand @ parties.load
    wanted = parties.demand[lanes.destination, lanes.good]
    fits = whole[lanes.destination] <= capacity[lanes.origin] * (1.0 + EDGE)
    fits &= wanted <= good_capacity[lanes.origin, lanes.good] * (1.0 + EDGE)
    pair = lanes.origin.astype(np.int64) * len(parties.customers) + lanes.destination
    of_pair = np.cumsum(np.append(False, pair[1:] != pair[:-1]))  # a pair lies together
    fitting = np.bincount(of_pair, weights=fits)[of_pair]
    needed = np.count_nonzero(parties.demand > 0, axis=1)[lanes.destination]
    return lanes.only(~asked | (fits & (fitting >= needed)))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _End:
    """One end of a leg: a table's names and rows, and (rows, goods) which goods each takes."""

    names: tuple[str, ...]
    rows: Sequence[SiteRow | CustomerRow | SupplierRow]
    takes: Flags


def _customers(study: Study, parties: Parties) -> _End:
    return _End(names=parties.customers, rows=study.customers, takes=parties.demand > 0)


def _ends(leg: Leg, study: Study, parties: Parties, starts: _End, stops: _End) -> LegEnds:
    (from_countries, from_at), (to_countries, to_at) = (countries_of(study, end.rows) for end in (starts, stops))
    return LegEnds(
        leg=leg,
        goods=parties.goods,
        origins=_places(starts, from_at),
        destinations=_places(stops, to_at),
        circuity=factors_between(study, from_countries, to_countries),
    )


def _places(end: _End, country: Positions) -> Places:
    degrees = [[math.nan if at is None else at for at in (row.latitude, row.longitude)] for row in end.rows]
    latitude, longitude = np.array(degrees, dtype=np.float64).reshape(-1, 2).T
    return Places(names=end.names, latitude=latitude, longitude=longitude, takes=end.takes, country=country)


def _reach(study: Study) -> Floats:
    return np.array([or_unlimited(row.reach_km) for row in study.customers], dtype=np.float64)
