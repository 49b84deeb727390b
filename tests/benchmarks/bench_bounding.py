"""
Measure the bounding engine: `python -m tests.benchmarks.bench_bounding [set ...] [--against-direct]`.

Sets: `capa` (the four published problems of 100 x 1,000 at gap 1e-6), `recipe-300`, `recipe-500`, `recipe-1000`
(seeded instances) and `wide` (200 sites x 10,000 customers, as drawn and with charges x 30). One line an instance: wall
and processor seconds of the engine (compiled, network built), gap reached, most memory of the process so far.
`--against-direct` also gives the same tight model to HiGHS and prints the ratio.
"""

from __future__ import annotations

import resource
import sys
import time
from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

from siting.listener import Silent, Stop
from siting.network.network import build_network
from siting.solving.bounding.engine import bounding
from siting.solving.direct import direct
from siting.solving.flows import flows_for, price
from siting.study.settings import SolveSettings
from tests.published.large_instances import recipe
from tests.solving.bounding.test_published import CAPA, capa

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Sequence

    from siting.network.network import Network
    from siting.solving.engine import Engine

DIRECT_LIMIT_S = 600.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Case:
    """An instance with the gap and the time it is given."""

    name: str
    make: Callable[[], Network]
    gap: float
    limit_s: float = 60.0


def _capa() -> Iterator[Case]:
    for capacity in CAPA:
        yield Case(name=f"capa {capacity}", make=partial(capa, capacity), gap=1e-6)


def drawn(size: tuple[int, int], ratio: float, seed: int, gap: float, *, charges: float = 1.0) -> Case:
    """Return a seeded instance with its charges multiplied."""

    def make() -> Network:
        network = build_network(recipe(*size, ratio, seed))
        return replace(network, option_charge=network.option_charge * charges)

    times = f" charges x {charges:g}" if charges != 1.0 else ""
    return Case(name=f"{size[0]} x {size[1]} ratio {ratio:g} seed {seed}{times}", make=make, gap=gap)


SETS: dict[str, Callable[[], Iterator[Case]]] = {
    "tiny": lambda: iter([drawn((10, 20), 3, 1, 1e-6)]),
    "capa": _capa,
    "recipe-300": lambda: (drawn((300, 300), ratio, seed, 1e-4) for ratio in (5, 10) for seed in (1, 2, 3)),
    "recipe-500": lambda: (drawn((500, 500), 5, seed, 1e-3) for seed in (1, 2)),
    "recipe-1000": lambda: (drawn((1000, 1000), ratio, 1, 1e-3) for ratio in (5, 10)),
    "wide": lambda: (drawn((200, 10_000), 10, 1, gap, charges=charges) for gap, charges in ((1e-4, 1.0), (1e-3, 30.0))),
}


def measure(network: Network, engine: Engine, gap: float, limit_s: float) -> tuple[float, float, float, float]:
    """Return wall and processor seconds, cost and relative gap of one run."""
    wall, processor = time.perf_counter(), time.process_time()
    result = engine(network, SolveSettings(gap=gap, time_limit_s=limit_s), listener=Silent(), stop=Stop())
    wall, processor = time.perf_counter() - wall, time.process_time() - processor
    amounts = None if result.decisions is None else flows_for(network, result.decisions)
    if result.decisions is None or amounts is None or result.bound is None:
        return wall, processor, float("nan"), float("nan")
    cost = price(network, result.decisions, amounts)
    return wall, processor, cost, max(0.0, (cost - result.bound) / cost)


def main(arguments: Sequence[str] = ()) -> None:
    """Print the table of the sets asked for."""
    against = "--against-direct" in arguments
    names = [name for name in arguments if not name.startswith("-")] or [name for name in SETS if name != "tiny"]
    bounding(next(SETS["tiny"]()).make(), SolveSettings(gap=1e-6), listener=Silent(), stop=Stop())
    sys.stdout.write(f"{'instance':44}{'wall s':>8}{'cpu s':>8}{'cost':>16}{'gap':>11}{'MB':>7}\n")
    for case in (case for name in names for case in SETS[name]()):
        network = case.make()
        wall, processor, cost, gap = measure(network, bounding, case.gap, case.limit_s)
        memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss // 1024
        sys.stdout.write(f"{case.name:44}{wall:8.2f}{processor:8.2f}{cost:16.3f}{gap:11.6%}{memory:7}\n")
        if against:
            _, slow, other, _ = measure(network, direct, case.gap, DIRECT_LIMIT_S)
            sys.stdout.write(
                f"{'  HiGHS on the tight model':44}{slow:16.2f}{other:16.3f}  {slow / processor:.0f} times\n"
            )


if __name__ == "__main__":
    main(sys.argv[1:])
