"""Repairs of random impossible studies: each is enough, and none is more than is needed."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest

from siting.network.network import build_network
from siting.solving.impossible import find_repairs
from siting.study.tables import (
    CustomerRow,
    DemandRow,
    GoodRow,
    Leg,
    OfferRow,
    RuleKind,
    RuleRow,
    SiteRow,
    SiteRuling,
    Study,
    SupplierRow,
)
from tests.building import LaneRow, cost_rows, lane_table, settings_of
from tests.solving.repairing import WHOLE, assert_true_alone, is_possible, repaired

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.solving.elastic import Repair


def random_study(seed: int) -> Study:
    """Return a small study with two goods and most limits tight, impossible more often than not."""
    draws = np.random.default_rng(seed)
    sites, customers, suppliers = ("Brno", "Graz", "Győr"), ("Enns", "Linz", "Steyr", "Wels"), ("North", "South")
    goods = (GoodRow(good="pots", weight_t=0.5, load=2.0), GoodRow(good="trees", load=1.0))
    lanes = [
        LaneRow(
            leg=Leg.OUTBOUND,
            origin=site,
            destination=customer,
            road_km=float(draws.integers(50, 300)),
            barred=bool(draws.random() < 0.1),
        )
        for site in sites
        for customer in customers
    ]
    lanes += cost_rows(Leg.INBOUND, suppliers, sites, draws.integers(1, 9, (2, 3)).astype(np.float64).tolist())
    return Study(
        settings=settings_of(
            "random",
            outbound_rate=0.1,
            interest_rate=0.08,
            life_years=10.0,
            most_sites=int(draws.integers(1, 4)),
            one_off_budget=float(draws.integers(50, 300)),
            service_km=150.0,
            service_share=float(draws.choice([0.2, 0.5, 0.8])),
        ),
        sites=tuple(
            SiteRow(
                site=site,
                capacity=float(draws.integers(60, 160)),
                opening_charge=float(draws.integers(50, 150)),
                least_throughput=float(draws.choice([0, 50])),
                ruling=draws.choice([SiteRuling.FREE, SiteRuling.FREE, SiteRuling.PINNED_SHUT]),
            )
            for site in sites
        ),
        customers=tuple(
            CustomerRow(
                customer=customer,
                reach_km=float(draws.integers(100, 300)),
                single_source=bool(draws.random() < 0.4),
            )
            for customer in customers
        ),
        suppliers=tuple(
            SupplierRow(
                supplier=name, capacity=float(draws.integers(80, 200)), least_yearly=float(draws.choice([0, 90]))
            )
            for name in suppliers
        ),
        goods=goods,
        demands=tuple(
            DemandRow(customer=customer, good=good.good, demand=float(draws.integers(5, 25)))
            for customer in customers
            for good in goods
        ),
        offers=tuple(
            OfferRow(supplier=name, good=good.good, capacity=float(draws.integers(20, 90)))
            for name in suppliers
            for good in goods
        ),
        rules=(RuleRow(rule=RuleKind.NOT_TOGETHER, members=sites[:2], row=2),),
        lanes=lane_table(lanes),
    )


@pytest.mark.parametrize("seed", range(25))
def test_repairs_of_random_studies_are_true(seed: int) -> None:
    """Whatever is reported repairs the study; less of it does not; nothing is reported of a possible study."""
    study = random_study(seed)
    repairs, together = find_repairs(study, build_network(study))
    if is_possible(study):
        assert (repairs, together) == ((), False)
        return
    assert repairs
    if not together:
        for repair in repairs:
            assert_true_alone(study, repair)
        return
    assert is_possible(all_repaired(study, repairs))
    for left_out in repairs:
        assert not is_possible(all_repaired(study, [repair for repair in repairs if repair is not left_out]))
    *earlier, last = repairs
    less = all_repaired(study, earlier)
    if last.requirement not in WHOLE:
        assert not is_possible(repaired(less, last, 1 - 1e-3))


def all_repaired(study: Study, repairs: Sequence[Repair]) -> Study:
    """Return the study with every repair applied."""
    for repair in repairs:
        study = repaired(study, repair, 1 + 1e-6)
    return study
