"""The benchmark of reading runs, at a small size and untimed."""

from __future__ import annotations

from tests.benchmarks.bench_read import bench


def test_the_benchmark_runs() -> None:
    """It writes, reads and fingerprints a study, and reports all three figures."""
    seconds = bench(sites=3, customers=20, lanes=60)
    assert set(seconds) == {"read", "fingerprint", "memory"}
    assert all(value > 0 for value in seconds.values())
