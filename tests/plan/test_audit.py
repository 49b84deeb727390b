"""The audit passes a good plan and objects to each kind of tampering with what a plan states."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from siting.plan.audit import audit
from siting.plan.plan import CostLine, SiteVerdict, SupplierVerdict
from siting.plan.proof import Outcome
from tests.plan import hand
from tests.plan.tampering import (
    Tamper,
    cost_of,
    objections,
    with_customer,
    with_flow,
    with_line,
    with_proof,
    with_service,
    with_site,
    with_supplier,
)


def test_a_good_plan_passes() -> None:
    """The hand-worked plan, its today included, has no fault."""
    assert audit(hand.STUDY, hand.plan_of()).faults == ()


def test_a_good_plan_of_today_passes_as_such() -> None:
    """Today breaks rulings, rules and least volumes of the study, which of_today ignores."""
    today = hand.today_of().plan
    assert today is not None
    assert audit(hand.STUDY, today, of_today=True).passed
    assert "rule in row 2" not in objections(today)  # one_of Graz, Brno holds today
    assert "rule in row 4" not in objections(today)
    assert "the plan does not say what today costs" in objections(today)


VERDICTS: list[tuple[str, Tamper, str]] = [
    ("site without a line", lambda p: replace(p, sites=p.sites[:-1]), r"site Wels has no line instead of one"),
    (
        "two sizes of a site",
        lambda p: replace(p, sites=(*p.sites, p.sites[1])),
        r"site Linz has 2 lines instead of one",
    ),
    ("unknown site", lambda p: with_site(p, "Wels", site="Ulm"), r"site Ulm is in no table"),
    ("supplier without a line", lambda p: replace(p, suppliers=p.suppliers[1:]), r"supplier Farm has no line"),
    ("open at a running site", lambda p: with_site(p, "Linz", verdict=SiteVerdict.OPEN), r"Linz is running, .* open"),
    ("keep at a proposed site", lambda p: with_site(p, "Brno", verdict=SiteVerdict.KEEP), r"Brno is proposed, .* keep"),
    (
        "sign of a signed one",
        lambda p: with_supplier(p, "Farm", verdict=SupplierVerdict.SIGN),
        r"Farm is signed, .* sign",
    ),
    (
        "stay of an offered one",
        lambda p: with_supplier(p, "Orchard", verdict=SupplierVerdict.STAY),
        r"Orchard is offered, .* stay",
    ),
    (
        "size the site lacks",
        lambda p: with_site(p, "Linz", size="huge"),
        r"Linz is open at size 'huge', which it does not",
    ),
    ("size of a shut site", lambda p: with_site(p, "Wels", size="small"), r"Wels is not open but has size 'small'"),
    (
        "capacity of a site",
        lambda p: with_site(p, "Brno", capacity=260.0),
        r"Brno: capacity is stated as 260.0, .* 250",
    ),
    ("capacity unlimited", lambda p: with_site(p, "Brno", capacity=None), r"Brno: capacity is stated as None, .* 250"),
    (
        "capacity of a supplier",
        lambda p: with_supplier(p, "Farm", capacity=None),
        r"Farm: capacity is stated as inf, the tables give 200",
    ),
    (
        "charge of a site",
        lambda p: with_site(p, "Graz", charge=0.0),
        r"Graz: charge is stated as 0 EUR a year, .* 223\.54",
    ),
    (
        "one-off of a site",
        lambda p: with_site(p, "Brno", one_off=0.0),
        r"Brno: one-off money is stated as 0 EUR, .* 8,000",
    ),
    (
        "charge of a supplier",
        lambda p: with_supplier(p, "Orchard", charge=600.0),
        r"Orchard: charge is .* 600 EUR a year",
    ),
    (
        "noted as empty",
        lambda p: with_site(p, "Linz", note="empty: pinned open"),
        r"site Linz is noted as empty but moves 80 t",
    ),
    (
        "noted as dear to close",
        lambda p: with_site(p, "Linz", note="empty: closing costs more than running"),
        r"site Linz is noted as dearer to close than to run: 0 against 2,375\.4",
    ),
    (
        "sum of one-off money",
        lambda p: replace(p, one_off=16_399.9),
        r"one-off money is stated as 16,399.9 EUR, .* 16,400",
    ),
]

FLOWS: list[tuple[str, Tamper, str]] = [
    (
        "demand short",
        lambda p: with_flow(p, "Linz", "Salzburg", amount=49.0),
        r"Salzburg needs 50 t of pots and gets 49",
    ),
    (
        "demand exceeded",
        lambda p: with_flow(p, "Linz", "Salzburg", amount=51.0),
        r"Salzburg needs 50 t of pots and gets 51",
    ),
    ("balance", lambda p: with_flow(p, "Farm", "Linz", amount=79.0), r"Linz takes in 79 t of pots and sends out 80"),
    ("inflow left out", lambda p: replace(p, flows=p.flows[1:]), r"site \w+ takes in 0 t of pots and sends out \d+"),
    (
        "through a shut site",
        lambda p: with_flow(p, "Linz", "Salzburg", origin="Wels"),
        r"50 t move through site Wels, which is not open and pays no charge",
    ),
    (
        "into a shut site",
        lambda p: with_flow(p, "Farm", "Linz", destination="Graz"),
        r"80 t move through site Graz, which is not open",
    ),
    (
        "from an unsigned supplier",
        lambda p: with_flow(p, "Orchard", "Brno", "trees", origin="Nursery"),
        r"50 t come from supplier Nursery, which is not signed",
    ),
    (
        "unknown customer",
        lambda p: with_flow(p, "Linz", "Salzburg", destination="Ulm"),
        r"destination 'Ulm' is in no table",
    ),
    (
        "unknown origin",
        lambda p: with_flow(p, "Linz", "Salzburg", origin="Farm"),
        r"origin 'Farm' is in no table it could",
    ),
    ("unknown good", lambda p: with_flow(p, "Linz", "Salzburg", good="figs"), r"good 'figs' is in no table"),
    (
        "amount of nothing",
        lambda p: with_flow(p, "Linz", "Salzburg", amount=0.0),
        r"Salzburg is 0.0 t; a flow is above 0",
    ),
    (
        "amount below 0",
        lambda p: with_flow(p, "Linz", "Salzburg", amount=-1.0),
        r"Salzburg is -1.0 t; a flow is above 0",
    ),
    ("listed twice", lambda p: replace(p, flows=(*p.flows, p.flows[0])), r"is listed more than once"),
    (
        "direct but not listed",
        lambda p: with_flow(p, "Orchard", "Ostrava", origin="Farm"),
        r"from Farm to Ostrava \(40 t\) may not be: a direct lane exists only where",
    ),
    (
        "barred",
        lambda p: with_flow(p, "Brno", "Zlin", "trees", origin="Linz"),
        r"from Linz to Zlin \(30 t\) may not be: the lane is barred",
    ),
    (
        "not offered",
        lambda p: with_flow(p, "Orchard", "Brno", "trees", origin="Farm"),
        r"may not be: Farm does not offer trees",
    ),
    (
        "out of reach",
        lambda p: with_flow(p, "Linz", "Salzburg", origin="Brno"),
        r"may not be: the lane is \d+\.\d+ km long, the customer's reach is 300 km",
    ),
    (
        "throughput",
        lambda p: with_site(p, "Brno", throughput=219.0),
        r"Brno: throughput is stated as 219 t, .* give 220",
    ),
    ("customers of a site", lambda p: with_site(p, "Brno", customers=3), r"Brno: 3 customers are stated, .* serve 2"),
    (
        "volume",
        lambda p: with_supplier(p, "Farm", volume=151.0),
        r"Farm: volume is stated as 151 t, the flows give 150",
    ),
    (
        "single sourcing",
        lambda p: replace(
            with_flow(p, "Brno", "Zlin", "trees", amount=15.0),
            flows=(
                *with_flow(p, "Brno", "Zlin", "trees", amount=15.0).flows,
                replace(p.flows[-2], origin="Wels", amount=15.0),
            ),
        ),
        r"customer Zlin must be served whole from one origin and is served from Brno, Wels",
    ),
]

STATED: list[tuple[str, Tamper, str]] = [
    *(
        (
            f"cost line {line}",
            lambda p, line=line: with_line(p, line, 1.0001),
            rf"cost line {line} is stated as [\d,.]+ EUR",
        )
        for line in CostLine
    ),
    (
        "cost line missing",
        lambda p: replace(p, cost_lines={k: v for k, v in p.cost_lines.items() if k is not CostLine.GOODS}),
        r"cost line goods is missing",
    ),
    ("total", lambda p: with_line(p, CostLine.GOODS, 1.00002), r"the cost lines add up to 35,560\.\d+ EUR a year"),
    ("cost", lambda p: with_proof(p, cost=cost_of(p) * (1 + 2e-6)), r"the cost is stated as 35,56\d\.\d+ EUR a year"),
    ("no cost", lambda p: with_proof(p, cost=None), r"cost None and bound [\d.]+ are not both numbers"),
    (
        "cost of a flow",
        lambda p: with_flow(p, "Brno", "Zlin", "trees", cost=1.0),
        r"Brno to Zlin is stated to cost 1 EUR",
    ),
    (
        "km of a flow",
        lambda p: with_flow(p, "Brno", "Zlin", "trees", km=102.0),
        r"stated to be 102 km long, .* give 101",
    ),
    ("km unknown", lambda p: with_flow(p, "Brno", "Zlin", "trees", km=None), r"road km is stated as None, .* give 101"),
    (
        "km given or not",
        lambda p: with_flow(p, "Brno", "Zlin", "trees", km_given=False),
        r"its distance is given, the plan says otherwise",
    ),
    (
        "a customer missing",
        lambda p: replace(p, customers=p.customers[1:]),
        r"customer Vienna has no line instead of one",
    ),
    (
        "load",
        lambda p: with_customer(p, "Zlin", load=91.0),
        r"customer Zlin: load is stated as 91 t, the flows give 90",
    ),
    (
        "origins",
        lambda p: with_customer(p, "Vienna", origins=("Brno",)),
        r"customer Vienna: served from (Linz, Brno|Brno, Linz), stated as Brno",
    ),
    (
        "order of origins",
        lambda p: with_customer(p, "Vienna", origins=("Linz", "Brno")),
        r"customer Vienna: its origins are not listed most load first",
    ),
    (
        "cost to serve",
        lambda p: with_customer(p, "Zlin", cost_to_serve=7_000.0),
        r"customer Zlin: cost to serve is stated as 7,000 EUR a year, the tables give 7,2\d\d",
    ),
    (
        "sum of costs to serve",
        lambda p: with_customer(p, "Zlin", cost_to_serve=7_000.0),
        r"the costs to serve add up to [\d,.]+ EUR a year, everything that is not a charge to",
    ),
    ("average km of a customer", lambda p: with_customer(p, "Zlin", km=99.0), r"customer Zlin: the average .* 99.0 km"),
    (
        "marginal cost if single-sourced",
        lambda p: with_customer(p, "Zlin", marginal_cost={"trees": 1.0}),
        r"customer Zlin is single-sourced, for which no marginal cost",
    ),
    (
        "marginal cost of no need",
        lambda p: with_customer(p, "Salzburg", marginal_cost={"trees": 1.0}),
        r"customer Salzburg: a marginal cost of 1.0 is stated for trees",
    ),
    (
        "emissions",
        lambda p: replace(p, tonnes_co2e=7.4),
        r"emissions are stated as 7.4 t CO2e a year, the tables give 7.45",
    ),
    ("emissions left out", lambda p: replace(p, tonnes_co2e=None), r"emissions are stated as None t CO2e"),
    ("average km", lambda p: with_service(p, average_km=1.0), r"the plan: the average distance is stated as 1.0 km"),
    (
        "service share",
        lambda p: with_service(p, share_within=1.0),
        r"delivered within service_km is stated as 1.0, .* 0.897",
    ),
    ("estimated share", lambda p: with_service(p, estimated_share=None), r"over estimated distances is stated as None"),
    ("no bands", lambda p: with_service(p, bands=()), r"distance bands are stated exactly where every used lane"),
    (
        "load of a band",
        lambda p: with_service(p, bands=(replace(p.service.bands[0], load=1.0), *p.service.bands[1:])),
        r"the distance band above 0 km is stated to hold 1 \(0.00%\), not 0",
    ),
    (
        "bands apart",
        lambda p: with_service(p, bands=(p.service.bands[0], *p.service.bands[2:])),
        r"the distance band above 100 km does not follow on the one before",
    ),
    (
        "bands incomplete",
        lambda p: with_service(p, bands=p.service.bands[:3]),
        r"the distance bands do not add up to 100 %",
    ),
    ("fingerprint", lambda p: replace(p, fingerprint="0" * 64), r"its fingerprint does not match the tables"),
    ("currency", lambda p: replace(p, currency="USD"), r"currency is stated as 'USD', the settings say 'EUR'"),
    ("unit", lambda p: replace(p, unit="kg"), r"unit is stated as 'kg', the settings say 't'"),
    ("title", lambda p: replace(p, title="Other"), r"title is stated as 'Other', the settings say 'Hand-worked'"),
]

PROOFS: list[tuple[str, Tamper, str]] = [
    ("bound too high", lambda p: with_proof(p, bound=cost_of(p) * 1.00001), r"the bound, [\d,.]+ EUR a year, is above"),
    ("bound infinite", lambda p: with_proof(p, bound=float("-inf")), r"bound -inf are not both numbers"),
    (
        "bound of its count",
        lambda p: with_proof(p, site_count_bounds={2: cost_of(p) + 1.0}),
        r"the bound for 2 sites, [\d,.]+ EUR a year, is above the cost",
    ),
    (
        "outcome not earned",
        lambda p: with_proof(p, outcome=Outcome.PROVED),
        r"the outcome is stated as proved; cost, bound and gap asked earn within-gap",
    ),
    ("outcome too modest", lambda p: with_proof(p, outcome=Outcome.STOPPED), r"stated as stopped; .* earn within-gap"),
    ("gap asked", lambda p: with_proof(p, gap_asked=1.0), r"the gap asked is 1.0, which is not in \[0, 1\)"),
    ("no bound, yet proved", lambda p: with_proof(p, bound=None), r"stated as within-gap; .* earn stopped"),
]


@pytest.mark.parametrize(
    ("tamper", "message"), [pytest.param(*case[1:], id=case[0]) for case in (*VERDICTS, *FLOWS, *STATED, *PROOFS)]
)
def test_tampering_is_caught(tamper: Tamper, message: str) -> None:
    """A good plan changed in one place fails, and a fault names the place and the amounts."""
    assert re.search(message, objections(tamper(hand.plan_of())))


@pytest.mark.parametrize(("off", "passes"), [(0.99e-6, True), (1.01e-6, False)])
def test_the_cost_is_checked_to_a_millionth(off: float, passes: bool) -> None:  # noqa: FBT001  # a parameter
    """A cost off by just less than 1e-6 is rounding, by just more a fault."""
    plan = hand.plan_of()
    tampered = with_proof(plan, cost=cost_of(plan) * (1 + off - 1e-9 if passes else 1 + off + 1e-9))
    assert audit(hand.STUDY, tampered).passed is passes
