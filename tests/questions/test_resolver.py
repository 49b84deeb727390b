"""The shared machinery: stopping, processes, what is kept, and what a restriction does to a study."""

from __future__ import annotations

import multiprocessing
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest

from siting.errors import PlanFileError, SettingsError
from siting.listener import Stop
from siting.network.network import build_network
from siting.plan.codec import decode, encode
from siting.plan.proof import Outcome
from siting.questions import pool, resolver
from siting.questions.closing import closing
from siting.questions.headroom import headroom
from siting.questions.headroom_result import Room
from siting.questions.resolved import Resolved
from siting.questions.resolver import Resolver
from siting.questions.restriction import Restriction, obeys, parts_of, restrict, restricted_study, tightens
from siting.questions.searching import Ask
from siting.questions.store import Key, MemoryStore
from siting.solving.solve import solve
from siting.study.settings import SolveSettings
from siting.study.tables import SiteRuling
from tests.published import instances
from tests.questions.asked import EXACT, CountingStore, dearer, held_in, held_out

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from siting.listener import Progress
    from siting.questions.searching import Bench


class Watcher:
    """A listener that remembers what it hears and may act on it."""

    def __init__(self, act: Callable[[Progress], None] = lambda _: None) -> None:
        self.heard: list[str] = []
        self._act = act

    def start(self, task: str) -> None:
        """Remember the task."""
        self.heard.append(task)

    def update(self, progress: Progress) -> None:
        """Remember the phase and act."""
        self.heard.append(progress.phase)
        self._act(progress)

    def end(self, progress: Progress) -> None:
        """Remember how it ended."""
        self.heard.append(progress.phase)


def outs() -> list[Ask]:
    """Return the searches without each site of the distribution centres."""
    study = instances.distribution_centres()
    return [Ask(restriction=Restriction(out=frozenset({row.site})), gap=1e-6) for row in study.sites]


def test_stop_keeps_what_is_done() -> None:
    """A stop after the third of eight searches: three answers are there, the others read as not asked."""
    study, stop = instances.farms_as_suppliers(), Stop()

    def act(progress: Progress) -> None:
        if progress.phase.startswith("3 of"):
            stop.request()

    watcher = Watcher(act)
    test = closing(study, settings=EXACT, listener=watcher, stop=stop)
    answers = [found for line in test.lines for found in (line.reroute, line.replan) if found is not None]
    assert len(test.lines) == 4
    assert len(answers) == 3
    assert not test.complete
    assert watcher.heard[0] == "closing test of farms"
    assert watcher.heard[-1] == "stopped"


def test_headroom_stopped_says_what_is_not_known() -> None:
    """A stop before the first search leaves every line as not known yet, and none is called exact."""
    study, stop = instances.distribution_centres(), Stop()
    answer = solve(study, EXACT)
    stop.request()
    found = headroom(study, answer, settings=EXACT, stop=stop)
    assert not found.complete
    assert {line.room for line in found.lines} == {Room.UNKNOWN}
    assert not any(line.exact for line in found.lines)


def test_progress_tells_how_many_are_done_and_the_time_left() -> None:
    """Each search done is counted, and once some are, the time the rest may take is told."""
    watcher = Watcher()
    closing(instances.distribution_centres(), settings=EXACT, listener=watcher)
    counted = [phase for phase in watcher.heard if "searches done" in phase]
    assert counted[0].startswith("1 of 4 searches done, about ")
    assert counted[-1] == "4 of 4 searches done"


@pytest.fixture
def at_once(monkeypatch: pytest.MonkeyPatch) -> Iterator[None]:
    """Use processes for every search, and look that none is left behind."""
    monkeypatch.setattr(resolver, "POOL_START_S", 0.0)
    monkeypatch.setattr(resolver, "cores", lambda: 2)
    yield
    assert multiprocessing.active_children() == []


@pytest.mark.usefixtures("at_once")
def test_processes_find_what_one_finds() -> None:
    """Resolved in two processes, a closing test is what it is in one."""
    study = instances.distribution_centres()
    watcher = Watcher()
    found = closing(study, settings=EXACT, listener=watcher)
    assert any("2 at a time" in phase for phase in watcher.heard)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(resolver, "POOL_START_S", float("inf"))
        alone = closing(study, settings=EXACT)
    assert [line.name for line in found.lines] == [line.name for line in alone.lines]
    for there, here in zip(found.lines, alone.lines, strict=True):
        assert there.replan is not None
        assert here.replan is not None
        assert there.replan.cost == here.replan.cost


@pytest.mark.usefixtures("at_once")
def test_processes_stop_when_asked() -> None:
    """A stop while processes run ends the question: what was not begun is left out, nothing cut short is kept."""
    stop, store = Stop(), CountingStore()
    watcher = Watcher(lambda progress: stop.request() if "at a time" in progress.phase else None)
    test = closing(instances.farms_as_suppliers(), settings=EXACT, store=store, listener=watcher, stop=stop)
    assert watcher.heard[-1] == "stopped"
    assert len(test.lines) == 4
    assert not test.complete
    assert len(store.keys) < 1 + 2 * len(test.lines)


@pytest.mark.usefixtures("at_once")
def test_what_processes_leave_undone_when_they_die_is_done_here(monkeypatch: pytest.MonkeyPatch) -> None:
    """Processes that end by themselves (out of memory, say) cost time, not answers."""
    monkeypatch.setattr(pool, "_begin", _end_at_once)
    found = dict(Resolver(instances.distribution_centres(), settings=EXACT).resolve(outs()))
    assert set(found) == set(outs())
    assert all(resolved.within for resolved in found.values())


def _end_at_once(_bench: Bench, _event: object) -> None:
    raise SystemExit


def test_an_answer_of_another_study_is_refused() -> None:
    """A plan whose fingerprint is not the study's is never compared with it."""
    study = instances.distribution_centres()
    answer = solve(dearer(study, "Denver", 1.0), EXACT)
    with pytest.raises(PlanFileError, match=r"the plan is of another study, or of this one before it was changed"):
        closing(study, answer, settings=EXACT)


def test_names_have_to_be_there() -> None:
    """An unknown name and one that the plan leaves alone are refused with what to choose from."""
    study = instances.distribution_centres()
    with pytest.raises(SettingsError, match=r"no site 'Graz'; choose one of Detroit, Toledo, Denver"):
        closing(study, sites=["Graz"], settings=EXACT)
    with pytest.raises(SettingsError, match=r"Denver is not in the plan \(verdict: leave\).*Kansas City, St. Louis\."):
        closing(study, sites=["Denver"], settings=EXACT)
    with pytest.raises(SettingsError, match=r"no supplier 'farm'; it has no supplier at all"):
        headroom(study, suppliers=["farm"], settings=EXACT)
    with pytest.raises(SettingsError, match=r"no site or supplier Graz"):
        restricted_study(study, Restriction(out=frozenset({"Graz"})))


def test_an_impossible_study_has_nothing_to_test() -> None:
    """Where there is no plan, both questions say why instead of listing lines."""
    study = instances.distribution_centres()
    study = replace(study, settings=replace(study.settings, most_sites=0))
    for found in (closing(study, settings=EXACT), headroom(study, settings=EXACT)):
        assert found.outcome is Outcome.IMPOSSIBLE
        assert found.lines == ()
        assert found.why_none[0].startswith("Impossible: most_sites is 0")


def test_a_kept_answer_survives_json() -> None:
    """What a store keeps is the same after it was written and read."""
    study = instances.distribution_centres()
    for ask, resolved in Resolver(study, settings=EXACT).resolve(outs()):
        assert decode(Resolved, encode(resolved), ask.restriction.text) == resolved


def test_a_store_serves_what_was_asked_for_no_wider() -> None:
    """An answer asked for at 1e-4 serves 1e-4 and wider; a narrower question only if its proof is as narrow."""
    study, store = instances.distribution_centres(), MemoryStore()
    resolved = Resolver(study, settings=EXACT).plan()
    wide = replace(resolved, proof=replace(resolved.proof, bound=(resolved.cost or 0.0) * (1 - 5e-5)))
    key = Key(fingerprint="f", question="best", parameters="", gap=1e-4)
    store.put(key, wide)
    assert store.get(key) == wide
    assert store.get(replace(key, gap=1e-3)) == wide
    assert store.get(replace(key, gap=5.1e-5)) == wide
    assert store.get(replace(key, gap=4.9e-5)) is None
    assert store.get(replace(key, fingerprint="g")) is None
    assert store.get(replace(key, parameters="x")) is None
    store.put(replace(key, gap=1e-6), resolved)
    assert store.get(key) == resolved
    assert len(store) == 2


def test_what_was_cut_short_is_searched_again_with_more_time() -> None:
    """An answer stopped by a time limit is found again under the same limit, and bettered under a longer one."""
    study, store = instances.distribution_centres(), CountingStore()
    first = Resolver(study, settings=EXACT, store=store)
    ask = outs()[0]
    (_, found), *_ = first.resolve([ask])
    short = replace(found, proof=replace(found.proof, outcome=Outcome.STOPPED, bound=0.0), time_limit_s=1.0)
    store.put(Key(fingerprint=first.mark, question="best", parameters=ask.restriction.text, gap=ask.gap), short)
    (_, again), *_ = Resolver(study, settings=replace(EXACT, time_limit_s=1.0), store=store).resolve([ask])
    assert again == short
    (_, better), *_ = Resolver(study, settings=replace(EXACT, time_limit_s=2.0), store=store).resolve([ask])
    assert better.proof.outcome is Outcome.PROVED


def test_restrictions_say_what_they_hold() -> None:
    """Rulings, counts, sizes and idle parts of a restriction are in the study and network it makes."""
    study = instances.distribution_centres()
    network = build_network(study)
    restriction = Restriction(
        out=frozenset({"Toledo"}), taken=frozenset({"Denver"}), idle=frozenset({("Detroit", "")}), sites_exactly=3
    )
    made = restrict(study, network, restriction)
    rulings = {row.site: row.ruling for row in made.study.sites}
    assert rulings["Toledo"] is SiteRuling.PINNED_SHUT
    assert rulings["Denver"] is SiteRuling.PINNED_OPEN
    assert (made.study.settings.fewest_sites, made.study.settings.most_sites) == (3, 3)
    assert made.searched.option_capacity[study.sites.index(study.sites[0])] == 0.0
    assert made.network.option_capacity[0] == network.option_capacity[0]
    assert np.array_equal(made.network.site_pinned_open, [row.site == "Denver" for row in study.sites])
    assert Restriction().text == ""
    assert restriction.text == replace(restriction, out=frozenset(["Toledo"])).text


def test_idle_and_held_parts_are_checked_in_the_plan() -> None:
    """A plan that moves load through an idle part, or opens what was not held, is told on."""
    plan = Resolver(instances.distribution_centres(), settings=EXACT).plan().plan
    assert plan is not None
    assert obeys(plan, Restriction(held=parts_of(plan))) == ()
    assert obeys(plan, Restriction(idle=frozenset({("Kansas City", "")}))) == (
        "Kansas City moves 40, which was ruled out",
    )
    assert obeys(plan, Restriction(without=frozenset({("Kansas City", "")}))) == (
        "Kansas City is open, which was ruled out",
    )
    assert "verdicts that were held differ" in obeys(plan, Restriction(held=frozenset()))[0]


def test_a_bound_is_shared_only_where_nothing_is_lifted() -> None:
    """Holding out what is pinned open lifts its ruling, so the study's bound does not hold any more."""
    study = instances.distribution_centres()
    out, taken = Restriction(out=frozenset({"Denver"})), Restriction(used=frozenset({"Denver"}))
    assert tightens(study, out)
    assert tightens(held_out(study, "Denver"), out)
    assert not tightens(held_in(study, "Denver"), out)
    assert tightens(held_in(study, "Denver"), taken)
    assert not tightens(held_out(study, "Denver"), taken)
    counted = replace(study, settings=replace(study.settings, fewest_sites=2, most_sites=4))
    assert [tightens(counted, Restriction(sites_exactly=n)) for n in (1, 2, 4, 5)] == [False, True, True, False]


def test_a_size_may_be_ruled_out_and_a_part_left_idle() -> None:
    """Without its large size a plant opens small; an idle plant moves nothing though it may stay open."""
    study = instances.regional_plants()
    settings = SolveSettings(gap=1e-6)
    resolver_of = Resolver(study, settings=settings)
    plan = resolver_of.plan().plan
    assert plan is not None
    part = next(part for part in sorted(parts_of(plan)) if part[1] == "large")
    asks = [
        Ask(restriction=Restriction(without=frozenset({part})), gap=1e-6),
        Ask(restriction=Restriction(idle=frozenset({part}), taken=frozenset({part[0]})), gap=1e-6),
    ]
    for _, resolved in resolver_of.resolve(asks):
        assert resolved.plan is not None
        assert resolved.cost is not None
        assert resolved.cost > plan.cost
