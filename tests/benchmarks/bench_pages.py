"""
Measure the pages on the demo study: `python -m tests.benchmarks.bench_pages`.

From `siting browse` to the first page in a browser (target: below 4 s; without Chromium, to the first answer of the
server), and a re-run of each page with its answer in place (target: below 0.3 s): median and slowest of some runs, and
processor seconds of the re-runs, which a busy machine does not stretch.
"""

from __future__ import annotations

import os
import statistics
import sys
import tempfile
import time
from contextlib import ExitStack
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from siting.browse import jobs, shell
from siting.browse.serve import STUDY_VARIABLE
from tests.browse.running import running

if TYPE_CHECKING:
    from collections.abc import Callable

    from streamlit.testing.v1 import AppTest

RUNS = 7
PATIENCE_S = 90.0


def rerun_seconds(runs: int) -> dict[str, tuple[list[float], list[float]]]:
    """Return, by page, how long each of some re-runs of the demo takes, by the clock and by the processor."""
    from streamlit.testing.v1 import AppTest  # noqa: PLC0415 - costs a second

    os.environ.pop(STUDY_VARIABLE, None)
    app = AppTest.from_file(str(Path(shell.__file__).parent / "app.py"), default_timeout=PATIENCE_S).run()
    found = {}
    for page in ("inputs", "plan", "share"):
        app = app.switch_page(str(shell.pages_folder() / f"{page}.py")).run()
        if page == "plan":
            app = _planned(app)
        times = [_timed(app.run) for _ in range(runs)]
        found[page] = ([clock for clock, _ in times], [processor for _, processor in times])
    return found


def _planned(app: AppTest) -> AppTest:
    """Press Run and wait for the answer."""
    [button] = [button for button in app.button if button.label == "Run"]
    app = button.click().run()
    key = app.session_state[shell.DRAFT].asked
    while (job := jobs.find_job(key)) is not None and job.running:
        time.sleep(0.1)
    return app.run()


def _timed(call: Callable[[], object]) -> tuple[float, float]:
    began, before = time.perf_counter(), time.process_time()
    call()
    return time.perf_counter() - began, time.process_time() - before


def start_seconds(runs: int) -> tuple[str, list[float]]:
    """Return what was waited for, and how long each of some starts took."""
    with ExitStack() as stack, tempfile.TemporaryDirectory() as folder:
        page = None
        try:
            from tests.browser.chromium import chromium  # noqa: PLC0415 - skips where there is none

            page = stack.enter_context(chromium()).new_page()
        except pytest.skip.Exception:
            sys.stdout.write("no Chromium: only the server is timed\n")
        times = []
        for _ in range(runs):
            began = time.perf_counter()
            with running(folder=Path(folder)) as server:
                if page is not None:
                    page.goto(server.url)
                    page.locator("h1.headline").wait_for(timeout=PATIENCE_S * 1000)
                times.append(time.perf_counter() - began)
        return "start to first page" if page else "start of the server", times


def main(runs: int = RUNS) -> None:
    """Print the figures of `runs` runs of each."""
    what, times = start_seconds(max(1, runs // 2))
    sys.stdout.write(f"{what:22} median {statistics.median(times):6.2f} s  slowest {max(times):6.2f} s\n")
    for page, (clock, processor) in rerun_seconds(runs).items():
        sys.stdout.write(
            f"re-run of {page:12} median {statistics.median(clock):6.3f} s  slowest {max(clock):6.3f} s"
            f"  processor {statistics.median(processor):6.3f} s\n"
        )


if __name__ == "__main__":
    main()
