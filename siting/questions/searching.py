"""
Find the best plan under one restriction: the work that is done many times over, here or in another process.

Everything that the restrictions of a study share is in a `Bench`, made once and sent to each process once. What comes
back is audited against the restricted study.
"""

from __future__ import annotations

import math
import time
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.errors import AuditError, EngineError
from siting.listener import Silent
from siting.network.decisions import NO_SOURCE, Decisions
from siting.plan.audit import audit
from siting.plan.draw_up import draw_up
from siting.plan.proof import PROVED_GAP, Outcome, Proof, gap_of
from siting.questions.allowed import allowed
from siting.questions.resolved import Resolved
from siting.questions.restriction import moving, obeys, parts_of, restrict, tightens
from siting.questions.starts import Hints, pinned_in, stand_ins
from siting.solving.flows import flows_for, price
from siting.solving.impossible import EXPLAIN_SECONDS, explain
from siting.solving.settle import settled_bound
from siting.solving.shortfall import least_unserved
from siting.solving.solve import REGISTRY, pick_engine
from siting.study.fingerprint import fingerprint

if TYPE_CHECKING:
    from siting.listener import Stop
    from siting.network.decisions import Amounts
    from siting.network.network import Network
    from siting.plan.plan import Plan, Reason, Today, Unserved
    from siting.questions.restriction import Restriction
    from siting.solving.bounding.again import Begun
    from siting.solving.engine import EngineResult
    from siting.study.settings import SolveSettings
    from siting.study.tables import Study


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Bench:
    """What every restriction of a study shares."""

    study: Study
    network: Network
    settings: SolveSettings
    """Time limit and engine; each ask names its own gap."""
    today: Today
    incumbent: Plan | None
    """A plan of the study to begin from."""
    floor: float | None
    """Money a year that no plan of the study can undercut."""
    begun: Begun | None = None
    """What searches of the engine `bounding` begin from, where they have something in common."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Ask:
    """One restriction to be resolved."""

    restriction: Restriction
    gap: float
    """Stop once within this fraction of the best."""
    explained: bool = False
    """Whether to find out why, where it is impossible."""

    @property
    def question(self) -> str:
        """The question an answer is kept under; a refusal that was explained is kept apart from one that was not."""
        return "best, explained" if self.explained else "best"


NO_HINTS = Hints()


def resolve_one(bench: Bench, ask: Ask, stop: Stop, hints: Hints = NO_HINTS) -> Resolved:
    """
    Return the best plan of a study under one restriction.

    Parameters
    ----------
    bench
        What every restriction of the study shares.
    ask
        The restriction, the gap, and whether to explain.
    stop
        Once requested, the best plan so far is returned.
    hints
        What other searches of the study have found.

    Returns
    -------
    resolved
        An audited plan with its proof, or why there is none.

    Raises
    ------
    EngineError
        If a solver gives up for a reason of its own.
    AuditError
        If the plan found fails its audit, or does not obey the restriction.
    """
    return _Search(bench, ask, stop, hints).resolve()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Found:
    """Decisions of the searched network with their cost, and a bound."""

    decisions: Decisions | None
    amounts: Amounts | None
    cost: float | None
    bound: float | None
    impossible: bool = False


NOTHING = _Found(decisions=None, amounts=None, cost=None, bound=None, impossible=True)


class _Search:
    """The search under one restriction."""

    def __init__(self, bench: Bench, ask: Ask, stop: Stop, hints: Hints) -> None:
        self._bench, self._ask, self._stop = bench, ask, stop
        tight = tightens(bench.study, ask.restriction)
        self._hints = hints if tight else replace(hints, without={})
        self._began = time.monotonic()
        self._settings = replace(bench.settings, gap=ask.gap)
        self._restricted = restrict(bench.study, bench.network, ask.restriction)
        self._floor = bench.floor if tight else None
        self._engine, self._reason = pick_engine(self._restricted.searched, self._settings)

    def resolve(self) -> Resolved:
        restriction, network = self._ask.restriction, self._restricted.searched
        found = self._best(network)
        if restriction.used and found.decisions is not None:
            found = self._in_use(network, found)
        if found.impossible:
            return self._impossible()
        if found.decisions is None or found.amounts is None:
            return Resolved(
                proof=self._proof(Outcome.NO_PLAN_YET, found.bound),
                plan=None,
                time_limit_s=self._settings.time_limit_s,
            )
        plan = self._plan(found.decisions, found.amounts, found.bound)
        return Resolved(proof=plan.proof, plan=plan, time_limit_s=self._settings.time_limit_s)

    def _best(self, network: Network) -> _Found:
        """Return the best decisions: without a search where nothing is left to decide, or the start is good enough."""
        start = self._start(network)
        if start is not None and self._good_enough(start):
            return replace(self._with_amounts(network, start), bound=self._floor)
        if self._decided(network):
            return NOTHING if start is None else replace(self._with_amounts(network, start), bound=start.cost)
        needed = self._needed(start)
        if needed:
            network = pinned_in(network, set(needed))
        result = self._search(network, None if start is None else start.decisions)
        if result.impossible and start is None:
            return NOTHING
        bound = None if result.bound is None else min(result.bound, *needed.values(), math.inf)
        found = start if result.decisions is None or _same(start, result) else self._priced(network, result.decisions)
        if found is None and result.decisions is not None:
            msg = f"the decisions of the engine `{self._engine}` cannot serve all demand. Try another engine."
            raise EngineError(msg)
        if found is None:
            return _Found(decisions=None, amounts=None, cost=None, bound=_highest(bound, self._floor))
        if start is not None and start.cost is not None and found.cost is not None and start.cost < found.cost:
            found = start
        return replace(self._with_amounts(network, found), bound=_highest(bound, self._floor))

    def _search(self, network: Network, start: Decisions | None) -> EngineResult:
        """Search with the engine, begun from what all searches share where there is such a thing."""
        settings, begun = replace(self._settings, time_limit_s=max(self._left(), 0.01)), self._bench.begun
        if begun is not None and start is not None and self._engine == "bounding" and begun.serves(network):
            from siting.solving.bounding.again import search_again  # noqa: PLC0415 - loads the compiled loops

            return search_again(network, settings, begun, start=start, stop=self._stop)
        return REGISTRY[self._engine](network, settings, listener=Silent(), stop=self._stop, start=start)

    def _needed(self, start: _Found | None) -> dict[str, float]:
        """Return what every plan cheaper than the start has, as other searches have proved, with their bounds."""
        if start is None or start.cost is None or start.decisions is None:
            return {}
        ceiling = start.cost - self._ask.gap * abs(start.cost)
        network = self._bench.network
        is_open = network.option_site[self._restricted.widen(start.decisions).option_open]
        names = {network.sites[at] for at in is_open.tolist()}
        names |= {network.suppliers[at] for at in np.flatnonzero(start.decisions.supplier_signed).tolist()}
        return self._hints.needed(names - self._ask.restriction.pinned, ceiling)

    def _in_use(self, network: Network, found: _Found) -> _Found:
        """
        Return the best decisions with which something can move through what has to be used.

        Where the best decisions allow it they are the answer: as little as one likes can be moved, so no plan in use
        is cheaper than them and one comes as near as one likes. Else the search is made with a least volume.
        """
        in_use = moving(network, self._ask.restriction.used)
        if found.decisions is None or flows_for(in_use, found.decisions) is not None:
            return found
        any_engine = replace(self._settings, engine="auto")  # the one named may not take least volumes
        self._engine, self._reason = pick_engine(in_use, any_engine)
        again = self._best(in_use)
        if again.decisions is None:
            return again
        amounts = flows_for(network, again.decisions)
        if amounts is None or again.cost is None:
            msg = "flows that exist with a least volume were not found without it. Try another engine."
            raise EngineError(msg)
        bound = None if again.bound is None else again.bound - PROVED_GAP * abs(again.cost)
        cost = price(network, again.decisions, amounts)
        return replace(again, amounts=amounts, cost=cost, bound=_highest(found.bound, bound))

    def _start(self, network: Network) -> _Found | None:
        """Return the cheapest plan at hand that keeps the restriction: the incumbent, one found, or with a stand-in."""
        incumbent, restriction = self._bench.incumbent, self._ask.restriction
        if restriction.held is not None:
            return self._begun(network, restriction.held)
        if incumbent is None:
            return None
        parts = frozenset(part for part in parts_of(incumbent) if part[0] not in restriction.out)
        there = {name for name, _ in parts}
        parts |= {part for name in restriction.pinned - there for part in self._cheapest_part(name)}
        fitting = self._hints.fitting(restriction)
        begun = [self._begun(network, at_hand) for at_hand in (parts, fitting) if at_hand is not None]
        best = min((found for found in begun if found is not None), key=_cost, default=None)
        if best is not None or not restriction.out or network.single_source.any():
            return best
        tried = stand_ins(self._bench.study, self._bench.network, incumbent, restriction.out)
        return next(
            (found for found in (self._begun(network, at_hand) for at_hand in tried) if found is not None), None
        )

    def _begun(self, network: Network, parts: frozenset[tuple[str, str]]) -> _Found | None:
        """Return the plan with these parts, where it is allowed and serves everything."""
        study, incumbent = self._bench.study, self._bench.incumbent
        decisions = self._restricted.narrow(decisions_of(study, self._bench.network, incumbent, parts))
        if not allowed(network, decisions):
            return None
        known = self._hints.cost_of(parts)
        ask = self._ask.restriction
        if known is None or ask.held is not None or ask.idle or ask.used or network.single_source.any():
            return self._priced(network, decisions)  # flows may differ from those of the plan that has these parts
        return _Found(decisions=decisions, amounts=None, cost=known, bound=self._floor)

    def _with_amounts(self, network: Network, found: _Found) -> _Found:
        """Return what was found with its flows, which are left open where another search has priced them."""
        if found.amounts is not None or found.decisions is None:
            return found
        priced = self._priced(network, found.decisions)
        if priced is None:
            msg = "a plan that another search has found cannot serve all demand. Try another engine."
            raise EngineError(msg)
        return replace(priced, bound=found.bound)

    def _cheapest_part(self, name: str) -> list[tuple[str, str]]:
        """Return the part of a site or supplier with the least charge."""
        places = np.flatnonzero(self._restricted.kept).tolist()
        options = [(self._bench.network.option_charge[at], self._bench.study.options[at]) for at in places]
        mine = [(float(charge), option.size) for charge, option in options if option.site == name]
        if mine:
            return [(name, min(mine)[1])]
        return [(name, "")] if name in self._bench.network.suppliers else []

    def _priced(self, network: Network, decisions: Decisions) -> _Found | None:
        amounts = flows_for(network, decisions)
        if amounts is None:
            return None
        return _Found(decisions=decisions, amounts=amounts, cost=price(network, decisions, amounts), bound=self._floor)

    def _good_enough(self, start: _Found) -> bool:
        gap = gap_of(start.cost, self._floor)
        return gap is not None and gap <= self._ask.gap

    def _decided(self, network: Network) -> bool:
        """Return whether every verdict is held and no customer is to choose its only source."""
        return self._ask.restriction.held is not None and not network.single_source.any()

    def _left(self) -> float:
        return self._settings.time_limit_s - (time.monotonic() - self._began)

    def _impossible(self) -> Resolved:
        """Return that there is no plan, with what cannot be served or the reasons where they are asked for."""
        unserved: tuple[Unserved, ...] = ()
        reasons: tuple[Reason, ...] = ()
        together = False
        study, network = self._restricted.study, self._restricted.network
        if self._ask.restriction.held is not None:
            seconds = max(self._left(), 1.0)
            unserved = least_unserved(self._restricted.searched, self._settings, seconds=seconds, stop=self._stop)
        if self._ask.explained and not unserved:
            seconds = min(EXPLAIN_SECONDS, self._settings.time_limit_s)
            reasons, together = explain(study, network, time_limit_s=seconds, stop=self._stop)
            reasons = self._without_own(reasons)
        return Resolved(
            proof=self._proof(Outcome.IMPOSSIBLE, None),
            plan=None,
            time_limit_s=self._settings.time_limit_s,
            reasons=reasons,
            together=together,
            unserved=unserved,
        )

    def _without_own(self, reasons: tuple[Reason, ...]) -> tuple[Reason, ...]:
        """Return the reasons but for the pins of the restriction itself, which are what was asked."""
        own = self._ask.restriction
        if own.held is not None:
            return tuple(reason for reason in reasons if reason.family != "rulings")
        pins = [f"{name} pinned-" for name in own.names]
        return tuple(
            reason
            for reason in reasons
            if reason.family != "rulings" or not any(pin in reason.sentence for pin in pins)
        )

    def _proof(self, outcome: Outcome, bound: float | None) -> Proof:
        return Proof(
            outcome=outcome,
            cost=None,
            bound=bound,
            gap_asked=self._ask.gap,
            seconds=time.monotonic() - self._began,
            engine=self._engine,
            reason=self._reason,
        )

    def _plan(self, decisions: Decisions, amounts: Amounts, bound: float | None) -> Plan:
        """Return the plan, audited against the restricted study and against the restriction."""
        study, network = self._restricted.study, self._restricted.network
        wide = self._restricted.widen(decisions)
        plan = draw_up(
            study,
            network,
            wide,
            amounts,
            bound=settled_bound(bound, price(network, wide, amounts)),
            gap_asked=self._ask.gap,
            seconds=time.monotonic() - self._began,
            engine=self._engine,
            reason=self._reason,
            today=_today_of(self._bench.today, fingerprint(study)),
        )
        faults = (*audit(study, plan).faults, *obeys(plan, self._ask.restriction))
        if faults:
            msg = "the plan found failed its audit and is not shown: " + "; ".join(faults)
            raise AuditError(msg)
        return plan


def _same(start: _Found | None, result: EngineResult) -> bool:
    """Return whether an engine decided what it began from; sources of single-sourced customers count too."""
    if start is None or start.decisions is None or result.decisions is None:
        return False
    one, other = start.decisions, result.decisions
    return (
        np.array_equal(one.option_open, other.option_open)
        and np.array_equal(one.supplier_signed, other.supplier_signed)
        and np.array_equal(one.source, other.source)
    )


def _cost(found: _Found) -> float:
    return math.inf if found.cost is None else found.cost


def _highest(one: float | None, other: float | None) -> float | None:
    known = [bound for bound in (one, other) if bound is not None]
    return max(known, default=None)


def _today_of(today: Today, mark: str) -> Today:
    """Return today as the restricted study has it: rulings and counts do not touch it, so only the mark differs."""
    return today if today.plan is None else replace(today, plan=replace(today.plan, fingerprint=mark))


def decisions_of(study: Study, network: Network, plan: Plan | None, parts: frozenset[tuple[str, str]]) -> Decisions:
    """
    Return the decisions that open and sign the parts, single-sourced customers served as in a plan.

    Parameters
    ----------
    study, network
        What the plan is of.
    plan
        Where single-sourced customers take from; None leaves them without a source.
    parts
        (site, size) open and (supplier, "") signed.

    Returns
    -------
    decisions
        Of the network; a single-sourced customer whose origin is not among the parts has none.
    """
    names = {name for name, _ in parts}
    place = {name: at for at, name in enumerate((*network.sites, *network.suppliers)) if name in names}
    source = np.full(len(network.customers), NO_SOURCE, dtype=np.int32)
    for at, line in enumerate(plan.customers if plan else ()):
        if network.single_source[at] and line.origins:
            source[at] = place.get(line.origins[0], NO_SOURCE)
    return Decisions(
        option_open=np.fromiter(((row.site, row.size) in parts for row in study.options), dtype=np.bool_),
        supplier_signed=np.fromiter(((name, "") in parts for name in network.suppliers), dtype=np.bool_),
        source=source,
    )
