"""
Measure how soon the command line answers: `python -m tests.benchmarks.bench_start`.

Start-up (target: below 0.5 s) and the demo study from command to written plan (target: below 5 s), each in a fresh
process: median and slowest of some runs, and processor seconds, which a busy machine does not stretch.
"""

from __future__ import annotations

import resource
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

RUNS = 5


def seconds(arguments: list[str]) -> tuple[float, float]:
    """Return how long one run of the command takes, in seconds of the clock and of the processors."""
    before, began = _processor(), time.perf_counter()
    command = [str(Path(sys.executable).parent / "siting"), *arguments]
    subprocess.run(command, check=True, capture_output=True)  # noqa: S603  (our own command)
    return time.perf_counter() - began, _processor() - before


def _processor() -> float:
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def main(runs: int = RUNS) -> None:
    """Print the figures of `runs` runs of each command."""
    with tempfile.TemporaryDirectory() as folder:
        plan = str(Path(folder) / "plan")
        planning = ["plan", "demo", "--quiet", "--out", plan]
        for arguments in (["--version"], ["--help"], ["check", "demo"], planning, ["audit", plan]):
            clock, processor = zip(*(seconds(arguments) for _ in range(runs)), strict=True)
            words = " ".join(argument.replace(plan, "PLAN") for argument in arguments)
            sys.stdout.write(
                f"siting {words:34} median {statistics.median(clock):6.2f} s  slowest {max(clock):6.2f} s"
                f"  processor {statistics.median(processor):6.2f} s\n"
            )


if __name__ == "__main__":
    main()
