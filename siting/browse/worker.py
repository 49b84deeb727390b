"""
One solve or follow-up question in a process of its own: `python -u -m siting.browse.worker FOLDER`.

FOLDER holds the study in a folder `study`, its plan in `plan.json` and searches kept from questions before in
`kept.json`, where there are any; it is removed at the end. The first line on standard input holds question, parameters
and `[solve]` settings as JSON; a line `stop`, or the end of standard input, asks for what is done so far. Standard
output carries one JSON object a line: `progress` and `kept` (a search worth keeping), then `answer` or `error`.
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

PLAN_FILE, KEPT_FILE = "plan.json", "kept.json"

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
        self.write({"event": "progress", "progress": asdict(replace(progress, phase="handing over"))})


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
    """Answer what is asked of the study in the folder named, write what happens, and remove the folder."""
    folder = Path(sys.argv[1])
    try:
        return _work(folder)
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def _work(folder: Path) -> int:
    from siting.browse.tasks import ToldStore, answer_task  # noqa: PLC0415 - heavy: once the folder is looked after
    from siting.plan.contract import answer_from_json  # noqa: PLC0415
    from siting.study.read import read_study  # noqa: PLC0415
    from siting.study.settings import SolveSettings  # noqa: PLC0415

    lines = _Lines(sys.stdout)
    stop = Stop()
    order = json.loads(sys.stdin.readline())
    threading.Thread(target=_wait_for_stop, args=(stop, folder), daemon=True).start()
    try:
        settings = SolveSettings(**order["settings"])
        study = read_study(folder / "study")
        plan, kept = _read(folder / PLAN_FILE), _read(folder / KEPT_FILE)
        store = ToldStore(lambda told: lines.write({"event": "kept", **told}))
        for told in kept or ():
            store.take(told)
        answer = answer_task(
            order["question"],
            study,
            answer_from_json(plan) if plan is not None else None,
            order["parameters"],
            settings=settings,
            store=store,
            listener=lines,
            stop=stop,
        )
    except SitingError as error:
        lines.write({"event": "error", "message": str(error)})
        return error.exit_code
    lines.write({"event": "answer", "answer": answer})
    return 0


def _read(path: Path) -> Any:  # noqa: ANN401 - a JSON value
    """Return what a file holds; None where it is not there."""
    return json.loads(path.read_text(encoding="utf-8")) if path.is_file() else None


if __name__ == "__main__":
    code = main()
    sys.stdout.flush()
    os._exit(code)  # a solver that has not noticed the stop yet must not keep the answer waiting
