"""HiGHS without its banner, and what its outcome means."""

from __future__ import annotations

import highspy

TOLERANCE = 1e-9
"""Feasibility tolerance asked of HiGHS: flows are shares of 1, so what leaks through a link is as small."""


class QuietHighs(highspy.Highs):
    """HiGHS that writes nothing to the console, not even its banner (which the constructor already prints)."""

    def enableCallbacks(self) -> None:  # noqa: N802 - overrides a method of highspy, called by its constructor
        """Silence the console before anything can be logged."""
        self.setOptionValue("log_to_console", False)  # noqa: FBT003 - highspy takes it by position
        super().enableCallbacks()  # type: ignore[no-untyped-call] # highspy types only part of its methods


def is_impossible(highs: highspy.Highs) -> bool:
    """
    Return whether HiGHS proved that nothing satisfies the rows.

    Every variable of our problems is bounded, so `infeasible or unbounded` can only be infeasible.
    """
    return highs.getModelStatus() in {
        highspy.HighsModelStatus.kInfeasible,
        highspy.HighsModelStatus.kUnboundedOrInfeasible,
    }


def has_solution(highs: highspy.Highs) -> bool:
    """Return whether HiGHS holds values that satisfy every row, optimal or not."""
    return bool(highs.getInfo().primal_solution_status == highspy.SolutionStatus.kSolutionStatusFeasible)
