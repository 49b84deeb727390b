"""
Measure the direct engine: `python -m tests.benchmarks.bench_direct`.

A seeded instance of 100 sites and 1,000 customers (100,000 lanes): seconds to work out the network, to state the model,
to solve it to 1 % and to find the flows anew. Give other sizes as arguments: sites, customers, gap.
"""

from __future__ import annotations

import sys
import time
from typing import TYPE_CHECKING

from siting.listener import Silent, Stop
from siting.network.network import build_network
from siting.solving.direct import search
from siting.solving.flows import flows_for, price
from siting.solving.model import build_model
from siting.study.settings import SolveSettings
from tests.published.large_instances import recipe

if TYPE_CHECKING:
    from collections.abc import Sequence

SIZE = ("100", "1000", "0.01")
TIME_LIMIT_S = 600.0


def measure(sites: int, customers: int, gap: float) -> dict[str, float]:
    """Return seconds by step, and the cost found."""
    study = recipe(sites, customers, 5, 1)
    marks = [time.perf_counter()]
    network = build_network(study)
    marks.append(time.perf_counter())
    model = build_model(network)
    marks.append(time.perf_counter())
    found = search(model, SolveSettings(gap=gap, time_limit_s=TIME_LIMIT_S), listener=Silent(), stop=Stop())
    marks.append(time.perf_counter())
    if found.values is None:
        return {"cost": float("nan")}
    decisions = model.decisions(found.values)
    amounts = flows_for(network, decisions)
    marks.append(time.perf_counter())
    steps = ("network", "model", "search", "flows")
    taken = {step: end - begin for step, begin, end in zip(steps, marks[:-1], marks[1:], strict=True)}
    return taken | {"cost": float("nan") if amounts is None else price(network, decisions, amounts)}


def main(arguments: Sequence[str] = ()) -> None:
    """Print the figures."""
    sites, customers, gap = tuple(arguments) or SIZE
    for step, figure in measure(int(sites), int(customers), float(gap)).items():
        sys.stdout.write(f"{sites} x {customers} {step:8} {figure:12.3f}\n")


if __name__ == "__main__":
    main(sys.argv[1:])
