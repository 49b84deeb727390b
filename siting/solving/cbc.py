"""
The engine `cbc`: the same model given to the CBC that PuLP brings along, as a cross-check.

CBC runs as a process of its own on a file in a folder that is removed afterwards. Its solution file tells how it ended,
its log the bound.
"""

from __future__ import annotations

import re
import signal
import subprocess
import tempfile
import time
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pulp

from siting.errors import EngineError
from siting.listener import Progress
from siting.solving.direct import GAP_MARGIN, LEAST_SECONDS
from siting.solving.engine import EngineResult
from siting.solving.model import build_model

if TYPE_CHECKING:
    from siting.listener import Listener, Stop
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.solving.model import Model
    from siting.study.settings import SolveSettings

POLL_S = 0.05
"""How often a request to stop is looked for."""

GRACE_S = 5.0
"""How long CBC may take to write its best plan once it is told to stop or its time is over."""

PRINTED = 1e-3
"""CBC prints bounds and values with 3 decimals: a bound read from its log may be this much too high."""

_BOUND = re.compile(r"^Lower bound:\s+(\S+)", re.MULTILINE)
_VALUE = re.compile(r"objective value\s+(\S+)")


def cbc(
    network: Network,
    settings: SolveSettings,
    *,
    listener: Listener,
    stop: Stop,
    start: Decisions | None = None,
) -> EngineResult:
    """
    Search with CBC until the gap, the time limit or `stop`.

    Parameters
    ----------
    network
        What to decide.
    settings
        Gap and time limit; building the model counts as time.
    listener
        Gets `update` with elapsed seconds; CBC tells cost and bound only at the end.
    stop
        Once requested, CBC is told to stop and the best decisions so far are returned.
    start
        Returned where CBC is stopped before it found anything.

    Returns
    -------
    result
        Decisions, bound, and whether the study is impossible.

    Raises
    ------
    EngineError
        If CBC is not there or fails.
    """
    began = time.monotonic()
    program = str(pulp.PULP_CBC_CMD.pulp_cbc_path)
    if not pulp.COIN_CMD(path=program).available():
        msg = "the solver CBC did not come with this PuLP. Use the engine `direct`."
        raise EngineError(msg)
    model = build_model(network)
    with tempfile.TemporaryDirectory(prefix="siting-") as name:
        folder = Path(name)
        names = model.problem.writeMPS(str(folder / "model.mps"), rename=1)
        left = max(settings.time_limit_s - (time.monotonic() - began), LEAST_SECONDS)
        command = [program, str(folder / "model.mps"), "-timeMode", "elapsed", "-sec", f"{left:.3f}"]
        command += ["-ratio", repr(settings.gap * GAP_MARGIN), "-allow", "0", "-primalT", "1e-9", "-integerT", "1e-9"]
        command += ["-solve", "-printingOptions", "all", "-solution", str(folder / "model.sol")]
        _run(command, folder / "model.log", left, listener=listener, stop=stop, began=began)
        return _result(model, folder, names, start)


def _run(  # noqa: PLR0913 - what a run needs, each named
    command: list[str],
    log: Path,
    seconds: float,
    *,
    listener: Listener,
    stop: Stop,
    began: float,
) -> None:
    """Run CBC to its end; told to stop, it writes the best it has."""
    with log.open("wb") as out:
        process = subprocess.Popen(command, stdin=subprocess.DEVNULL, stdout=out, stderr=out)  # noqa: S603 - PuLP's own
        deadline = began + seconds + GRACE_S
        told = False
        while process.poll() is None:
            now = time.monotonic()
            if stop.requested and not told:
                process.send_signal(signal.SIGINT)
                told, deadline = True, now + GRACE_S
            if now > deadline:
                process.kill()
            listener.update(Progress(elapsed_s=now - began, phase="searching with CBC"))
            time.sleep(POLL_S)


def _result(model: Model, folder: Path, names: tuple[object, ...], start: Decisions | None) -> EngineResult:
    """Read how CBC ended from its solution file and its log."""
    file, log = folder / "model.sol", (folder / "model.log").read_text(errors="replace")
    if not file.exists():
        return EngineResult(decisions=start, bound=_bound(log, model), note="CBC was stopped before it wrote a plan")
    head = file.read_text().partition("\n")[0]
    if head.startswith(("Infeasible", "Integer infeasible")):
        return EngineResult(decisions=None, bound=None, impossible=True)
    value = _VALUE.search(head)
    if "no integer solution" in head or value is None:
        return EngineResult(decisions=start, bound=_bound(log, model), note="CBC stopped before it found a plan")
    variables, variable_names, row_names, _ = names
    _, found, *_ = pulp.COIN_CMD().readsol_MPS(file, model.problem, variables, variable_names, row_names)
    values = np.array([found.get(variable.name, variable.lowBound) for variable in model.columns.all])
    proved = head.startswith("Optimal")
    bound = _bound(log, model)
    if bound is None and proved:
        bound = float(value.group(1)) * model.money
    return EngineResult(decisions=model.decisions(values), bound=bound, note="" if proved else "CBC was stopped")


def _bound(log: str, model: Model) -> float | None:
    """Return the bound CBC printed, lowered by what printing may have added; None where it printed none."""
    found = _BOUND.findall(log)
    return (float(found[-1]) - PRINTED) * model.money if found else None
