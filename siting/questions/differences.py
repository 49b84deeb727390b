"""What differs between two plans of a study: verdicts, cost lines, who serves whom, how full what is open gets."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.plan.plan import LOAD_TOLERANCE, CostLine
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from siting.plan.plan import Plan, SiteLine, SupplierLine

FULL = 1.0 - 1e-6
"""A site or supplier used to this share of its capacity is full."""


@dataclass(frozen=True, slots=True, kw_only=True)
class VerdictChange:
    """A site or supplier with another verdict, or a site with another size."""

    kind: str
    """`site` or `supplier`."""
    name: str
    before: str
    """The verdict before."""
    after: str
    size_before: str = ""
    size_after: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Shift:
    """Load of a customer that comes from elsewhere."""

    customer: str
    before: str
    """Site or supplier it came from; empty where it came from nowhere."""
    after: str
    """Site or supplier it comes from; empty where it comes from nowhere."""
    load: float
    """Load a year."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Filling:
    """A site or supplier through which more or less moves."""

    kind: str
    """`site` or `supplier`."""
    name: str
    before: float
    """Load a year."""
    after: float
    capacity: float | None
    """Load a year afterwards; None = unlimited, or not open."""
    full: bool
    """True where nothing more can move through it afterwards."""


def verdict_changes(before: Plan, after: Plan) -> tuple[VerdictChange, ...]:
    """
    Return every site and supplier whose verdict or size differs, in the order of the tables.

    Parameters
    ----------
    before, after
        Two plans of one study.

    Returns
    -------
    changes
        Sites first.
    """
    sites = [
        VerdictChange(
            kind="site",
            name=was.site,
            before=str(was.verdict),
            after=str(now.verdict),
            size_before=was.size,
            size_after=now.size,
        )
        for was, now in zip(before.sites, after.sites, strict=True)
        if (was.verdict, was.size) != (now.verdict, now.size)
    ]
    suppliers = [
        VerdictChange(kind="supplier", name=was.supplier, before=str(was.verdict), after=str(now.verdict))
        for was, now in zip(before.suppliers, after.suppliers, strict=True)
        if was.verdict != now.verdict
    ]
    return (*sites, *suppliers)


def line_differences(before: Plan, after: Plan) -> dict[CostLine, float]:
    """
    Return by how much each cost line is higher afterwards, money a year.

    Parameters
    ----------
    before, after
        Two plans of one study.

    Returns
    -------
    differences
        Every line; they add up to the difference of the costs.
    """
    return {line: after.cost_lines[line] - before.cost_lines[line] for line in CostLine}


def fillings(before: Plan, after: Plan) -> tuple[Filling, ...]:
    """
    Return every site and supplier through which more or less moves, the largest gain first.

    Parameters
    ----------
    before, after
        Two plans of one study.

    Returns
    -------
    fillings
        Differences of at most a millionth of the load are left out.
    """
    noise = _noise(after)
    changed = [
        _filling("site", was.site, was.throughput, now.throughput, now)
        for was, now in zip(before.sites, after.sites, strict=True)
        if abs(now.throughput - was.throughput) > noise
    ]
    changed += [
        _filling("supplier", was.supplier, was.volume, now.volume, now)
        for was, now in zip(before.suppliers, after.suppliers, strict=True)
        if abs(now.volume - was.volume) > noise
    ]
    return tuple(sorted(changed, key=lambda filling: filling.before - filling.after))


def _filling(kind: str, name: str, before: float, after: float, line: SiteLine | SupplierLine) -> Filling:
    full = line.utilisation is not None and line.utilisation >= FULL
    return Filling(kind=kind, name=name, before=before, after=after, capacity=line.capacity, full=full)


def _noise(plan: Plan) -> float:
    return max(LOAD_TOLERANCE, LOAD_TOLERANCE * sum(line.load for line in plan.customers))


def shifts(before: Plan, after: Plan, load: Mapping[str, float]) -> tuple[Shift, ...]:
    """
    Return which customers get load from elsewhere, and how much, by customer in the order of the table.

    Parameters
    ----------
    before, after
        Two plans of one study.
    load
        Load of one unit of each good.

    Returns
    -------
    shifts
        What an origin loses at a customer is matched with what others gain there, largest first.
    """
    was, now = _from_whom(before, load), _from_whom(after, load)
    noise = _noise(after)
    found: list[Shift] = []
    for line in before.customers:
        had, has = was.get(line.customer, {}), now.get(line.customer, {})
        if had == has:
            continue
        change = {origin: has.get(origin, 0.0) - had.get(origin, 0.0) for origin in dict.fromkeys((*had, *has))}
        lost = sorted(((-value, name) for name, value in change.items() if value < -noise), reverse=True)
        won = sorted(((value, name) for name, value in change.items() if value > noise), reverse=True)
        found += [
            Shift(customer=line.customer, before=source, after=target, load=amount)
            for source, target, amount in _matched(lost, won, noise)
        ]
    return tuple(found)


def _from_whom(plan: Plan, load: Mapping[str, float]) -> dict[str, dict[str, float]]:
    """Return the load of each customer by site or supplier."""
    served: dict[str, dict[str, float]] = {}
    for flow in plan.flows:
        if flow.leg is not Leg.INBOUND:
            origins = served.setdefault(flow.destination, {})
            origins[flow.origin] = origins.get(flow.origin, 0.0) + flow.amount * load[flow.good]
    return served


def _matched(
    lost: Iterable[tuple[float, str]], won: Iterable[tuple[float, str]], noise: float
) -> list[tuple[str, str, float]]:
    """Return (from, to, load): each loss is matched with the gains in turn; what has no match is from or to nowhere."""
    found: list[tuple[str, str, float]] = []
    losses, gains = list(lost), list(won)
    while losses and gains:
        (loss, source), (gain, target) = losses.pop(0), gains.pop(0)
        amount = min(loss, gain)
        found.append((source, target, amount))
        if loss - amount > noise:
            losses.insert(0, (loss - amount, source))
        if gain - amount > noise:
            gains.insert(0, (gain - amount, target))
    found += [(name, "", amount) for amount, name in losses]
    found += [("", name, amount) for amount, name in gains]
    return found
