"""Networks small enough to solve by hand, built without tables."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np
import pytest

from siting.network.network import LegLanes, Network
from siting.network.tariffs import NO_TARIFF

if TYPE_CHECKING:
    from collections.abc import Sequence

Lane = tuple[int, int, float] | tuple[int, int, float, int] | tuple[int, int, float, int, float]
"""Origin, destination, cost per unit, then the good (0) and the road km (0)."""


class NetworkMaker(Protocol):
    """What the fixture `make_network` is."""

    def __call__(
        self,
        *,
        demand: Sequence[Sequence[float]],
        charges: Sequence[float] = (),
        capacities: Sequence[float] | None = None,
        sites: Sequence[int] | None = None,
        supplier_charges: Sequence[float] = (),
        outbound: Sequence[Lane] = (),
        inbound: Sequence[Lane] = (),
        direct: Sequence[Lane] = (),
        **changes: object,
    ) -> Network:
        """Return a network of proposed sites and offered suppliers, then changed as asked."""


def _lanes(rows: Sequence[Lane]) -> LegLanes:
    padded = sorted((*row[:3], row[3] if len(row) > 3 else 0, row[4] if len(row) > 4 else 0.0) for row in rows)
    padded.sort(key=lambda row: (row[0], row[1], row[3]))
    columns = list(zip(*padded, strict=True)) or [()] * 5
    count = len(padded)
    cost = np.array(columns[2], dtype=np.float64)
    return LegLanes(
        origin=np.array(columns[0], dtype=np.int32),
        destination=np.array(columns[1], dtype=np.int32),
        good=np.array(columns[3], dtype=np.int32),
        km=np.array(columns[4], dtype=np.float64),
        km_given=np.ones(count, dtype=np.bool_),
        freight=cost,
        delivery=np.zeros(count),
        tariff=np.full(count, NO_TARIFF, dtype=np.int32),
        kg_co2e=np.zeros(count),
        cost=cost,
    )


def _make(
    *,
    demand: Sequence[Sequence[float]],
    charges: Sequence[float] = (),
    capacities: Sequence[float] | None = None,
    sites: Sequence[int] | None = None,
    supplier_charges: Sequence[float] = (),
    outbound: Sequence[Lane] = (),
    inbound: Sequence[Lane] = (),
    direct: Sequence[Lane] = (),
    **changes: Any,  # noqa: ANN401 - any field of Network
) -> Network:
    needs = np.array(demand, dtype=np.float64)
    option_site = np.arange(len(charges)) if sites is None else np.array(sites)
    site_count = int(option_site.max()) + 1 if option_site.size else 0
    suppliers, goods, options = len(supplier_charges), needs.shape[1], len(charges)
    network = Network(
        sites=tuple(f"S{number}" for number in range(site_count)),
        suppliers=tuple(f"K{number}" for number in range(suppliers)),
        customers=tuple(f"C{number}" for number in range(needs.shape[0])),
        goods=tuple(f"G{number}" for number in range(goods)),
        load=np.ones(goods),
        weight_t=np.ones(goods),
        demand=needs,
        single_source=np.zeros(needs.shape[0], dtype=np.bool_),
        option_site=option_site.astype(np.int32),
        option_running=np.zeros(options, dtype=np.bool_),
        option_charge=np.array(charges, dtype=np.float64),
        option_one_off=np.zeros(options),
        option_capacity=np.full(options, np.inf) if capacities is None else np.array(capacities, dtype=np.float64),
        option_least=np.zeros(options),
        site_running=np.zeros(site_count, dtype=np.bool_),
        site_closing=np.zeros(site_count),
        site_closing_one_off=np.zeros(site_count),
        site_pinned_open=np.zeros(site_count, dtype=np.bool_),
        site_pinned_shut=np.zeros(site_count, dtype=np.bool_),
        supplier_signed=np.zeros(suppliers, dtype=np.bool_),
        supplier_charge=np.array(supplier_charges, dtype=np.float64),
        supplier_one_off=np.zeros(suppliers),
        supplier_dropping=np.zeros(suppliers),
        supplier_dropping_one_off=np.zeros(suppliers),
        supplier_capacity=np.full(suppliers, np.inf),
        supplier_least=np.zeros(suppliers),
        supplier_pinned_signed=np.zeros(suppliers, dtype=np.bool_),
        supplier_pinned_unsigned=np.zeros(suppliers, dtype=np.bool_),
        offer_capacity=np.full((suppliers, goods), np.inf),
        offer_least=np.zeros((suppliers, goods)),
        inbound=_lanes(inbound),
        outbound=_lanes(outbound),
        direct=_lanes(direct),
        rules=(),
        fewest_sites=0,
        most_sites=site_count,
        one_off_budget=np.inf,
        service_km=np.inf,
        service_share=0.0,
        annuity=0.0,
    )
    return replace(network, **{name: _like(network, name, value) for name, value in changes.items()})


def _like(network: Network, name: str, value: Any) -> Any:  # noqa: ANN401 - any field of Network
    """Return `value` as the kind of array the field holds."""
    now = getattr(network, name)
    return np.array(value, dtype=now.dtype) if isinstance(now, np.ndarray) else value


@pytest.fixture(scope="session")
def make_network() -> NetworkMaker:
    """Return the maker of small networks."""
    return _make


@pytest.fixture(scope="session")
def two_sites(make_network: NetworkMaker) -> Network:
    """
    Return two sites and three customers needing 10, 20 and 30.

    Site 0 costs 100, site 1 costs 120; units cost 1, 2, 9 from site 0 and 8, 3, 1 from site 1. Alone they come to
    100 + 10 + 40 + 270 = 420 and 120 + 80 + 60 + 30 = 290; together to 220 + 10 + 40 + 30 = 300.
    """
    return make_network(
        demand=[[10], [20], [30]],
        charges=[100, 120],
        outbound=[(0, 0, 1), (0, 1, 2), (0, 2, 9), (1, 0, 8), (1, 1, 3), (1, 2, 1)],
    )
