"""Every reason an impossible study is given is true: the repair repairs it, and a little less does not."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from siting.listener import Stop
from siting.network.network import build_network
from siting.solving.elastic import Elastic, Repair
from siting.solving.impossible import explain, find_repairs
from siting.solving.repair_words import Words, shown
from siting.solving.requirements import Requirement, asked
from siting.study.tables import (
    IMPLIED_GOOD,
    CustomerRow,
    Leg,
    OfferRow,
    RuleKind,
    RuleRow,
    SiteRow,
    SiteRuling,
    SizeRow,
    Study,
    SupplierRow,
    SupplierRuling,
)
from tests.building import LaneRow, cost_rows, lane_rows, lane_table, settings_of
from tests.solving.repairing import assert_true_alone, is_possible, repaired

SITES = ("Brno", "Graz")
DEMAND = {"Linz": 60.0, "Wels": 70.0}
KM = {("Brno", "Linz"): 80.0, ("Brno", "Wels"): 200.0, ("Graz", "Linz"): 120.0, ("Graz", "Wels"): 150.0}


def study_of(capacity: float = math.inf, *, suppliers: tuple[SupplierRow, ...] = (), **settings: object) -> Study:
    """Return two sites of one capacity and two customers of 60 and 70, all lanes of known length, possible as it is."""
    lanes = [LaneRow(leg=Leg.OUTBOUND, origin=i, destination=j, road_km=km) for (i, j), km in KM.items()]
    lanes += cost_rows(Leg.INBOUND, [row.supplier for row in suppliers], SITES, [[1.0, 1.0]] * len(suppliers))
    return Study(
        settings=settings_of("t", outbound_rate=0.1, interest_rate=0.08, life_years=10.0, **settings),
        sites=tuple(SiteRow(site=name, capacity=capacity, opening_charge=100_000.0) for name in SITES),
        customers=tuple(CustomerRow(customer=name, demand=amount) for name, amount in DEMAND.items()),
        suppliers=suppliers,
        lanes=lane_table(lanes),
    )


def reasons_of(study: Study) -> dict[str, tuple[object, str, str]]:
    """Return amount, unit and sentence of each reason by family, after checking that every repair is true alone."""
    assert not is_possible(study)
    network = build_network(study)
    repairs, _ = find_repairs(study, network)
    for repair in repairs:
        assert_true_alone(study, repair)
    reasons, together = explain(study, network)
    assert not together
    assert [reason.family for reason in reasons] == [repair.requirement for repair in repairs]
    return {reason.family: (reason.amount, reason.unit, reason.sentence) for reason in reasons}


def test_possible_study_has_no_reasons() -> None:
    """Nothing has to give where a plan exists."""
    assert explain(study_of(capacity=65.0), build_network(study_of(capacity=65.0))) == ((), False)


@pytest.mark.parametrize("capacity", [40.0, 64.99])
def test_total_capacity(capacity: float) -> None:
    """Two sites hold 2 x capacity of the 130 needed; at 65 each the study is possible (test above)."""
    reasons = reasons_of(study_of(capacity))
    short = 130 - 2 * capacity
    assert set(reasons) == {"site-capacity"}
    assert reasons["site-capacity"][0] == pytest.approx(short)
    assert reasons["site-capacity"][1] == "unit"
    assert f"The total capacity of all sites is short by {shown(short)} unit; enough: " in reasons["site-capacity"][2]


def test_capacity_within_most_sites() -> None:
    """One site of 100 may open, 130 are needed: 30 more, or one more site. Both are said."""
    reasons = reasons_of(study_of(100.0, most_sites=1))
    assert set(reasons) == {"site-capacity", "most-sites"}
    assert reasons["site-capacity"][2].startswith("Site capacity is short by 30 unit; enough: ")
    assert reasons["most-sites"] == (1.0, "sites", "most_sites is 1, 1 too few: 2 sites are needed.")


def test_capacity_of_sizes() -> None:
    """The largest sizes hold 50 and 40: still 40 short."""
    sizes = (
        SizeRow(site="Brno", size="s", capacity=20.0),
        SizeRow(site="Brno", size="l", capacity=50.0),
        SizeRow(site="Graz", size="s", capacity=40.0),
    )
    assert reasons_of(replace(study_of(), sizes=sizes))["site-capacity"][0] == pytest.approx(40.0)


def test_supplier_capacity() -> None:
    """The supplier delivers 100 of 130 and its offer 90: 40 short, and both limits are named."""
    study = study_of(suppliers=(SupplierRow(supplier="North", capacity=100.0),))
    study = replace(study, offers=(OfferRow(supplier="North", good=IMPLIED_GOOD, capacity=90.0),))
    amount, unit, sentence = reasons_of(study)["supplier-capacity"]
    assert (amount, unit) == (pytest.approx(40.0), "unit")
    assert sentence == "Supplier capacity is short by 40 unit; enough: North +30 unit, North's goods +40 unit."


def test_reach() -> None:
    """Linz lies 80 km from the nearest site and is reached to 79 km; at 80 the study is possible."""
    study = study_of()

    def with_reach(reach: float) -> Study:
        return replace(study, customers=(replace(study.customers[0], reach_km=reach), study.customers[1]))

    assert is_possible(with_reach(80.0))
    reasons = reasons_of(with_reach(79.0))
    assert reasons == {
        "reach": (1.0, "customers", "This customer has no site within reach: Linz (reach 79 km, nearest 80 km).")
    }


def test_reach_of_customers_with_a_full_site() -> None:
    """Linz has a site within reach, too small for it."""
    study = study_of(65.0)
    sites = (replace(study.sites[0], capacity=30.0), replace(study.sites[1], capacity=100.0))
    customers = (replace(study.customers[0], reach_km=100.0), study.customers[1])
    reasons = reasons_of(replace(study, sites=sites, customers=customers))
    assert reasons["reach"][2] == (
        "This customer can only be served from beyond reach: Linz (reach 100 km, nearest beyond it 120 km)."
    )
    assert reasons["site-capacity"][0] == pytest.approx(30.0)


def test_bars() -> None:
    """Both lanes to Wels are barred; lifting either bar is enough."""
    study = study_of()
    rows = [replace(row, barred=row.destination == "Wels") for row in lane_rows(study.lanes)]
    amount, unit, sentence = reasons_of(replace(study, lanes=lane_table(rows)))["bars"]
    assert (amount, unit) == (1.0, "bars")
    assert sentence in {f"This bar stands in the way: {site} to Wels." for site in SITES}


def test_single_sourcing() -> None:
    """Sites of 100 and 50 hold 60 and 70 only if one is split; or if Graz grew by 10 to hold Linz."""
    study = study_of(single_source=True)
    sites = (replace(study.sites[0], capacity=100.0), replace(study.sites[1], capacity=50.0))
    reasons = reasons_of(replace(study, sites=sites))
    assert set(reasons) == {"single-sourcing", "site-capacity"}
    assert reasons["single-sourcing"][:2] == (1.0, "customers")
    assert "cannot be taken whole from one origin, only split: " in reasons["single-sourcing"][2]
    assert reasons["site-capacity"][0] == pytest.approx(10.0)


def test_customer_too_large_for_any_site() -> None:
    """A single-sourced customer of 70 has no lane from sites of 66, yet they hold it split, or grown by 4 and by 0."""
    study = study_of(66.0, single_source=True)
    reasons = reasons_of(study)
    assert reasons["single-sourcing"][0] == 1.0
    assert reasons["site-capacity"][0] == pytest.approx(4.0)


def test_least_throughput() -> None:
    """A pinned site must move 150, of 130 demanded: 20 too much; or unpin it."""
    study = study_of()
    sites = (replace(study.sites[0], least_throughput=150.0, ruling=SiteRuling.PINNED_OPEN), study.sites[1])
    reasons = reasons_of(replace(study, sites=sites))
    assert set(reasons) == {"least-throughput", "rulings"}
    assert reasons["least-throughput"] == (
        pytest.approx(20.0),
        "unit",
        "Least throughput is 20 unit too high; enough: Brno -20 unit.",
    )
    assert reasons["rulings"] == (1.0, "rulings", "This ruling stands in the way: Brno pinned-open.")


def test_least_yearly_volume() -> None:
    """A pinned supplier must deliver 150, its offer 145, of 130 demanded: the larger excess, 20, is what counts."""
    supplier = SupplierRow(supplier="North", least_yearly=150.0, ruling=SupplierRuling.PINNED_SIGNED)
    study = study_of(suppliers=(supplier, SupplierRow(supplier="South")))
    offers = (
        OfferRow(supplier="North", good=IMPLIED_GOOD, least_yearly=145.0),
        OfferRow(supplier="South", good=IMPLIED_GOOD),
    )
    reasons = reasons_of(replace(study, offers=offers))
    assert set(reasons) == {"least-yearly", "rulings"}
    assert reasons["least-yearly"][0] == pytest.approx(20.0)
    assert reasons["least-yearly"][2].endswith("enough: North's goods -15 unit, North -20 unit.")


def test_service_share() -> None:
    """Only the 60 of Linz lie within 100 km of a site: 46.2 % of 130, not the 90 % asked."""
    amount, unit, sentence = reasons_of(study_of(service_km=100.0, service_share=0.9))["service-share"]
    assert (amount, unit) == (pytest.approx(90 - 100 * 60 / 130), "points")
    assert sentence.startswith("At most 46.1538 % of the weight can be delivered within 100 km, 43.8462 points less")


def test_a_service_share_that_is_said_to_be_possible_is() -> None:
    """The 70 of Linz out of 130 are 53.84615... %: cut, not rounded up to 53.8462."""
    study = study_of(service_km=100.0, service_share=0.9)
    study = replace(
        study, customers=(replace(study.customers[0], demand=70.0), replace(study.customers[1], demand=60.0))
    )
    sentence = reasons_of(study)["service-share"][2]
    assert sentence.startswith("At most 53.8461 % of the weight can be delivered within 100 km, 36.1539 points less")


def test_fewest_sites() -> None:
    """Three sites are asked for and two are there."""
    reasons = reasons_of(study_of(fewest_sites=3))
    assert reasons == {"fewest-sites": (1.0, "sites", "fewest_sites is 3, 1 more than can be open: at most 2.")}


def test_budget() -> None:
    """Two sites of 100,000 are needed: a budget of 120,000 falls 80,000 short."""
    reasons = reasons_of(study_of(100.0, one_off_budget=120_000.0))
    assert set(reasons) == {"one-off-budget", "site-capacity"}
    assert reasons["one-off-budget"] == (
        pytest.approx(80_000.0),
        "XXX",
        "The one-off budget of 120,000 XXX falls 80,000 XXX short: 200,000 XXX are needed.",
    )


def test_contradicting_rules() -> None:
    """Both or none, exactly one: rows 2 and 3 contradict each other, row 4 has nothing to do with it."""
    rules = (
        RuleRow(rule=RuleKind.TOGETHER, members=SITES, row=2),
        RuleRow(rule=RuleKind.ONE_OF, members=SITES, row=3),
        RuleRow(rule=RuleKind.AT_LEAST, members=SITES, number=1, row=4),
    )
    amount, unit, sentence = reasons_of(replace(study_of(), rules=rules))["rules"]
    assert (amount, unit) == (1.0, "rules")
    assert sentence.startswith("The rules in rows 2 and 3 contradict each other. Enough: take out the rule in row ")


def test_rule_against_the_rest() -> None:
    """One site only, of 100, for 130: the rule is not contradictory, but cannot be met with the rest."""
    rules = (RuleRow(rule=RuleKind.ONE_OF, members=SITES, row=5),)
    reasons = reasons_of(replace(study_of(100.0), rules=rules))
    assert reasons["rules"][2] == (
        "The rule in row 5 cannot be met together with the other requirements. Enough: take out the rule in row 5."
    )


@pytest.mark.parametrize(
    ("kind", "number", "pins"),
    [
        (RuleKind.NEEDS, None, (SiteRuling.PINNED_OPEN, SiteRuling.PINNED_SHUT)),
        (RuleKind.NOT_TOGETHER, None, (SiteRuling.PINNED_OPEN, SiteRuling.PINNED_OPEN)),
        (RuleKind.AT_MOST, 1, (SiteRuling.PINNED_OPEN, SiteRuling.PINNED_OPEN)),
        (RuleKind.AT_LEAST, 2, (SiteRuling.PINNED_OPEN, SiteRuling.PINNED_SHUT)),
        (RuleKind.TOGETHER, None, (SiteRuling.PINNED_OPEN, SiteRuling.PINNED_SHUT)),
        (RuleKind.ONE_OF, None, (SiteRuling.PINNED_OPEN, SiteRuling.PINNED_OPEN)),
    ],
)
def test_rule_against_rulings(kind: RuleKind, number: int | None, pins: tuple[SiteRuling, SiteRuling]) -> None:
    """Each kind of rule gives way whole, and so does one of the two rulings."""
    study = study_of()
    sites = tuple(replace(row, ruling=pin) for row, pin in zip(study.sites, pins, strict=True))
    rules = (RuleRow(rule=kind, members=SITES, number=number, row=2),)
    reasons = reasons_of(replace(study, sites=sites, rules=rules))
    assert {family: reason[0] for family, reason in reasons.items()} == {"rules": 1.0, "rulings": 1.0}


def test_rulings_on_suppliers() -> None:
    """The only supplier may not be signed."""
    study = study_of(suppliers=(SupplierRow(supplier="North", ruling=SupplierRuling.PINNED_UNSIGNED),))
    reasons = reasons_of(study)
    assert reasons == {"rulings": (1.0, "rulings", "This ruling stands in the way: North pinned-unsigned.")}


def test_customer_without_any_lane() -> None:
    """Enns has no coordinates and no row: nothing that could be lifted serves it."""
    study = study_of()
    study = replace(study, customers=(*study.customers, CustomerRow(customer="Enns", demand=5.0)))
    reasons, together = explain(study, build_network(study))
    assert not together
    assert [(reason.family, reason.amount) for reason in reasons] == [("lanes", 1.0)]
    assert reasons[0].sentence.startswith(
        "This customer has no lane at all, whatever is lifted: Enns. Give coordinates"
    )


def test_customer_whose_good_nobody_can_bring() -> None:
    """A site no inbound lane reaches serves nobody; with it, a shortage elsewhere is told as well."""
    study = study_of(40.0, suppliers=(SupplierRow(supplier="North"),))
    rows = [row for row in lane_rows(study.lanes) if row.leg is not Leg.INBOUND]
    reasons, together = explain(
        replace(study, lanes=lane_table(rows)), build_network(replace(study, lanes=lane_table(rows)))
    )
    assert ([reason.family for reason in reasons], reasons[0].amount, together) == (["lanes"], 2.0, False)
    short = replace(study, customers=(*study.customers, CustomerRow(customer="Enns", demand=5.0)))
    reasons, together = explain(short, build_network(short))
    assert ([reason.family for reason in reasons], together) == (["lanes", "site-capacity"], True)
    assert reasons[1].amount == pytest.approx(50.0)
    assert reasons[1].sentence.endswith("Not enough alone.")


def test_one_family_found_late_is_enough_alone(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where time ran out on each family by itself, and one then turns out to be enough, it is not said to be not."""
    study = study_of(100.0, most_sites=1)
    real = Elastic.minimise
    hurried = iter([True] * len(asked(study)))

    def minimise(self: Elastic, requirement: Requirement, seconds: float, stop: Stop | None) -> Repair | None:
        return None if next(hurried, False) else real(self, requirement, seconds, stop)

    monkeypatch.setattr(Elastic, "minimise", minimise)
    reasons, together = explain(study, build_network(study))
    assert not together
    assert [reason.family for reason in reasons] == ["site-capacity"]
    assert "Not enough alone" not in reasons[0].sentence


@pytest.mark.parametrize(("smallest", "word"), [(True, "needed"), (False, "enough")])
def test_a_repair_that_may_be_too_large_is_not_said_to_be_needed(smallest: bool, word: str) -> None:  # noqa: FBT001  # a parameter
    """Where time ran out on the search for the smallest."""
    study = study_of(100.0, most_sites=1, one_off_budget=120_000.0)
    words = Words(study, build_network(study))
    for requirement, amount, said in (
        (Requirement.MOST_SITES, 1.0, f"2 sites are {word}."),
        (Requirement.BUDGET, 80_000.0, f"200,000 XXX are {word}."),
    ):
        repair = Repair(requirement=requirement, amount=amount, parts=(), smallest=smallest)
        sentence = words.reason(repair, [], together=False).sentence
        assert said in sentence
        assert ("Less may do" in sentence) is not smallest


def test_smallest_combination() -> None:
    """Linz is out of reach and three sites are asked for: neither repair alone helps, the two together do."""
    study = study_of(fewest_sites=3, one_off_budget=1e6, most_sites=1)
    study = replace(
        study,
        settings=replace(study.settings, most_sites=None),
        customers=(replace(study.customers[0], reach_km=79.0), study.customers[1]),
    )
    network = build_network(study)
    repairs, together = find_repairs(study, network)
    assert together
    assert [(repair.requirement, repair.amount) for repair in repairs] == [
        (Requirement.REACH, 1.0),
        (Requirement.FEWEST_SITES, pytest.approx(1.0)),
    ]
    assert is_possible(repaired(repaired(study, repairs[0]), repairs[1]))
    assert not any(is_possible(repaired(study, repair)) for repair in repairs)
    reasons, together = explain(study, network)
    assert together
    assert all(reason.sentence.endswith("Not enough alone.") for reason in reasons)


def test_a_stopped_explanation_says_nothing_untrue() -> None:
    """Stopped before it began, an explanation says that it found nothing, and what could be looked at."""
    stop = Stop()
    stop.request()
    study = study_of(120.0, most_sites=1)
    reasons, together = explain(study, build_network(study), stop=stop)
    assert not together
    assert [(reason.family, reason.amount) for reason in reasons] == [("not-found", None)]
    assert "The study asks for site-capacity, most-sites: lift one and plan again." in reasons[0].sentence


@pytest.mark.parametrize(
    ("amount", "text"),
    [
        (1240.0, "1,240"),
        (80_000.0, "80,000"),
        (1.0, "1"),
        (0.0425, "0.0425"),
        (1_234_567.2, "1,234,570"),
        (12.3456781, "12.3457"),
        (40.000000001, "40"),
        (0.0, "0"),
    ],
)
def test_amounts_are_rounded_up(amount: float, text: str) -> None:
    """Six digits, never less than what is needed."""
    assert shown(amount) == text
