"""What freight would be if roads were longer or shorter than estimated, with the same flows."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.network.freight import price_lanes
from siting.network.lanes import NO_ROW, FoundLanes
from siting.network.tariffs import OWN_COST

if TYPE_CHECKING:
    from siting.network.network import Network
    from siting.plan.pricing import AllMoves, Moves
    from siting.study.tables import Study

CIRCUITY_STEP = 0.1
"""Share by which estimated distances are taken longer and shorter."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RoadSensitivity:
    """Money a year that the flows of a plan would cost more (or less, where negative)."""

    longer: float
    """If every estimated distance were longer by `CIRCUITY_STEP`."""
    shorter: float
    """If every estimated distance were shorter by `CIRCUITY_STEP`."""


def road_sensitivity(study: Study, network: Network, moves: AllMoves) -> RoadSensitivity:
    """
    Re-price flows at longer and shorter estimated distances.

    Parameters
    ----------
    study
        For rates, tariffs and what carbon costs.
    network
        Its numbers.
    moves
        What moves; nothing is decided or moved anew, so that a new plan could only be cheaper than this says.

    Returns
    -------
    sensitivity
        Freight, deliveries and carbon of lanes with an estimated distance; those with a unit_cost keep their freight.
    """
    present, longer, shorter = (
        sum(_money(study, network, leg, factor) for leg in moves)
        for factor in (1.0, 1.0 + CIRCUITY_STEP, 1.0 - CIRCUITY_STEP)
    )
    return RoadSensitivity(longer=longer - present, shorter=shorter - present)


def _money(study: Study, network: Network, moves: Moves, factor: float) -> float:
    """Return what the flows of a leg over estimated distances cost a year, without price and handling."""
    at = np.flatnonzero(~moves.km_given & ~np.isnan(moves.km))
    none = np.full(at.size, np.nan)
    lanes = FoundLanes(
        origin=moves.origin[at],
        destination=moves.destination[at],
        good=moves.good[at],
        row=np.full(at.size, NO_ROW, dtype=np.int32),
        km=factor * moves.km[at],
        km_given=np.zeros(at.size, dtype=np.bool_),
        unit_cost=np.where(moves.tariff[at] == OWN_COST, 0.0, none),  # costs the same at any distance
    )
    priced = price_lanes(moves.leg, lanes, study, network, np.zeros(at.size))
    return float(priced.cost @ moves.amount[at])
