"""The progress line: what it says, how often, and that it leaves nothing behind on a terminal."""

from __future__ import annotations

import io

import pytest

from siting.commands.progress import LIVE_S, PLAIN_S, WIDTH, ProgressLine, progress_on_stderr, state
from siting.listener import Progress, Silent


class Clock:
    """Seconds that pass when told."""

    def __init__(self) -> None:
        self.now = 0.0

    def __call__(self) -> float:
        """Return the seconds so far."""
        return self.now


@pytest.fixture
def clock() -> Clock:
    """Start a clock at 0."""
    return Clock()


def test_says_best_bound_gap_and_seconds() -> None:
    """All four figures stand in the line, the gap as a share of the best cost."""
    progress = Progress(elapsed_s=12.34, cost=38_250_000.0, bound=38_000_000.0, phase="searching")
    assert state(progress) == "  12.3 s  best 38,250,000  bound 38,000,000  gap 0.654 %  searching"


def test_leaves_out_what_is_not_known_yet() -> None:
    """Before the first plan there is neither a best cost nor a gap, and no zero stands for them."""
    assert state(Progress(elapsed_s=1.0, bound=7.0)) == "   1.0 s  bound 7"


def test_live_line_is_rewritten_and_wiped(clock: Clock) -> None:
    """On a terminal there is one line, and none once the answer follows."""
    stream = io.StringIO()
    line = ProgressLine(stream, live=True, clock=clock)
    line.start("Planning")
    clock.now = LIVE_S
    line.update(Progress(elapsed_s=LIVE_S, cost=5.0))
    assert "\n" not in stream.getvalue()
    assert stream.getvalue().split("\r")[-1].startswith("   0.2 s  best 5")
    line.end(Progress(elapsed_s=1.0, cost=5.0))
    assert stream.getvalue().endswith("\r" + " " * WIDTH + "\r")


@pytest.mark.parametrize(("after_s", "writes"), [(LIVE_S - 0.01, 0), (LIVE_S, 1), (LIVE_S + 0.01, 1)])
def test_live_line_is_throttled(clock: Clock, after_s: float, writes: int) -> None:
    """A solver that reports a thousand times a second costs five writes a second."""
    stream = io.StringIO()
    line = ProgressLine(stream, live=True, clock=clock)
    line.start("Planning")
    before = stream.getvalue().count("\r")
    clock.now = after_s
    line.update(Progress(elapsed_s=after_s))
    line.update(Progress(elapsed_s=after_s))
    assert stream.getvalue().count("\r") - before == writes


def test_plain_lines_are_rare_and_the_last_state_is_kept(clock: Clock) -> None:
    """In a log: what begins, a line every ten seconds, and how it ended; no carriage return."""
    stream = io.StringIO()
    line = ProgressLine(stream, live=False, clock=clock)
    line.start("Planning")
    for clock.now in (PLAIN_S - 0.1, PLAIN_S, PLAIN_S + 5.0):
        line.update(Progress(elapsed_s=clock.now))
    line.end(Progress(elapsed_s=16.0, cost=5.0, bound=5.0))
    assert stream.getvalue().splitlines() == ["Planning ...", "  10.0 s", "  16.0 s  best 5  bound 5  gap 0.000 %"]


def test_nothing_is_said_where_not_wanted() -> None:
    """With --json or --quiet the listener is silent."""
    assert isinstance(progress_on_stderr(wanted=False), Silent)
    assert not isinstance(progress_on_stderr(wanted=True), Silent)
