"""
A start for large studies of one echelon: the search over sites alone, with every other requirement left out.

What is left out can only make a plan cheaper, so the bound of `run` holds. Its multipliers v (money per load of each
demand) price the sites; the *site program* then chooses sites in whole numbers,

    v x demand + least sum over options of (charge + best continuous knapsack of (cost - v) x load) x open,

over the rows that speak of sites alone (sizes, counts, rules, budget) and over what every plan must satisfy: room for
all demand, and no more least throughput than there is demand. A service share is relaxed with one multiplier more: a
fine on what moves too far, less the most that a plan which meets the share can pay of it. This bounds the whole model
from below, and its sites are good ones to begin with.

References
----------
Geoffrion (1974), Mathematical Programming Study 2: 82-114; Cornuejols, Sridharan & Thizy (1991), European Journal of
Operational Research 50(3): 280-297.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import highspy
import numpy as np

from siting.listener import Stop
from siting.solving.bounding.matrix import Gathering
from siting.solving.bounding.whole_start import cheapest
from siting.solving.highs import TOLERANCE, QuietHighs, has_solution, is_impossible
from siting.solving.tightest import is_near

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from numpy.typing import NDArray

    from siting.arrays import Floats
    from siting.listener import Listener
    from siting.network.network import Network
    from siting.solving.bounding.matrix import Rows
    from siting.solving.bounding.run import Root, Run
    from siting.solving.bounding.whole_problem import WholeProblem
    from siting.study.settings import SolveSettings

LARGE = 20_000
"""Outbound lanes from which on the start pays; below, the search over lanes is as fast without."""

ROOM = (1.0, 1.01, 1.03, 1.06, 1.1, 1.2, 1.4, 1.8, 2.5)
"""Times the demand that the sites must hold, one after the other, until a set of sites can serve everything."""

NEAREST = 12
"""Lanes of each demand to begin with, from the sites that the relaxation uses."""

USED = 1e-3
"""How far the averaged solution must open an option for its lanes to count as promising."""

TRIALS = 1000
"""Moves from each set of sites tried at most."""

FINES = 6
"""Fines on what moves too far tried at most, where a service share is asked."""

MARGIN = 1e-9
"""Relative margin by which rows about all demand are eased, so that rounding makes nothing impossible."""

NODES = 500
"""Nodes of the site program at most: its bound is valid at any of them."""

ROUNDING = 1e-10
"""Relative margin taken off a bound that is a sum of many prices."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Core:
    """What the search over sites alone gives."""

    bound: float
    """In the problem's money, its constant included; what no plan can undercut."""
    sets: Iterator[Floats]
    """(options,) sets of open options that keep the rows about sites, most promising first, each found when asked for;
    they may not serve all demand."""
    lanes: NDArray[np.intp]
    """Columns of lanes to begin with."""
    run: Run
    """Of the greatest bound, to go on from."""
    root: Root
    """Where that run began."""
    allows: Callable[[Floats], bool]
    """Says whether a set of open options (options,) keeps the rows about sites and can meet the service share."""
    forgiven: float
    """Money a year to take off the bounds of `run`."""

    def deepen(self, problem: WholeProblem) -> tuple[float, Floats | None]:
        """Go on with the search over sites alone; return what no plan can undercut, and its best set if allowed."""
        bound = self.safe(problem, self.run.deepen())
        opened = _opened(problem, self.root.open_options)
        return bound, opened if self.allows(opened) else None

    def safe(self, problem: WholeProblem, bound: float) -> float:
        """Return a bound of `run` as one of the problem, in its money."""
        return (bound - self.forgiven - ROUNDING * (abs(bound) + self.forgiven)) / problem.money


class Until(Stop):
    """A request to stop that also stands once something is so."""

    def __init__(self, stop: Stop, done: Callable[[], bool]) -> None:
        super().__init__()
        self._stop = stop
        self._done = done

    @property
    def requested(self) -> bool:
        """True once somebody asked, or it is so."""
        return self._stop.requested or self._done()


def begins_with_core(problem: WholeProblem) -> bool:
    """Return whether a problem is one that `core_of` takes, and large enough for it to pay."""
    network = problem.network
    needed = network.demand.sum(axis=0) > 0
    return not network.suppliers and len(network.outbound) >= LARGE and bool((network.load[needed] > 0).all())


def core_of(
    problem: WholeProblem, settings: SolveSettings, listener: Listener, stop: Stop, halt: Callable[[], bool]
) -> Core | None:
    """
    Search over the sites alone.

    Parameters
    ----------
    problem
        One that `begins_with_core` takes.
    settings
        Gap, and the time that is left.
    listener, stop
        Of the runs over sites alone; their costs are none of the problem's.
    halt
        Says when to give up.

    Returns
    -------
    core
        None where the relaxation did not come to a bound; its bound is infinite where the sites alone make every plan
        impossible.
    """
    from siting.solving.bounding.run import Run  # noqa: PLC0415 - loads the compiled loops

    bound = deepest = -math.inf
    best: tuple[Run, Root, SiteProgram, float] | None = None
    sets: list[Iterator[Floats]] = []
    lanes: list[NDArray[np.intp]] = []
    fines = Fines(problem.network)
    while (fine := fines.next()) is not None and not halt():
        run = Run(fines.fined(fine), settings, listener, stop)
        root = run.root()
        if root is None:
            break
        program = SiteProgram(problem, root, fines.forgiven(fine), halt)
        bound = max(bound, program.bound)
        fines.learn(fine, met=fines.is_met(_opened(problem, root.open_options)))
        first, proved = program.solve(ROOM[0])
        bound = max(bound, proved)
        if program.bound > deepest:
            deepest, best = program.bound, (run, root, program, fines.forgiven(fine))
        sets.insert(0, filter(fines.is_met, _sets(problem, root, program, first, halt)))
        lanes.append(_lanes(problem, root))
    if best is None:
        return None
    run, root, program, forgiven = best
    return Core(
        bound=bound,
        sets=_different(itertools.chain.from_iterable(sets)),
        lanes=np.unique(np.concatenate(lanes)),
        run=run,
        root=root,
        allows=lambda opened: program.allows(opened) and fines.is_met(opened),
        forgiven=forgiven,
    )


def _different(sets: Iterator[Floats]) -> Iterator[Floats]:
    """Yield each set once."""
    seen: set[bytes] = set()
    for opened in sets:
        if opened.tobytes() not in seen:
            seen.add(opened.tobytes())
            yield opened


def _opened(problem: WholeProblem, options: NDArray[np.int32]) -> Floats:
    opened = np.zeros(problem.places.option.size)
    opened[options] = 1.0
    return opened


def _sets(
    problem: WholeProblem, root: Root, program: SiteProgram, first: Floats | None, halt: Callable[[], bool]
) -> Iterator[Floats]:
    """Yield sets of options that keep the rows of sites: the best plan's, then those of the program, moved and not."""
    network = problem.network
    stays = np.isin(network.option_site[root.problem.option], _ruled(network))
    stays = stays[root.problem.site_option[:-1]]
    known = _opened(problem, root.open_options)
    if root.open_options.size and program.allows(known):
        yield known
    for room in ROOM:
        if halt():
            return
        opened = first if room == ROOM[0] else program.solve(room)[0]
        if opened is None:
            return
        cost, options = root.descend(np.flatnonzero(opened).astype(np.int32), stays, trials=TRIALS)
        better = _opened(problem, options)
        if math.isfinite(cost) and program.allows(better):
            yield better
        yield opened


def _ruled(network: Network) -> list[int]:
    """Return the sites that a rule is about."""
    return [place for rule in network.rules for kind, place in rule.members if kind == "site"]


class Fines:
    """Fines on what moves beyond the service distance, money a tonne: doubled until the share is met, then less."""

    def __init__(self, network: Network) -> None:
        lanes = network.outbound
        self._network = network
        self._tonnes = network.weight_t[lanes.good]
        self._weight = network.demand @ network.weight_t
        self._asks = network.service_share > 0 and float(self._tonnes.sum()) > 0
        self._far = ~is_near(network, lanes) if self._asks else np.zeros(len(lanes), dtype=np.bool_)
        self._short, self._enough = 0.0, math.inf
        self._turns = 0

    def next(self) -> float | None:
        """Return the fine to try next, None after the last."""
        self._turns += 1
        if not self._asks:
            return 0.0 if self._turns == 1 else None
        if self._turns > FINES:
            return None
        if math.isfinite(self._enough):
            return (self._short + self._enough) / 2
        if self._short > 0:
            return 2 * self._short
        tonnes = float(self._tonnes.sum())
        return float(self._network.outbound.cost.sum()) / tonnes

    def learn(self, fine: float, *, met: bool) -> None:
        """Remember whether the share was met at a fine."""
        if met:
            self._enough = min(self._enough, fine)
        else:
            self._short = max(self._short, fine)

    def fined(self, fine: float) -> Network:
        """Return the network with the fine on every far lane."""
        if fine == 0:
            return self._network
        lanes = self._network.outbound
        return replace(self._network, outbound=replace(lanes, cost=lanes.cost + fine * self._tonnes * self._far))

    def forgiven(self, fine: float) -> float:
        """Return the greatest fine that a plan which meets the share pays, money a year."""
        return fine * (1 - self._network.service_share) * float(self._weight.sum()) if fine else 0.0

    def is_met(self, opened: Floats) -> bool:
        """Return whether open options are near enough to as many customers as the share asks, capacity apart."""
        if not self._asks:
            return True
        lanes, network = self._network.outbound, self._network
        is_open = np.zeros(len(network.sites), dtype=np.bool_)
        is_open[network.option_site[opened > 0]] = True
        near = np.zeros(network.demand.shape, dtype=np.bool_)
        reached = is_open[lanes.origin] & ~self._far
        near[lanes.destination[reached], lanes.good[reached]] = True
        covered = float(((network.demand * near) @ network.weight_t).sum())
        return covered >= network.service_share * float(self._weight.sum()) * (1 - MARGIN)


def _lanes(problem: WholeProblem, root: Root) -> NDArray[np.intp]:
    """Return the cheapest lanes of each demand from sites that the relaxation uses."""
    network = problem.network
    out = network.outbound
    promising = np.zeros(len(network.sites), dtype=np.bool_)
    promising[network.option_site[root.problem.option[root.used > USED]]] = True
    promising[network.option_site[root.open_options]] = True
    lane = np.flatnonzero(promising[out.origin] & (problem.upper[problem.places.outbound] > 0))
    key = out.destination[lane].astype(np.int64) * max(len(network.goods), 1) + out.good[lane]
    return np.unique(problem.places.outbound[lane[cheapest(key, out.cost[lane], NEAREST)]]).astype(np.intp)


class SiteProgram:
    """The site program of one set of multipliers, in HiGHS."""

    def __init__(self, problem: WholeProblem, root: Root, forgiven: float, halt: Callable[[], bool]) -> None:
        """
        Price the options.

        Parameters
        ----------
        problem, root
            What to decide, and its relaxation.
        forgiven
            Money a year in the relaxation's costs that a plan need not pay.
        halt
            Says when to give up.
        """
        core = root.problem
        self._problem = problem
        self._halt = halt
        self._fixed = float(root.v @ core.demand) + core.constant - forgiven
        self._size = float(np.abs(root.v) @ core.demand) + abs(core.constant) + forgiven
        self.bound = (root.bound + core.constant - forgiven - ROUNDING * self._size) / problem.money
        options = problem.places.option.size
        self._cost = np.zeros(options)
        self._cost[core.option] = _priced_options(root)
        self._lower, self._upper = problem.lower[:options].copy(), problem.upper[:options].copy()
        absent = np.ones(options, dtype=np.bool_)
        absent[core.option] = False
        self._upper[absent] = 0.0
        self._own = _rows_of_sites(problem)
        self._room = problem.most.option_most
        self._demand = float(core.demand.sum())

    def allows(self, opened: Floats) -> bool:
        """Return whether a set of open options keeps the rows that speak of sites alone."""
        sums = self._own.times(opened)
        margin = TOLERANCE * np.maximum(np.abs(sums), 1.0)
        within = np.all(sums >= self._own.lower - margin) and np.all(sums <= self._own.upper + margin)
        return bool(within and np.all(opened >= self._lower) and np.all(opened <= self._upper))

    def solve(self, room: float) -> tuple[Floats | None, float]:
        """
        Choose sites that hold `room` times the demand.

        Parameters
        ----------
        room
            1 for a bound on the whole model; more for sites that leave room for what was left out.

        Returns
        -------
        opened, bound
            (options,) the sites, None without any; what no plan can undercut if `room` is 1, in the problem's money.
        """
        highs = self._highs(room)

        def interrupt(event: Any) -> None:  # noqa: ANN401 - highspy's event
            if self._halt():
                event.interrupt()

        highs.cbMipInterrupt.subscribe(interrupt)
        highs.cbSimplexInterrupt.subscribe(interrupt)
        highs.run()
        if is_impossible(highs):
            return None, math.inf
        bound = -math.inf
        info = highs.getInfo()
        if math.isfinite(info.mip_dual_bound):
            bound = info.mip_dual_bound + (self._fixed - ROUNDING * self._size) / self._problem.money
        if not has_solution(highs):
            return None, bound
        return np.rint(np.array(highs.getSolution().col_value)), bound

    def _highs(self, room: float) -> highspy.Highs:
        network, own = self._problem.network, self._own
        option = np.arange(self._cost.size)
        made = Gathering(option.size)
        made.add(own.row, own.column, own.value, own.lower, own.upper)
        least = np.minimum(network.option_least, self._room)
        endless = np.array([math.inf])
        made.add(0 * option, option, self._room, np.array([room * self._demand * (1 - MARGIN)]), endless)
        made.add(0 * option, option, least, -endless, np.array([self._demand * (1 + MARGIN)]))
        rows = made.rows(scaled=True)
        program = highspy.HighsLp()
        program.num_col_, program.num_row_ = option.size, len(rows)
        program.col_cost_ = self._cost / self._problem.money
        program.col_lower_, program.col_upper_ = self._lower, self._upper
        program.row_lower_, program.row_upper_ = rows.lower, rows.upper
        program.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
        program.a_matrix_.num_col_, program.a_matrix_.num_row_ = option.size, len(rows)
        program.a_matrix_.start_, program.a_matrix_.index_ = rows.start, rows.column
        program.a_matrix_.value_ = rows.value
        program.integrality_ = [highspy.HighsVarType.kInteger] * option.size
        highs = QuietHighs()  # type: ignore[no-untyped-call] # highspy types only part of its methods
        highs.setOptionValue("mip_feasibility_tolerance", TOLERANCE)
        highs.setOptionValue("primal_feasibility_tolerance", TOLERANCE)
        highs.setOptionValue("mip_max_nodes", NODES)
        highs.passModel(program)
        return highs


def _rows_of_sites(problem: WholeProblem) -> Rows:
    """Return the limits that have entries of options only, over the options."""
    limits, options = problem.limits, problem.places.option.size
    others = np.bincount(limits.row, limits.column >= options, minlength=len(limits))
    any_entry = np.diff(limits.start) > 0
    place = np.full(limits.columns, -1, dtype=np.int32)
    place[:options] = np.arange(options)
    mine = limits.chosen(np.flatnonzero((others == 0) & any_entry))
    return mine.within(place, options)


def _priced_options(root: Root) -> Floats:
    """Return (O,) charge of each of the core's options plus its best continuous knapsack, money a year."""
    problem = root.problem
    row = np.repeat(np.arange(problem.rows), np.diff(problem.row_start))
    margin = problem.lane_cost - root.v[row]
    worth = np.flatnonzero(margin < 0)
    order = worth[np.lexsort((margin[worth], problem.lane_site[worth]))]
    site, load, gain = problem.lane_site[order], problem.demand[row[order]], margin[order]
    start = np.searchsorted(site, np.arange(problem.sites + 1))
    cost = problem.charge.astype(np.float64).copy()
    for option, where in enumerate(problem.option_site.tolist()):
        first, end = start[where], start[where + 1]
        before = np.cumsum(load[first:end]) - load[first:end]
        taken = np.clip(problem.capacity[option] - before, 0.0, load[first:end])
        cost[option] += float(taken @ gain[first:end])
    return cost
