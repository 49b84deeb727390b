"""What the tests on published problems share: both engines, to the proof."""

from __future__ import annotations

import pytest

from siting.study.settings import SolveSettings


@pytest.fixture(params=["direct", "bounding"])
def exact(request: pytest.FixtureRequest) -> SolveSettings:
    """Each engine in turn, asked for the proof."""
    return SolveSettings(gap=0.0, engine=request.param)
