"""
The machinery that the questions share: a study's plan, and the best plan under each of many restrictions.

One network, one incumbent and one bound serve them all. What the store holds is not computed again; small studies are
resolved in this process, larger ones on all cores; Stop keeps what is done.
"""

from __future__ import annotations

import math
import time
from dataclasses import replace
from typing import TYPE_CHECKING

from siting.errors import PlanFileError
from siting.listener import Progress, Silent, Stop
from siting.network.network import build_network
from siting.questions.pool import cores, in_processes
from siting.questions.resolved import Resolved
from siting.questions.restriction import Restriction, parts_of
from siting.questions.searching import Ask, Bench, decisions_of, resolve_one
from siting.questions.starts import Hints, regret
from siting.questions.store import Key, MemoryStore
from siting.solving.solve import pick_engine, solve
from siting.study.fingerprint import fingerprint

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from siting.listener import Listener
    from siting.network.network import Network
    from siting.plan.plan import Answer, Plan
    from siting.questions.store import Store
    from siting.solving.bounding.again import Begun
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study

PLAN_SHARE = 1 / 6
"""Share of the plan's time that a search is expected to take at first; most begin near their end."""

POOL_START_S = 3.0
"""Seconds of work from which processes are worth starting: each takes about one to be there."""


class Resolver:
    """
    Resolves restrictions of one study.

    Parameters
    ----------
    study
        The study asked about.
    answer
        Its plan, where there is one already.
    settings
        Gap, time limit (of each search) and engine; the study's own where None.
    store
        Where answers are kept; in memory where None.
    listener
        Told what is being done and how long it may still take.
    stop
        Once requested, what is done is kept and nothing more begins.

    Raises
    ------
    PlanFileError
        If the answer is of another study.
    """

    def __init__(  # noqa: PLR0913 - what a question is asked with, each by name
        self,
        study: Study,
        *,
        answer: Answer | None = None,
        settings: SolveSettings | None = None,
        store: Store | None = None,
        listener: Listener | None = None,
        stop: Stop | None = None,
    ) -> None:
        self.study = study
        self.settings = settings or study.settings.solve
        self.mark = fingerprint(study)
        self.stop = stop or Stop()
        self.searches = 0
        """How many restrictions were resolved and not found in the store."""
        self._store = MemoryStore() if store is None else store
        self._listener = listener or Silent()
        self._began = time.monotonic()
        self._given = answer
        self._bench: Bench | None = None
        self._without: dict[str, float] = {}
        self._plans: list[tuple[float, frozenset[tuple[str, str]]]] = []
        self._refuse_another()

    def start(self, task: str) -> None:
        """Tell the listener what begins."""
        self._began = time.monotonic()
        self._listener.start(task)

    def end(self, phase: str) -> None:
        """Tell the listener that it ended, and how."""
        self._listener.end(Progress(elapsed_s=self.seconds, phase=phase))

    @property
    def seconds(self) -> float:
        """Seconds since the start."""
        return time.monotonic() - self._began

    def plan(self) -> Resolved:
        """
        Return the study's own plan: the one given, the one kept, or a new one.

        Returns
        -------
        resolved
            With its proof; why there is none where it is impossible.

        Raises
        ------
        EngineError, AuditError
            As `solve` raises them.
        """
        key = self._key(Restriction(), "best", self.settings.gap)
        if self._given is not None:
            given = self._given.proof
            self._store.put(replace(key, gap=given.gap_asked), _kept(self._given, self.settings))
        kept = self._found(key)
        if kept is not None:
            return kept
        self.searches += 1
        rough = self._store.get(replace(key, gap=1.0))
        heard = _Part(self._listener, self.seconds)
        if rough is not None and rough.plan is not None:
            heard.start("proving the plan closer")
            ask = Ask(restriction=Restriction(), gap=self.settings.gap)
            resolved = resolve_one(self._bench_of(rough), ask, self.stop)
        else:
            resolved = _kept(solve(self.study, self.settings, listener=heard, stop=self.stop), self.settings)
        self._keep(key, resolved)
        return resolved

    def resolve(self, asks: Sequence[Ask]) -> Iterator[tuple[Ask, Resolved]]:
        """
        Yield each restriction with its answer as it comes: those kept first, then the others in any order.

        Parameters
        ----------
        asks
            What to resolve; what is asked twice is answered once.

        Yields
        ------
        ask, resolved
            Once stopped, those that were not begun are left out, and those under way may be without a proof.

        Raises
        ------
        EngineError, AuditError
            If a solver gives up, or a plan fails its audit.
        """
        todo: list[Ask] = []
        for ask in dict.fromkeys(asks):
            kept = self._found(self._key(ask.restriction, ask.question, ask.gap))
            if kept is None:
                todo.append(ask)
            else:
                self._learn(ask, kept)
                yield ask, kept
        for ask, resolved in self._answers(self._in_order(todo)):
            self.searches += 1
            self._learn(ask, resolved)
            self._keep(self._key(ask.restriction, ask.question, ask.gap), resolved)
            yield ask, resolved

    def _in_order(self, asks: list[Ask]) -> list[Ask]:
        """Return the asks: held verdicts first, then what is dearest to do without, which narrows the rest."""
        if len(asks) <= 1:
            return asks
        network, plan = self.bench().network, self.plan().plan
        there = {name for name, _ in parts_of(plan)} if plan else set()

        def place(ask: Ask) -> tuple[int, float]:
            out = ask.restriction.out & there
            if ask.restriction.held is not None:
                return 0, 0.0
            if plan is None or len(out) != 1:
                return 2, 0.0
            return 1, -regret(network, plan, *out)

        return sorted(asks, key=place)

    def _learn(self, ask: Ask, resolved: Resolved) -> None:
        """Take from an answer what may help the searches after it."""
        out, cost, bound = ask.restriction.out, resolved.cost, resolved.bound
        if len(out) == 1 and ask.restriction == Restriction(out=out):
            proved = math.inf if resolved.impossible else bound
            if proved is not None:
                self._without |= dict.fromkeys(out, proved)
        if resolved.plan is not None and cost is not None:
            self._plans.append((cost, parts_of(resolved.plan)))

    def _hints(self) -> Hints:
        return Hints(without=dict(self._without), plans=tuple(sorted(self._plans, key=lambda plan: plan[0])))

    def bench(self) -> Bench:
        """Return what all restrictions of the study share, its plan as the incumbent."""
        if self._bench is None:
            self._bench = self._bench_of(self.plan())
        return self._bench

    def _bench_of(self, resolved: Resolved) -> Bench:
        plan = resolved.plan
        if plan is None or plan.today is None:
            msg = "a question needs the plan of the study, and there is none to begin from. Plan the study first."
            raise PlanFileError(msg)
        network = build_network(self.study)
        return Bench(
            study=self.study,
            network=network,
            settings=self.settings,
            today=plan.today,
            incumbent=plan,
            floor=resolved.bound,
            begun=self._begun(network, plan),
        )

    def _begun(self, network: Network, plan: Plan) -> Begun | None:
        """Return what the searches begin from where the engine can share it."""
        if pick_engine(network, self.settings)[0] != "bounding":
            return None
        from siting.solving.bounding.again import begin  # noqa: PLC0415 - loads the compiled loops

        return begin(network, decisions_of(self.study, network, plan, parts_of(plan)))

    def _answers(self, todo: list[Ask]) -> Iterator[tuple[Ask, Resolved]]:
        """Resolve here while that is quick, on all cores once it is not."""
        if not todo:
            return
        bench, left, began = self.bench(), list(todo), time.monotonic()
        expected = bench.incumbent.proof.seconds * PLAN_SHARE if bench.incumbent else 0.0
        workers = min(cores(), len(left))
        while left and not self.stop.requested:
            if workers > 1 and len(left) > 1 and expected * len(left) > POOL_START_S:
                break
            ask = left.pop(0)
            yield ask, resolve_one(bench, ask, self.stop, self._hints())
            done = len(todo) - len(left)
            expected = (time.monotonic() - began) / done
            self._report(len(todo), done, began, 1)
        if left and not self.stop.requested:
            yield from self._on_all_cores(bench, left, len(todo), workers)

    def _on_all_cores(self, bench: Bench, left: list[Ask], total: int, workers: int) -> Iterator[tuple[Ask, Resolved]]:
        before, began, done = total - len(left), time.monotonic(), 0

        def tick() -> None:
            self._report(total, before + done, began, workers, here=done)

        for ask, resolved in in_processes(bench, left, self._hints, workers=workers, stop=self.stop, tick=tick):
            done += 1
            yield ask, resolved

    def _report(self, total: int, done: int, began: float, workers: int, *, here: int | None = None) -> None:
        """Tell how many are done and, once some are, how long the rest may take."""
        finished = done if here is None else here
        left = total - done
        phase = f"{done} of {total} searches done"
        if finished and left:
            seconds = (time.monotonic() - began) / finished * left
            phase += f", about {seconds:,.0f} s left"
        if workers > 1:
            phase += f", {workers} at a time"
        self._listener.update(Progress(elapsed_s=self.seconds, phase=phase))

    def _key(self, restriction: Restriction, question: str, gap: float) -> Key:
        return Key(fingerprint=self.mark, question=question, parameters=restriction.text, gap=gap)

    def _found(self, key: Key) -> Resolved | None:
        """Return what the store holds, unless its search was cut short and more time is allowed now."""
        kept = self._store.get(key)
        if kept is None or kept.within or kept.time_limit_s >= self.settings.time_limit_s:
            return kept
        return None

    def _keep(self, key: Key, resolved: Resolved) -> None:
        """Keep an answer; one that was cut short by a stop is not, since it can be had better."""
        if resolved.within or not self.stop.requested:
            self._store.put(key, resolved)

    def _refuse_another(self) -> None:
        plan = self._given.plan if self._given else None
        if plan is not None and plan.fingerprint != self.mark:
            msg = "the plan is of another study, or of this one before it was changed. Plan the study again."
            raise PlanFileError(msg)


def _kept(answer: Answer, settings: SolveSettings) -> Resolved:
    """Return a study's answer as it is kept."""
    return Resolved(
        proof=answer.proof,
        plan=answer.plan,
        time_limit_s=settings.time_limit_s,
        reasons=answer.reasons,
        together=answer.together,
    )


class _Part:
    """A listener for a part that began `by` seconds after the whole."""

    def __init__(self, listener: Listener, by: float) -> None:
        self._listener = listener
        self._by = by

    def start(self, task: str) -> None:
        """Say what the whole does first."""
        self._listener.update(Progress(elapsed_s=self._by, phase=task))

    def update(self, progress: Progress) -> None:
        """Pass the update on in the whole's seconds."""
        self._listener.update(replace(progress, elapsed_s=progress.elapsed_s + self._by))

    def end(self, progress: Progress) -> None:
        """Pass the last state on; the whole goes on."""
        self.update(progress)
