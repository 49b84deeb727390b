"""The benchmark of the command line runs."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tests.benchmarks.bench_start import main

if TYPE_CHECKING:
    import pytest


def test_the_benchmark_runs(capsys: pytest.CaptureFixture[str]) -> None:
    """Once, untimed: start-up, check, plan and audit each give a line of figures."""
    main(runs=1)
    lines = capsys.readouterr().out.splitlines()
    assert [line.split("median")[0].split()[1] for line in lines] == ["--version", "--help", "check", "plan", "audit"]
    assert all(float(line.split()[-2]) > 0 for line in lines)
