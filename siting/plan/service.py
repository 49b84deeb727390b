"""How far customers are from what serves them, and what that emits."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.plan.plan import Band, Service
from siting.plan.pricing import KG_PER_T

if TYPE_CHECKING:
    from siting.arrays import Floats
    from siting.network.network import Network
    from siting.plan.pricing import AllMoves
    from siting.study.settings import Settings

BAND_EDGES_KM = (0.0, 50.0, 100.0, 200.0, 400.0, 800.0)
"""Lower ends of the distance bands, doubling so that they suit a city and a continent; the last has no upper end."""


def service_of(network: Network, moves: AllMoves) -> Service:
    """
    Return average distance, distance bands and service share of what is delivered.

    Parameters
    ----------
    network
        The numbers of the study, for service_km.
    moves
        What moves; deliveries are the outbound and direct legs.

    Returns
    -------
    service
        Averages, bands and the estimated share go by load, the service share by weight.
    """
    km = np.concatenate([moves.outbound.km, moves.direct.km])
    given = np.concatenate([moves.outbound.km_given, moves.direct.km_given])
    load = np.concatenate([moves.outbound.load, moves.direct.load])
    tonnes = np.concatenate([moves.outbound.tonnes, moves.direct.tonnes])
    total, known = float(load.sum()), ~np.isnan(km)
    complete = bool(total > 0 and known.all())
    weight, near = float(tonnes.sum()), known & (km <= network.service_km)
    within = float(tonnes[near].sum()) / weight if weight > 0 else 1.0
    return Service(
        average_km=float(km @ load) / total if complete else None,
        bands=_bands(km, load, total) if complete else (),
        share_within=within if np.isfinite(network.service_km) else None,
        estimated_share=float(load[known & ~given].sum()) / total if known.any() and total > 0 else None,
    )


def _bands(km: Floats, load: Floats, total: float) -> tuple[Band, ...]:
    """Return the bands: above the lower edge, up to and with the upper one; the first takes 0 km as well."""
    place = np.maximum(np.searchsorted(BAND_EDGES_KM, km, side="left") - 1, 0)
    carried = np.bincount(place, weights=load, minlength=len(BAND_EDGES_KM))
    uppers = (*BAND_EDGES_KM[1:], None)
    return tuple(
        Band(above_km=lower, to_km=upper, load=float(held), share=float(held) / total)
        for lower, upper, held in zip(BAND_EDGES_KM, uppers, carried, strict=True)
    )


def tonnes_co2e_of(settings: Settings, moves: AllMoves) -> float | None:
    """Return tonnes CO2e a year; None where no factor is set or a used lane has no distance (not reported, never 0)."""
    if settings.emission_kg_per_tkm is None or any(np.isnan(leg.km).any() for leg in moves):
        return None
    return sum(float(leg.kg_co2e.sum()) for leg in moves) / KG_PER_T
