"""Ctrl-C: the first stops and keeps the best plan, the second aborts the process."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import threading

import pytest

from siting.commands.interrupt import run_stoppable
from siting.listener import Stop


def test_first_interrupt_stops_and_keeps_the_result(capsys: pytest.CaptureFixture[str]) -> None:
    """The work sees the request, ends by itself, and its result is returned."""
    stop = Stop()

    def work() -> str:
        os.kill(os.getpid(), signal.SIGINT)
        for _ in range(1000):
            if stop.requested:
                return "best so far"
            threading.Event().wait(0.01)
        return "never stopped"

    assert run_stoppable(work, stop) == "best so far"
    assert "Stopping with the best plan so far; Ctrl-C again to abort" in capsys.readouterr().err


def test_handler_is_put_back() -> None:
    """Afterwards Ctrl-C means what it meant before, also when the work failed."""
    before = signal.getsignal(signal.SIGINT)

    def work() -> None:
        msg = "broken"
        raise RuntimeError(msg)

    with pytest.raises(RuntimeError, match="broken"):
        run_stoppable(work, Stop())
    assert signal.getsignal(signal.SIGINT) is before


def test_runs_where_no_handler_can_be_set() -> None:
    """Outside the main thread, where Python allows no handler, the work runs all the same."""
    results: list[int] = []
    thread = threading.Thread(target=lambda: results.append(run_stoppable(lambda: 7, Stop())))
    thread.start()
    thread.join()
    assert results == [7]


def test_second_interrupt_aborts_with_the_exit_code_of_no_plan() -> None:
    """A computation deaf to the request is ended by the second Ctrl-C, with exit code 4."""
    script = (
        "import os, signal, time\n"
        "from siting.commands.interrupt import run_stoppable\n"
        "from siting.listener import Stop\n"
        "stop = Stop()\n"
        "def deaf():\n"
        "    os.kill(os.getpid(), signal.SIGINT)\n"
        "    while not stop.requested: time.sleep(0.01)\n"
        "    os.kill(os.getpid(), signal.SIGINT)\n"
        "    time.sleep(60)\n"
        "run_stoppable(deaf, stop)\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, timeout=30, check=False)  # noqa: S603  (our own)
    assert done.returncode == 4
    assert "Aborted; no plan is kept." in done.stderr
