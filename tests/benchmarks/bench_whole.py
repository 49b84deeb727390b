"""
Measure the engine of the whole model: `python -m tests.benchmarks.bench_whole [SECONDS] [SEED]`.

Two echelons of 20 suppliers x 100 sites x 1,000 customers, seeded; targets: gap 0.3 % within 60 s and 0.1 % within
180 s on two cores. Prints the gap over time, and the same for the whole tight model given to HiGHS as it is. CPU
seconds stand beside the clock's, since other work on the machine stretches only the latter. Before these: the published
problem of 100 sites x 1,000 customers at capacity 8,000 with every customer single-sourced, and with rules on sites.
"""

from __future__ import annotations

import sys
import time
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from siting.listener import Improving, Silent, Stop
from siting.network.network import NetworkRule, build_network
from siting.solving.bounding.whole import whole
from siting.solving.direct import direct
from siting.study.demo import demo_folder
from siting.study.read import read_study
from siting.study.settings import SolveSettings
from siting.study.tables import RuleKind
from tests.benchmarks.two_echelons import two_echelons
from tests.published.large_instances import BENCHMARKS
from tests.solving.bounding.test_published import capa

if TYPE_CHECKING:
    from siting.listener import Progress
    from siting.network.network import Network
    from siting.solving.engine import Engine

MARKS = (1, 2, 5, 10, 20, 30, 60, 90, 120, 180, 240, 300)
"""Seconds at which the gap is printed."""


class Marks(Silent):
    """Prints cost, bound and gap at the marks."""

    def __init__(self) -> None:
        self._left = list(MARKS)
        self._began = time.process_time()

    def update(self, progress: Progress) -> None:
        """Print where a mark has passed."""
        if self._left and progress.elapsed_s >= self._left[0]:
            while self._left and progress.elapsed_s >= self._left[0]:
                self._left.pop(0)
            self.show(progress)

    def show(self, progress: Progress) -> None:
        """Print one line."""
        gap = "-" if progress.gap is None else f"{100 * progress.gap:.3f} %"
        cpu = time.process_time() - self._began
        sys.stdout.write(f"{progress.elapsed_s:8.1f} s {cpu:8.1f} s CPU  gap {gap:>10}  {progress.phase}\n")
        sys.stdout.flush()


def measure(name: str, network: Network, engine: Engine, asked: SolveSettings) -> None:
    """Run an engine and print its gap over time."""
    sys.stdout.write(f"\n{name}\n")
    marks = Marks()
    began, used = time.monotonic(), time.process_time()
    found = engine(network, asked, listener=Improving(marks), stop=Stop())
    taken, cpu = time.monotonic() - began, time.process_time() - used
    sys.stdout.write(f"{taken:8.1f} s {cpu:8.1f} s CPU  bound {found.bound}  {found.note or 'reached the gap'}\n")


def one_echelon_with_more() -> dict[str, Network]:
    """Return the published problem with a requirement that the sites alone do not state, by name; none if not there."""
    if not BENCHMARKS.is_dir():
        return {}
    plain = capa(8000)
    rules = (
        NetworkRule(kind=RuleKind.NOT_TOGETHER, members=(("site", 0), ("site", 1)), number=None),
        NetworkRule(kind=RuleKind.AT_LEAST, members=tuple(("site", n) for n in range(40, 60)), number=4),
    )
    return {
        "single-sourced": replace(plain, single_source=np.ones(len(plain.customers), np.bool_)),
        "with rules": replace(plain, rules=rules),
    }


def main() -> None:
    """Print the figures."""
    seconds = float(sys.argv[1]) if len(sys.argv) > 1 else 180.0
    seed = int(sys.argv[2]) if len(sys.argv) > 2 else 1
    for name, network in one_echelon_with_more().items():
        asked = SolveSettings(gap=1e-3, time_limit_s=seconds)
        measure(f"100 x 1,000, {name}, gap 0.1 %: engine whole", network, whole, asked)
    demo = build_network(read_study(demo_folder()))
    large = build_network(two_echelons(20, 100, 1000, seed))
    for name, network, gap in (("demo study, gap 0.01 %", demo, 1e-4), ("20 x 100 x 1,000, gap 0.1 %", large, 1e-3)):
        asked = SolveSettings(gap=gap, time_limit_s=seconds)
        measure(f"{name}: engine whole", network, whole, asked)
        measure(f"{name}: engine direct", network, direct, asked)


if __name__ == "__main__":
    main()
