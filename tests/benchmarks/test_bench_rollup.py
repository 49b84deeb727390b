"""The benchmark of adding up order lines runs, at a small size and untimed."""

from __future__ import annotations

from tests.benchmarks.bench_rollup import bench


def test_the_benchmark_runs() -> None:
    """It writes and adds up lines, and reports all three figures."""
    figures = bench(2000)
    assert set(figures) == {"seconds", "processor", "memory"}
    assert all(value > 0 for value in figures.values())
