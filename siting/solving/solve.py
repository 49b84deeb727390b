"""
Solve a study: network, today, search, flows, plan, audit, proof.

Whatever engine ran, its decisions are held, the flows found anew, the plan priced from the tables and audited before
anyone sees it.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from siting.errors import AuditError, EngineError, SettingsError
from siting.listener import Improving, Progress, Silent, Stop
from siting.network.network import build_network
from siting.plan.audit import audit
from siting.plan.draw_up import draw_up
from siting.plan.plan import Answer
from siting.plan.proof import Outcome, Proof
from siting.solving.bounding.engine import bounding
from siting.solving.cbc import cbc
from siting.solving.direct import direct
from siting.solving.flows import flows_for, price
from siting.solving.settle import settled_bound
from siting.solving.today import plan_today

if TYPE_CHECKING:
    from siting.listener import Listener
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.plan.plan import Plan, Today
    from siting.solving.engine import Engine, EngineResult
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

REGISTRY: dict[str, Engine] = {"direct": direct, "bounding": bounding, "cbc": cbc}
"""Every engine by the name the settings know it by."""

FEW_LANES = 2_000
"""Up to so many lanes `auto` gives the whole model to one solver, which needs about a second there."""

TODAY_SHARE = 0.25
"""Share of the time limit the search for today may take; without single-sourced customers it needs none."""


def solve(
    study: Study,
    settings: SolveSettings | None = None,
    *,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> Answer:
    """
    Return the plan of a study with its proof, or why there is none.

    Parameters
    ----------
    study
        Checked, as `read_study` returns it.
    settings
        Gap, time limit and engine; the study's own where None.
    listener
        Told about start, progress (seconds, best cost and bound in money a year) and end.
    stop
        Once requested, the best plan so far is returned.

    Returns
    -------
    answer
        An audited plan with its proof; or outcome `no-plan-yet`; or outcome `impossible` with the reasons.

    Raises
    ------
    SettingsError
        If the settings name an engine that does not exist.
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If the plan found fails its audit; the message lists every fault.
    """
    settings = settings or study.settings.solve
    heard = Improving(listener or Silent())
    stop = stop or Stop()
    began = time.monotonic()
    heard.start(f"planning {study.settings.title}".strip())
    heard.update(Progress(elapsed_s=0.0, phase="working out lanes and costs"))
    network = build_network(study)
    name, reason = pick_engine(network, settings)
    heard.update(Progress(elapsed_s=time.monotonic() - began, phase="planning today"))
    brief = replace(settings, time_limit_s=settings.time_limit_s * TODAY_SHARE)
    today = plan_today(study, network, brief, stop=stop)
    later = _Later(heard, time.monotonic() - began)
    result = REGISTRY[name](network, settings, listener=later, stop=stop)
    phase = "finding out why it is impossible" if result.impossible else "pricing and auditing"
    heard.update(Progress(elapsed_s=time.monotonic() - began, phase=phase))
    run = _Run(settings=settings, engine=name, reason=reason, began=began, stop=stop)
    if result.impossible:
        answer = _impossible(study, network, run, today)
    elif result.decisions is None:
        answer = Answer(proof=run.proof(Outcome.NO_PLAN_YET, result.bound, note=result.note), plan=None, today=today)
    else:
        plan = _plan(study, network, result, result.decisions, run, today)
        answer = Answer(proof=plan.proof, plan=plan, today=today)
    proof = answer.proof
    heard.end(Progress(elapsed_s=proof.seconds, cost=proof.cost, bound=proof.bound, phase=str(proof.outcome)))
    return answer


def pick_engine(network: Network, settings: SolveSettings) -> tuple[str, str]:
    """
    Return which engine to run and why.

    Parameters
    ----------
    network
        What is to be decided.
    settings
        Name an engine, or `auto`.

    Returns
    -------
    name, reason
        Name in `REGISTRY`; the reason is empty where the settings name the engine.

    Raises
    ------
    SettingsError
        If the settings name an engine that does not exist.
    """
    if settings.engine in REGISTRY:
        return settings.engine, ""
    if settings.engine != "auto":
        msg = f"there is no engine {settings.engine!r}; choose one of auto, {', '.join(sorted(REGISTRY))}"
        raise SettingsError(msg)
    lanes = len(network.inbound) + len(network.outbound) + len(network.direct)
    size = "1 lane" if lanes == 1 else f"{lanes:,} lanes"
    if lanes <= FEW_LANES:
        return "direct", f"auto: the whole model, {size}, goes to one solver"
    return "bounding", f"auto: {size} are more than one solver proves fast, so bounds and plans are searched for"


@dataclass(frozen=True, slots=True, kw_only=True)
class _Run:
    """What every proof of this run says."""

    settings: SolveSettings
    engine: str
    reason: str
    began: float
    """`time.monotonic()` at the start."""
    stop: Stop

    def why(self, note: str) -> str:
        """Return why this engine ran and why it stopped before its end, where it has something to say."""
        return "; ".join(part for part in (self.reason, note) if part)

    def proof(self, outcome: Outcome, bound: float | None, *, note: str = "") -> Proof:
        """Return the proof of an answer without a plan."""
        return Proof(
            outcome=outcome,
            cost=None,
            bound=bound,
            gap_asked=self.settings.gap,
            seconds=time.monotonic() - self.began,
            engine=self.engine,
            reason=self.why(note),
        )


def _plan(  # noqa: PLR0913, PLR0917 - what a plan is drawn up from
    study: Study,
    network: Network,
    result: EngineResult,
    decisions: Decisions,
    run: _Run,
    today: Today,
) -> Plan:
    """Return the audited plan that an engine's decisions make: flows found anew, priced from the tables."""
    amounts = flows_for(network, decisions)
    if amounts is None:
        msg = f"the decisions of the engine `{run.engine}` cannot serve all demand as they are. Try another engine."
        raise EngineError(msg)
    plan = draw_up(
        study,
        network,
        decisions,
        amounts,
        bound=settled_bound(result.bound, price(network, decisions, amounts)),
        gap_asked=run.settings.gap,
        seconds=time.monotonic() - run.began,
        engine=run.engine,
        reason=run.why(result.note),
        site_count_bounds=result.site_count_bounds,
        today=today,
    )
    report = audit(study, plan)
    if not report.passed:
        msg = "the plan found failed its audit and is not shown: " + "; ".join(report.faults)
        raise AuditError(msg)
    return plan


def _impossible(study: Study, network: Network, run: _Run, today: Today) -> Answer:
    """Return the answer of an impossible study, with the reasons."""
    from siting.solving.impossible import explain  # noqa: PLC0415 - only impossible studies need it

    reasons, together = explain(study, network, stop=run.stop)
    proof = run.proof(Outcome.IMPOSSIBLE, None)
    return Answer(proof=proof, plan=None, today=today, reasons=reasons, together=together)


class _Later:
    """A listener for a part that began `by` seconds after the whole."""

    def __init__(self, listener: Listener, by: float) -> None:
        self._listener = listener
        self._by = by

    def start(self, task: str) -> None:
        """Say nothing: the whole has started already."""

    def update(self, progress: Progress) -> None:
        """Pass the update on in the whole's seconds."""
        self._listener.update(replace(progress, elapsed_s=progress.elapsed_s + self._by))

    def end(self, progress: Progress) -> None:
        """Say nothing: the whole goes on."""
