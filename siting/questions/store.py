"""
How answers are kept, so that no question computes again what another has computed.

What is kept is the best plan under a restriction (`Resolved`), found again by the fingerprint of the study, the
question and its parameters. A changed study has another fingerprint, so an old answer is never mistaken for a new one.
"""

from __future__ import annotations

import threading
from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

if TYPE_CHECKING:
    from siting.questions.resolved import Resolved


@dataclass(frozen=True, slots=True, kw_only=True)
class Key:
    """What an answer is kept under."""

    fingerprint: str
    """Of the study asked about, as it is and not as a question restricts it."""
    question: str
    """Such as `best` (the best plan under a restriction)."""
    parameters: str
    """What the question was about, as text; the same for the same parameters."""
    gap: float
    """The gap asked, as a fraction of the cost."""


class Store(Protocol):
    """Where answers are kept. Methods may be called from several threads."""

    def get(self, key: Key) -> Resolved | None:
        """
        Return an answer kept under the key's fingerprint, question and parameters that is good enough for its gap.

        As `serves` says; of several the one with the smallest gap asked. None where there is none.
        """

    def put(self, key: Key, answer: Resolved) -> None:
        """Keep an answer under its key, in place of what the key held before."""


def serves(answer: Resolved, asked: float, gap: float) -> bool:
    """Return whether an answer asked for at one gap answers another: asked no wider, found no wider, or impossible."""
    found = answer.proof.gap
    return asked <= gap or answer.impossible or (found is not None and found <= gap)


class MemoryStore:
    """A store that lasts as long as the process."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._kept: dict[tuple[str, str, str], dict[float, Resolved]] = {}

    def get(self, key: Key) -> Resolved | None:
        """Return the answer asked for at the smallest gap that serves the key."""
        with self._lock:
            by_gap = self._kept.get((key.fingerprint, key.question, key.parameters), {})
            fit = [asked for asked, answer in by_gap.items() if serves(answer, asked, key.gap)]
            return by_gap[min(fit)] if fit else None

    def put(self, key: Key, answer: Resolved) -> None:
        """Keep an answer under its key."""
        with self._lock:
            self._kept.setdefault((key.fingerprint, key.question, key.parameters), {})[key.gap] = answer

    def __len__(self) -> int:
        """Return how many answers are kept."""
        with self._lock:
            return sum(map(len, self._kept.values()))
