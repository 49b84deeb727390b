"""
The engine `direct`: the whole model given to HiGHS, in-process, through PuLP.

How the run ended is read from HiGHS itself: PuLP files a run stopped by its time limit under "Optimal".
"""

from __future__ import annotations

import math
import threading
import time
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import highspy
import numpy as np
import pulp

from siting.errors import EngineError
from siting.listener import Progress
from siting.solving.engine import EngineResult
from siting.solving.highs import TOLERANCE, QuietHighs, has_solution, is_impossible
from siting.solving.model import build_model

if TYPE_CHECKING:
    from siting.arrays import Floats
    from siting.listener import Listener, Stop
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.solving.model import Model
    from siting.study.settings import SolveSettings

GAP_MARGIN = 0.999
"""Share of the gap asked that the solver is told, so that pricing its plan anew cannot lift the gap above it."""

LEAST_SECONDS = 0.01
"""Time limit given to a solver when building the model used all of it: enough to return cleanly."""

PATIENCE_S = 0.2
"""Seconds HiGHS gets to notice a request to stop; it looks only now and then, and in some phases not for long."""

LONGER_PATIENCE_S = 0.8
"""The same where it has told of no solution or no bound yet, which are worth a moment."""

POLL_S = 0.05
"""Seconds between two looks at whether a stop is requested."""

NOTES = {
    highspy.HighsModelStatus.kOptimal: "",
    highspy.HighsModelStatus.kTimeLimit: "stopped by the time limit",
    highspy.HighsModelStatus.kInterrupt: "stopped on request",
}
"""What is said of each way a run may end well; empty where it ended by itself."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Found:
    """What a run of a solver on a model ended with."""

    values: Floats | None
    """(columns,) of the best solution; None without one."""
    bound: float | None
    """In the unit of the objective (money a year, or load unserved), valid also when stopped."""
    impossible: bool
    """True only when nothing satisfies the rows."""
    note: str
    """Why it stopped before its end; empty where it did not."""


def direct(
    network: Network,
    settings: SolveSettings,
    *,
    listener: Listener,
    stop: Stop,
    start: Decisions | None = None,
) -> EngineResult:
    """
    Search with HiGHS until the gap, the time limit or `stop`.

    Parameters
    ----------
    network
        What to decide.
    settings
        Gap and time limit; building the model counts as time.
    listener
        Gets `update` with elapsed seconds, best cost and bound in money a year.
    stop
        Once requested, the best decisions so far are returned.
    start
        Decisions known to be feasible, to begin from.

    Returns
    -------
    result
        Decisions, bound, and whether the study is impossible.

    Raises
    ------
    EngineError
        If HiGHS gives up without a plan for a reason of its own.
    """
    began = time.monotonic()
    listener.update(Progress(elapsed_s=0.0, phase="stating the model"))
    model = build_model(network)
    if stop.requested:
        return EngineResult(decisions=start, bound=None, note=NOTES[highspy.HighsModelStatus.kInterrupt])
    found = search(model, settings, listener=listener, stop=stop, start=start, began=began)
    return EngineResult(
        decisions=None if found.values is None else model.decisions(found.values),
        bound=found.bound,
        impossible=found.impossible,
        note=found.note,
    )


def search(  # noqa: PLR0913 - what a run needs, each named
    model: Model,
    settings: SolveSettings,
    *,
    listener: Listener,
    stop: Stop,
    start: Decisions | None = None,
    began: float | None = None,
) -> Found:
    """
    Run HiGHS on a model.

    Parameters
    ----------
    model
        As built.
    settings
        Gap and time limit.
    listener, stop
        Told how far it is; asks to stop.
    start
        Decisions to begin from.
    began
        `time.monotonic()` when the time began to count; now where None.

    Returns
    -------
    found
        Values, bound, and how it ended.

    Raises
    ------
    EngineError
        If HiGHS gives up without values for a reason of its own.
    """
    began = time.monotonic() if began is None else began
    run = InProcess(model, settings, listener=listener, stop=stop, start=start, began=began)
    model.problem.solve(run)
    return run.left if run.left is not None else _found(model, model.problem.solverModel)


def column_values(model: Model, highs: highspy.Highs) -> Floats:
    """
    Return the value of each column of the model; a variable that no row and no cost mentions rests at its lower bound.

    Parameters
    ----------
    model
        As given to PuLP's HiGHS.
    highs
        Holds its solution.

    Returns
    -------
    values
        Shape (columns,).
    """
    return _of_columns(model, np.array(highs.getSolution().col_value))


def _of_columns(model: Model, solution: Floats) -> Floats:
    values = np.array([variable.lowBound for variable in model.columns.all], dtype=np.float64)
    place = np.array([getattr(variable, "index", -1) for variable in model.columns.all])
    values[place >= 0] = solution[place[place >= 0]]
    return values


class InProcess(pulp.HiGHS):  # type: ignore[misc] # PuLP ships no types
    """
    PuLP's in-process HiGHS, reporting to a listener and stopping on request.

    HiGHS runs in a thread of its own. Where it does not notice a stop within `PATIENCE_S`, it is left to end by itself
    and `left` holds the best it had told of. A process that ends waits for it; one in haste calls `os._exit`.
    """

    left: Found | None = None
    """What was known when HiGHS was left behind; None where it came to an end."""

    def __init__(  # noqa: PLR0913 - what a run needs, each named
        self,
        model: Model,
        settings: SolveSettings,
        *,
        listener: Listener,
        stop: Stop,
        start: Decisions | None,
        began: float,
    ) -> None:
        super().__init__(msg=True)
        self._model = model
        self._settings = settings
        self._listener = listener
        self._stop = stop
        self._start = start
        self._began = began
        self._best: Floats | None = None
        self._bound: float | None = None
        self._error: BaseException | None = None

    def createAndConfigureSolver(self, lp: pulp.LpProblem) -> None:  # noqa: N802 - overrides a method of PuLP
        """Make a quiet HiGHS with our limits and our listener."""
        highs = QuietHighs()  # type: ignore[no-untyped-call] # highspy types only part of its methods
        left = max(self._settings.time_limit_s - (time.monotonic() - self._began), LEAST_SECONDS)
        options: dict[str, float] = {
            "mip_rel_gap": self._settings.gap * GAP_MARGIN,
            "mip_abs_gap": 0.0,
            "mip_feasibility_tolerance": TOLERANCE,
            "primal_feasibility_tolerance": TOLERANCE,
            "time_limit": left,
        }
        for name, value in options.items():
            highs.setOptionValue(name, value)
        highs.setOptionValue("mip_allow_restart", False)  # noqa: FBT003 - a third slower with restarts on two echelons
        highs.cbMipLogging.subscribe(self._report)
        highs.cbMipImprovingSolution.subscribe(self._improve)
        highs.cbMipInterrupt.subscribe(self._interrupt)
        lp.solverModel = highs

    def callSolver(self, lp: pulp.LpProblem) -> None:  # noqa: N802 - overrides a method of PuLP
        """Hand over the start, if there is one, and run."""
        if self._start is not None:
            columns, values = self._model.binaries(self._start)
            place = np.array([getattr(self._model.columns.all[column], "index", -1) for column in columns.tolist()])
            known = place >= 0
            lp.solverModel.setSolution(int(known.sum()), place[known].astype(np.int32), values[known])
        thread = threading.Thread(target=self._run, args=(lp.solverModel,), name="HiGHS")
        thread.start()
        while thread.is_alive():
            thread.join(POLL_S)
            if self._stop.requested:
                self._wait(thread)
                break
        if thread.is_alive():
            best = self._best
            found = None if best is None else _of_columns(self._model, best)
            note = NOTES[highspy.HighsModelStatus.kInterrupt]
            self.left = Found(values=found, bound=self._bound, impossible=False, note=note)
        elif self._error is not None:
            raise self._error

    def _wait(self, thread: threading.Thread) -> None:
        """Give HiGHS its time to notice the stop."""
        told = time.monotonic()
        while thread.is_alive():
            known = self._best is not None and self._bound is not None
            if time.monotonic() - told > (PATIENCE_S if known else LONGER_PATIENCE_S):
                return
            thread.join(POLL_S)

    def _run(self, highs: highspy.Highs) -> None:
        try:
            highs.run()
        except BaseException as error:  # noqa: BLE001 - raised again by the thread that waits
            self._error = error

    def findSolutionValues(self, lp: pulp.LpProblem) -> tuple[int, int]:  # noqa: ARG002, N802 - overrides a method of PuLP
        """Leave the variables alone: values and outcome are read from HiGHS itself."""
        return pulp.LpStatusNotSolved, pulp.LpSolutionNoSolutionFound

    def _improve(self, event: Any) -> None:  # noqa: ANN401 - highspy's event
        self._best = np.array(event.data_out.mip_solution)
        self._report(event)

    def _report(self, event: Any) -> None:  # noqa: ANN401 - highspy's event
        if self.left is not None:
            return
        out = event.data_out
        self._bound = _finite(out.mip_dual_bound, self._model.money)
        self._listener.update(
            Progress(
                elapsed_s=time.monotonic() - self._began,
                cost=_finite(out.mip_primal_bound, self._model.money),
                bound=_finite(out.mip_dual_bound, self._model.money),
                phase="searching",
            )
        )

    def _interrupt(self, event: Any) -> None:  # noqa: ANN401 - highspy's event
        self._bound = _finite(event.data_out.mip_dual_bound, self._model.money)
        if self._stop.requested:
            event.interrupt()


def _finite(value: float, money: float) -> float | None:
    return value * money if math.isfinite(value) else None


def _found(model: Model, highs: highspy.Highs) -> Found:
    """Read how the run ended from HiGHS itself."""
    if is_impossible(highs):
        return Found(values=None, bound=None, impossible=True, note="")
    status = highs.getModelStatus()
    there = has_solution(highs)
    if not there and status not in NOTES:
        msg = f"HiGHS gave up without a plan: {highs.modelStatusToString(status)}. Try the engine `cbc`."
        raise EngineError(msg)
    info = highs.getInfo()
    bound: float | None = None
    if any(variable.cat == pulp.LpInteger for variable in model.problem.variables()):
        bound = _finite(info.mip_dual_bound, model.money)
    elif status == highspy.HighsModelStatus.kOptimal:
        bound = info.objective_function_value * model.money
    return Found(
        values=column_values(model, highs) if there else None,
        bound=bound,
        impossible=False,
        note=NOTES.get(status, f"HiGHS ended with: {highs.modelStatusToString(status)}"),
    )
