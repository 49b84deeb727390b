"""How the engines end: proved, within the gap, out of time, told to stop, impossible; and what they leave behind."""

from __future__ import annotations

import subprocess
import sys
import tempfile
import threading
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pulp
import pytest

from siting.errors import EngineError
from siting.listener import Progress, Silent, Stop
from siting.network.decisions import Decisions
from siting.network.network import build_network
from siting.solving.cbc import cbc
from siting.solving.direct import direct
from siting.study.settings import SolveSettings
from tests.published.large_instances import recipe
from tests.solving.solved import best

if TYPE_CHECKING:
    from pathlib import Path

    from siting.network.network import Network
    from siting.solving.engine import Engine

ENGINES = pytest.mark.parametrize("engine", [direct, cbc], ids=["direct", "cbc"])

OPTIMUM = 7849.867624
"""Of the recipe instance 30 x 60, ratio 5, seed 3; two independent solvers agree on it."""


@pytest.fixture(scope="module")
def hard() -> Network:
    """Return a network that takes seconds to prove."""
    return build_network(recipe(30, 60, 5, 3))


class Recorder(Silent):
    """Keeps every update, and may ask to stop at the first cost."""

    def __init__(self, stop: Stop | None = None) -> None:
        self.updates: list[Progress] = []
        self._stop = stop

    def update(self, progress: Progress) -> None:
        """Keep the update."""
        self.updates.append(progress)
        if self._stop is not None and progress.cost is not None:
            self._stop.request()


@pytest.mark.parametrize("seed", range(4))
def test_engines_agree(seed: int) -> None:
    """Both engines prove the same cost on seeded instances of 8 x 16."""
    network = build_network(recipe(8, 16, 3, seed))
    one, other = best(network, direct), best(network, cbc)
    assert one is not None
    assert other is not None
    assert one.cost == pytest.approx(other.cost, rel=1e-9)
    assert one.bound == pytest.approx(other.bound, rel=1e-7)


def test_a_run_tells_cost_and_bound(hard: Network) -> None:
    """The listener of the direct engine gets both in money a year, each on its side of the optimum."""
    heard = Recorder()
    result = direct(hard, SolveSettings(gap=0.0), listener=heard, stop=Stop())
    assert result.bound == pytest.approx(OPTIMUM, rel=1e-7)
    costs = [update.cost for update in heard.updates if update.cost is not None]
    bounds = [update.bound for update in heard.updates if update.bound is not None]
    assert min(costs) == pytest.approx(OPTIMUM, rel=1e-7)
    assert max(bounds) <= OPTIMUM * (1 + 1e-7)
    assert len(costs) > 1
    elapsed = [update.elapsed_s for update in heard.updates]
    assert elapsed == sorted(elapsed)


def test_the_gap_asked_is_kept_and_used(hard: Network) -> None:
    """At a gap of 5 % the run ends of itself with a bound no further below its cost than that."""
    heard = Recorder()
    result = direct(hard, SolveSettings(gap=0.05), listener=heard, stop=Stop())
    assert result.note == ""
    assert result.bound is not None
    cost = min(update.cost for update in heard.updates if update.cost is not None)
    assert 0 < (cost - result.bound) / cost <= 0.05


def test_stopped_direct_returns_the_best_so_far(hard: Network) -> None:
    """Asked to stop at its first plan, the direct engine returns decisions and a bound below the optimum."""
    stop = Stop()
    result = direct(hard, SolveSettings(gap=0.0), listener=Recorder(stop), stop=stop)
    assert result.note == "stopped on request"
    assert result.decisions is not None
    assert result.decisions.option_open.any()
    assert result.bound is not None
    assert result.bound < OPTIMUM * (1 - 1e-6)


def test_stopped_cbc_returns_the_best_so_far() -> None:
    """Interrupted from another thread, CBC writes its best plan; its bound stays below the optimum of 10,728.963."""
    network = build_network(recipe(50, 100, 5, 3))
    stop = Stop()
    timer = threading.Timer(3.0, stop.request)
    timer.start()
    result = cbc(network, SolveSettings(gap=0.0, time_limit_s=60.0), listener=Silent(), stop=stop)
    timer.join()
    assert result.note
    assert not result.impossible
    assert result.bound is None or result.bound < 10728.96
    assert result.decisions is None or result.decisions.option_open.any()


@ENGINES
def test_out_of_time_is_never_the_end(hard: Network, engine: Engine) -> None:
    """A run cut off after 0.2 s says so and claims no more than it found."""
    result = engine(hard, SolveSettings(gap=0.0, time_limit_s=0.2), listener=Silent(), stop=Stop())
    assert result.note
    assert not result.impossible
    assert result.bound is None or result.bound < OPTIMUM * (1 - 1e-6)


def test_stop_before_the_search_returns_the_start(two_sites: Network) -> None:
    """Stopped before anything ran, the decisions to begin from are the best so far."""
    start = Decisions(
        option_open=np.array([True, True]),
        supplier_signed=np.zeros(0, dtype=np.bool_),
        source=np.full(3, -1, dtype=np.int32),
    )
    stop = Stop()
    stop.request()
    result = direct(two_sites, SolveSettings(), listener=Silent(), stop=stop, start=start)
    assert result.decisions is start
    assert result.bound is None


def test_a_start_is_taken_up(hard: Network) -> None:
    """Begun from the optimum, the first cost told is the optimum."""
    first = direct(hard, SolveSettings(gap=0.0), listener=Silent(), stop=Stop())
    heard = Recorder()
    direct(hard, SolveSettings(gap=0.0), listener=heard, stop=Stop(), start=first.decisions)
    costs = [update.cost for update in heard.updates if update.cost is not None]
    assert costs[0] == pytest.approx(OPTIMUM, rel=1e-7)


@ENGINES
def test_impossible_is_said_only_when_proved(two_sites: Network, engine: Engine) -> None:
    """Capacity of 59 for a demand of 60 is impossible, 60 is not."""
    for total, impossible in ((59.0, True), (60.0, False)):
        network = replace(two_sites, option_capacity=np.array([20.0, total - 20.0]))
        result = engine(network, SolveSettings(gap=0.0), listener=Silent(), stop=Stop())
        assert result.impossible is impossible
        assert (result.decisions is None) is impossible


@ENGINES
def test_a_customer_without_any_lane_is_impossible(two_sites: Network, engine: Engine) -> None:
    """A demand row without terms is a contradiction, not an error."""
    demand = np.array([[10.0], [20.0], [30.0], [1.0]])
    network = replace(two_sites, customers=("a", "b", "c", "d"), demand=demand, single_source=np.zeros(4, dtype=bool))
    assert engine(network, SolveSettings(), listener=Silent(), stop=Stop()).impossible


@ENGINES
def test_nothing_to_decide_and_nothing_to_pay(make_network: object, engine: Engine) -> None:
    """Free sites and lanes make an objective without terms; the bound is 0."""
    network = make_network(demand=[[1]], charges=[0], outbound=[(0, 0, 0)])  # type: ignore[operator] # a fixture
    result = engine(network, SolveSettings(gap=0.0), listener=Silent(), stop=Stop())
    assert result.decisions is not None
    assert result.bound == pytest.approx(0.0, abs=1e-2)


def test_cbc_leaves_no_files(two_sites: Network, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The folder CBC works in is gone afterwards, also when the study is impossible."""
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    monkeypatch.chdir(tmp_path)
    assert best(two_sites, cbc) is not None
    assert best(replace(two_sites, option_capacity=np.array([1.0, 1.0])), cbc) is None
    assert list(tmp_path.iterdir()) == []


def test_a_missing_cbc_is_one_clear_error(two_sites: Network, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where PuLP brought no CBC, the message names the engine to use."""
    monkeypatch.setattr(pulp.PULP_CBC_CMD, "pulp_cbc_path", "/nowhere/cbc")
    with pytest.raises(EngineError, match=r"CBC did not come with this PuLP\. Use the engine `direct`"):
        cbc(two_sites, SolveSettings(), listener=Silent(), stop=Stop())


SCRIPT = """
from siting.solving.solve import solve
from tests.published.large_instances import recipe
for engine in ("direct", "cbc"):
    from siting.study.settings import SolveSettings
    assert solve(recipe(5, 8, 3, 1), SolveSettings(engine=engine)).plan is not None
"""


def test_solving_writes_nothing_to_the_console() -> None:
    """Not even the banner of a solver: standard output belongs to `--json`."""
    done = subprocess.run([sys.executable, "-c", SCRIPT], capture_output=True, text=True, check=True)  # noqa: S603 - own
    assert done.stdout == ""
    assert done.stderr == ""
