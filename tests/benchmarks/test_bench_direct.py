"""The benchmark of the direct engine runs."""

from __future__ import annotations

import pytest

from siting.network.network import build_network
from siting.solving.cbc import cbc
from tests.benchmarks.bench_direct import main
from tests.published.large_instances import recipe
from tests.solving.solved import best


def test_the_benchmark_runs(capsys: pytest.CaptureFixture[str]) -> None:
    """Once, untimed, on 10 x 20: every step is printed, and the cost is the one CBC proves."""
    proved = best(build_network(recipe(10, 20, 5, 1)), cbc)
    assert proved is not None
    main(["10", "20", "0"])
    lines = dict(line.split()[3:] for line in capsys.readouterr().out.splitlines())
    assert set(lines) == {"network", "model", "search", "flows", "cost"}
    assert float(lines["cost"]) == pytest.approx(proved.cost, abs=0.001)
