"""
A study turned into numbers: arrays of charges, capacities and lane costs per unit.

Positions follow the order of the study's tables. An *option* is one way a site may be open: one of its sizes, or the
site itself where it has none (`Study.options`). Money is yearly unless the name says one-off; amounts are units of the
good a year; load = amount x the good's load.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from siting.network.annualise import factors_of
from siting.network.freight import LegLanes
from siting.network.legs import direct_lanes, inbound_lanes, outbound_lanes
from siting.network.parties import Parties
from siting.network.tariffs import tariff_names
from siting.study.tables import SiteRuling, SiteStanding, SupplierRuling, SupplierStanding

if TYPE_CHECKING:
    from collections.abc import Iterable

    from siting.arrays import Flags, Floats, Positions
    from siting.study.tables import RuleKind, Study

__all__ = ["LegLanes", "Network", "NetworkRule", "build_network"]


@dataclass(frozen=True, slots=True, kw_only=True)
class NetworkRule:
    """One rule with its members as positions."""

    kind: RuleKind
    members: tuple[tuple[str, int], ...]
    """("site" or "supplier", position) in the order typed."""
    number: int | None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Network:
    """
    Numbers of a study; see the module for the words.

    Shapes: S sites, O options, K suppliers, C customers, G goods.
    """

    sites: tuple[str, ...]
    suppliers: tuple[str, ...]
    customers: tuple[str, ...]
    goods: tuple[str, ...]

    load: Floats
    """(G,) capacity used by one unit."""
    weight_t: Floats
    """(G,) tonnes per unit."""
    demand: Floats
    """(C, G) units a year."""
    single_source: Flags
    """(C,)"""

    option_site: Positions
    """(O,) ascending."""
    option_running: Flags
    """(O,) True for the size that is there today."""
    option_charge: Floats
    """(O,) yearly_charge + annualised opening charge less residual (proposed options only)."""
    option_one_off: Floats
    """(O,) opening charge, one-off; 0 for a running option."""
    option_capacity: Floats
    """(O,) load a year; inf = unlimited."""
    option_least: Floats
    """(O,) load a year."""

    site_running: Flags
    """(S,)"""
    site_closing: Floats
    """(S,) annualised closing charge, paid when no option of the site is open; 0 unless running."""
    site_closing_one_off: Floats
    """(S,) the same, one-off."""
    site_pinned_open: Flags
    """(S,)"""
    site_pinned_shut: Flags
    """(S,)"""

    supplier_signed: Flags
    """(K,)"""
    supplier_charge: Floats
    """(K,) yearly_charge + annualised signing charge (offered suppliers only)."""
    supplier_one_off: Floats
    """(K,) signing charge, one-off; 0 for a signed supplier."""
    supplier_dropping: Floats
    """(K,) annualised dropping charge, paid when a signed supplier is dropped; 0 unless signed."""
    supplier_dropping_one_off: Floats
    """(K,) the same, one-off."""
    supplier_capacity: Floats
    """(K,) load a year over all goods; inf = unlimited."""
    supplier_least: Floats
    """(K,) load a year over all goods, while signed."""
    supplier_pinned_signed: Flags
    """(K,)"""
    supplier_pinned_unsigned: Flags
    """(K,)"""
    offer_capacity: Floats
    """(K, G) units a year; 0 where not offered, inf = unlimited."""
    offer_least: Floats
    """(K, G) units a year, while signed."""

    inbound: LegLanes
    outbound: LegLanes
    direct: LegLanes

    tariffs: tuple[str, ...] = ()
    """Names that `LegLanes.tariff` points to."""

    rules: tuple[NetworkRule, ...]
    fewest_sites: int
    """0 where not set."""
    most_sites: int
    """S where not set."""
    one_off_budget: float
    """inf where not set."""
    service_km: float
    """inf where not set."""
    service_share: float
    """0 where not set."""
    annuity: float
    """Yearly money per one-off money; 0 where the study sets no interest rate and life (no one-off charge)."""

    @property
    def two_echelons(self) -> bool:
        """True where suppliers and sites exist, so that inflow equals outflow at each site and good."""
        return bool(self.suppliers) and bool(self.sites)


def build_network(study: Study) -> Network:
    """
    Return the numbers of a checked study.

    Parameters
    ----------
    study
        Checked: names agree, charges have an interest rate and a life, lanes that need a distance have one.

    Returns
    -------
    network
        Every array in the order of the study's tables; lanes sorted by origin, destination and good.

    Raises
    ------
    SettingsError
        If the interest rate or the life is out of its range.
    """
    parties = Parties.of(study)
    settings, options, sites, suppliers = study.settings, study.options, study.sites, study.suppliers
    annuity, worth = factors_of(settings)
    proposed = _flags(option.standing is SiteStanding.PROPOSED for option in options)
    running = _running_sites(study)
    signed = _flags(row.standing is SupplierStanding.SIGNED for row in suppliers)
    opening = _floats(option.opening_charge for option in options)
    residual = _floats(option.residual_value for option in options)
    signing = _floats(row.signing_charge for row in suppliers)
    closing = np.where(running, _floats(row.closing_charge for row in sites), 0.0)
    dropping = np.where(signed, _floats(row.dropping_charge for row in suppliers), 0.0)
    return Network(
        sites=parties.sites,
        suppliers=parties.suppliers,
        customers=parties.customers,
        goods=parties.goods,
        load=parties.load,
        weight_t=parties.weight_t,
        demand=parties.demand,
        single_source=parties.single_source,
        option_site=parties.option_site,
        option_running=~proposed,
        option_charge=_floats(option.yearly_charge for option in options)
        + np.where(proposed, annuity * (opening - worth * residual), 0.0),
        option_one_off=np.where(proposed, opening, 0.0),
        option_capacity=parties.option_capacity,
        option_least=_floats(option.least_throughput for option in options),
        site_running=running,
        site_closing=annuity * closing,
        site_closing_one_off=closing,
        site_pinned_open=_flags(row.ruling is SiteRuling.PINNED_OPEN for row in sites),
        site_pinned_shut=_flags(row.ruling is SiteRuling.PINNED_SHUT for row in sites),
        supplier_signed=signed,
        supplier_charge=_floats(row.yearly_charge for row in suppliers) + np.where(signed, 0.0, annuity * signing),
        supplier_one_off=np.where(signed, 0.0, signing),
        supplier_dropping=annuity * dropping,
        supplier_dropping_one_off=dropping,
        supplier_capacity=parties.supplier_capacity,
        supplier_least=_floats(row.least_yearly for row in suppliers),
        supplier_pinned_signed=_flags(row.ruling is SupplierRuling.PINNED_SIGNED for row in suppliers),
        supplier_pinned_unsigned=_flags(row.ruling is SupplierRuling.PINNED_UNSIGNED for row in suppliers),
        offer_capacity=parties.offer_capacity,
        offer_least=parties.offer_least,
        inbound=inbound_lanes(study, parties),
        outbound=outbound_lanes(study, parties),
        direct=direct_lanes(study, parties),
        tariffs=tariff_names(study),
        rules=_rules(study),
        fewest_sites=settings.fewest_sites or 0,
        most_sites=len(sites) if settings.most_sites is None else settings.most_sites,
        one_off_budget=math.inf if settings.one_off_budget is None else settings.one_off_budget,
        service_km=math.inf if settings.service_km is None else settings.service_km,
        service_share=settings.service_share or 0.0,
        annuity=annuity,
    )


def _floats(numbers: Iterable[float]) -> Floats:
    return np.fromiter(numbers, dtype=np.float64)


def _flags(answers: Iterable[bool]) -> Flags:
    return np.fromiter(answers, dtype=np.bool_)


def _running_sites(study: Study) -> Flags:
    """Return where a site runs: as its row says, or, where it has sizes, as one of them says."""
    sizes = {size.site for size in study.sizes if size.standing is SiteStanding.RUNNING}
    return _flags(row.standing is SiteStanding.RUNNING or row.site in sizes for row in study.sites)


def _rules(study: Study) -> tuple[NetworkRule, ...]:
    member = {row.site: ("site", i) for i, row in enumerate(study.sites)}
    member |= {row.supplier: ("supplier", k) for k, row in enumerate(study.suppliers)}
    return tuple(
        NetworkRule(kind=row.rule, members=tuple(member[name] for name in row.members), number=row.number)
        for row in study.rules
    )
