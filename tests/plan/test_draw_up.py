"""A plan drawn up from decisions and amounts: verdicts, money, distances, notes and warnings, worked out by hand."""

from __future__ import annotations

from dataclasses import replace

import pytest

from siting.plan.plan import CostLine, SiteVerdict, SupplierVerdict
from siting.plan.proof import Outcome
from siting.study.tables import CustomerRow, SiteRow, SiteRuling, Study, SupplierRow, SupplierRuling
from tests.building import LaneRow, lane_table
from tests.plan import hand

FACTOR = 0.08 / (1 - 1.08**-10)


def test_verdicts_follow_standing_and_decision() -> None:
    """Running and proposed sites, signed and offered suppliers get the four words each that belong to them."""
    plan = hand.plan_of()
    assert {line.site: line.verdict for line in plan.sites} == {
        "Graz": SiteVerdict.CLOSE,
        "Linz": SiteVerdict.KEEP,
        "Brno": SiteVerdict.OPEN,
        "Wels": SiteVerdict.LEAVE,
    }
    assert {line.supplier: line.verdict for line in plan.suppliers} == {
        "Farm": SupplierVerdict.STAY,
        "Orchard": SupplierVerdict.SIGN,
        "Nursery": SupplierVerdict.DROP,
    }


def test_an_offered_supplier_not_taken_is_left() -> None:
    """Orchard is not signed today."""
    today = hand.today_of().plan
    assert today is not None
    assert today.suppliers[1].verdict is SupplierVerdict.LEAVE


def test_cost_lines_are_those_worked_out_by_hand() -> None:
    """Charges, prices, handling and deliveries from the tables of the case; freight is checked by the audit's tests."""
    lines = hand.plan_of().cost_lines
    residual = 2_000 / 1.08**10, 300 / 1.08**10
    assert lines[CostLine.OPENING] == pytest.approx(FACTOR * (8_000 - residual[0] + 4_000 - residual[1]))
    assert lines[CostLine.SITES] == pytest.approx(1_800 + 3_000)
    assert lines[CostLine.CLOSING] == pytest.approx(FACTOR * 1_500)
    assert lines[CostLine.SIGNING] == pytest.approx(FACTOR * 2_000)
    assert lines[CostLine.SUPPLIERS] == pytest.approx(400 + 600)
    assert lines[CostLine.DROPPING] == pytest.approx(FACTOR * 900)
    assert lines[CostLine.GOODS] == pytest.approx(150 * 20 + 50 * 50 + 40 * 21)
    assert lines[CostLine.HANDLING] == pytest.approx(80 * 5 + 220 * 3)
    assert lines[CostLine.DIRECT] == pytest.approx(40 * 420 * 0.2)
    loads_with_delivery = 50 + 30 + 90 + 40  # Brno to Vienna has a unit cost of its own, which takes the place of both
    assert lines[CostLine.DELIVERY] == pytest.approx(48 / 2.5 * loads_with_delivery)


def test_cost_lines_and_costs_to_serve_add_up() -> None:
    """The lines add up to the cost, the costs to serve to everything that is not a charge."""
    plan = hand.plan_of()
    charges = sum(line.charge for line in plan.sites) + sum(line.charge for line in plan.suppliers)
    assert plan.proof.cost == pytest.approx(sum(plan.cost_lines.values()))
    assert sum(line.cost_to_serve for line in plan.customers) == pytest.approx(plan.cost - charges)
    assert sum(flow.cost for flow in plan.flows) == pytest.approx(plan.cost - charges)


def test_one_off_money_is_the_sum_of_all_four_kinds() -> None:
    """Opening 8,000 and 4,000, closing 1,500, signing 2,000, dropping 900; today has none."""
    plan = hand.plan_of()
    assert plan.one_off == pytest.approx(16_400)
    assert plan.today is not None
    assert plan.today.plan is not None
    assert plan.today.plan.one_off == 0.0


def test_utilisation_is_throughput_over_the_open_size() -> None:
    """Brno moves 220 of 250; a closed site and an unlimited one have no utilisation."""
    lines = {line.site: line for line in hand.plan_of().sites}
    assert lines["Brno"].utilisation == pytest.approx(0.88)
    assert lines["Linz"].utilisation == pytest.approx(80 / 120)
    assert lines["Graz"].utilisation is None


def test_a_supplier_is_limited_by_its_offers_in_load() -> None:
    """Farm offers 200 pots of its 300; Nursery 100 trees of 3 units of load; Orchard's pots are unlimited."""
    assert [line.capacity for line in hand.plan_of().suppliers] == [200.0, 250.0, 300.0]


def test_a_split_customer_lists_its_origins_most_load_first() -> None:
    """Vienna gets 130 units of load from Brno and 30 from Linz."""
    vienna = hand.plan_of().customers[0]
    assert vienna.origins == ("Brno", "Linz")
    assert vienna.load == pytest.approx(160)


def test_inbound_is_counted_at_the_average_of_the_site() -> None:
    """Zlin takes 30 of the 50 trees Orchard sends to Brno, so it pays three fifths of that flow."""
    plan = hand.plan_of()
    own = sum(flow.cost for flow in plan.flows if flow.destination == "Zlin")
    trees_in = sum(flow.cost for flow in plan.flows if flow.destination == "Brno" and flow.good == "trees")
    assert plan.customers[2].cost_to_serve == pytest.approx(own + 0.6 * trees_in)


def test_marginal_costs_are_blank_for_single_sourced_customers() -> None:
    """Zlin is single-sourced; a good that is not needed has none either."""
    lines = {line.customer: line for line in hand.plan_of().customers}
    assert lines["Zlin"].marginal_cost == {}
    assert lines["Salzburg"].marginal_cost == {"pots": 12.5}


def test_bands_hold_their_upper_edge() -> None:
    """101 and 138 km lie in 100 to 200, the 420 km in 400 to 800; shares are of all load."""
    bands = {(band.above_km, band.to_km): band.share for band in hand.plan_of().service.bands}
    assert bands[400.0, 800.0] == pytest.approx(40 / 340)
    assert sum(bands.values()) == pytest.approx(1.0)


def test_the_service_share_goes_by_weight() -> None:
    """All but Ostrava's 20 t of 195 t lies within 250 km."""
    assert hand.plan_of().service.share_within == pytest.approx(1 - 20 / 195)


def test_nothing_is_reported_where_it_is_not_set() -> None:
    """Without factor or service distance both are None, never 0."""
    settings = replace(
        hand.SETTINGS, emission_kg_per_tkm=None, carbon_price_per_t=0.0, service_km=None, service_share=None
    )
    plan = hand.plan_of(replace(hand.STUDY, settings=settings))
    assert plan.tonnes_co2e is None
    assert plan.service.share_within is None


def test_emissions_are_blank_where_a_lane_has_no_distance() -> None:
    """A lane known by its unit cost alone emits something, but nobody knows how much."""
    study = one_lane(unit_cost=3.0)
    settings = replace(study.settings, emission_kg_per_tkm=0.1)
    study = replace(study, settings=settings)
    plan = hand.draw(study, hand.worked(study, {("A", "")}, set(), {(hand.OUT, "A", "B", "goods"): 10.0}))
    assert plan.tonnes_co2e is None
    assert plan.service.average_km is None
    assert plan.service.bands == ()
    assert plan.service.estimated_share is None


def one_lane(*, unit_cost: float, capacity: float | None = None, demand: float = 10.0) -> Study:
    """Return one site, one customer and a lane known by its unit cost."""
    return Study(
        settings=hand.settings_for("One lane"),
        sites=(SiteRow(site="A", capacity=capacity),),
        customers=(CustomerRow(customer="B", demand=demand),),
        lanes=lane_table([LaneRow(leg=hand.OUT, origin="A", destination="B", unit_cost=unit_cost)]),
    )


@pytest.mark.parametrize(("capacity", "flagged"), [(12.94, True), (12.9411764705882, True), (12.95, False)])
def test_sites_that_would_be_too_full_are_flagged(capacity: float, flagged: bool) -> None:  # noqa: FBT001  # a parameter
    """At 10 % more demand, 11 of 12.95 is below 85 %, of 12.94 above it."""
    study = one_lane(unit_cost=1.0, capacity=capacity)
    plan = hand.draw(study, hand.worked(study, {("A", "")}, set(), {(hand.OUT, "A", "B", "goods"): 10.0}))
    assert any("above 85 % full: A (85" in warning for warning in plan.warnings) is flagged


def test_estimated_distances_are_warned_of() -> None:
    """140 of 340 units of load move over lanes that coordinates give."""
    assert any(
        warning.startswith("41.2 % of the load is delivered over estimated") for warning in hand.plan_of().warnings
    )


def empty_graz(**changes: object) -> str:
    """Return the note on Graz, kept open with nothing moving through it."""
    graz = replace(hand.SITES[0], **changes)  # type: ignore[arg-type]  # fields by name
    study = replace(hand.STUDY, sites=(graz, *hand.SITES[1:]))
    opened = {("Graz", ""), ("Linz", "large"), ("Brno", "")}
    case = hand.worked(study, opened, {"Farm", "Orchard"}, hand.PLAN_MOVES)
    return hand.draw(study, case).sites[0].note


@pytest.mark.parametrize(
    ("changes", "note"),
    [
        ({"yearly_charge": FACTOR * 1_500 - 0.01}, "empty: closing costs more than running"),
        ({"yearly_charge": FACTOR * 1_500 + 0.01}, "empty: nothing moves through it"),
        ({"ruling": SiteRuling.PINNED_OPEN}, "empty: pinned open"),
    ],
)
def test_an_empty_site_says_why_it_stays_open(changes: dict[str, object], note: str) -> None:
    """The note on closing is given only where closing does cost more a year than running."""
    assert empty_graz(**changes) == note


def test_an_empty_new_site_says_so() -> None:
    """A proposed site that opens for a rule alone has no closing to avoid."""
    opened = {("Wels", ""), ("Linz", "large"), ("Brno", "")}
    case = hand.worked(hand.STUDY, opened, {"Farm", "Orchard"}, hand.PLAN_MOVES)
    assert hand.draw(hand.STUDY, case).sites[3].note == "empty: nothing moves through it"


@pytest.mark.parametrize(
    ("changes", "note"),
    [
        ({"yearly_charge": FACTOR * 900 - 0.01}, "empty: dropping costs more than staying"),
        ({"yearly_charge": FACTOR * 900 + 0.01}, "empty: nothing is bought from it"),
        ({"ruling": SupplierRuling.PINNED_SIGNED}, "empty: pinned signed"),
    ],
)
def test_an_unused_supplier_says_why_it_stays(changes: dict[str, object], note: str) -> None:
    """The note on dropping is given only where dropping does cost more a year than staying."""
    nursery: SupplierRow = replace(hand.SUPPLIERS[2], **changes)  # type: ignore[arg-type]  # fields by name
    study = replace(hand.STUDY, suppliers=(*hand.SUPPLIERS[:2], nursery))
    case = hand.worked(study, {("Linz", "large"), ("Brno", "")}, {"Farm", "Orchard", "Nursery"}, hand.PLAN_MOVES)
    assert hand.draw(study, case).suppliers[2].note == note


def test_a_change_of_size_is_noted() -> None:
    """Linz runs small today and large in the plan; the large size's opening charge is paid, no closing charge."""
    linz = hand.plan_of().sites[1]
    assert linz.note == "changes size from small to large"
    assert linz.one_off == 4_000.0


def test_rounding_of_a_solver_is_no_flow() -> None:
    """An amount of a billionth of what is needed is left out; a millionth is a flow."""
    for share, flows in ((1e-9, 9), (1e-6, 10)):
        moved = {**hand.PLAN_MOVES, (hand.OUT, "Linz", "Vienna", "trees"): 20.0 * share}
        case = hand.worked(hand.STUDY, {("Linz", "large"), ("Brno", "")}, {"Farm", "Orchard"}, moved)
        assert len(hand.draw(hand.STUDY, case).flows) == flows


@pytest.mark.parametrize(
    ("share", "outcome"),
    [
        (1.0, Outcome.PROVED),
        (1.0 - 0.99e-6, Outcome.PROVED),
        (1.0 - 1.01e-6, Outcome.WITHIN_GAP),
        (1.0 - 0.99e-4, Outcome.WITHIN_GAP),
        (1.0 - 1.01e-4, Outcome.STOPPED),
    ],
)
def test_the_outcome_is_what_cost_and_bound_earn(share: float, outcome: Outcome) -> None:
    """Proved up to a gap of 1e-6, within the gap up to the gap asked of 1e-4, stopped beyond."""
    assert hand.draw(hand.STUDY, hand.case_of(), bound_share=share).proof.outcome is outcome


@pytest.mark.parametrize(("share", "kept"), [(1.0 + 0.9e-6, False), (1.0 + 1.1e-6, True)])
def test_a_bound_above_the_cost_is_rounding_only_up_to_a_millionth(share: float, kept: bool) -> None:  # noqa: FBT001  # a parameter
    """Beyond that the bound is left to the audit, which objects."""
    proof = hand.draw(hand.STUDY, hand.case_of(), bound_share=share).proof
    assert proof.bound is not None
    assert proof.cost is not None
    assert (proof.bound > proof.cost) is kept


def test_a_pure_choice_of_suppliers_needs_no_site() -> None:
    """Without sites everything goes straight, and the site lines are empty."""
    study = Study(
        settings=hand.settings_for("Suppliers alone"),
        suppliers=(SupplierRow(supplier="K", yearly_charge=5.0, unit_price=2.0),),
        customers=(CustomerRow(customer="B", demand=4.0),),
        lanes=lane_table([LaneRow(leg=hand.DIRECT, origin="K", destination="B", unit_cost=1.0)]),
    )
    plan = hand.draw(study, hand.worked(study, set(), {"K"}, {(hand.DIRECT, "K", "B", "goods"): 4.0}))
    assert plan.sites == ()
    assert plan.cost == pytest.approx(5 + 4 * (1 + 2))
