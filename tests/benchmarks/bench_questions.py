"""
Measure a closing test against its plan: `python -m tests.benchmarks.bench_questions`.

On 100 sites and 1,000 customers (OR-Library `capa`, each site holding 8,000; the seeded recipe where the file is not
beside the checkout): the plan, the closing test of every open site, and planning from scratch without each of them, all
at the same gap. Targets: the closing test takes at most 4 times the plan, and planning from scratch at least 3 times
the closing test. Arguments: capacity, engine, gap.
"""

from __future__ import annotations

import resource
import sys
import time
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.questions.closing import closing
from siting.questions.restriction import Restriction, restricted_study
from siting.solving.solve import solve
from siting.study.settings import SolveSettings
from siting.study.tables import SiteRow
from tests.building import one_echelon
from tests.published.large_instances import BENCHMARKS, recipe

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from siting.study.tables import Study

GIVEN = ("8000", "auto", "1e-4")
TIME_LIMIT_S = 600.0
DEMAND = 50_886
"""Total of `capa`, as the list of published values has it."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Seconds:
    """What something took."""

    clock: float
    processor: float
    """Of this process and those it started."""


def large_study(capacity: float) -> Study:
    """Return `capa` with every site holding `capacity`, or the recipe of the same size."""
    path = BENCHMARKS / "orlib" / "capa.txt"
    if not path.is_file():
        return recipe(100, 1000, 5, 1)
    words = path.read_text(encoding="ascii").split()
    sites, customers = int(words[0]), int(words[1])
    charges = [float(word) for word in words[3 : 2 + 2 * sites : 2]]
    body = np.array(words[2 + 2 * sites :], dtype=np.float64).reshape(customers, 1 + sites)
    demand = body[:, 0]
    if demand.sum() != DEMAND:
        msg = f"capa holds a total demand of {demand.sum():g}, not {DEMAND}: get an undamaged copy"
        raise ValueError(msg)
    rows = [SiteRow(site=f"S{n}", capacity=capacity, yearly_charge=charge) for n, charge in enumerate(charges)]
    needs = {f"C{n}": float(amount) for n, amount in enumerate(demand)}
    return one_echelon("capa", rows, needs, (body[:, 1:] / demand[:, None]).T.tolist())


def timed(work: Callable[[], object]) -> Seconds:
    """Return what a piece of work takes."""
    clock, processor = time.perf_counter(), _processor()
    work()
    return Seconds(clock=time.perf_counter() - clock, processor=_processor() - processor)


def _processor() -> float:
    used = [resource.getrusage(who) for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)]
    return sum(usage.ru_utime + usage.ru_stime for usage in used)


def measure(capacity: float, engine: str, gap: float) -> dict[str, Seconds]:
    """Return seconds of the plan, of the closing test, and of planning without each open site from scratch."""
    study = large_study(capacity)
    settings = SolveSettings(gap=gap, engine=engine, time_limit_s=TIME_LIMIT_S)
    answer = solve(study, settings)  # once before the clock runs, so that nothing is loaded or compiled within it
    taken = {"plan": timed(lambda: solve(study, settings))}
    test = closing(study, answer, sites=[], suppliers=[], settings=settings)

    def test_all() -> None:
        nonlocal test
        test = closing(study, answer, settings=settings)

    taken["closing"] = timed(test_all)

    def from_scratch() -> None:
        for line in test.lines:
            solve(restricted_study(study, Restriction(out=frozenset({line.name}))), settings)

    taken[f"scratch, {len(test.lines)} sites"] = timed(from_scratch)
    return taken


def main(arguments: Sequence[str] = ()) -> None:
    """Print the figures."""
    capacity, engine, gap = (*arguments, *GIVEN[len(arguments) :])
    taken = measure(float(capacity), engine, float(gap))
    plan = taken["plan"]
    for what, seconds in taken.items():
        times = f"{seconds.clock / plan.clock:6.1f} x clock {seconds.processor / plan.processor:6.1f} x processor"
        sys.stdout.write(f"{what:20} {seconds.clock:9.2f} s {seconds.processor:9.2f} s {times} of the plan\n")


if __name__ == "__main__":
    main(sys.argv[1:])
