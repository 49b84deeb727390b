"""The families of requirements a study may be impossible for, and a study with some of them lifted."""

from __future__ import annotations

import math
from dataclasses import replace
from enum import StrEnum
from typing import TYPE_CHECKING

import numpy as np

from siting.study.tables import SiteRuling, SupplierRuling

if TYPE_CHECKING:
    from collections.abc import Set as AbstractSet

    from siting.study.tables import Study


class Requirement(StrEnum):
    """A family of requirements, in the order in which they are explained."""

    LANES = "lanes"
    """A customer needs a lane at all; cannot be lifted, only be met by adding lanes or coordinates."""
    REACH = "reach"
    BARS = "bars"
    SITE_CAPACITY = "site-capacity"
    SUPPLIER_CAPACITY = "supplier-capacity"
    """Of suppliers in load, of offers in units of the good."""
    SINGLE_SOURCING = "single-sourcing"
    LEAST_THROUGHPUT = "least-throughput"
    LEAST_YEARLY = "least-yearly"
    SERVICE_SHARE = "service-share"
    FEWEST_SITES = "fewest-sites"
    MOST_SITES = "most-sites"
    BUDGET = "one-off-budget"
    RULES = "rules"
    RULINGS = "rulings"


STATED = {
    Requirement.LEAST_THROUGHPUT,
    Requirement.LEAST_YEARLY,
    Requirement.SERVICE_SHARE,
    Requirement.FEWEST_SITES,
    Requirement.MOST_SITES,
    Requirement.BUDGET,
    Requirement.RULES,
}
"""Requirements that are rows of the model and nothing else: no link and no lane depends on them."""


def asked(study: Study) -> tuple[Requirement, ...]:
    """
    Return the requirements the study makes that could be lifted, in their order.

    Parameters
    ----------
    study
        Checked.

    Returns
    -------
    requirements
        Those with at least one limit, bar, rule, ruling or single-sourced customer; never `LANES`.
    """
    settings = study.settings
    made = {
        Requirement.REACH: any(row.reach_km is not None for row in study.customers),
        Requirement.BARS: bool(study.lanes.barred.any()),
        Requirement.SITE_CAPACITY: any(math.isfinite(option.capacity) for option in study.options),
        Requirement.SUPPLIER_CAPACITY: any(
            limit is not None and math.isfinite(limit)
            for limit in [*(row.capacity for row in study.suppliers), *(row.capacity for row in study.offers)]
        ),
        Requirement.SINGLE_SOURCING: any(study.is_single_sourced(row) for row in study.customers),
        Requirement.LEAST_THROUGHPUT: any(option.least_throughput > 0 for option in study.options),
        Requirement.LEAST_YEARLY: any(row.least_yearly > 0 for row in study.suppliers)
        or any(row.least_yearly > 0 for row in study.offers),
        Requirement.SERVICE_SHARE: bool(settings.service_share),
        Requirement.FEWEST_SITES: bool(settings.fewest_sites),
        Requirement.MOST_SITES: settings.most_sites is not None and settings.most_sites < len(study.sites),
        Requirement.BUDGET: settings.one_off_budget is not None,
        Requirement.RULES: bool(study.rules),
        Requirement.RULINGS: any(row.ruling is not SiteRuling.FREE for row in study.sites)
        or any(row.ruling is not SupplierRuling.FREE for row in study.suppliers),
    }
    return tuple(requirement for requirement in Requirement if made.get(requirement))


def lifted(study: Study, requirements: AbstractSet[Requirement]) -> Study:
    """
    Return the study without the requirements that change its links or lanes.

    Parameters
    ----------
    study
        Checked.
    requirements
        What to lift. Those of `STATED` stay: the model's rows are softened instead.

    Returns
    -------
    study
        With endless capacity, reach and so on; everything else as it was.
    """
    for requirement in requirements:
        lift = _LIFTS.get(requirement)
        if lift is not None:
            study = lift(study)
    return study


def _without_reach(study: Study) -> Study:
    return replace(study, customers=tuple(replace(row, reach_km=None) for row in study.customers))


def _without_bars(study: Study) -> Study:
    return replace(study, lanes=replace(study.lanes, barred=np.zeros_like(study.lanes.barred)))


def _without_site_capacity(study: Study) -> Study:
    return replace(
        study,
        sites=tuple(replace(row, capacity=None) for row in study.sites),
        sizes=tuple(replace(row, capacity=math.inf) for row in study.sizes),
    )


def _without_supplier_capacity(study: Study) -> Study:
    return replace(
        study,
        suppliers=tuple(replace(row, capacity=None) for row in study.suppliers),
        offers=tuple(replace(row, capacity=None) for row in study.offers),
    )


def _without_single_sourcing(study: Study) -> Study:
    return replace(study, customers=tuple(replace(row, single_source=False) for row in study.customers))


def _without_rulings(study: Study) -> Study:
    return replace(
        study,
        sites=tuple(replace(row, ruling=SiteRuling.FREE) for row in study.sites),
        suppliers=tuple(replace(row, ruling=SupplierRuling.FREE) for row in study.suppliers),
    )


_LIFTS = {
    Requirement.REACH: _without_reach,
    Requirement.BARS: _without_bars,
    Requirement.SITE_CAPACITY: _without_site_capacity,
    Requirement.SUPPLIER_CAPACITY: _without_supplier_capacity,
    Requirement.SINGLE_SOURCING: _without_single_sourcing,
    Requirement.RULINGS: _without_rulings,
}
