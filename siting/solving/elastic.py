"""
The model with some families of requirements made elastic: each may give way, and how much it gives is measured.

Every give is a share between 0 and 1 (or a yes-or-no) of the most it can be, so that its links are as well scaled as
those of the flows. Each family is measured in its own unit: load, money, sites, customers; they are never added up.
Families whose limits shape links or lanes are lifted from the study first and stated again here, softly; the others
are rows of the model and are softened where they stand.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import highspy
import numpy as np
import pulp

from siting.errors import EngineError
from siting.network.network import build_network
from siting.solving.highs import TOLERANCE, QuietHighs, has_solution, is_impossible
from siting.solving.model import build_model
from siting.solving.requirements import lifted
from siting.solving.rows import AT_LEAST, AT_MOST, power_of_two

if TYPE_CHECKING:
    from collections.abc import Mapping
    from collections.abc import Set as AbstractSet

    from siting.listener import Stop
    from siting.network.network import Network
    from siting.solving.model import Model
    from siting.solving.requirements import Requirement
    from siting.solving.rows import Row
    from siting.study.tables import Study

Terms = Iterable[tuple[pulp.LpVariable, float]]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Give:
    """By how much one limit gives way: `most` x the variable."""

    place: tuple[str, ...]
    """Names of what gives: a site, a supplier and good, both ends of a lane; empty for the larger of other gives."""
    variable: pulp.LpVariable
    most: float
    """In the unit of its family (load for capacities and volumes, 1 for what gives whole or not at all)."""
    counted: bool
    """False where another give already measures it."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Repair:
    """What one family has to give for the study to be possible."""

    requirement: Requirement
    amount: float
    """In the family's unit."""
    parts: tuple[tuple[tuple[str, ...], float], ...]
    """(names, amount) of every limit that gives, counted or not."""
    smallest: bool
    """True where no smaller amount is possible; False where time ran out on the search for one."""


class Elastic:
    """A model whose requirements of some families give way. Made by `softened` in `softening.py`."""

    def __init__(self, study: Study, network: Network, requirements: AbstractSet[Requirement]) -> None:
        self.study = study
        self.original = network
        """Numbers of the study as it is."""
        self.requirements = requirements
        self.network = build_network(lifted(study, requirements))
        """Numbers of the study with the requirements lifted; the model's lanes are these."""
        self.model: Model = build_model(self.network)
        self.gives: dict[Requirement, list[Give]] = {requirement: [] for requirement in requirements}
        self._rows = 0
        self._values: dict[str, float] = {}
        self._gates: dict[Requirement, pulp.LpVariable] = {}

    def give(
        self,
        requirement: Requirement,
        place: tuple[str, ...],
        most: float = 1.0,
        *,
        whole: bool = False,
        counted: bool = True,
    ) -> Give:
        """Return a new give of a family: a share of `most`, or with `whole` all of it or nothing."""
        number = sum(map(len, self.gives.values()))
        kind = pulp.LpInteger if whole else pulp.LpContinuous
        variable = self.model.problem.add_variable(f"give_{number}", 0.0, 1.0, kind)
        made = Give(place=place, variable=variable, most=most, counted=counted)
        self.gives[requirement].append(made)
        return made

    def at_most(self, terms: Terms, right: float = 0.0) -> None:
        """Add a row: the terms sum to at most `right`. Terms of one variable add up."""
        total: dict[pulp.LpVariable, float] = {}
        for variable, coefficient in terms:
            total[variable] = total.get(variable, 0.0) + coefficient
        scale = power_of_two(max((abs(value) for value in total.values()), default=0.0))
        expression = pulp.LpAffineExpression([(variable, value * scale) for variable, value in total.items() if value])
        self.model.problem.addConstraint(
            pulp.LpConstraint(expression, AT_MOST, rhs=right * scale), f"soft_{self._rows}"
        )
        self._rows += 1

    def soften(
        self, row: Row, requirement: Requirement, place: tuple[str, ...], *, counted: bool = True, per_unit: float = 1.0
    ) -> Give | None:
        """
        Let an at-most or at-least row of the model give as far as it can be missed; None where it cannot be missed.

        One unit of the row's family counts as `per_unit` in the give.
        """
        short, over = _missed_by(row)
        missed = short - over  # one of the two is 0
        if not missed:
            return None
        made = self.give(requirement, place, abs(missed) / row.scale * per_unit, counted=counted)
        row.constraint.addInPlace(pulp.LpAffineExpression([(made.variable, missed)]))
        return made

    def lift(self, row: Row, give: Give) -> None:
        """Let a row of the model hold or, with a whole give, not at all."""
        short, over = _missed_by(row)
        for share, sign in ((short, 1.0), (over, -1.0)):
            if share > 0:
                part = self.model.problem.add_variable(f"part_{self._rows}", 0.0, 1.0)
                row.constraint.addInPlace(pulp.LpAffineExpression([(part, sign * share)]))
                self.at_most([(part, 1.0), (give.variable, -1.0)])

    def minimise(self, requirement: Requirement, seconds: float, stop: Stop | None) -> Repair | None:
        """
        Return the least that one family has to give; None where the study stays impossible, or nothing was found.

        Raises
        ------
        EngineError
            If HiGHS gives up for a reason of its own.
        """
        self._objective((give.variable, give.most) for give in self.gives[requirement] if give.counted)
        proved = self._run(seconds, stop)
        if proved is None:
            return None
        rest = [give for give in self.gives[requirement] if not give.counted]
        if rest:  # what the larger of two measures may still be more than is needed
            self.hold(self.given(requirement, smallest=proved))
            self._objective((give.variable, give.most) for give in rest)
            self._run(seconds, stop)
        return self.given(requirement, smallest=proved)

    def given(self, requirement: Requirement, *, smallest: bool) -> Repair:
        """Return what a family gives in the last solution found; `smallest` is noted as told."""
        gives = self.gives[requirement]
        noise = TOLERANCE * max((give.most for give in gives), default=1.0)
        amounts = [(give, give.most * self._values.get(give.variable.name, 0.0)) for give in gives]
        return Repair(
            requirement=requirement,
            amount=sum(amount for give, amount in amounts if give.counted and amount > noise),
            parts=tuple((give.place, amount) for give, amount in amounts if amount > noise),
            smallest=smallest,
        )

    def possible(self, seconds: float, stop: Stop | None) -> bool:
        """Return whether some plan was found, whatever gives."""
        self._objective(())
        return self._run(seconds, stop) is not None

    def hold(self, repair: Repair) -> None:
        """Let a family give no more than a repair of it takes."""
        counted = [give for give in self.gives[repair.requirement] if give.counted]
        self.at_most([(give.variable, give.most) for give in counted], repair.amount * (1.0 + TOLERANCE))

    def fewest_families(
        self, weights: Mapping[Requirement, int], seconds: float, stop: Stop | None
    ) -> frozenset[Requirement] | None:
        """Return the cheapest families, by weight, that have to give; None where none do or time ran out."""
        if not self._gates:
            for place, requirement in enumerate(weights):
                gate = self.model.problem.add_variable(f"gate_{place}", 0.0, 1.0, pulp.LpInteger)
                self._gates[requirement] = gate
                for give in self.gives[requirement]:
                    self.at_most([(give.variable, 1.0), (gate, -1.0)])
        self._objective((self._gates[requirement], float(weight)) for requirement, weight in weights.items())
        if self._run(seconds, stop) is None:
            return None
        opened = {name for name, gate in self._gates.items() if self._values[gate.name] > 0.5}  # noqa: PLR2004 - a binary
        return frozenset(opened)

    def exclude(self, families: AbstractSet[Requirement]) -> None:
        """Ask of `fewest_families` at least one family outside these, which were found not to be enough."""
        others = [(gate, -1.0) for requirement, gate in self._gates.items() if requirement not in families]
        self.at_most(others, -1.0)

    def _objective(self, terms: Terms) -> None:
        pairs = list(terms)
        scale = power_of_two(max((value for _, value in pairs), default=0.0))
        self.model.problem.setObjective(pulp.LpAffineExpression([(name, value * scale) for name, value in pairs]))

    def _run(self, seconds: float, stop: Stop | None) -> bool | None:
        """Keep the values of the best solution and return whether it is proved least; None where there is none."""
        problem = self.model.problem
        problem.solve(_Quiet(seconds, stop))
        highs: highspy.Highs = problem.solverModel
        status = highs.getModelStatus()
        if not has_solution(highs):
            ended = {highspy.HighsModelStatus.kTimeLimit, highspy.HighsModelStatus.kInterrupt}
            if not is_impossible(highs) and status not in ended:
                msg = f"HiGHS gave up while explaining: {highs.modelStatusToString(status)}. Allow it more time."
                raise EngineError(msg)
            return None
        if not _settle(highs):
            return None
        solution = np.array(highs.getSolution().col_value)
        known = [variable for variable in problem.variables() if hasattr(variable, "index")]
        self._values = {variable.name: float(solution[variable.index]) for variable in known}
        return bool(status == highspy.HighsModelStatus.kOptimal)


def _missed_by(row: Row) -> tuple[float, float]:
    """Return by how much the left side of a row can be too small and too large, in the row's scale."""
    right = -row.constraint.constant
    values = list(row.constraint.values())  # every variable lies in [0, 1]
    short = 0.0 if row.constraint.sense == AT_MOST else right - sum(value for value in values if value < 0)
    over = 0.0 if row.constraint.sense == AT_LEAST else sum(value for value in values if value > 0) - right
    return max(short, 0.0), max(over, 0.0)


def _settle(highs: highspy.Highs) -> bool:
    """Round the whole variables, hold them and solve for the others again, so that no tolerance hides in an amount."""
    whole = [place for place, kind in enumerate(highs.getLp().integrality_) if kind == highspy.HighsVarType.kInteger]
    if not whole:
        return True
    rounded = np.rint(np.array(highs.getSolution().col_value)[whole])
    places = np.array(whole, dtype=np.int32)
    highs.changeColsBounds(places.size, places, rounded, rounded)
    highs.setOptionValue("time_limit", highs.getRunTime() + 60.0)
    highs.run()
    return has_solution(highs)


class _Quiet(pulp.HiGHS):  # type: ignore[misc] # PuLP ships no types
    """PuLP's in-process HiGHS, silent, to the last digit, within a time and until asked to stop."""

    def __init__(self, seconds: float, stop: Stop | None) -> None:
        super().__init__(msg=True)
        self._seconds = seconds
        self._stop = stop

    def createAndConfigureSolver(self, lp: pulp.LpProblem) -> None:  # noqa: N802 - overrides a method of PuLP
        """Make a quiet HiGHS that asks for a full proof."""
        highs = QuietHighs()  # type: ignore[no-untyped-call] # highspy types only part of its methods
        for name, value in {
            "mip_rel_gap": 0.0,
            "mip_abs_gap": 0.0,
            "mip_feasibility_tolerance": TOLERANCE,
            "primal_feasibility_tolerance": TOLERANCE,
            "time_limit": max(self._seconds, 0.01),
        }.items():
            highs.setOptionValue(name, value)
        highs.cbMipInterrupt.subscribe(self._interrupt)
        lp.solverModel = highs

    def callSolver(self, lp: pulp.LpProblem) -> None:  # noqa: N802 - overrides a method of PuLP
        """Run."""
        lp.solverModel.run()

    def findSolutionValues(self, lp: pulp.LpProblem) -> tuple[int, int]:  # noqa: ARG002, N802 - overrides a method of PuLP
        """Leave the variables alone: values and outcome are read from HiGHS itself."""
        return pulp.LpStatusNotSolved, pulp.LpSolutionNoSolutionFound

    def _interrupt(self, event: object) -> None:
        if self._stop is not None and self._stop.requested:
            event.interrupt()  # type: ignore[attr-defined]  # highspy's event
