"""Small studies on which random ones once failed, kept so that they never fail again."""

from __future__ import annotations

import pytest

from siting.plan.proof import Outcome
from siting.study.tables import CustomerRow, Leg, SiteRow, Study
from tests.answers import audited
from tests.building import LaneRow, lane_table, settings_of

NEAREST = "This customer has no site within reach: C1 (reach 1 km, nearest 2 km)"


@pytest.mark.parametrize(
    ("capacity", "is_barred"), [(None, True), (4.0, False), (5.0, True)], ids=["barred", "too small", "both just so"]
)
def test_says_how_far_a_lane_is_that_is_out_of_reach_and_more(capacity: float | None, is_barred: bool) -> None:  # noqa: FBT001 - a parameter of the test
    """Lifting the reach alone leaves no lane (barred, or the site too small), so the nearest is looked for beyond."""
    lane = LaneRow(leg=Leg.OUTBOUND, origin="S1", destination="C1", road_km=2.0, barred=is_barred)
    study = Study(
        settings=settings_of("far and more"),
        sites=(SiteRow(site="S1", capacity=capacity),),
        customers=(CustomerRow(customer="C1", demand=5.0, reach_km=1.0, single_source=True),),
        lanes=lane_table([lane]),
    )
    answer = audited(study)
    assert answer.proof.outcome is Outcome.IMPOSSIBLE
    assert answer.together
    assert NEAREST in answer.reasons[0].sentence
