"""
Compare: two to six plans side by side, what differs first.

Plans may be of one study or of several, such as a study and its variants; a site that a plan's study does not have has
no verdict there. All must count in one currency and one unit.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from siting.errors import PlanFileError, SettingsError
from siting.plan.folder import VARIANTS_FILE, read_plan_folder
from siting.plan.plan import LOAD_TOLERANCE, CostLine
from siting.questions.compare_result import Comparison, CostRow, CustomerMove, Figures, LaneChange, VerdictRow
from siting.questions.restriction import OPEN, SIGNED
from siting.study.tables import Leg
from siting.study.variant import variant_names

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.plan.plan import Plan, SiteLine, SupplierLine
    from siting.questions.compare_result import Place
    from siting.study.tables import CustomerRow, SiteRow, Study, SupplierRow

FEWEST, MOST = 2, 6
"""How many plans can be compared."""

Lane = tuple[Leg, str, str]
"""Leg, origin and destination."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Named:
    """A plan with its study and the name it goes by."""

    name: str
    study: Study
    plan: Plan


def compare(plans: Sequence[Named]) -> Comparison:
    """
    Set plans side by side.

    Parameters
    ----------
    plans
        Two to six, each with a name of its own and the study it answers.

    Returns
    -------
    comparison
        Every row in the order of the plans.

    Raises
    ------
    SettingsError
        If there are too few or too many plans, or two of one name.
    PlanFileError
        If the plans count in different currencies or units.
    """
    _refuse(plans)
    noise = LOAD_TOLERANCE * max(1.0, *(sum(line.load for line in each.plan.customers) for each in plans))
    lanes = [_lanes(each) for each in plans]
    places = _places(plans)
    verdicts = (*_sites(plans, places), *_suppliers(plans, places))
    return Comparison(
        plans=tuple(_figures(each) for each in plans),
        currency=plans[0].plan.currency,
        unit=plans[0].plan.unit,
        cost_lines=tuple(row for row in _costs(plans) if any(row.amounts)),
        verdicts=tuple(sorted(verdicts, key=lambda row: not row.differs)),
        customers=_customers(plans, lanes, places, noise),
        lanes=_changes(lanes, places, noise),
    )


def read_named(folders: Sequence[Path | str]) -> tuple[Named, ...]:
    """
    Read PLAN folders and name each by its variants, or else by its folder.

    Parameters
    ----------
    folders
        What `siting plan --out` wrote.

    Returns
    -------
    plans
        With the whole path as the name where two would bear the same.

    Raises
    ------
    PlanFileError
        If a folder holds no plan, or its tables are not the ones the plan was made from.
    """
    read = []
    for folder in map(Path, folders):
        study, answer = read_plan_folder(folder)
        if answer.plan is None:
            msg = f"{folder} holds no plan (outcome: {answer.proof.outcome}). Name the folder of a plan."
            raise PlanFileError(msg)
        read.append(Named(name=_name(folder), study=study, plan=answer.plan))
    names = [each.name for each in read]
    return tuple(
        each if names.count(each.name) == 1 else Named(name=str(folder), study=each.study, plan=each.plan)
        for folder, each in zip(folders, read, strict=True)
    )


def _name(folder: Path) -> str:
    held = folder / VARIANTS_FILE
    if held.is_file():
        return " + ".join(variant_names(held.read_text(encoding="utf-8")))
    return folder.name or folder.resolve().name


def _refuse(plans: Sequence[Named]) -> None:
    if not FEWEST <= len(plans) <= MOST:
        msg = f"{FEWEST} to {MOST} plans can be compared, got {len(plans)}. Leave some out, or add one."
        raise SettingsError(msg)
    names = [each.name for each in plans]
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        msg = f"two plans go by the name {twice[0]!r}. Give each plan once, under a name of its own."
        raise SettingsError(msg)
    for what in ("currency", "unit"):
        found = {each.name: getattr(each.plan, what) for each in plans}
        if len(set(found.values())) > 1:
            listed = ", ".join(f"{name} in {value}" for name, value in found.items())
            msg = f"plans that differ in their {what} cannot be compared: {listed}. Bring the studies to one {what}."
            raise PlanFileError(msg)


def _figures(each: Named) -> Figures:
    plan, proof = each.plan, each.plan.proof
    return Figures(
        name=each.name,
        cost=plan.cost,
        bound=proof.bound,
        outcome=proof.outcome,
        gap=proof.gap,
        saving=plan.saving,
        one_off=plan.one_off,
        open_sites=sum(line.verdict in OPEN for line in plan.sites),
        signed_suppliers=sum(line.verdict in SIGNED for line in plan.suppliers),
        average_km=plan.service.average_km,
        share_within=plan.service.share_within,
        tonnes_co2e=plan.tonnes_co2e,
        fingerprint=plan.fingerprint,
    )


def _costs(plans: Sequence[Named]) -> list[CostRow]:
    return [CostRow(name=str(line), amounts=tuple(each.plan.cost_lines[line] for each in plans)) for line in CostLine]


def _sites(plans: Sequence[Named], places: Mapping[str, Place]) -> list[VerdictRow]:
    lines: list[dict[str, SiteLine]] = [{line.site: line for line in each.plan.sites} for each in plans]
    names = dict.fromkeys(name for known in lines for name in known)
    return [
        VerdictRow(
            kind="site",
            name=name,
            verdicts=tuple(str(known[name].verdict) if name in known else "" for known in lines),
            sizes=tuple(known[name].size if name in known else "" for known in lines),
            loads=tuple(known[name].throughput if name in known else 0.0 for known in lines),
            place=places.get(name),
        )
        for name in names
    ]


def _suppliers(plans: Sequence[Named], places: Mapping[str, Place]) -> list[VerdictRow]:
    lines: list[dict[str, SupplierLine]] = [{line.supplier: line for line in each.plan.suppliers} for each in plans]
    names = dict.fromkeys(name for known in lines for name in known)
    return [
        VerdictRow(
            kind="supplier",
            name=name,
            verdicts=tuple(str(known[name].verdict) if name in known else "" for known in lines),
            sizes=("",) * len(lines),
            loads=tuple(known[name].volume if name in known else 0.0 for known in lines),
            place=places.get(name),
        )
        for name in names
    ]


def _lanes(each: Named) -> dict[Lane, float]:
    """Return the load on each lane of a plan, all goods together."""
    load = {good.good: good.load for good in each.study.all_goods}
    lanes: dict[Lane, float] = {}
    for flow in each.plan.flows:
        lane = (flow.leg, flow.origin, flow.destination)
        lanes[lane] = lanes.get(lane, 0.0) + flow.amount * load[flow.good]
    return lanes


def _customers(
    plans: Sequence[Named], lanes: Sequence[Mapping[Lane, float]], places: Mapping[str, Place], noise: float
) -> tuple[CustomerMove, ...]:
    """Return the customers that are not served from the same places in every plan, the largest first."""
    served: list[dict[str, dict[str, float]]] = []
    for known in lanes:
        by_customer: dict[str, dict[str, float]] = {}
        for (leg, origin, customer), load in known.items():
            if leg is not Leg.INBOUND and load > noise:
                by_customer.setdefault(customer, {})[origin] = load
        served.append(by_customer)
    names = dict.fromkeys(line.customer for each in plans for line in each.plan.customers)
    moves = [
        CustomerMove(
            customer=name,
            origins=tuple(tuple(sorted(known.get(name, {}))) for known in served),
            loads=tuple(sum(known.get(name, {}).values()) for known in served),
            place=places.get(_customer(name)),
        )
        for name in names
    ]
    changed = [move for move in moves if len(set(move.origins)) > 1]
    return tuple(sorted(changed, key=lambda move: (-max(move.loads), move.customer)))


def _changes(
    lanes: Sequence[Mapping[Lane, float]], places: Mapping[str, Place], noise: float
) -> tuple[LaneChange, ...]:
    """Return the lanes over which not the same moves in every plan, the largest difference first."""
    changes = []
    for lane in dict.fromkeys(lane for known in lanes for lane in known):
        loads = tuple(known.get(lane, 0.0) for known in lanes)
        if max(loads) - min(loads) <= noise:
            continue
        leg, origin, destination = lane
        end = destination if leg is Leg.INBOUND else _customer(destination)
        changes.append(
            LaneChange(
                leg=leg,
                origin=origin,
                destination=destination,
                loads=loads,
                from_place=places.get(origin),
                to_place=places.get(end),
            )
        )
    return tuple(sorted(changes, key=lambda change: (min(change.loads) - max(change.loads), change.origin)))


def _customer(name: str) -> str:
    """Return the key of a customer's place: a customer may bear the name of a site."""
    return f"to {name}"


def _places(plans: Sequence[Named]) -> dict[str, Place]:
    """Return where sites, suppliers and customers are, as the first study that says so has it."""
    places: dict[str, Place] = {}
    for each in plans:
        rows: list[tuple[str, SiteRow | SupplierRow | CustomerRow]] = [(row.site, row) for row in each.study.sites]
        rows += [(row.supplier, row) for row in each.study.suppliers]
        rows += [(_customer(row.customer), row) for row in each.study.customers]
        for name, row in rows:
            if row.latitude is not None and row.longitude is not None:
                places.setdefault(name, (row.latitude, row.longitude))
    return places
