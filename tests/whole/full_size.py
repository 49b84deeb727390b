"""An invented study of full size: 20 sites, 100 customers, 5 suppliers, two goods, sizes, rules and charges."""

from __future__ import annotations

import numpy as np

from siting.study.settings import Settings
from siting.study.tables import (
    CustomerRow,
    DemandRow,
    GoodRow,
    Leg,
    OfferRow,
    RuleKind,
    RuleRow,
    SiteRow,
    SiteStanding,
    SizeRow,
    Study,
    SupplierRow,
    SupplierStanding,
)
from tests.building import LaneRow, lane_table

SITES, CUSTOMERS, SUPPLIERS = 20, 100, 5
RUNNING, SIGNED = 4, 2


def full_size(seed: int = 7) -> Study:
    """Return the study of a seed: places at random in Central Europe, capacities about three times the demand."""
    random = np.random.default_rng(seed)

    def places(count: int) -> list[tuple[float, float]]:
        return [
            (float(a), float(b))
            for a, b in zip(random.uniform(46, 52, count), random.uniform(9, 20, count), strict=True)
        ]

    def whole(low: int, high: int) -> float:
        return float(random.integers(low, high))

    sites, sizes = [], []
    for n, (latitude, longitude) in enumerate(places(SITES)):
        standing = SiteStanding.RUNNING if n < RUNNING else SiteStanding.PROPOSED
        has_sizes = n % 5 == RUNNING
        own = {} if has_sizes else {"yearly_charge": whole(60, 140) * 1000, "capacity": whole(1500, 3500)}
        if not has_sizes and standing is SiteStanding.PROPOSED:
            own["opening_charge"] = whole(100, 500) * 1000
        sites.append(
            SiteRow(
                site=f"S{n}",
                latitude=latitude,
                longitude=longitude,
                standing=standing,
                closing_charge=whole(50, 200) * 1000 if n < RUNNING else 0.0,
                handling_rate=whole(4, 9),
                **own,  # type: ignore[arg-type]  # charges and capacity
            )
        )
        sizes += [
            SizeRow(
                site=f"S{n}",
                size=size,
                opening_charge=charge * whole(100, 300) * 1000,
                yearly_charge=charge * whole(50, 110) * 1000,
                capacity=charge * 1600.0,
                residual_value=20_000.0,
            )
            for size, charge in (("small", 1.0), ("large", 1.8))
            if has_sizes
        ]
    suppliers = [
        SupplierRow(
            supplier=f"K{n}",
            latitude=latitude,
            longitude=longitude,
            standing=SupplierStanding.SIGNED if n < SIGNED else SupplierStanding.OFFERED,
            signing_charge=0.0 if n < SIGNED else whole(20, 60) * 1000,
            yearly_charge=whole(20, 60) * 1000,
            capacity=whole(5000, 8000),
        )
        for n, (latitude, longitude) in enumerate(places(SUPPLIERS))
    ]
    customers = [
        CustomerRow(customer=f"C{n}", latitude=latitude, longitude=longitude, reach_km=400.0)
        for n, (latitude, longitude) in enumerate(places(CUSTOMERS))
    ]
    return Study(
        settings=Settings(
            title="full size",
            currency="EUR",
            unit="t",
            outbound_rate=0.2,
            inbound_rate=0.07,
            drop_charge=40.0,
            drop_size=2.5,
            interest_rate=0.08,
            life_years=10.0,
            service_km=250.0,
            service_share=0.6,
            most_sites=12,
            emission_kg_per_tkm=0.1,
            carbon_price_per_t=60.0,
        ),
        sites=tuple(sites),
        sizes=tuple(sizes),
        suppliers=tuple(suppliers),
        customers=tuple(customers),
        goods=(GoodRow(good="G0"), GoodRow(good="G1", load=1.5, weight_t=0.8)),
        demands=tuple(
            DemandRow(customer=f"C{n}", good=good, demand=whole(*limits))
            for n in range(CUSTOMERS)
            for good, limits in (("G0", (20, 160)), ("G1", (10, 60)))
        ),
        offers=tuple(
            OfferRow(supplier=f"K{n}", good=good, unit_price=base + whole(0, 30), capacity=float("inf"))
            for n in range(SUPPLIERS)
            for good, base in (("G0", 300), ("G1", 420))
            if (n, good) != (3, "G1")
        ),
        lanes=lane_table(
            [
                LaneRow(leg=Leg.OUTBOUND, origin="S0", destination="C0", barred=True),
                LaneRow(leg=Leg.OUTBOUND, origin="S1", destination="C1", good="G1", unit_cost=12.0, road_km=80.0),
                LaneRow(leg=Leg.DIRECT, origin="K0", destination="C2", road_km=300.0),
            ]
        ),
        rules=(
            RuleRow(rule=RuleKind.NOT_TOGETHER, members=("S5", "S6")),
            RuleRow(rule=RuleKind.NEEDS, members=("S9", "K2")),
        ),
    )
