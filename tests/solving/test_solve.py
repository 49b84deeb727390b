"""A study solved from end to end: outcome, proof, saving, listener, stop, errors."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from siting.errors import AuditError, EngineError, SettingsError
from siting.listener import Progress, Stop
from siting.plan.audit import AuditReport
from siting.plan.plan import SiteVerdict, TodayOutcome
from siting.plan.proof import Outcome
from siting.solving import solve as solving
from siting.solving.direct import direct
from siting.solving.engine import EngineResult
from siting.solving.solve import solve
from siting.study.settings import SolveSettings
from siting.study.tables import SiteRow, SiteStanding, Study
from tests.building import one_echelon
from tests.published.large_instances import recipe

if TYPE_CHECKING:
    from siting.listener import Listener
    from siting.network.decisions import Decisions
    from siting.network.network import Network

EXACT = SolveSettings(gap=0.0)


@pytest.fixture
def study() -> Study:
    """Return two sites and three customers: site 1 alone costs 290, site 0 alone, which runs today, 420."""
    return one_echelon(
        "two sites",
        [
            SiteRow(site="zero", standing=SiteStanding.RUNNING, yearly_charge=100),
            SiteRow(site="one", yearly_charge=120),
        ],
        {"a": 10, "b": 20, "c": 30},
        [[1, 2, 9], [8, 3, 1]],
    )


class Recorder:
    """Keeps everything a listener hears."""

    def __init__(self, stop: Stop | None = None) -> None:
        self.started: list[str] = []
        self.updates: list[Progress] = []
        self.ended: list[Progress] = []
        self._stop = stop

    def start(self, task: str) -> None:
        """Keep the start."""
        self.started.append(task)

    def update(self, progress: Progress) -> None:
        """Keep the update; ask to stop at the first cost."""
        self.updates.append(progress)
        if self._stop is not None and progress.cost is not None:
            self._stop.request()

    def end(self, progress: Progress) -> None:
        """Keep the end."""
        self.ended.append(progress)


@pytest.mark.parametrize("engine", ["auto", "direct", "cbc"])
def test_proved_plan(study: Study, engine: str) -> None:
    """The plan closes the running site, costs 290, saves 130 and is proved, whatever engine ran."""
    answer = solve(study, SolveSettings(gap=0.0, engine=engine))
    assert answer.proof.outcome is Outcome.PROVED
    assert answer.proof.cost == pytest.approx(290)
    assert answer.proof.bound == pytest.approx(290)
    plan = answer.plan
    assert plan is not None
    assert plan.proof is answer.proof
    assert [line.verdict for line in plan.sites] == [SiteVerdict.CLOSE, SiteVerdict.OPEN]
    assert answer.today is not None
    assert answer.today.outcome is TodayOutcome.SERVED
    assert plan.saving == pytest.approx(130)
    assert answer.proof.engine == ("cbc" if engine == "cbc" else "direct")
    assert bool(answer.proof.reason) is (engine == "auto")


def test_the_study_says_how_to_solve(study: Study) -> None:
    """Without settings of its own a run takes those of the study."""
    mine = replace(study, settings=replace(study.settings, solve=SolveSettings(gap=0.25, engine="cbc")))
    proof = solve(mine).proof
    assert (proof.gap_asked, proof.engine) == (0.25, "cbc")


def test_marginal_costs_are_in_the_plan(study: Study) -> None:
    """The plan carries the duals of the flows, not of the search."""
    plan = solve(study, EXACT).plan
    assert plan is not None
    assert [line.marginal_cost["goods"] for line in plan.customers] == pytest.approx([8, 3, 1])


def test_within_the_gap() -> None:
    """A run that ends at a gap of 5 % says within-gap, and its gap is no wider."""
    answer = solve(recipe(30, 60, 5, 3), SolveSettings(gap=0.05))
    assert answer.proof.outcome is Outcome.WITHIN_GAP
    assert answer.proof.gap is not None
    assert 1e-6 < answer.proof.gap <= 0.05


def test_out_of_time_is_never_proved() -> None:
    """Cut off long before its end, a run says `stopped` with a plan and `no-plan-yet` without one."""
    proof = solve(recipe(50, 100, 5, 3), SolveSettings(gap=0.0, time_limit_s=0.4)).proof
    assert proof.outcome is (Outcome.NO_PLAN_YET if proof.cost is None else Outcome.STOPPED)
    assert proof.bound is None or proof.bound < 10728.96


def test_stopped_on_request_keeps_the_best_plan() -> None:
    """Asked to stop at its first cost, a run returns an audited plan, a bound and the outcome `stopped`."""
    stop = Stop()
    heard = Recorder(stop)
    answer = solve(recipe(50, 100, 5, 3), EXACT, listener=heard, stop=stop)
    assert answer.plan is not None
    assert answer.proof.outcome is Outcome.STOPPED
    assert answer.proof.bound is not None
    assert answer.proof.bound < 10728.96 < answer.plan.cost + 0.01
    assert answer.proof.reason.endswith("; stopped on request")
    assert len(heard.ended) == 1


def test_stopped_before_any_plan(study: Study) -> None:
    """Stopped at once there is no plan, but today is still known."""
    stop = Stop()
    stop.request()
    answer = solve(study, EXACT, stop=stop)
    assert answer.proof.outcome is Outcome.NO_PLAN_YET
    assert answer.proof.reason.endswith("; stopped on request")
    assert answer.plan is None
    assert answer.today is not None


def test_the_listener_hears_one_start_and_one_end(study: Study) -> None:
    """Start and end once, updates in between with seconds that never run backwards and costs that never worsen."""
    heard = Recorder()
    answer = solve(study, EXACT, listener=heard)
    assert heard.started == ["planning two sites"]
    assert [end.cost for end in heard.ended] == [answer.proof.cost]
    elapsed = [update.elapsed_s for update in [*heard.updates, *heard.ended]]
    assert elapsed == sorted(elapsed)
    costs = [update.cost for update in heard.updates if update.cost is not None]
    assert costs == sorted(costs, reverse=True)


def test_impossible_has_reasons(study: Study) -> None:
    """A capacity of 59 for a demand of 60 is impossible: no plan, no cost, reasons instead."""
    sites = (replace(study.sites[0], capacity=20), replace(study.sites[1], capacity=39))
    answer = solve(replace(study, sites=sites), EXACT)
    assert answer.proof.outcome is Outcome.IMPOSSIBLE
    assert answer.plan is None
    assert answer.proof.cost is None
    assert answer.reasons
    assert answer.today is not None
    assert answer.today.outcome is TodayOutcome.SHORT


def test_a_failed_audit_is_an_error(study: Study, monkeypatch: pytest.MonkeyPatch) -> None:
    """A plan that fails is never an answer; every fault is in the message."""
    monkeypatch.setattr(solving, "audit", lambda *_: AuditReport(passed=False, faults=("first wrong", "second wrong")))
    with pytest.raises(AuditError, match=r"failed its audit and is not shown: first wrong; second wrong"):
        solve(study, EXACT)


def test_decisions_that_cannot_serve_are_an_error(study: Study, monkeypatch: pytest.MonkeyPatch) -> None:
    """An engine whose decisions leave demand unserved is found out by the flows."""

    def nothing_open(network: Network, settings: SolveSettings, **_: object) -> EngineResult:
        result = direct(network, settings, listener=_silent(), stop=Stop())
        decisions: Decisions | None = result.decisions
        assert decisions is not None
        return EngineResult(decisions=replace(decisions, option_open=~decisions.option_open & False), bound=0.0)

    monkeypatch.setitem(solving.REGISTRY, "direct", nothing_open)
    with pytest.raises(EngineError, match=r"the engine `direct` cannot serve all demand"):
        solve(study, EXACT)


def _silent() -> Listener:
    return Recorder()


def test_an_unknown_engine_is_refused(study: Study) -> None:
    """The message lists the engines there are."""
    with pytest.raises(SettingsError, match=r"there is no engine 'abacus'; choose one of auto, .*cbc.*direct"):
        solve(study, SolveSettings(engine="abacus"))
