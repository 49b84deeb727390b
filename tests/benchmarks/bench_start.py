"""
Measure how soon the command line answers: `python -m tests.benchmarks.bench_start`.

Start-up (target: below 0.5 s) and the demo study from command to written plan (target: below 5 s), each in a fresh
process; the median of five runs and the slowest.
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

RUNS = 5


def seconds(arguments: list[str]) -> float:
    """Return how long one run of the command takes, in seconds."""
    began = time.perf_counter()
    command = [str(Path(sys.executable).parent / "siting"), *arguments]
    subprocess.run(command, check=True, capture_output=True)  # noqa: S603  (our own command)
    return time.perf_counter() - began


def main() -> None:
    """Print the figures."""
    with tempfile.TemporaryDirectory() as folder:
        plan = str(Path(folder) / "plan")
        planning = ["plan", "demo", "--quiet", "--out", plan]
        for arguments in (["--version"], ["--help"], ["check", "demo"], planning, ["audit", plan]):
            taken = [seconds(arguments) for _ in range(RUNS)]
            words = " ".join(argument.replace(plan, "PLAN") for argument in arguments)
            median, slowest = statistics.median(taken), max(taken)
            sys.stdout.write(f"siting {words:40} median {median:6.2f} s  slowest {slowest:6.2f} s\n")


if __name__ == "__main__":
    main()
