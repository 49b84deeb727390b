"""Apply the repairs of an impossible study to its tables, and see whether they are true."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import TYPE_CHECKING

from siting.listener import Silent, Stop
from siting.network.network import build_network
from siting.solving.direct import direct
from siting.solving.requirements import Requirement
from siting.study.settings import SolveSettings
from siting.study.tables import SiteRuling, Study, SupplierRuling
from tests.building import lane_rows, lane_table

if TYPE_CHECKING:
    from collections.abc import Callable

    from siting.solving.elastic import Repair


def is_possible(study: Study) -> bool:
    """Return whether the engine finds a plan of the study."""
    settings = SolveSettings(gap=0.0, time_limit_s=30.0)
    result = direct(build_network(study), settings, listener=Silent(), stop=Stop())
    assert result.impossible is (result.decisions is None)
    return not result.impossible


def repaired(study: Study, repair: Repair, share: float = 1.0) -> Study:
    """Return the study with a share of every part of a repair applied to its tables."""
    return APPLY[repair.requirement](study, {place: amount * share for place, amount in repair.parts})


Parts = dict[tuple[str, ...], float]


def _larger_sites(study: Study, parts: Parts) -> Study:
    """Raise the capacity of the sites, at all their sizes."""

    def raised(site: str, capacity: float | None) -> float | None:
        return None if capacity is None else capacity + parts.get((site,), 0.0)

    return replace(
        study,
        sites=tuple(replace(row, capacity=raised(row.site, row.capacity)) for row in study.sites),
        sizes=tuple(replace(row, capacity=row.capacity + parts.get((row.site,), 0.0)) for row in study.sizes),
    )


def _larger_suppliers(study: Study, parts: Parts) -> Study:
    """Raise the capacity of suppliers in load and of offers in units of the good."""
    load = {row.good: row.load for row in study.all_goods}
    return replace(
        study,
        suppliers=tuple(
            replace(row, capacity=None if row.capacity is None else row.capacity + parts.get((row.supplier,), 0.0))
            for row in study.suppliers
        ),
        offers=tuple(
            replace(
                row,
                capacity=None
                if row.capacity is None
                else row.capacity + parts.get((row.supplier, row.good), 0.0) / load[row.good],
            )
            for row in study.offers
        ),
    )


def _lower_throughput(study: Study, parts: Parts) -> Study:
    """Lower least throughput at all sizes."""

    def lowered(site: str, least: float) -> float:
        return max(0.0, least - parts.get((site,), 0.0))

    return replace(
        study,
        sites=tuple(replace(row, least_throughput=lowered(row.site, row.least_throughput)) for row in study.sites),
        sizes=tuple(replace(row, least_throughput=lowered(row.site, row.least_throughput)) for row in study.sizes),
    )


def _lower_volumes(study: Study, parts: Parts) -> Study:
    """Lower the least yearly volume of suppliers in load and of offers in units of the good."""
    load = {row.good: row.load for row in study.all_goods}
    return replace(
        study,
        suppliers=tuple(
            replace(row, least_yearly=max(0.0, row.least_yearly - parts.get((row.supplier,), 0.0)))
            for row in study.suppliers
        ),
        offers=tuple(
            replace(
                row, least_yearly=max(0.0, row.least_yearly - parts.get((row.supplier, row.good), 0.0) / load[row.good])
            )
            for row in study.offers
        ),
    )


def _reached(study: Study, parts: Parts) -> Study:
    return replace(
        study,
        customers=tuple(
            replace(row, reach_km=None if (row.customer,) in parts else row.reach_km) for row in study.customers
        ),
    )


def _split(study: Study, parts: Parts) -> Study:
    return replace(
        study,
        customers=tuple(
            replace(row, single_source=study.is_single_sourced(row) and (row.customer,) not in parts)
            for row in study.customers
        ),
    )


def _unbarred(study: Study, parts: Parts) -> Study:
    rows = [
        replace(row, barred=row.barred and (row.origin, row.destination) not in parts) for row in lane_rows(study.lanes)
    ]
    return replace(study, lanes=lane_table(rows))


def _set_free(study: Study, parts: Parts) -> Study:
    return replace(
        study,
        sites=tuple(replace(row, ruling=SiteRuling.FREE) if (row.site,) in parts else row for row in study.sites),
        suppliers=tuple(
            replace(row, ruling=SupplierRuling.FREE) if (row.supplier,) in parts else row for row in study.suppliers
        ),
    )


def _unruled(study: Study, parts: Parts) -> Study:
    return replace(study, rules=tuple(row for place, row in enumerate(study.rules) if (str(place),) not in parts))


def _setting(name: str, sign: int, unit: type[int | float] = float) -> Callable[[Study, Parts], Study]:
    def apply(study: Study, parts: Parts) -> Study:
        amount = sum(parts.values())
        if name == "service_share":
            amount /= sum(need.demand * weight_of(study, need.good) for need in study.all_demands)
        value = getattr(study.settings, name) + sign * amount
        # money and shares as found; a count of sites only moves by whole sites
        whole = (
            round(value) if abs(value - round(value)) < 1e-6 else math.floor(value) if sign > 0 else math.ceil(value)
        )
        return replace(study, settings=replace(study.settings, **{name: whole if unit is int else value}))

    return apply


def weight_of(study: Study, good: str) -> float:
    """Return tonnes per unit of a good."""
    return next(row.weight_t for row in study.all_goods if row.good == good)


APPLY: dict[Requirement, Callable[[Study, Parts], Study]] = {
    Requirement.REACH: _reached,
    Requirement.BARS: _unbarred,
    Requirement.SITE_CAPACITY: _larger_sites,
    Requirement.SUPPLIER_CAPACITY: _larger_suppliers,
    Requirement.SINGLE_SOURCING: _split,
    Requirement.LEAST_THROUGHPUT: _lower_throughput,
    Requirement.LEAST_YEARLY: _lower_volumes,
    Requirement.SERVICE_SHARE: _setting("service_share", -1),
    Requirement.FEWEST_SITES: _setting("fewest_sites", -1, int),
    Requirement.MOST_SITES: _setting("most_sites", 1, int),
    Requirement.BUDGET: _setting("one_off_budget", 1),
    Requirement.RULES: _unruled,
    Requirement.RULINGS: _set_free,
}

WHOLE = {
    Requirement.REACH,
    Requirement.BARS,
    Requirement.SINGLE_SOURCING,
    Requirement.RULES,
    Requirement.RULINGS,
}
"""Families whose limits give whole or not at all."""


def assert_true_alone(study: Study, repair: Repair) -> None:
    """Check that a repair makes the study possible, and that less of it does not."""
    assert is_possible(repaired(study, repair, 1 + 1e-6)), repair
    if repair.requirement in WHOLE:
        assert repair.amount == len(repair.parts)
        for part in repair.parts:
            fewer = replace(repair, parts=tuple(other for other in repair.parts if other != part))
            assert not is_possible(repaired(study, fewer)), repair
    else:
        assert not is_possible(repaired(study, repair, 1 - 1e-3)), repair
