"""
Many restrictions of one study at once: a process a core, each given the study and its network once.

Processes are spawned, never forked, so that threads of a caller (a page's server, a test runner) do no harm. They leave
Ctrl-C to their parent, stop when it says so, and end by themselves when it is gone.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
from concurrent.futures import FIRST_COMPLETED, ProcessPoolExecutor, wait
from concurrent.futures.process import BrokenProcessPool
from typing import TYPE_CHECKING

from siting.listener import Stop
from siting.questions.searching import resolve_one

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Sequence
    from concurrent.futures import Future
    from multiprocessing.synchronize import Event

    from siting.questions.resolved import Resolved
    from siting.questions.searching import Ask, Bench
    from siting.questions.starts import Hints

TICK_S = 0.25
"""Seconds between two looks at the stop and two reports of progress."""


class _SharedStop(Stop):
    """A stop that another process requests."""

    def __init__(self, event: Event) -> None:
        super().__init__()
        self._shared = event

    @property
    def requested(self) -> bool:
        """True once the parent asked."""
        return self._shared.is_set()


_bench: Bench | None = None
_stop: Stop = Stop()


def cores() -> int:
    """Return how many processes may run at once."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def in_processes(  # noqa: PLR0913 - what is shared, what is asked, and how it is watched
    bench: Bench,
    asks: Sequence[Ask],
    hints: Callable[[], Hints],
    *,
    workers: int,
    stop: Stop,
    tick: Callable[[], None],
) -> Iterator[tuple[Ask, Resolved]]:
    """
    Yield each restriction with its answer as it comes; once stopped, those under way end early and no more begin.

    Parameters
    ----------
    bench
        What every restriction of the study shares; sent to each process once.
    asks
        What to resolve, in the order in which to begin.
    hints
        Returns what was found so far; called when a search begins.
    workers
        Number of processes.
    stop
        Watched while waiting.
    tick
        Called every `TICK_S` seconds while waiting.

    Yields
    ------
    ask, resolved
        In the order in which they end. Where the processes die (memory runs out, a script starts without a guard),
        what is left is resolved in this process.

    Raises
    ------
    EngineError, AuditError
        As `resolve_one` raises them.
    """
    context = multiprocessing.get_context("spawn")
    event = context.Event()
    pool = ProcessPoolExecutor(workers, mp_context=context, initializer=_begin, initargs=(bench, event))
    waiting = list(asks)
    running: dict[Future[Resolved], Ask] = {}
    try:
        while running or (waiting and not stop.requested):
            while waiting and len(running) < workers and not stop.requested:
                running[pool.submit(_work, waiting[0], hints())] = waiting[0]
                del waiting[0]
            done, _ = wait(running, timeout=TICK_S, return_when=FIRST_COMPLETED)
            tick()
            if stop.requested:
                event.set()
            for future in done:
                yield running[future], future.result()
                del running[future]
    except BrokenProcessPool:
        for ask in (*running.values(), *waiting):
            if not stop.requested:
                yield ask, resolve_one(bench, ask, stop, hints())
                tick()
    finally:
        event.set()
        pool.shutdown(cancel_futures=True)


def _begin(bench: Bench, event: Event) -> None:
    """Take what all restrictions share; runs once in each process."""
    global _bench, _stop
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _bench, _stop = bench, _SharedStop(event)
    threading.Thread(target=_end_with_parent, daemon=True).start()


def _end_with_parent() -> None:
    parent = multiprocessing.parent_process()
    if parent is not None:
        parent.join()
        os._exit(1)


def _work(ask: Ask, hints: Hints) -> Resolved:
    if _bench is None:
        msg = "a process of the pool was not given its study"
        raise RuntimeError(msg)
    return resolve_one(_bench, ask, _stop, hints)
