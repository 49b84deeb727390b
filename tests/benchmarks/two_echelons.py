"""Seeded studies of two echelons at any size, made as arrays."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.study.tables import CustomerRow, LaneTable, Leg, SiteRow, Study, SupplierRow
from tests.building import settings_of

if TYPE_CHECKING:
    from siting.arrays import Floats


def two_echelons(suppliers: int, sites: int, customers: int, seed: int, *, ratio: float = 5.0) -> Study:
    """
    Return a seeded study: places in the unit square, freight 10 a unit and distance outbound, 6 inbound.

    Demand is uniform in 5-35; site capacities uniform in 10-160, scaled to `ratio` times the demand; site charges as in
    the recipe of Cornuejols, Sridharan & Thizy (1991) from the unscaled capacity. Suppliers likewise, with three times
    the demand in all and signing charges (8 % over 10 years) on top of yearly ones.
    """
    random = np.random.default_rng(seed)
    at_supplier, at_site, at_customer = (random.random((count, 2)) for count in (suppliers, sites, customers))
    demand = random.uniform(5, 35, customers)
    capacity = random.uniform(10, 160, sites)
    charge = random.uniform(0, 90, sites) + random.uniform(100, 110, sites) * np.sqrt(capacity)
    capacity *= ratio * demand.sum() / capacity.sum()
    brings = random.uniform(10, 160, suppliers)
    signing = (random.uniform(0, 90, suppliers) + random.uniform(100, 110, suppliers) * np.sqrt(brings)) * 5
    brings *= 3.0 * demand.sum() / brings.sum()
    price = random.uniform(0, 2, suppliers)
    names = tuple(
        f"{letter}{n}" for letter, count in (("K", suppliers), ("S", sites), ("C", customers)) for n in range(count)
    )
    inbound = 6 * _distance(at_supplier, at_site)
    outbound = 10 * _distance(at_site, at_customer)
    supplier, site = np.divmod(np.arange(inbound.size), sites)
    origin, customer = np.divmod(np.arange(outbound.size), customers)
    count = inbound.size + outbound.size
    table = LaneTable(
        names=names,
        origin=np.concatenate([supplier, suppliers + origin]).astype(np.int32),
        destination=np.concatenate([suppliers + site, suppliers + sites + customer]).astype(np.int32),
        good=np.full(count, -1, np.int32),
        leg=np.repeat(
            [LaneTable.LEGS.index(Leg.INBOUND), LaneTable.LEGS.index(Leg.OUTBOUND)], [inbound.size, outbound.size]
        ).astype(np.int32),
        road_km=np.full(count, np.nan),
        unit_cost=np.concatenate([inbound.ravel(), outbound.ravel()]),
        barred=np.zeros(count, np.bool_),
        row=np.arange(2, count + 2, dtype=np.int32),
    )
    return Study(
        settings=settings_of(f"{suppliers} x {sites} x {customers}", interest_rate=0.08, life_years=10.0),
        sites=tuple(
            SiteRow(site=names[suppliers + n], capacity=float(capacity[n]), yearly_charge=float(charge[n]))
            for n in range(sites)
        ),
        suppliers=tuple(
            SupplierRow(
                supplier=names[n],
                capacity=float(brings[n]),
                signing_charge=float(signing[n]),
                yearly_charge=float(signing[n] / 10),
                unit_price=float(price[n]),
            )
            for n in range(suppliers)
        ),
        customers=tuple(
            CustomerRow(customer=names[suppliers + sites + n], demand=float(demand[n])) for n in range(customers)
        ),
        lanes=table,
    )


def _distance(a: Floats, b: Floats) -> Floats:
    gap = a[:, None, :] - b[None, :, :]
    distance: Floats = np.hypot(gap[..., 0], gap[..., 1])
    return distance
