"""A study turned into numbers: charges, capacities, rules. Lanes are in test_lanes.py."""

from __future__ import annotations

import math

import numpy as np
import pytest

from siting.network.network import build_network
from siting.study.settings import Settings
from siting.study.tables import (
    CustomerRow,
    DemandRow,
    GoodRow,
    OfferRow,
    RuleKind,
    RuleRow,
    SiteRow,
    SiteRuling,
    SiteStanding,
    SizeRow,
    Study,
    SupplierRow,
    SupplierRuling,
    SupplierStanding,
)

SPREAD = Settings(currency="EUR", unit="t", interest_rate=0.08, life_years=10)
A = 0.149029488697
"""Capital recovery at 8 % over ten years (1,000,000 is 149,029.49 a year)."""
WORTH = 0.463193488
"""Present worth of one unit after ten years at 8 %."""


def test_proposed_site_pays_its_opening_charge_less_what_is_left() -> None:
    """It costs yearly + a x (opening - residual x (1+i)^-n): 1,000,000 with 200,000 left is 135,223.59 a year."""
    site = SiteRow(site="Brno", yearly_charge=50_000, opening_charge=1_000_000, residual_value=200_000)
    network = build_network(Study(settings=SPREAD, sites=(site,)))
    assert network.option_charge == pytest.approx([50_000 + 135_223.59], abs=0.005)
    assert network.option_one_off.tolist() == [1_000_000]
    assert network.site_closing.tolist() == [0.0]
    assert network.annuity == pytest.approx(A, rel=1e-9)


def test_running_site_pays_for_closing_only() -> None:
    """What runs is paid for: no opening charge, no residual value; closing is annualised, and only where it runs."""
    running = SiteRow(
        site="Graz",
        standing=SiteStanding.RUNNING,
        yearly_charge=50_000,
        opening_charge=1_000_000,
        residual_value=200_000,
        closing_charge=80_000,
    )
    proposed = SiteRow(site="Brno", closing_charge=80_000)
    network = build_network(Study(settings=SPREAD, sites=(running, proposed)))
    assert network.option_charge.tolist() == [50_000, 0]
    assert network.option_one_off.tolist() == [0, 0]
    assert network.option_running.tolist() == [True, False]
    assert network.site_running.tolist() == [True, False]
    assert network.site_closing == pytest.approx([80_000 * A, 0], rel=1e-9)
    assert network.site_closing_one_off.tolist() == [80_000, 0]


def test_sale_proceeds_lower_the_cost() -> None:
    """A negative closing charge stays negative."""
    site = SiteRow(site="Graz", standing=SiteStanding.RUNNING, closing_charge=-80_000)
    assert build_network(Study(settings=SPREAD, sites=(site,))).site_closing == pytest.approx([-80_000 * A], rel=1e-9)


def test_no_interest_spreads_over_the_life() -> None:
    """At interest 0 a charge of 1,000 with 400 left after ten years costs 60 a year."""
    settings = Settings(currency="EUR", unit="t", interest_rate=0.0, life_years=10)
    site = SiteRow(site="Brno", opening_charge=1_000, residual_value=400)
    assert build_network(Study(settings=settings, sites=(site,))).option_charge == pytest.approx([60.0], rel=1e-12)


def test_moving_to_another_size_costs_that_size() -> None:
    """Sizes become options in order; the running one is paid for, the others cost their opening charge."""
    sizes = (
        SizeRow(site="Graz", size="small", standing=SiteStanding.RUNNING, yearly_charge=10, capacity=100),
        SizeRow(site="Graz", size="large", yearly_charge=15, opening_charge=1_000, capacity=300, least_throughput=20),
    )
    network = build_network(Study(settings=SPREAD, sites=(SiteRow(site="Brno"), SiteRow(site="Graz")), sizes=sizes))
    assert network.option_site.tolist() == [0, 1, 1]
    assert network.option_running.tolist() == [False, True, False]
    assert network.site_running.tolist() == [False, True]
    assert network.option_charge == pytest.approx([0, 10, 15 + 1_000 * A], rel=1e-9)
    assert network.option_one_off.tolist() == [0, 0, 1_000]
    assert network.option_capacity.tolist() == [math.inf, 100, 300]
    assert network.option_least.tolist() == [0, 0, 20]


def test_suppliers_pay_for_signing_or_for_dropping() -> None:
    """An offered supplier pays to be signed, a signed one to be dropped; blank capacity is unlimited."""
    suppliers = (
        SupplierRow(supplier="North", signing_charge=1_000, dropping_charge=500, yearly_charge=7, capacity=40),
        SupplierRow(
            supplier="South",
            standing=SupplierStanding.SIGNED,
            signing_charge=1_000,
            dropping_charge=500,
            yearly_charge=7,
            least_yearly=9,
        ),
    )
    network = build_network(Study(settings=SPREAD, suppliers=suppliers))
    assert network.supplier_charge == pytest.approx([7 + 1_000 * A, 7], rel=1e-9)
    assert network.supplier_one_off.tolist() == [1_000, 0]
    assert network.supplier_dropping == pytest.approx([0, 500 * A], rel=1e-9)
    assert network.supplier_dropping_one_off.tolist() == [0, 500]
    assert network.supplier_signed.tolist() == [False, True]
    assert network.supplier_capacity.tolist() == [40, math.inf]
    assert network.supplier_least.tolist() == [0, 9]
    assert not network.two_echelons


def test_offers_limit_what_each_supplier_brings() -> None:
    """Offers present: only listed pairs, in the good's own unit. Absent: every supplier offers every good."""
    goods = (GoodRow(good="pots", weight_t=0.5, load=2.0), GoodRow(good="trees"))
    suppliers = (SupplierRow(supplier="North", unit_price=3), SupplierRow(supplier="South"))
    offers = (OfferRow(supplier="North", good="trees", unit_price=8, capacity=60, least_yearly=5),)
    listed = build_network(Study(settings=SPREAD, suppliers=suppliers, goods=goods, offers=offers))
    assert listed.offer_capacity.tolist() == [[0, 60], [0, 0]]
    assert listed.offer_least.tolist() == [[0, 5], [0, 0]]
    absent = build_network(Study(settings=SPREAD, suppliers=suppliers, goods=goods))
    assert np.isinf(absent.offer_capacity).all()
    assert absent.load.tolist() == [2.0, 1.0]
    assert absent.weight_t.tolist() == [0.5, 1.0]


def test_demand_stands_by_customer_and_good() -> None:
    """Units each customer needs, 0 where it needs none; single sourcing as the row or else the settings say."""
    settings = Settings(currency="EUR", unit="t", single_source=True)
    customers = (CustomerRow(customer="Linz"), CustomerRow(customer="Wels", single_source=False))
    goods = (GoodRow(good="pots"), GoodRow(good="trees"))
    demands = (
        DemandRow(customer="Wels", good="trees", demand=4),
        DemandRow(customer="Linz", good="pots", demand=6),
    )
    network = build_network(
        Study(settings=settings, sites=(SiteRow(site="Brno"),), customers=customers, goods=goods, demands=demands)
    )
    assert network.demand.tolist() == [[6, 0], [0, 4]]
    assert network.single_source.tolist() == [True, False]


def test_rulings_and_rules_become_positions() -> None:
    """Pins are flags; members of a rule keep the order typed and say which kind they are."""
    sites = (SiteRow(site="Brno", ruling=SiteRuling.PINNED_OPEN), SiteRow(site="Graz", ruling=SiteRuling.PINNED_SHUT))
    suppliers = (
        SupplierRow(supplier="North", ruling=SupplierRuling.PINNED_SIGNED),
        SupplierRow(supplier="South", ruling=SupplierRuling.PINNED_UNSIGNED),
    )
    rules = (
        RuleRow(rule=RuleKind.NEEDS, members=("South", "Brno")),
        RuleRow(rule=RuleKind.AT_MOST, members=("Graz", "Brno"), number=1),
    )
    network = build_network(Study(settings=SPREAD, sites=sites, suppliers=suppliers, rules=rules))
    assert network.site_pinned_open.tolist() == [True, False]
    assert network.site_pinned_shut.tolist() == [False, True]
    assert network.supplier_pinned_signed.tolist() == [True, False]
    assert network.supplier_pinned_unsigned.tolist() == [False, True]
    assert [rule.kind for rule in network.rules] == [RuleKind.NEEDS, RuleKind.AT_MOST]
    assert network.rules[0].members == (("supplier", 1), ("site", 0))
    assert network.rules[1].members == (("site", 1), ("site", 0))
    assert [rule.number for rule in network.rules] == [None, 1]


def test_limits_not_set_bind_nothing() -> None:
    """Without settings: no fewest, every site at most, endless budget and service distance, share 0."""
    sites = (SiteRow(site="Brno"), SiteRow(site="Graz"))
    free = build_network(Study(settings=Settings(currency="EUR", unit="t"), sites=sites))
    assert (free.fewest_sites, free.most_sites, free.one_off_budget) == (0, 2, math.inf)
    assert (free.service_km, free.service_share, free.annuity) == (math.inf, 0.0, 0.0)
    bound = Settings(
        currency="EUR", unit="t", fewest_sites=1, most_sites=1, one_off_budget=5.0, service_km=200, service_share=0.9
    )
    network = build_network(Study(settings=bound, sites=sites))
    assert (network.fewest_sites, network.most_sites, network.one_off_budget) == (1, 1, 5.0)
    assert (network.service_km, network.service_share) == (200, 0.9)
