"""Show how far a long computation is: one live line on a terminal, a plain line now and then elsewhere."""

from __future__ import annotations

import sys
import threading
import time
from typing import TYPE_CHECKING, TextIO

from siting.listener import Silent

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.listener import Listener, Progress

LIVE_S = 0.2
"""Seconds between two states of the live line."""
PLAIN_S = 10.0
"""Seconds between two plain lines."""
WIDTH = 100
"""Columns the live line may take."""


class ProgressLine:
    """
    A listener that writes to a stream: one line rewritten in place where `live`, else plain lines now and then.

    Parameters
    ----------
    stream
        Where to write.
    live
        Whether the stream is a terminal, where a line can be rewritten.
    clock
        Seconds, ever rising; the time between two writes is measured with it.
    """

    def __init__(self, stream: TextIO, *, live: bool, clock: Callable[[], float] = time.monotonic) -> None:
        self._stream = stream
        self._live = live
        self._clock = clock
        self._lock = threading.Lock()
        self._next = 0.0
        self._shown = False

    def start(self, task: str) -> None:
        """Begin to count the time to the next write; plain lines say what begins."""
        with self._lock:
            self._next = self._clock() + (LIVE_S if self._live else PLAIN_S)
            self._shown = False
            if self._live:
                self._write(f"{task} ...")
            else:
                self._stream.write(f"{task} ...\n")

    def update(self, progress: Progress) -> None:
        """Write the state, unless the last write was a moment ago."""
        with self._lock:
            now = self._clock()
            if now < self._next:
                return
            self._next = now + (LIVE_S if self._live else PLAIN_S)
            self._write(state(progress))

    def end(self, progress: Progress) -> None:
        """Wipe the live line, since the answer follows; a plain log gets the last state."""
        with self._lock:
            if self._live:
                if self._shown:
                    self._stream.write("\r" + " " * WIDTH + "\r")
            else:
                self._stream.write(state(progress) + "\n")
            self._stream.flush()

    def _write(self, text: str) -> None:
        line = text[:WIDTH]
        self._stream.write(f"\r{line:<{WIDTH}}" if self._live else f"{line}\n")
        self._stream.flush()
        self._shown = True


def state(progress: Progress) -> str:
    """Return the state in one line: seconds, best cost, bound, gap, phase; what is not known yet is left out."""
    parts = [f"{progress.elapsed_s:6.1f} s"]
    if progress.cost is not None:
        parts.append(f"best {progress.cost:,.0f}")
    if progress.bound is not None:
        parts.append(f"bound {progress.bound:,.0f}")
    if progress.gap is not None:
        parts.append(f"gap {progress.gap:.3%}".replace("%", " %"))
    if progress.phase:
        parts.append(progress.phase)
    return "  ".join(parts)


def progress_on_stderr(*, wanted: bool) -> Listener:
    """Return the listener for a command: silent where not wanted, live on a terminal, plain lines elsewhere."""
    if not wanted:
        return Silent()
    return ProgressLine(sys.stderr, live=sys.stderr.isatty())
