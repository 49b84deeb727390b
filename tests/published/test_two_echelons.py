"""Published problems with plants, depots and direct shipping; sources in `instances.py`."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.plan.plan import SiteVerdict
from siting.study.tables import Leg
from tests.answers import open_sites, proved
from tests.published import instances as given

if TYPE_CHECKING:
    from siting.study.settings import SolveSettings


def test_distributes_through_depots_and_straight_to_customers(exact: SolveSettings) -> None:
    """The published cost is 198.5 thousand pounds a month; flows have ties, so only the cost is compared."""
    plan = proved(given.distribution(), exact)
    assert plan.proof.cost == pytest.approx(198.5, abs=1e-4)
    assert {flow.leg for flow in plan.flows} == {Leg.INBOUND, Leg.OUTBOUND, Leg.DIRECT}


@pytest.mark.parametrize(("savings", "cost"), [(True, 174.0), (False, 174.0 + 15.0)])
def test_closes_newcastle_builds_northampton_and_expands_birmingham(
    savings: bool,  # noqa: FBT001 - a parameter of the test
    cost: float,
    exact: SolveSettings,
) -> None:
    """The book's 174.0 counts what closing saves; as yearly charges the same plan is dearer by the constant 15."""
    plan = proved(given.depot_location(savings=savings), exact)
    assert plan.proof.cost == pytest.approx(cost, abs=1e-4)
    assert plan.proof.bound == pytest.approx(cost, abs=1e-3)
    assert {line.site: (line.verdict, line.size) for line in plan.sites} == {
        "Newcastle": (SiteVerdict.CLOSE, ""),
        "Birmingham": (SiteVerdict.KEEP, "expanded"),
        "London": (SiteVerdict.KEEP, ""),
        "Exeter": (SiteVerdict.KEEP, ""),
        "Bristol": (SiteVerdict.LEAVE, ""),
        "Northampton": (SiteVerdict.OPEN, ""),
    }


@pytest.mark.parametrize(
    ("barred", "cost"),
    [
        ((), 740),
        ((("w1", "c1"), ("w1", "c2"), ("w1", "c3")), 1120),
        ((("w1", "c2"), ("w1", "c3"), ("w2", "c1")), 920),
    ],
)
def test_beats_the_rules_of_thumb(barred: tuple[tuple[str, str], ...], cost: float, exact: SolveSettings) -> None:
    """Flows cost 740; each market from its cheapest warehouse costs 1120, over its cheapest path 920."""
    assert proved(given.two_warehouses(*barred), exact).proof.cost == pytest.approx(cost, abs=1e-4)


@pytest.mark.parametrize("as_sites", [True, False])
@pytest.mark.parametrize("name", given.TRANSPORT)
def test_solves_transport_problems_without_charges(
    name: str,
    as_sites: bool,  # noqa: FBT001 - a parameter
    exact: SolveSettings,
) -> None:
    """The published transport cost is reached, whether the origins are sites or suppliers that deliver directly."""
    study = given.transport(name, as_sites=as_sites)
    plan = proved(study, exact)
    assert plan.proof.cost == pytest.approx(given.TRANSPORT[name][3], abs=0.0005)
    assert open_sites(plan) <= {row.site for row in study.sites}
