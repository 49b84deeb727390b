"""
What a question imposes on a study: sites and suppliers held out or in, verdicts held, an exact number of sites.

Every restriction is a study and a network derived from those asked about, so that the plan found under it can be drawn
up and audited like any other. The ruling of whatever a restriction holds out or in is lifted; all others hold.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, fields, replace
from typing import TYPE_CHECKING

import numpy as np

from siting.errors import SettingsError
from siting.plan.plan import LOAD_TOLERANCE, SiteVerdict, SupplierVerdict
from siting.study.tables import SiteRuling, SupplierRuling

if TYPE_CHECKING:
    from collections.abc import Iterable

    from siting.arrays import Flags, Floats
    from siting.network.decisions import Decisions
    from siting.network.network import Network
    from siting.plan.plan import Plan
    from siting.study.tables import Study

LEAST_SHARE = 1e-6
"""Share of the most a site or supplier can move that counts as moving something: well above a solver's tolerance."""

NONE: frozenset[str] = frozenset()

OPEN = frozenset({SiteVerdict.KEEP, SiteVerdict.OPEN})
SIGNED = frozenset({SupplierVerdict.STAY, SupplierVerdict.SIGN})


@dataclass(frozen=True, slots=True, kw_only=True)
class Restriction:
    """
    What is imposed on top of the study. Names are of sites and suppliers, which never share one.

    A *part* is a name with a size: "" for a supplier and for a site without sizes.
    """

    out: frozenset[str] = NONE
    """Not open, not signed."""
    taken: frozenset[str] = NONE
    """Open, signed; something may move or not."""
    used: frozenset[str] = NONE
    """Open or signed, and something moves. The cost is the least that any such plan comes near to, however little."""
    idle: frozenset[tuple[str, str]] = frozenset()
    """Parts through which no load moves; they may stay open or signed, where nothing least is asked of them."""
    without: frozenset[tuple[str, str]] = frozenset()
    """Parts of sites that are not open; the site may be open at another size."""
    held: frozenset[tuple[str, str]] | None = None
    """Where given, these parts are open and signed and nothing else is."""
    sites_exactly: int | None = None
    """Number of sites open."""

    @property
    def text(self) -> str:
        """The restriction as text, the same for the same restriction; empty where nothing is imposed."""
        imposed = {}
        for each in fields(self):
            value = getattr(self, each.name)
            if isinstance(value, frozenset):
                if value or each.name == "held":
                    imposed[each.name] = sorted(value)
            elif value is not None:
                imposed[each.name] = value
        return json.dumps(imposed, sort_keys=True) if imposed else ""

    @property
    def names(self) -> frozenset[str]:
        """Every site and supplier held out or in, whose ruling is lifted."""
        return self.out | self.pinned

    @property
    def pinned(self) -> frozenset[str]:
        """What is open or signed for sure."""
        return self.taken | self.used | ({name for name, _ in self.held} if self.held else NONE)


def restricted_study(study: Study, restriction: Restriction) -> Study:
    """
    Return the study with the rulings and counts of a restriction, fit to audit the plan found under it.

    Parameters
    ----------
    study
        The study asked about.
    restriction
        What is imposed.

    Returns
    -------
    study
        The same but for rulings and counts; what no ruling can say (idle parts, sizes) is checked by `obeys`.

    Raises
    ------
    SettingsError
        If the restriction names what the study does not have.
    """
    _refuse_unknown(study, restriction)
    shut, pinned, named = _shut(study, restriction), restriction.pinned, restriction.names
    settings = study.settings
    if restriction.sites_exactly is not None:
        settings = replace(settings, fewest_sites=restriction.sites_exactly, most_sites=restriction.sites_exactly)

    def site(name: str, ruling: SiteRuling) -> SiteRuling:
        if name in shut:
            return SiteRuling.PINNED_SHUT
        return SiteRuling.PINNED_OPEN if name in pinned else SiteRuling.FREE if name in named else ruling

    def supplier(name: str, ruling: SupplierRuling) -> SupplierRuling:
        if name in shut:
            return SupplierRuling.PINNED_UNSIGNED
        return SupplierRuling.PINNED_SIGNED if name in pinned else SupplierRuling.FREE if name in named else ruling

    return replace(
        study,
        settings=settings,
        sites=tuple(replace(row, ruling=site(row.site, row.ruling)) for row in study.sites),
        suppliers=tuple(replace(row, ruling=supplier(row.supplier, row.ruling)) for row in study.suppliers),
    )


def tightens(study: Study, restriction: Restriction) -> bool:
    """
    Return whether a restriction lifts nothing the study imposes, so that what bounds the study bounds it too.

    Parameters
    ----------
    study
        The study asked about.
    restriction
        What is imposed.

    Returns
    -------
    tightens
        False where a ruling against it is lifted, or its number of sites is one the study rules out.
    """
    shut = _shut(study, restriction)
    against = {row.site for row in study.sites if row.ruling is SiteRuling.PINNED_OPEN and row.site in shut}
    against |= {row.supplier for row in study.suppliers if row.ruling is SupplierRuling.PINNED_SIGNED} & shut
    against |= {row.site for row in study.sites if row.ruling is SiteRuling.PINNED_SHUT} & restriction.pinned
    unsigned = {row.supplier for row in study.suppliers if row.ruling is SupplierRuling.PINNED_UNSIGNED}
    count, settings = restriction.sites_exactly, study.settings
    fewest, most = settings.fewest_sites or 0, settings.most_sites
    counted = count is None or (fewest <= count and (most is None or count <= most))
    return counted and not against and not unsigned & restriction.pinned


def _refuse_unknown(study: Study, restriction: Restriction) -> None:
    """Refuse names and sizes that the study does not have."""
    parts = {(option.site, option.size) for option in study.options} | {(row.supplier, "") for row in study.suppliers}
    wrong = sorted(restriction.names - {name for name, _ in parts})
    asked = restriction.idle | restriction.without | (restriction.held or frozenset())
    wrong += sorted(" ".join(part).strip() for part in asked - parts)
    if wrong:
        msg = f"the study has no site or supplier {', '.join(wrong)}. Name one of its tables, with a size it has."
        raise SettingsError(msg)


def _shut(study: Study, restriction: Restriction) -> frozenset[str]:
    """Return every name that is not open or signed for sure."""
    if restriction.held is None:
        return restriction.out | _never_idle_suppliers(study, restriction)
    everyone = {row.site for row in study.sites} | {row.supplier for row in study.suppliers}
    return restriction.out | frozenset(everyone - restriction.pinned)


def _never_idle_suppliers(study: Study, restriction: Restriction) -> frozenset[str]:
    """Return the suppliers that are to be idle but have a least volume, so that they cannot be signed at all."""
    idle = {name for name, _ in restriction.idle}
    least = {row.supplier for row in study.suppliers if row.least_yearly > 0}
    least |= {row.supplier for row in study.all_offers if row.least_yearly > 0}
    return frozenset(idle & least)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Restricted:
    """A restriction in numbers."""

    study: Study
    """With the restriction's rulings and counts."""
    network: Network
    """Its numbers: the network asked about with other pins and counts."""
    searched: Network
    """The same as an engine gets it: without the options that may not open, idle parts without capacity."""
    kept: Flags
    """(O,) the options of `network` that `searched` has."""

    def narrow(self, decisions: Decisions) -> Decisions:
        """Return decisions of `network` as decisions of `searched`; what has no place there is not open."""
        return replace(decisions, option_open=decisions.option_open[self.kept])

    def widen(self, decisions: Decisions) -> Decisions:
        """Return decisions of `searched` as decisions of `network`."""
        option_open = np.zeros(self.kept.size, dtype=np.bool_)
        option_open[self.kept] = decisions.option_open
        return replace(decisions, option_open=option_open)


def restrict(study: Study, network: Network, restriction: Restriction) -> Restricted:
    """
    Return a restriction in numbers.

    Parameters
    ----------
    study
        The study asked about.
    network
        Its numbers, which the restricted network shares.
    restriction
        What is imposed.

    Returns
    -------
    restricted
        Study and networks under the restriction. `used` counts as `taken` here; `moving` asks for the rest.

    Raises
    ------
    SettingsError
        If the restriction names what the study does not have.
    """
    imposed = restricted_study(study, restriction)
    settings = imposed.settings
    pinned = replace(
        network,
        site_pinned_open=_where(row.ruling is SiteRuling.PINNED_OPEN for row in imposed.sites),
        site_pinned_shut=_where(row.ruling is SiteRuling.PINNED_SHUT for row in imposed.sites),
        supplier_pinned_signed=_where(row.ruling is SupplierRuling.PINNED_SIGNED for row in imposed.suppliers),
        supplier_pinned_unsigned=_where(row.ruling is SupplierRuling.PINNED_UNSIGNED for row in imposed.suppliers),
        fewest_sites=settings.fewest_sites or 0,
        most_sites=len(study.sites) if settings.most_sites is None else settings.most_sites,
    )
    kept = _kept(study, pinned, restriction)
    return Restricted(study=imposed, network=pinned, searched=_narrowed(study, pinned, restriction, kept), kept=kept)


def _where(answers: Iterable[bool]) -> Flags:
    return np.fromiter(answers, dtype=np.bool_)


def _kept(study: Study, network: Network, restriction: Restriction) -> Flags:
    """Return (O,) the options that may open: not those held out, and no idle one that has a least throughput."""
    kept = np.ones(network.option_site.size, dtype=np.bool_)
    for at, option in enumerate(study.options):
        part = (option.site, option.size)
        kept[at] = part not in restriction.without and (restriction.held is None or part in restriction.held)
        kept[at] &= part not in restriction.idle or option.least_throughput <= 0
    return kept


def _narrowed(study: Study, network: Network, restriction: Restriction, kept: Flags) -> Network:
    """Return the network with only the options kept; sites left without any are shut."""
    if not restriction.idle and kept.all():
        return network
    capacity = network.option_capacity.copy()
    for at, option in enumerate(study.options):
        if (option.site, option.size) in restriction.idle:
            capacity[at] = 0.0
    volume = network.supplier_capacity.copy()
    for at, row in enumerate(study.suppliers):
        if (row.supplier, "") in restriction.idle:
            volume[at] = 0.0
    has_option = np.zeros(len(network.sites), dtype=np.bool_)
    has_option[network.option_site[kept]] = True
    return replace(
        network,
        option_site=network.option_site[kept],
        option_running=network.option_running[kept],
        option_charge=network.option_charge[kept],
        option_one_off=network.option_one_off[kept],
        option_capacity=capacity[kept],
        option_least=network.option_least[kept],
        site_pinned_shut=network.site_pinned_shut | ~has_option,
        supplier_capacity=volume,
    )


def moving(network: Network, names: frozenset[str]) -> Network:
    """
    Return the network in which something has to move through each of the names once it is open or signed.

    Parameters
    ----------
    network
        With the names pinned open or signed.
    names
        Sites and suppliers.

    Returns
    -------
    network
        With a least volume of `LEAST_SHARE` of the most that can move, at least twice `LOAD_TOLERANCE`.
    """
    site, supplier = _load_within(network)
    least, volume = network.option_least.copy(), network.supplier_least.copy()
    for at, place in enumerate(network.option_site.tolist()):
        if network.sites[place] in names:
            most = min(float(network.option_capacity[at]), float(site[place]))
            least[at] = max(float(least[at]), LEAST_SHARE * most, 2 * LOAD_TOLERANCE)
    for at, name in enumerate(network.suppliers):
        if name in names:
            most = min(float(network.supplier_capacity[at]), supplier)
            volume[at] = max(float(volume[at]), LEAST_SHARE * most, 2 * LOAD_TOLERANCE)
    return replace(network, option_least=least, supplier_least=volume)


def _load_within(network: Network) -> tuple[Floats, float]:
    """Return (S,) the load demanded within each site's lanes, and all load demanded."""
    within, lanes = np.zeros(len(network.sites)), network.outbound
    np.add.at(within, lanes.origin, network.demand[lanes.destination, lanes.good] * network.load[lanes.good])
    return within, float((network.demand @ network.load).sum())


def obeys(plan: Plan, restriction: Restriction) -> tuple[str, ...]:
    """
    Return where a plan does not obey what no ruling says: sizes, idle parts and held verdicts.

    Parameters
    ----------
    plan
        Found under the restriction.
    restriction
        What was imposed.

    Returns
    -------
    faults
        Empty where it obeys.
    """
    parts = parts_of(plan)
    through = {line.site: line.throughput for line in plan.sites}
    through |= {line.supplier: line.volume for line in plan.suppliers}
    ruled_out = sorted(" ".join(part).strip() for part in parts & restriction.without)
    faults = [f"{part} is open, which was ruled out" for part in ruled_out]
    faults += [
        f"{name} moves {through[name]:g}, which was ruled out"
        for name, _ in sorted(parts & restriction.idle)
        if through[name] > LOAD_TOLERANCE
    ]
    if restriction.held is not None and parts != restriction.held:
        faults.append(f"verdicts that were held differ: {sorted(parts ^ restriction.held)}")
    return tuple(faults)


def parts_of(plan: Plan) -> frozenset[tuple[str, str]]:
    """Return what a plan opens or keeps, by site and size, and whom it signs or stays with, as (supplier, "")."""
    sites = {(line.site, line.size) for line in plan.sites if line.verdict in OPEN}
    return frozenset(sites | {(line.supplier, "") for line in plan.suppliers if line.verdict in SIGNED})
