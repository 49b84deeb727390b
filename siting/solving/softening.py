"""How each family of requirements gives way in the elastic model."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from siting.network.lanes import EDGE
from siting.network.network import build_network
from siting.solving.elastic import Elastic
from siting.solving.requirements import Requirement, lifted
from siting.solving.rows import Family
from siting.study.tables import Leg

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence
    from collections.abc import Set as AbstractSet

    import pulp
    from numpy.typing import NDArray

    from siting.arrays import Positions
    from siting.network.network import LegLanes, Network
    from siting.solving.elastic import Give
    from siting.study.tables import Study

    Pairs = list[tuple[pulp.LpVariable, float]]


def softened(study: Study, network: Network, requirements: AbstractSet[Requirement]) -> Elastic:
    """
    Return the model of a study in which some families of requirements give way.

    Parameters
    ----------
    study
        Checked.
    network
        Its numbers.
    requirements
        The families that give way; all others hold.

    Returns
    -------
    elastic
        Without an objective yet.
    """
    elastic = Elastic(study, network, requirements)
    for requirement in requirements:
        _SOFTEN[requirement](elastic)
    return elastic


def _legs(elastic: Elastic) -> Iterator[tuple[Leg, LegLanes, Positions]]:
    """Yield both legs that end at customers, with the column of each lane."""
    yield Leg.OUTBOUND, elastic.network.outbound, elastic.model.columns.outbound
    yield Leg.DIRECT, elastic.network.direct, elastic.model.columns.direct


def _pairs(elastic: Elastic, columns: Sequence[int] | NDArray[np.integer], values: NDArray[np.float64]) -> Pairs:
    variables = elastic.model.columns.all
    return [(variables[column], value) for column, value in zip(list(columns), values.tolist(), strict=True)]


def _site_capacity(elastic: Elastic) -> None:
    """Ask that load out of a site <= what its open option holds + give."""
    lanes, columns, most = elastic.network.outbound, elastic.model.columns, elastic.model.most
    load = columns.outbound_units * elastic.network.load[lanes.good] * most.outbound_usable
    for site, name in enumerate(elastic.network.sites):
        options = np.flatnonzero(elastic.network.option_site == site)
        holds = np.minimum(elastic.original.option_capacity[options], most.site_load[site])
        if (holds >= most.site_load[site]).all():
            continue
        give = elastic.give(Requirement.SITE_CAPACITY, (name,), float(most.site_load[site] - holds.min()))
        mine = np.flatnonzero(lanes.origin == site)
        moved = _pairs(elastic, columns.outbound[mine], load[mine])
        elastic.at_most([*moved, *_pairs(elastic, columns.option[options], -holds), (give.variable, -give.most)])


def _supplier_capacity(elastic: Elastic) -> None:
    """Ask that load and units from a supplier <= what it and its offers hold + give; the larger give counts."""
    network, columns, most = elastic.network, elastic.model.columns, elastic.model.most
    origin = np.concatenate([network.inbound.origin, network.direct.origin])
    good = np.concatenate([network.inbound.good, network.direct.good])
    column = np.concatenate([columns.inbound, columns.direct])
    units = np.concatenate([columns.inbound_units, columns.direct_units * most.direct_usable])
    load = np.where(network.load > 0, network.load, 1.0)  # units of a good without load count as load
    for supplier, name in enumerate(network.suppliers):
        signed = columns.all[columns.supplier[supplier]]
        mine = np.flatnonzero(origin == supplier)
        reach = most.offer_most[supplier] * load
        whole = _below(elastic, (name,), float(elastic.original.supplier_capacity[supplier]), float(reach.sum()))
        if whole is not None:
            moved = _pairs(elastic, column[mine], units[mine] * network.load[good[mine]])
            held = float(elastic.original.supplier_capacity[supplier])
            elastic.at_most([*moved, (signed, -held), (whole.variable, -whole.most)])
        offers: list[Give] = []
        for place, label in enumerate(network.goods):
            held = float(elastic.original.offer_capacity[supplier, place] * load[place])
            offer = _below(elastic, (name, label), held, float(reach[place]))
            if offer is not None:
                its = mine[good[mine] == place]
                moved = _pairs(elastic, column[its], units[its] * load[place])
                elastic.at_most([*moved, (signed, -held), (offer.variable, -offer.most)])
                offers.append(offer)
        _larger(elastic, Requirement.SUPPLIER_CAPACITY, whole, offers)


def _below(elastic: Elastic, place: tuple[str, ...], held: float, reach: float) -> Give | None:
    """Return a give up to the load in reach, not counted itself; None where capacity is no limit."""
    if not held < reach:
        return None
    return elastic.give(Requirement.SUPPLIER_CAPACITY, place, reach - held, counted=False)


def _larger(elastic: Elastic, family: Requirement, whole: Give | None, offers: list[Give]) -> None:
    """Count for one supplier the larger of what it gives as a whole and what its offers give together, in load."""
    most = max(whole.most if whole else 0.0, sum(offer.most for offer in offers))
    if most <= 0:
        return
    larger = elastic.give(family, (), most)
    for part in ([whole] if whole else [], offers):
        elastic.at_most([*((give.variable, give.most) for give in part), (larger.variable, -larger.most)])


def _reach(elastic: Elastic) -> None:
    """Use a lane beyond the reach of its customer only where that reach is lifted."""
    reach = np.array([math.inf if row.reach_km is None else row.reach_km for row in elastic.study.customers])
    variables = elastic.model.columns.all
    lifts: dict[int, Give] = {}
    for _, lanes, columns in _legs(elastic):
        for lane in np.flatnonzero(lanes.km > reach[lanes.destination] * (1.0 + EDGE)).tolist():
            customer = int(lanes.destination[lane])
            if customer not in lifts:
                place = (elastic.network.customers[customer],)
                lifts[customer] = elastic.give(Requirement.REACH, place, whole=True)
            elastic.at_most([(variables[columns[lane]], 1.0), (lifts[customer].variable, -1.0)])


def _bars(elastic: Elastic) -> None:
    """Use a barred lane only where its bar is lifted, for all goods of the pair at once."""
    kept = build_network(lifted(elastic.study, elastic.requirements - {Requirement.BARS}))
    network, columns, variables = elastic.network, elastic.model.columns, elastic.model.columns.all
    for lanes, others, column, origins, ends in (
        (network.inbound, kept.inbound, columns.inbound, network.suppliers, network.sites),
        (network.outbound, kept.outbound, columns.outbound, network.sites, network.customers),
        (network.direct, kept.direct, columns.direct, network.suppliers, network.customers),
    ):
        lifts: dict[tuple[str, str], Give] = {}
        for lane in np.flatnonzero(~np.isin(_keys(lanes, network), _keys(others, network))).tolist():
            place = origins[lanes.origin[lane]], ends[lanes.destination[lane]]
            if place not in lifts:
                lifts[place] = elastic.give(Requirement.BARS, place, whole=True)
            elastic.at_most([(variables[column[lane]], 1.0), (lifts[place].variable, -1.0)])


def _keys(lanes: LegLanes, network: Network) -> NDArray[np.int64]:
    width = max(len(network.sites), len(network.customers))
    return (lanes.origin.astype(np.int64) * width + lanes.destination) * len(network.goods) + lanes.good


def _single_sourcing(elastic: Elastic) -> None:
    """Let a single-sourced customer take from one origin, or give and take from any."""
    variables, sites = elastic.model.columns.all, len(elastic.network.sites)
    takes: list[dict[int, list[pulp.LpVariable]]] = [{} for _ in elastic.network.customers]
    for leg, lanes, columns in _legs(elastic):
        first = 0 if leg is Leg.OUTBOUND else sites
        for lane in np.flatnonzero(elastic.original.single_source[lanes.destination]).tolist():
            origins = takes[int(lanes.destination[lane])]
            origins.setdefault(first + int(lanes.origin[lane]), []).append(variables[columns[lane]])
    for customer, origins in enumerate(takes):
        if len(origins) < 2:  # noqa: PLR2004 - with one origin there is nothing to split
            continue
        give = elastic.give(Requirement.SINGLE_SOURCING, (elastic.network.customers[customer],), whole=True)
        chosen: Pairs = []
        for origin, shares in origins.items():
            name = f"from_{customer}_{origin}"
            taken = elastic.model.problem.add_variable(name, 0.0, 1.0, "Integer")
            chosen.append((taken, 1.0))
            for share in shares:
                elastic.at_most([(share, 1.0), (taken, -1.0)])
        elastic.at_most([*chosen, (give.variable, 1.0 - len(origins))], 1.0)


def _least_throughput(elastic: Elastic) -> None:
    for row in elastic.model.rows:
        if row.family is Family.SITE_LEAST:
            elastic.soften(row, Requirement.LEAST_THROUGHPUT, (elastic.network.sites[row.place],))


def _least_yearly(elastic: Elastic) -> None:
    """Let least volumes of a supplier and of its offers give; the larger of both, in load, counts."""
    goods = len(elastic.network.goods)
    wholes: dict[int, Give] = {}
    offers: dict[int, list[Give]] = {}
    for row in elastic.model.rows:
        if row.family is Family.SUPPLIER_LEAST:
            place: tuple[str, ...] = (elastic.network.suppliers[row.place],)
            give = elastic.soften(row, Requirement.LEAST_YEARLY, place, counted=False)
            if give is not None:
                wholes[row.place] = give
        elif row.family is Family.OFFER_LEAST:
            supplier, good = divmod(row.place, goods)
            place = elastic.network.suppliers[supplier], elastic.network.goods[good]
            load = float(elastic.network.load[good]) or 1.0
            give = elastic.soften(row, Requirement.LEAST_YEARLY, place, counted=False, per_unit=load)
            if give is not None:
                offers.setdefault(supplier, []).append(give)
    for supplier in range(len(elastic.network.suppliers)):
        _larger(elastic, Requirement.LEAST_YEARLY, wholes.get(supplier), offers.get(supplier, []))


def _row(elastic: Elastic, family: Family, requirement: Requirement) -> None:
    for row in elastic.model.rows:
        if row.family is family:
            elastic.soften(row, requirement, ())


def _rules(elastic: Elastic) -> None:
    """Let a rule hold, or lift it with every row it has."""
    lifts: dict[int, Give] = {}
    for row in elastic.model.rows:
        if row.family is Family.RULE:
            if row.place not in lifts:
                lifts[row.place] = elastic.give(Requirement.RULES, (str(row.place),), whole=True)
            elastic.lift(row, lifts[row.place])


def _rulings(elastic: Elastic) -> None:
    """Leave a site or supplier as pinned, or lift its ruling."""
    network, columns = elastic.original, elastic.model.columns
    for site, name in enumerate(network.sites):
        options = columns.option[network.option_site == site]
        is_open = _pairs(elastic, options, np.ones(options.size))
        _pin(
            elastic,
            name,
            is_open,
            pinned=bool(network.site_pinned_open[site]),
            shut=bool(network.site_pinned_shut[site]),
        )
    for supplier, name in enumerate(network.suppliers):
        signed: Pairs = [(columns.all[columns.supplier[supplier]], 1.0)]
        pinned, shut = network.supplier_pinned_signed[supplier], network.supplier_pinned_unsigned[supplier]
        _pin(elastic, name, signed, pinned=bool(pinned), shut=bool(shut))


def _pin(elastic: Elastic, name: str, taken: Pairs, *, pinned: bool, shut: bool) -> None:
    if not (pinned or shut):
        return
    give = elastic.give(Requirement.RULINGS, (name,), whole=True)
    if pinned:
        elastic.at_most([*((variable, -value) for variable, value in taken), (give.variable, -1.0)], -1.0)
    else:
        elastic.at_most([*taken, (give.variable, -1.0)])


_SOFTEN = {
    Requirement.REACH: _reach,
    Requirement.BARS: _bars,
    Requirement.SITE_CAPACITY: _site_capacity,
    Requirement.SUPPLIER_CAPACITY: _supplier_capacity,
    Requirement.SINGLE_SOURCING: _single_sourcing,
    Requirement.LEAST_THROUGHPUT: _least_throughput,
    Requirement.LEAST_YEARLY: _least_yearly,
    Requirement.SERVICE_SHARE: lambda elastic: _row(elastic, Family.SERVICE, Requirement.SERVICE_SHARE),
    Requirement.FEWEST_SITES: lambda elastic: _row(elastic, Family.FEWEST, Requirement.FEWEST_SITES),
    Requirement.MOST_SITES: lambda elastic: _row(elastic, Family.MOST, Requirement.MOST_SITES),
    Requirement.BUDGET: lambda elastic: _row(elastic, Family.BUDGET, Requirement.BUDGET),
    Requirement.RULES: _rules,
    Requirement.RULINGS: _rulings,
}
