"""What every engine takes and returns."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Protocol

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.listener import Listener, Stop
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.study.settings import SolveSettings


@dataclass(frozen=True, slots=True, kw_only=True)
class EngineResult:
    """What an engine found, in the network's positions."""

    decisions: Decisions | None
    """The best plan's decisions; None when stopped before any plan, or impossible."""
    bound: float | None
    """Money a year that no plan can undercut, constant closing and dropping terms included; valid also when stopped."""
    impossible: bool = False
    """True only when the engine proved that no plan exists."""
    site_count_bounds: Mapping[int, float] = field(default_factory=dict)
    """Bound for each exact number of open sites, where kept."""
    note: str = ""
    """What the engine wants said, such as why it stopped."""


class Engine(Protocol):
    """Find the best decisions on a network."""

    def __call__(
        self,
        network: Network,
        settings: SolveSettings,
        *,
        listener: Listener,
        stop: Stop,
        start: Decisions | None = None,
    ) -> EngineResult:
        """
        Search until the gap, the time limit or `stop`.

        Calls `listener.update` only (the caller calls start and end). `start` is a known feasible set of decisions.
        """
