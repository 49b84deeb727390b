"""
The engine `bounding`: Lagrangean bounds, plans found on the way, and branch and bound on the sites.

Every phase is budgeted in steps, not seconds: a run that neither time nor a request stops gives the same answer always.
The compiled loops are loaded when the engine runs, so that other engines never wait for them.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.errors import EngineError
from siting.solving.bounding.problem import handles

if TYPE_CHECKING:
    from siting.listener import Listener, Stop
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.solving.engine import EngineResult
    from siting.study.settings import SolveSettings


def bounding(
    network: Network,
    settings: SolveSettings,
    *,
    listener: Listener,
    stop: Stop,
    start: Decisions | None = None,
) -> EngineResult:
    """
    Search with Lagrangean bounds until the gap, the time limit or `stop`.

    Parameters
    ----------
    network
        What to decide; `handles` must have no objection.
    settings
        Gap and time limit.
    listener
        Gets `update` with elapsed seconds, best cost and bound in money a year.
    stop
        Once requested, the best decisions so far are returned, within a second.
    start
        A known feasible set of decisions.

    Returns
    -------
    result
        With a bound for each number of sites looked at.

    Raises
    ------
    EngineError
        If the network asks for something that this engine cannot do.
    """
    reason = handles(network)
    if reason is not None:
        msg = f"the engine `bounding` cannot solve this study: {reason}. Choose the engine `auto` or `direct`."
        raise EngineError(msg)
    from siting.solving.bounding.run import Run  # noqa: PLC0415 - loads the compiled loops

    return Run(network, settings, listener, stop).solve(start)
