"""The benchmark of the bounding engine runs."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tests.benchmarks.bench_bounding import main

if TYPE_CHECKING:
    import pytest


def test_the_benchmark_runs(capsys: pytest.CaptureFixture[str]) -> None:
    """Once, untimed, on the seeded instance of 10 x 20: both engines print its known optimum (two solvers agree)."""
    main(["tiny", "--against-direct"])
    head, line, other = capsys.readouterr().out.splitlines()
    assert head.split() == ["instance", "wall", "s", "cpu", "s", "cost", "gap", "MB"]
    assert line.startswith("10 x 20 ratio 3 seed 1")
    assert "3973.858" in line
    assert "3973.858" in other
