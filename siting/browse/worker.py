"""
One solve in a process of its own: `python -u -m siting.browse.worker FOLDER`.

FOLDER holds the study in a folder `study`; it is removed at the end. The first line on standard input holds the
`[solve]` settings as JSON; a line `stop`, or the end of standard input, asks for the best plan so far. Standard output
carries one JSON object a line: `progress`, then `answer` or `error`.
"""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import signal
import sys
import threading
import time
from dataclasses import asdict, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from siting.errors import SitingError
from siting.listener import Progress, Stop

if TYPE_CHECKING:
    from typing import TextIO

LEAST_PAUSE_S = 0.1
"""Seconds between two progress lines that bring nothing new."""

ORPHAN_GRACE_S = 5.0
"""Seconds a worker whose server has gone gets to end by itself."""


class _Lines:
    """A listener that writes JSON lines: every improvement, and otherwise at most ten lines a second."""

    def __init__(self, out: TextIO) -> None:
        self._out = out
        self._lock = threading.Lock()
        self._last: tuple[float | None, float | None] = (None, None)
        self._written = 0.0

    def write(self, event: dict[str, Any]) -> None:
        # No one reads any more where the server has gone: `_wait_for_stop` ends this process.
        with self._lock, contextlib.suppress(OSError):
            self._out.write(json.dumps(event) + "\n")
            self._out.flush()

    def start(self, task: str) -> None:
        self.write({"event": "progress", "progress": asdict(Progress(elapsed_s=0.0, phase=task))})

    def update(self, progress: Progress) -> None:
        now = time.monotonic()
        news = (progress.cost, progress.bound)
        if news == self._last and now - self._written < LEAST_PAUSE_S:
            return
        self._last, self._written = news, now
        self.write({"event": "progress", "progress": asdict(progress)})

    def end(self, progress: Progress) -> None:
        self.write({"event": "progress", "progress": asdict(replace(progress, phase="auditing the plan"))})


def _wait_for_stop(stop: Stop, folder: Path) -> None:
    """Request the stop on a line `stop` or at the end of standard input; then make sure that an orphan ends."""
    for line in sys.stdin:
        if line.strip() == "stop":
            stop.request()
    stop.request()
    time.sleep(ORPHAN_GRACE_S)
    shutil.rmtree(folder, ignore_errors=True)
    if hasattr(os, "killpg") and os.getpgrp() == os.getpid():
        os.killpg(0, signal.SIGKILL)  # with the solver this process may have started
    os._exit(1)


def main() -> int:
    """Solve the study in the folder named on the command line, write what happens, and remove the folder."""
    folder = Path(sys.argv[1])
    try:
        return _solve(folder)
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def _solve(folder: Path) -> int:
    from siting.plan.audit import AuditReport  # noqa: PLC0415 - the heavy imports come once the folder is looked after
    from siting.plan.contract import answer_to_json  # noqa: PLC0415
    from siting.solving.solve import solve  # noqa: PLC0415
    from siting.study.read import read_study  # noqa: PLC0415
    from siting.study.settings import SolveSettings  # noqa: PLC0415

    lines = _Lines(sys.stdout)
    stop = Stop()
    settings = SolveSettings(**json.loads(sys.stdin.readline()))
    threading.Thread(target=_wait_for_stop, args=(stop, folder), daemon=True).start()
    try:
        study = read_study(folder / "study")
        answer = solve(study, settings, listener=lines, stop=stop)
    except SitingError as error:
        lines.write({"event": "error", "message": str(error)})
        return error.exit_code
    report = AuditReport(passed=True, faults=()) if answer.plan else None  # `solve` raises where it fails
    lines.write({"event": "answer", "answer": answer_to_json(answer, report)})
    return 0


if __name__ == "__main__":
    code = main()
    sys.stdout.flush()
    os._exit(code)  # a solver that has not noticed the stop yet must not keep the answer waiting
