"""The audit objects when a limit, rule or ruling of the tables is broken: values just below, at and above each."""

from __future__ import annotations

import re
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import pytest

from siting.plan.audit import audit
from siting.study.tables import RuleKind, RuleRow, SiteRuling, Study, SupplierRuling
from tests.building import lane_table
from tests.plan import hand

if TYPE_CHECKING:
    from collections.abc import Callable

PLAN = hand.plan_of()


def changed(table: str, key: str, **values: Any) -> Study:  # noqa: ANN401  # fields by name
    """Return the study with one row of a table changed; `key` are the row's first one or two cells."""
    rows = getattr(hand.STUDY, table)
    found = [row for row in rows if "/".join(cells(row)).startswith(key)]
    assert len(found) == 1
    values_of: dict[str, Any] = {table: tuple(replace(row, **values) if row is found[0] else row for row in rows)}
    return replace(hand.STUDY, **values_of)


def cells(row: object) -> list[str]:
    """Return the names a row is about."""
    names = (getattr(row, name, None) for name in ("site", "size", "customer", "supplier", "good"))
    return [name for name in names if isinstance(name, str)]


def with_settings(**values: Any) -> Study:  # noqa: ANN401  # fields by name
    """Return the study with settings changed."""
    return replace(hand.STUDY, settings=replace(hand.SETTINGS, **values))


def faults(study: Study) -> list[str]:
    """Return what the audit says about the plan when the study asks something else of it."""
    return list(audit(study, hand.stamped(study, PLAN)).faults)


SALZBURG_KM = next(flow.km for flow in PLAN.flows if flow.destination == "Salzburg")
assert SALZBURG_KM is not None
SHARE = PLAN.service.share_within
assert SHARE is not None

LIMITS: list[tuple[str, Callable[[float], Study], float, bool, str]] = [
    (
        "supplier capacity",
        lambda value: changed("suppliers", "Farm", capacity=value),
        150.0,
        True,
        r"supplier Farm delivers 150 t, its capacity is 149\.99",
    ),
    (
        "offer capacity",
        lambda value: changed("offers", "Orchard/trees", capacity=value),
        50.0,
        True,
        r"supplier Orchard delivers 50 t of trees, its offer is 49\.99",
    ),
    (
        "least yearly volume of a supplier",
        lambda value: changed("suppliers", "Farm", least_yearly=value),
        150.0,
        False,
        r"supplier Farm delivers 150 t, its least yearly volume is 150\.0",
    ),
    (
        "least yearly volume of an offer",
        lambda value: changed("offers", "Orchard/trees", least_yearly=value),
        50.0,
        False,
        r"supplier Orchard delivers 50 t of trees, the least is 50\.0",
    ),
    (
        "least throughput of a site",
        lambda value: changed("sites", "Brno", least_throughput=value),
        220.0,
        False,
        r"site Brno: 220 t move through it, its least throughput is 220\.0",
    ),
    (
        "least throughput of a size",
        lambda value: changed("sizes", "Linz/large", least_throughput=value),
        80.0,
        False,
        r"site Linz: 80 t move through it, its least throughput is 80\.0",
    ),
    (
        "site capacity",
        lambda value: changed("sites", "Brno", capacity=value),
        220.0,
        True,
        r"site Brno: 220 t move through it, its capacity is 219\.9",
    ),
    (
        "size capacity",
        lambda value: changed("sizes", "Linz/large", capacity=value),
        80.0,
        True,
        r"site Linz: 80 t move through it, its capacity is 79\.99",
    ),
    (
        "reach",
        lambda value: changed("customers", "Salzburg", reach_km=value),
        SALZBURG_KM,
        True,
        r"from Linz to Salzburg \(50 t\) may not be: the lane is 141\.8\d+ km long, the customer's reach is 141\.\d",
    ),
    (
        "one-off budget",
        lambda value: with_settings(one_off_budget=value),
        16_400.0,
        True,
        r"one-off money is 16,400 EUR, the budget is 16,399\.\d+",
    ),
    (
        "service share",
        lambda value: with_settings(service_share=value),
        SHARE,
        False,
        r"89\.7436% of the weight is delivered within 250 km, service_share asks for 89\.74",
    ),
    (
        "fewest sites",
        lambda value: with_settings(fewest_sites=int(value)),
        2,
        False,
        r"2 sites are open, fewest_sites is 3",
    ),
    ("most sites", lambda value: with_settings(most_sites=int(value)), 2, True, r"2 sites are open, most_sites is 1"),
]


def test_demand_is_met_exactly() -> None:
    """Salzburg gets 50: needing a little less or a little more is a fault, 50 and rounding of it is none."""
    for need, met in ((49.999, False), (49.99996, True), (50.0, True), (50.00004, True), (50.001, False)):
        study = changed("demands", "Salzburg/pots", demand=need)
        assert any("customer Salzburg needs" in fault for fault in faults(study)) is not met


@pytest.mark.parametrize(
    ("study_of", "limit", "is_most", "message"), [pytest.param(*case[1:], id=case[0]) for case in LIMITS]
)
def test_limits_hold_at_their_value_and_fail_just_beyond(
    study_of: Callable[[float], Study],
    limit: float,
    is_most: bool,  # noqa: FBT001  # a parameter
    message: str,
) -> None:
    """At the limit, within it and within rounding of it a plan passes; 1e-5 (or one site) beyond it does not."""
    step = 1.0 if isinstance(limit, int) else 1e-5 * limit
    outward = -1.0 if is_most else 1.0
    words = message.rpartition(", ")[2].rpartition(" ")[0]  # such as: its capacity is

    def found(value: float) -> list[str]:
        own = [fault for fault in faults(study_of(value)) if not fault.startswith("today: ")]
        return [fault for fault in own if words in fault]

    beyond = found(limit + outward * step)
    assert len(beyond) == 1
    assert re.search(message, beyond[0])
    assert not found(limit)
    assert not found(limit - outward * step)
    if not isinstance(limit, int):
        assert not found(limit * (1.0 + outward * 0.9e-6))


@pytest.mark.parametrize(
    ("rule", "members", "number", "broken"),
    [
        (RuleKind.ONE_OF, ("Graz", "Brno"), None, False),
        (RuleKind.ONE_OF, ("Graz", "Wels"), None, True),
        (RuleKind.ONE_OF, ("Linz", "Brno"), None, True),
        (RuleKind.NOT_TOGETHER, ("Graz", "Wels"), None, False),
        (RuleKind.NOT_TOGETHER, ("Graz", "Brno"), None, False),
        (RuleKind.NOT_TOGETHER, ("Linz", "Brno"), None, True),
        (RuleKind.TOGETHER, ("Graz", "Wels", "Nursery"), None, False),
        (RuleKind.TOGETHER, ("Linz", "Brno", "Orchard"), None, False),
        (RuleKind.TOGETHER, ("Linz", "Brno", "Nursery"), None, True),
        (RuleKind.NEEDS, ("Graz", "Wels"), None, False),
        (RuleKind.NEEDS, ("Brno", "Linz", "Farm"), None, False),
        (RuleKind.NEEDS, ("Brno", "Linz", "Nursery"), None, True),
        (RuleKind.AT_MOST, ("Graz", "Linz", "Brno"), 2, False),
        (RuleKind.AT_MOST, ("Graz", "Linz", "Brno"), 1, True),
        (RuleKind.AT_LEAST, ("Graz", "Linz", "Brno"), 2, False),
        (RuleKind.AT_LEAST, ("Graz", "Linz", "Brno"), 3, True),
    ],
)
def test_every_kind_of_rule_is_checked(
    rule: RuleKind,
    members: tuple[str, ...],
    number: int | None,
    broken: bool,  # noqa: FBT001  # a parameter
) -> None:
    """Linz, Brno, Farm and Orchard are taken; Graz, Wels and Nursery are not."""
    row = RuleRow(rule=rule, members=members, number=number, row=2)
    found = faults(replace(hand.STUDY, rules=(row,)))
    assert bool(found) is broken
    if broken:
        assert re.match(rf"rule in row 2 \({rule}.* of {', '.join(members)}\) is broken: taken are", found[0])


@pytest.mark.parametrize(
    ("table", "name", "ruling", "message"),
    [
        ("sites", "Graz", SiteRuling.PINNED_OPEN, "site Graz is pinned open but the verdict is close"),
        ("sites", "Wels", SiteRuling.PINNED_OPEN, "site Wels is pinned open but the verdict is leave"),
        ("sites", "Linz", SiteRuling.PINNED_SHUT, "site Linz is pinned shut but the verdict is keep"),
        ("sites", "Brno", SiteRuling.PINNED_SHUT, "site Brno is pinned shut but the verdict is open"),
        (
            "suppliers",
            "Nursery",
            SupplierRuling.PINNED_SIGNED,
            "supplier Nursery is pinned signed but the verdict is drop",
        ),
        (
            "suppliers",
            "Farm",
            SupplierRuling.PINNED_UNSIGNED,
            "supplier Farm is pinned unsigned but the verdict is stay",
        ),
    ],
)
def test_rulings_are_checked(table: str, name: str, ruling: str, message: str) -> None:
    """A verdict against a ruling is the only fault: today ignores rulings."""
    assert faults(changed(table, name, ruling=ruling)) == [message]


@pytest.mark.parametrize(
    ("table", "name", "ruling"),
    [
        ("sites", "Graz", SiteRuling.PINNED_SHUT),
        ("sites", "Brno", SiteRuling.PINNED_OPEN),
        ("suppliers", "Farm", SupplierRuling.PINNED_SIGNED),
        ("suppliers", "Nursery", SupplierRuling.PINNED_UNSIGNED),
    ],
)
def test_rulings_that_are_kept_pass(table: str, name: str, ruling: str) -> None:
    """A verdict that agrees with its ruling is no fault."""
    assert faults(changed(table, name, ruling=ruling)) == []


def test_single_sourcing_is_checked_for_the_whole_study_and_for_one_customer() -> None:
    """Vienna is split: a fault once the study, or Vienna itself, asks for one origin."""
    message = "customer Vienna must be served whole from one origin and is served from Brno, Linz"
    for study in (with_settings(single_source=True), changed("customers", "Vienna", single_source=True)):
        assert message in faults(study)
    exempt = replace(
        changed("customers", "Vienna", single_source=False), settings=replace(hand.SETTINGS, single_source=True)
    )
    assert message not in faults(exempt)


def test_a_lane_that_loses_its_row_may_not_be_used_directly() -> None:
    """Ostrava is served straight only because `lanes` lists it."""
    study = replace(hand.STUDY, lanes=lane_table(hand.LANES[1:]))
    assert any("a direct lane exists only where `lanes` lists it" in fault for fault in faults(study))


def test_a_lane_without_coordinates_or_row_does_not_exist() -> None:
    """Salzburg without coordinates has no lane from Linz."""
    study = changed("customers", "Salzburg", latitude=None, longitude=None)
    assert any("Linz to Salzburg (50 t) may not be: neither coordinates" in fault for fault in faults(study))


def test_today_ignores_what_it_should_and_holds_the_rest() -> None:
    """Least volumes, rules, rulings, counts, budget and service share do not bind today; capacity does."""
    ignored = replace(
        hand.STUDY,
        settings=replace(hand.SETTINGS, service_share=1.0, fewest_sites=4, one_off_budget=0.0),
        sites=tuple(
            replace(row, ruling=SiteRuling.PINNED_SHUT, least_throughput=row.least_throughput and 240.0)
            for row in hand.SITES
        ),
        suppliers=tuple(replace(row, least_yearly=1e6) for row in hand.SUPPLIERS),
        rules=(RuleRow(rule=RuleKind.NOT_TOGETHER, members=("Graz", "Linz"), row=2),),
    )
    assert not [fault for fault in faults(ignored) if fault.startswith("today: ")]
    tight = faults(changed("sites", "Graz", capacity=289.0))
    assert "today: site Graz: 290 t move through it, its capacity is 289" in tight
