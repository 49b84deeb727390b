"""The benchmark of the pages runs."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tests.benchmarks.bench_pages import main

if TYPE_CHECKING:
    import pytest


def test_the_benchmark_runs(capsys: pytest.CaptureFixture[str]) -> None:
    """Once, untimed: the start and a re-run of each page give a line of figures."""
    main(runs=1)
    lines = capsys.readouterr().out.splitlines()
    assert [line.split("median")[0].split()[-1] for line in lines[-3:]] == ["inputs", "plan", "share"]
    assert all(" median " in line for line in lines[-4:])
