"""
The best plan but for those found already: the whole model with each answer found ruled out.

Two sets of decisions are the same answer where what moves uses the same options and suppliers. Let U be what an answer
uses and F(U) what moving costs with U alone. Decisions D that hold all of U can move as that answer does, so they move
at F(U) or cheaper; where they are no cheaper, whatever else D opens is of no use and D is the same answer. Each answer
found is therefore ruled out by one row on the binaries of options and suppliers::

    moving cost <= F(U) - least saving + M (number of U not in D + number in D outside U that must move something)

with M = (most that moving may cost within the limit asked) - F(U) + least saving, the smallest constant that is valid.
What has a least volume is always used once it is open, so that opening it makes another answer. A second row rules out
the very decisions found, so that no tolerance of a solver can bring them back::

    number of decisions that differ >= 1
"""

from __future__ import annotations

import time
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import pulp

from siting.listener import Stop
from siting.solving.direct import search
from siting.solving.engine import EngineResult
from siting.solving.model import build_model
from siting.solving.rows import AT_LEAST, AT_MOST, power_of_two

if TYPE_CHECKING:
    from siting.arrays import Flags
    from siting.listener import Listener, Progress
    from siting.network.decisions import Amounts, Decisions
    from siting.network.network import Network
    from siting.study.settings import SolveSettings

SAVING = 1e-7
"""Share of the best cost that using something must save in moving for it to count as used."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Used:
    """What an answer uses."""

    options: Flags
    """(O,)"""
    suppliers: Flags
    """(K,)"""
    moving: float
    """Money a year that moving costs: the cost without any charge."""


class NextBest:
    """
    Finds one answer after the other, each the best but for those ruled out.

    Parameters
    ----------
    network
        What is decided.
    limit
        Money a year beyond which no plan is looked for.
    saving
        Money a year of moving below which using something more saves nothing.
    """

    def __init__(self, network: Network, *, limit: float, saving: float) -> None:
        self._network = network
        self._limit = limit
        self._saving = saving
        self._model = build_model(network)
        self._count = 0

    def rule_out(self, decisions: Decisions, used: Used) -> None:
        """Rule out decisions found, and all others that are the same answer."""
        self._count += 1
        columns = self._model.columns
        inside = np.concatenate([columns.option[used.options], columns.supplier[used.suppliers]]).tolist()
        must_move = np.concatenate(
            [
                columns.option[~used.options & options_must_move(self._network)],
                columns.supplier[~used.suppliers & suppliers_must_move(self._network)],
            ]
        ).tolist()
        taken = np.concatenate([decisions.option_open, decisions.supplier_signed])
        every = np.concatenate([columns.option, columns.supplier])
        apart = list(zip(every.tolist(), np.where(taken, -1.0, 1.0).tolist(), strict=True))
        self._add("apart", apart, AT_LEAST, 1.0 - float(taken.sum()))
        room = max(self._most_moving() - used.moving, 0.0) + self._saving
        terms = [*self._moving(), *((column, room) for column in inside), *((column, -room) for column in must_move)]
        self._add("cheaper", terms, AT_MOST, used.moving - self._saving + room * len(inside))

    def search(
        self, settings: SolveSettings, *, listener: Listener, stop: Stop, start: Decisions | None = None
    ) -> EngineResult:
        """
        Find the best plan but for the answers ruled out.

        Parameters
        ----------
        settings
            Gap and time limit.
        listener
            Gets `update` with cost and bound in money a year.
        stop
            Once requested, the best decisions so far are returned.
        start
            Decisions to begin from.

        Returns
        -------
        result
            As an engine returns it; the bound holds for every answer not ruled out. It ends early, and may be without
            decisions, once the bound is above the limit; where nothing within the limit is left, it is impossible.

        Raises
        ------
        EngineError
            If HiGHS gives up without a plan for a reason of its own.
        """
        began = time.monotonic()
        enough = _Enough(listener, stop, self._limit)
        found = search(self._model, settings, listener=enough, stop=enough.stop, start=start, began=began)
        return EngineResult(
            decisions=None if found.values is None else self._model.decisions(found.values),
            bound=found.bound if enough.bound is None else max(enough.bound, found.bound or enough.bound),
            impossible=found.impossible,
            note=found.note,
        )

    def _moving(self) -> list[tuple[int, float]]:
        """Return the terms of what moving costs, money a year."""
        columns, network = self._model.columns, self._network
        costs = np.zeros(len(columns.all))
        for lanes, column, units in (
            (network.inbound, columns.inbound, columns.inbound_units),
            (network.outbound, columns.outbound, columns.outbound_units),
            (network.direct, columns.direct, columns.direct_units),
        ):
            np.add.at(costs, column, lanes.cost * units)
        at = np.flatnonzero(costs)
        return list(zip(at.tolist(), costs[at].tolist(), strict=True))

    def _most_moving(self) -> float:
        """Return the most that moving may cost in a plan within the limit: the limit less the least of all charges."""
        network = self._network
        option = np.minimum(network.option_charge - network.site_closing[network.option_site], 0.0)
        least = np.zeros(len(network.sites))
        np.minimum.at(least, network.option_site, option)
        charges = least.sum() + network.site_closing.sum() + network.supplier_dropping.sum()
        charges += np.minimum(network.supplier_charge - network.supplier_dropping, 0.0).sum()
        return self._limit - float(charges)

    def _add(self, name: str, terms: list[tuple[int, float]], sense: int, right: float) -> None:
        scale = power_of_two(max((abs(value) for _, value in terms), default=0.0))
        pairs = [(self._model.columns.all[column], value * scale) for column, value in terms if value]
        row = pulp.LpConstraint(pulp.LpAffineExpression(pairs), sense, rhs=right * scale)
        self._model.problem.addConstraint(row, f"{name}_{self._count}")


def options_must_move(network: Network) -> Flags:
    """Return (O,) which options have a least throughput, so that something moves once they are open."""
    must: Flags = network.option_least > 0
    return must


def suppliers_must_move(network: Network) -> Flags:
    """Return (K,) which suppliers have a least volume, so that something moves once they are signed."""
    must: Flags = (network.supplier_least > 0) | (network.offer_least > 0).any(axis=1)
    return must


def moving_cost(network: Network, amounts: Amounts) -> float:
    """Return what amounts cost to move, money a year: the cost of a plan without any charge."""
    moves = network.inbound.cost @ amounts.inbound + network.outbound.cost @ amounts.outbound
    return float(moves + network.direct.cost @ amounts.direct)


class _Enough:
    """Passes progress on, and stops the search once its bound is above the limit."""

    def __init__(self, listener: Listener, stop: Stop, limit: float) -> None:
        self._listener = listener
        self._limit = limit
        self.stop = _Either(stop)
        self.bound: float | None = None
        """The bound that ended the search; None where it did not."""

    def start(self, task: str) -> None:
        """Pass the start on."""
        self._listener.start(task)

    def update(self, progress: Progress) -> None:
        """Pass the update on and look at the bound."""
        self._listener.update(progress)
        if progress.bound is not None and progress.bound > self._limit:
            self.bound = progress.bound
            self.stop.request()

    def end(self, progress: Progress) -> None:
        """Pass the end on."""
        self._listener.end(progress)


class _Either(Stop):
    """A stop that is requested with another one too."""

    def __init__(self, other: Stop) -> None:
        super().__init__()
        self._other = other

    @property
    def requested(self) -> bool:
        """True once this one or the other was requested."""
        return super().requested or self._other.requested
