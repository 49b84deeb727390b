"""
The one way a long computation speaks to a terminal, a page or a test, and is told to stop.

A computation calls `start` once, `update` as often as it likes and `end` once. Cost and bound only improve: wrap a
listener in `Improving` where the source may report otherwise.
"""

from __future__ import annotations

import threading
from dataclasses import dataclass, replace
from typing import Protocol


@dataclass(frozen=True, slots=True, kw_only=True)
class Progress:
    """How far a computation is."""

    elapsed_s: float
    """Seconds since `start`."""

    cost: float | None = None
    """Money a year of the best plan so far; None before the first."""

    bound: float | None = None
    """Money a year that no plan can undercut; None before the first bound."""

    phase: str = ""
    """What is being done, in words for the user."""

    @property
    def gap(self) -> float | None:
        """(cost - bound) / |cost|, at least 0; None while either is missing."""
        if self.cost is None or self.bound is None:
            return None
        if self.cost <= self.bound:
            return 0.0
        return (self.cost - self.bound) / abs(self.cost) if self.cost else float("inf")


class Listener(Protocol):
    """What a long computation calls. Methods return quickly and may be called from another thread."""

    def start(self, task: str) -> None:
        """Say that `task` begins."""

    def update(self, progress: Progress) -> None:
        """Say how far it is."""

    def end(self, progress: Progress) -> None:
        """Say that it ended, with its last state."""


class Silent:
    """A listener that ignores everything."""

    def start(self, task: str) -> None:
        """Ignore the start."""

    def update(self, progress: Progress) -> None:
        """Ignore the update."""

    def end(self, progress: Progress) -> None:
        """Ignore the end."""


class Improving:
    """Pass events on with the best cost and bound so far, so that neither ever worsens."""

    def __init__(self, listener: Listener) -> None:
        self._listener = listener
        self._lock = threading.Lock()
        self._cost: float | None = None
        self._bound: float | None = None

    def _best(self, progress: Progress) -> Progress:
        with self._lock:
            if progress.cost is not None and (self._cost is None or progress.cost < self._cost):
                self._cost = progress.cost
            if progress.bound is not None and (self._bound is None or progress.bound > self._bound):
                self._bound = progress.bound
            return replace(progress, cost=self._cost, bound=self._bound)

    def start(self, task: str) -> None:
        """Pass the start on."""
        self._listener.start(task)

    def update(self, progress: Progress) -> None:
        """Pass the update on, improved to the best so far."""
        self._listener.update(self._best(progress))

    def end(self, progress: Progress) -> None:
        """Pass the end on, improved to the best so far."""
        self._listener.end(self._best(progress))


class Stop:
    """A request to stop, safe to make from any thread; the computation keeps its best plan so far."""

    def __init__(self) -> None:
        self._event = threading.Event()

    def request(self) -> None:
        """Ask the computation to stop as soon as it can."""
        self._event.set()

    @property
    def requested(self) -> bool:
        """True once somebody asked."""
        return self._event.is_set()
