"""Small studies on which random ones once failed, kept so that they never fail again."""

from __future__ import annotations

from siting.plan.proof import Outcome
from siting.study.tables import CustomerRow, Leg, SiteRow, Study
from tests.answers import audited
from tests.building import LaneRow, lane_table, settings_of


def test_says_how_far_a_lane_is_that_is_barred_and_out_of_reach() -> None:
    """Lifting the reach alone leaves no lane, so the nearest is looked for beyond the bars too."""
    study = Study(
        settings=settings_of("barred and far"),
        sites=(SiteRow(site="S1"),),
        customers=(CustomerRow(customer="C1", demand=1.0, reach_km=1.0),),
        lanes=lane_table([LaneRow(leg=Leg.OUTBOUND, origin="S1", destination="C1", road_km=2.0, barred=True)]),
    )
    answer = audited(study)
    assert answer.proof.outcome is Outcome.IMPOSSIBLE
    assert answer.together
    assert "This customer has no site within reach: C1 (reach 1 km, nearest 2 km)" in answer.reasons[0].sentence
