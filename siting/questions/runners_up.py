"""
Runners-up: the next-best answers, in order, proved complete within a percentage of the best or said not to be.

Two answers are the same where the sites, sizes and suppliers through which something moves are the same; the cheapest
plan stands for all of them. What is open and could stay idle at no extra cost is not used. Each search is for the best
plan but for the answers found (`solving/next_best.py`), so that its bound holds for every answer not listed.
"""

from __future__ import annotations

import json
import time
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.errors import AuditError, EngineError, SettingsError
from siting.listener import Progress, Silent, Stop
from siting.plan.audit import audit
from siting.plan.draw_up import draw_up
from siting.plan.plan import LOAD_TOLERANCE
from siting.plan.proof import PROVED_GAP, Outcome, Proof
from siting.plan.words import headline
from siting.questions.resolved import Resolved
from siting.questions.resolver import Resolver
from siting.questions.restriction import parts_of
from siting.questions.runners_up_result import RunnersUp, RunnerUp, differs_line, limit_of
from siting.questions.searching import decisions_of
from siting.questions.store import Key, MemoryStore
from siting.solving.flows import flows_for, price
from siting.solving.next_best import SAVING, NextBest, Used, moving_cost, options_must_move, suppliers_must_move
from siting.solving.settle import settled_bound

if TYPE_CHECKING:
    from siting.arrays import Floats
    from siting.listener import Listener
    from siting.network.decisions import Amounts, Decisions
    from siting.network.network import Network
    from siting.plan.plan import Answer, Plan
    from siting.questions.searching import Bench
    from siting.questions.store import Store
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

WITHIN = 0.02
MOST = 10
"""What is asked for where nothing is said."""


def runners_up(  # noqa: PLR0913 - what a question is asked with, all but the first two by name
    study: Study,
    answer: Answer | None = None,
    *,
    within: float = WITHIN,
    most: int = MOST,
    gap: float = PROVED_GAP,
    settings: SolveSettings | None = None,
    store: Store | None = None,
    listener: Listener | None = None,
    stop: Stop | None = None,
) -> RunnersUp:
    """
    Return the best answers of a study, in order.

    Parameters
    ----------
    study
        Checked.
    answer
        Its plan, where there is one already; proved to `gap` first.
    within
        How far above the best to look, as a fraction of its cost, at least 0.
    most
        How many to list next to the best, at least 1.
    gap
        Gap of every search, in [0, 1).
    settings
        Time limit of each search; the study's own where None. The whole model is searched whatever the engine.
    store
        Where answers are kept and found again; in memory, for this call only, where None.
    listener
        Told how far it is.
    stop
        Once requested, what is done is returned.

    Returns
    -------
    found
        The best and those next to it, ties included; the money a year up to which none is missing.

    Raises
    ------
    SettingsError
        If `within` or `most` is out of its range.
    PlanFileError
        If the answer is of another study.
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If a plan fails its audit.
    """
    if not 0.0 <= within < float("inf") or most < 1:
        msg = f"runners-up need a fraction of at least 0 and a number of at least 1, got {within:g} and {most}"
        raise SettingsError(msg)
    asked = replace(settings or study.settings.solve, gap=gap)
    kept = MemoryStore() if store is None else store
    stop = stop or Stop()
    resolver = Resolver(study, answer=answer, settings=asked, store=kept, listener=listener, stop=stop)
    resolver.start(f"runners-up of {study.settings.title}".strip())
    base = resolver.plan()
    answers: tuple[RunnerUp, ...] = ()
    complete_to = None
    if base.plan is not None:
        hunt = _Hunt(resolver, kept, within, listener or Silent())
        answers, complete_to = hunt.run(base.plan, base.bound, most)
    resolver.end("stopped" if stop.requested else "done")
    return RunnersUp(
        title=study.settings.title,
        currency=study.settings.currency,
        fingerprint=resolver.mark,
        outcome=base.proof.outcome,
        within=within,
        most=most,
        gap_asked=gap,
        answers=answers,
        complete_to=complete_to,
        why_none=() if base.plan else (headline(base.as_answer(), currency=study.settings.currency),),
        seconds=resolver.seconds,
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Settled:
    """Decisions with the flows that use as little as they can at no extra cost."""

    decisions: Decisions
    amounts: Amounts
    used: Used


class _Hunt:
    """One search after the other, each for the best answer not found yet."""

    def __init__(self, resolver: Resolver, store: Store, within: float, listener: Listener) -> None:
        self._resolver = resolver
        self._store = store
        self._within = within
        self._listener = listener
        self._bench: Bench = resolver.bench()
        self._saving = 0.0
        self._found: dict[frozenset[tuple[str, str, str]], RunnerUp] = {}
        self._best: RunnerUp | None = None

    def run(self, plan: Plan, bound: float | None, most: int) -> tuple[tuple[RunnerUp, ...], float | None]:
        """
        Return the answers, the best first, and the money a year up to which none is missing.

        Parameters
        ----------
        plan
            The best plan.
        bound
            Money a year that no plan can undercut.
        most
            How many to find next to the best.
        """
        bench = self._bench
        self._saving = SAVING * max(1.0, abs(plan.cost))
        decisions = decisions_of(bench.study, bench.network, plan, parts_of(plan))
        settled = self._settled(decisions)
        self._take(settled, self._plan(settled, bound, plan.proof.seconds))
        limit = limit_of(plan.cost, self._within)
        finder: NextBest | None = None
        ruled_out: list[_Settled] = [settled]
        complete_to = bound
        while len(self._found) <= most and not self._resolver.stop.requested:
            kept = self._store.get(self._key(ruled_out, limit))
            if kept is None:
                if finder is None:
                    finder = NextBest(bench.network, limit=limit, saving=self._saving)
                    for each in ruled_out[:-1]:
                        finder.rule_out(each.decisions, each.used)
                finder.rule_out(ruled_out[-1].decisions, ruled_out[-1].used)
                kept = self._search(finder, limit)
                if kept.within:
                    self._store.put(self._key(ruled_out, limit), kept)
            elif finder is not None:
                finder.rule_out(ruled_out[-1].decisions, ruled_out[-1].used)
            complete_to = _higher(complete_to, limit if kept.impossible else kept.bound)
            if kept.plan is None or kept.plan.cost > limit + self._saving:
                break
            settled = self._settled(decisions_of(bench.study, bench.network, kept.plan, parts_of(kept.plan)))
            ruled_out.append(settled)
            self._take(settled, kept.plan)
        return self._in_order(), complete_to

    def _in_order(self) -> tuple[RunnerUp, ...]:
        """Return the answers from the cheapest up, what they add measured from the cheapest."""
        ranked = sorted(self._found.values(), key=lambda each: each.cost)
        best = replace(ranked[0], extra=0.0, differs="")
        rest = (
            replace(
                each,
                extra=each.cost - best.cost,
                differs=differs_line(best, each.plan, each.used_sites, each.used_suppliers),
            )
            for each in ranked[1:]
        )
        return (best, *rest)

    def _key(self, ruled_out: list[_Settled], limit: float) -> Key:
        network, study = self._bench.network, self._bench.study
        names = [
            [
                *([row.site, row.size] for row, used in zip(study.options, each.used.options, strict=True) if used),
                *([name] for name, used in zip(network.suppliers, each.used.suppliers, strict=True) if used),
            ]
            for each in ruled_out
        ]
        parameters = json.dumps({"but for": names, "up to": limit})
        return Key(
            fingerprint=self._resolver.mark,
            question="next best",
            parameters=parameters,
            gap=self._resolver.settings.gap,
        )

    def _search(self, finder: NextBest, limit: float) -> Resolved:
        """Return the best answer not ruled out; impossible where none is left within the limit."""
        settings, began = self._resolver.settings, time.monotonic()
        heard = _Told(self._listener, self._resolver, len(self._found))
        result = finder.search(settings, listener=heard, stop=self._resolver.stop)
        self._resolver.searches += 1
        seconds = time.monotonic() - began
        past = result.bound is not None and result.bound > limit
        plan = None
        if result.decisions is not None and not past:
            settled = self._settled(result.decisions)
            plan = self._plan(settled, result.bound, seconds)
        outcome = Outcome.IMPOSSIBLE if result.impossible or past else Outcome.NO_PLAN_YET
        proof = Proof(
            outcome=outcome,
            cost=None,
            bound=None if result.impossible else result.bound,
            gap_asked=settings.gap,
            seconds=seconds,
            engine="direct",
        )
        return Resolved(proof=proof if plan is None else plan.proof, plan=plan, time_limit_s=settings.time_limit_s)

    def _settled(self, decisions: Decisions) -> _Settled:
        """Return decisions with flows from which nothing used can be left out at no extra cost."""
        network = self._bench.network
        amounts = flows_for(network, decisions)
        if amounts is None:
            msg = "the decisions of a search cannot serve all demand as they are. Ask again with a smaller gap."
            raise EngineError(msg)
        cost, idle = moving_cost(network, amounts), network
        least = [
            (load, kind, at)
            for kind, loads, must in (
                ("option", _option_loads(network, decisions, amounts), options_must_move(network)),
                ("supplier", _supplier_loads(network, amounts), suppliers_must_move(network)),
            )
            for at, load in enumerate(loads.tolist())
            if load > LOAD_TOLERANCE and not must[at]
        ]
        for _, kind, at in sorted(least):
            without = _idle(idle, kind, at)
            other = flows_for(without, decisions)
            if other is not None and moving_cost(network, other) <= cost + self._saving / 2:
                idle, amounts = without, other
        used = Used(
            options=_option_loads(network, decisions, amounts) > LOAD_TOLERANCE,
            suppliers=_supplier_loads(network, amounts) > LOAD_TOLERANCE,
            moving=moving_cost(network, amounts),
        )
        return _Settled(decisions=decisions, amounts=amounts, used=used)

    def _plan(self, settled: _Settled, bound: float | None, seconds: float) -> Plan:
        """Return the audited plan of an answer; its bound is that of every answer not found before."""
        bench = self._bench
        plan = draw_up(
            bench.study,
            bench.network,
            settled.decisions,
            settled.amounts,
            bound=settled_bound(bound, price(bench.network, settled.decisions, settled.amounts)),
            gap_asked=self._resolver.settings.gap,
            seconds=seconds,
            engine="direct",
            reason="the best but for the answers found before",
            today=bench.today,
        )
        report = audit(bench.study, plan)
        if not report.passed:
            msg = "a plan found failed its audit and is not shown: " + "; ".join(report.faults)
            raise AuditError(msg)
        return plan

    def _take(self, settled: _Settled, plan: Plan) -> None:
        """Keep an answer, the cheapest where it was found before."""
        study, network, used = self._bench.study, self._bench.network, settled.used
        each = RunnerUp(
            plan=plan,
            used_sites=tuple(
                (row.site, row.size) for row, moves in zip(study.options, used.options, strict=True) if moves
            ),
            used_suppliers=tuple(name for name, moves in zip(network.suppliers, used.suppliers, strict=True) if moves),
            extra=0.0,
            differs="",
        )
        before = self._found.get(each.used)
        if before is None or each.cost < before.cost:
            self._found[each.used] = each


def _option_loads(network: Network, decisions: Decisions, amounts: Amounts) -> Floats:
    """Return (O,) the load out of each open option; 0 where not open."""
    through = np.zeros(len(network.sites))
    np.add.at(through, network.outbound.origin, amounts.outbound * network.load[network.outbound.good])
    loads: Floats = np.where(decisions.option_open, through[network.option_site], 0.0)
    return loads


def _supplier_loads(network: Network, amounts: Amounts) -> Floats:
    """Return (K,) the load from each supplier."""
    loads = np.zeros(len(network.suppliers))
    np.add.at(loads, network.inbound.origin, amounts.inbound * network.load[network.inbound.good])
    np.add.at(loads, network.direct.origin, amounts.direct * network.load[network.direct.good])
    return loads


def _idle(network: Network, kind: str, at: int) -> Network:
    """Return the network in which nothing can move through one option or supplier."""
    if kind == "option":
        return replace(network, option_capacity=_zeroed(network.option_capacity, at))
    return replace(network, supplier_capacity=_zeroed(network.supplier_capacity, at))


def _zeroed(capacity: Floats, at: int) -> Floats:
    changed = capacity.copy()
    changed[at] = 0.0
    return changed


def _higher(one: float | None, other: float | None) -> float | None:
    return max((bound for bound in (one, other) if bound is not None), default=None)


class _Told:
    """Tells a listener how many answers there are and what no other can undercut."""

    def __init__(self, listener: Listener, resolver: Resolver, found: int) -> None:
        self._listener = listener
        self._resolver = resolver
        self._found = found

    def start(self, task: str) -> None:
        """Say nothing: the whole has started already."""

    def update(self, progress: Progress) -> None:
        """Pass the update on in the whole's seconds."""
        count = "1 answer" if self._found == 1 else f"{self._found} answers"
        phase = f"{count} found, searching the next"
        self._listener.update(replace(progress, elapsed_s=self._resolver.seconds, phase=phase))

    def end(self, progress: Progress) -> None:
        """Say nothing: the whole goes on."""
