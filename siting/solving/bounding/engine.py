"""
The engine `bounding`: bounds from relaxations, plans found on the way, and branch and bound.

Two searches stand behind it. Where the network is one echelon of sites that `handles` has no objection to, the demand
rows are relaxed (`run`); every other network is searched over lanes priced in (`whole`).

Every phase is budgeted in steps, not seconds: a run that neither time nor a request stops gives the same answer always.
The compiled loops are loaded when the engine runs, so that other engines never wait for them.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.listener import Progress
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
    Search until the gap, the time limit or `stop`.

    Parameters
    ----------
    network
        What to decide; any feature.
    settings
        Gap and time limit; compiling the search, once on a machine, does not count.
    listener
        Gets `update` with elapsed seconds, best cost and bound in money a year.
    stop
        Once requested, the best decisions so far are returned, within a second.
    start
        A known feasible set of decisions.

    Returns
    -------
    result
        With a bound for each number of sites looked at, where the sites alone are searched.

    Raises
    ------
    EngineError
        If a linear program fails for a reason of its own.
    """
    if handles(network) is not None:
        from siting.solving.bounding.whole import whole  # noqa: PLC0415 - each search loads what it needs

        return whole(network, settings, listener=listener, stop=stop, start=start)
    from siting.solving.bounding.compiled import is_compiled  # noqa: PLC0415 - loads the compiler

    if not is_compiled():
        from siting.solving.bounding.warm import compile_loops  # noqa: PLC0415 - only once a machine

        listener.update(Progress(elapsed_s=0.0, phase="compiling the search, once on this machine"))
        compile_loops()
    from siting.solving.bounding.run import Run  # noqa: PLC0415 - loads the compiled loops

    return Run(network, settings, listener, stop).solve(start)
