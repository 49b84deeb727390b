"""What a search splits: binaries, the number of open sites, the number of signed suppliers; and what splitting did."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.solving.bounding.whole_bound import Sides

if TYPE_CHECKING:
    from siting.arrays import Floats
    from siting.solving.bounding.whole_problem import WholeProblem

WHOLE = 1e-6
"""How far from a whole number a binary may be and still be taken for one, before its plan is priced exactly."""


class Levers:
    """Levers of a problem and what splitting them has done so far."""

    def __init__(self, problem: WholeProblem) -> None:
        self._problem = problem
        self._binaries = problem.places.binaries
        self.split = problem.places.option.size + problem.places.supplier.size
        """The first so many binaries are split; pairs are left to the finish."""
        self.count = self._binaries + 2
        self._gain = np.zeros((2, self.count))
        self._seen = np.zeros((2, self.count))

    def whole(self) -> tuple[Floats, Floats]:
        """Return the bounds of every lever before anything is split."""
        limits, size = self._problem.limits, self._binaries
        lower = np.concatenate([self._problem.lower[:size], limits.lower[-2:]])
        return lower, np.concatenate([self._problem.upper[:size], limits.upper[-2:]])

    def sides(self, lower: Floats, upper: Floats) -> Sides:
        """Return the bounds of columns and rows that bounds of the levers mean."""
        problem, size = self._problem, self._binaries
        return Sides(
            lower=np.concatenate([lower[:size], problem.lower[size:]]),
            upper=np.concatenate([upper[:size], problem.upper[size:]]),
            row_lower=np.concatenate([problem.limits.lower[:-2], lower[size:]]),
            row_upper=np.concatenate([problem.limits.upper[:-2], upper[size:]]),
        )

    def values(self, values: Floats) -> Floats:
        """Return (levers,) their values in a solution."""
        places = self._problem.places
        sums = [values[places.option].sum(), values[places.supplier].sum()]
        return np.concatenate([values[: self._binaries], sums])

    def fractional(self, value: Floats) -> np.ndarray:
        """Return the levers that are split and not whole."""
        away = np.abs(value - np.rint(value))
        away[self.split : self._binaries] = 0.0
        return np.flatnonzero(away > WHOLE)

    def learn(self, lever: int, *, up: bool, gain: float, away: float) -> None:
        """Remember what moving a lever by `away` did to the bound."""
        self._gain[int(up), lever] += max(gain, 0.0) / max(away, WHOLE)
        self._seen[int(up), lever] += 1.0

    def record(self, levers: np.ndarray, value: Floats) -> tuple[Floats, Floats]:
        """Return the score of each lever by its record, and how often it was seen (the lesser side)."""
        mean = self._gain.sum(axis=1) / np.maximum(self._seen.sum(axis=1), 1.0)
        per = np.where(self._seen > 0, self._gain / np.maximum(self._seen, 1.0), mean[:, None])[:, levers]
        down, up = value[levers] - np.floor(value[levers]), np.ceil(value[levers]) - value[levers]
        return score(per[0] * down, per[1] * up), self._seen[:, levers].min(axis=0)


def score(down: Floats, up: Floats) -> Floats:
    """Return how good a split is: the product of what both sides gain."""
    return np.maximum(down, 1e-9) * np.maximum(up, 1e-9)
