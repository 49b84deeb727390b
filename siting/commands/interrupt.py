"""Ctrl-C during a long computation: the first asks it to stop and keep its best plan, the second aborts."""

from __future__ import annotations

import os
import signal
import sys
import threading
from concurrent.futures import ThreadPoolExecutor
from typing import TYPE_CHECKING, TypeVar

from siting.commands.command import NO_PLAN_YET

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.listener import Stop

Result = TypeVar("Result")


def run_stoppable(work: Callable[[], Result], stop: Stop, *, keeping: str = "the best plan so far") -> Result:
    """
    Run `work` beside a Ctrl-C handler that stops it.

    The work runs in a thread of its own, because a signal handler waits for the main thread to leave a solver's
    compiled code.

    Parameters
    ----------
    work
        The computation; it watches `stop` itself.
    stop
        Requested at the first Ctrl-C. A second one ends the process with the exit code of "stopped before any plan".
    keeping
        What is kept at the first, in words.

    Returns
    -------
    result
        What `work` returned; what it raised is raised.
    """
    if threading.current_thread() is not threading.main_thread():
        return work()

    def interrupted(_signal: int, _frame: object) -> None:
        if stop.requested:
            sys.stderr.write("\nAborted; no plan is kept.\n")
            sys.stderr.flush()
            os._exit(NO_PLAN_YET)
        stop.request()
        sys.stderr.write(f"\nStopping with {keeping}; Ctrl-C again to abort without it.\n")

    before = signal.signal(signal.SIGINT, interrupted)
    try:
        with ThreadPoolExecutor(max_workers=1) as pool:
            return pool.submit(work).result()
    finally:
        signal.signal(signal.SIGINT, before)
