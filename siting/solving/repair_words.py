"""Repairs in words: which requirement cannot be met, and by how much, as an analyst would say it."""

from __future__ import annotations

import math
from decimal import Decimal
from typing import TYPE_CHECKING

import numpy as np

from siting.network.network import build_network
from siting.plan.plan import Reason
from siting.solving.requirements import Requirement, lifted

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.arrays import Floats
    from siting.network.network import Network
    from siting.solving.conflicts import Conflict
    from siting.solving.elastic import Repair
    from siting.study.tables import RuleRow, Study

PERCENT = 100.0

ALIKE = 1e-6
"""Relative difference below which what is short is what all sites together lack."""

NAMED = 10
"""Names listed in a sentence before the rest is only counted."""


def shown(amount: float) -> str:
    """
    Return an amount with six digits, rounded up so that the repair it states is enough.

    Parameters
    ----------
    amount
        At least 0, in any unit.

    Returns
    -------
    text
        Such as `1,240` or `0.0425`.
    """
    if amount <= 0:
        return "0"
    step = 10.0 ** (math.floor(math.log10(amount)) - 5)
    up = math.ceil(amount / step - 1e-3) * step
    return f"{up:,.0f}" if step >= 1 else f"{up:,.{max(0, round(-math.log10(step)))}f}".rstrip("0").rstrip(".")


class Words:
    """Says what a repair of one study means."""

    def __init__(self, study: Study, network: Network) -> None:
        self._study = study
        self._network = network

    def reason(self, repair: Repair, conflicts: Sequence[Conflict], *, together: bool) -> Reason:
        """
        Return a repair as a reason.

        Parameters
        ----------
        repair
            Of this study.
        conflicts
            Of its rules, where the repair lifts rules.
        together
            True where other repairs are needed as well.

        Returns
        -------
        reason
            Its sentence ends with a full stop.
        """
        say = {
            Requirement.LANES: self._lanes,
            Requirement.REACH: self._reach,
            Requirement.BARS: self._bars,
            Requirement.SITE_CAPACITY: self._site_capacity,
            Requirement.SUPPLIER_CAPACITY: self._supplier_capacity,
            Requirement.SINGLE_SOURCING: self._single_sourcing,
            Requirement.LEAST_THROUGHPUT: self._least_throughput,
            Requirement.LEAST_YEARLY: self._least_yearly,
            Requirement.SERVICE_SHARE: self._service_share,
            Requirement.FEWEST_SITES: self._fewest_sites,
            Requirement.MOST_SITES: self._most_sites,
            Requirement.BUDGET: self._budget,
            Requirement.RULINGS: self._rulings,
        }
        if repair.requirement is Requirement.RULES:
            sentence, unit = self._rules(repair, conflicts)
        else:
            sentence, unit = say[repair.requirement](repair)
        amount = repair.amount
        if repair.requirement is Requirement.SERVICE_SHARE:
            amount = self._points(repair)
        if not repair.smallest:
            sentence += " Less may do: time ran out on the search for the smallest repair."
        if together:
            sentence += " Not enough alone."
        return Reason(family=str(repair.requirement), sentence=sentence, amount=amount, unit=unit)

    def _lanes(self, repair: Repair) -> tuple[str, str]:
        who, have = _these(repair, "customer"), "has" if len(repair.parts) == 1 else "have"
        return (
            f"{who} {have} no lane at all, whatever is lifted: {_names(repair)}. Give coordinates or list a lane from "
            "a site or supplier that can bring the goods."
        ), "customers"

    def _reach(self, repair: Repair) -> tuple[str, str]:
        """Name the customers whose reach has to be lifted, with what is nearest to each."""
        far = build_network(lifted(self._study, {Requirement.REACH}))
        reached = {*self._network.outbound.destination.tolist(), *self._network.direct.destination.tolist()}
        listed = []
        alone = True
        for place, _ in repair.parts:
            customer = self._network.customers.index(place[0])
            alone = alone and customer not in reached
            km = _km_to(customer, far)
            if not km.size:  # what is nearest is barred, or too small for the customer, as well
                km = _km_to(customer, build_network(lifted(self._study, set(Requirement))))
            listed.append(_reach_of(place[0], self._study.customers[customer].reach_km or 0.0, km))
        origin = "supplier" if not self._study.sites else "site or supplier" if len(far.direct) else "site"
        who = _these(repair, "customer")
        if alone:
            have = "has" if len(repair.parts) == 1 else "have"
            return f"{who} {have} no {origin} within reach: {_some(listed)}.", "customers"
        return f"{who} can only be served from beyond reach: {_some(listed)}.", "customers"

    def _bars(self, repair: Repair) -> tuple[str, str]:
        lanes = _some([" to ".join(place) for place, _ in repair.parts])
        stand = "stands" if len(repair.parts) == 1 else "stand"
        return f"{_these(repair, 'bar')} {stand} in the way: {lanes}.", "bars"

    def _site_capacity(self, repair: Repair) -> tuple[str, str]:
        unit = self._study.settings.unit
        largest = np.zeros(len(self._network.sites))
        np.maximum.at(largest, self._network.option_site, self._network.option_capacity)
        load = float((self._network.demand @ self._network.load).sum())
        total = not len(self._network.direct) and math.isclose(load - largest.sum(), repair.amount, rel_tol=ALIKE)
        what = "The total capacity of all sites" if total else "Site capacity"
        return f"{what} is short by {shown(repair.amount)} {unit}; enough: {_more(repair, unit)}.", unit

    def _supplier_capacity(self, repair: Repair) -> tuple[str, str]:
        unit = self._study.settings.unit
        enough = _more(repair, unit)
        return f"Supplier capacity is short by {shown(repair.amount)} {unit}; enough: {enough}.", unit

    def _single_sourcing(self, repair: Repair) -> tuple[str, str]:
        who = _these(repair, "customer")
        return f"{who} cannot be taken whole from one origin, only split: {_names(repair)}.", "customers"

    def _least_throughput(self, repair: Repair) -> tuple[str, str]:
        unit = self._study.settings.unit
        amount = shown(repair.amount)
        return f"Least throughput is {amount} {unit} too high; enough: {_less(repair, unit)}.", unit

    def _least_yearly(self, repair: Repair) -> tuple[str, str]:
        unit = self._study.settings.unit
        amount = shown(repair.amount)
        return f"The least yearly volume of suppliers is {amount} {unit} too high; enough: {_less(repair, unit)}.", unit

    def _service_share(self, repair: Repair) -> tuple[str, str]:
        settings = self._study.settings
        asked, short = round((settings.service_share or 0.0) * PERCENT, 9), shown(self._points(repair))
        can_be = Decimal(str(asked)) - Decimal(short.replace(",", ""))
        at_most = "At most " if repair.smallest else ""
        return (
            f"{at_most}{can_be.normalize():f} % of the weight can be delivered within {settings.service_km:g} km, "
            f"{short} points less than the {asked:g} % asked."
        ), "points"

    def _points(self, repair: Repair) -> float:
        """Return tonnes short as percentage points of all weight."""
        return repair.amount / float((self._network.demand @ self._network.weight_t).sum()) * PERCENT

    def _fewest_sites(self, repair: Repair) -> tuple[str, str]:
        asked, short = self._network.fewest_sites, round(repair.amount)
        return f"fewest_sites is {asked}, {short} more than can be open: at most {asked - short}.", "sites"

    def _most_sites(self, repair: Repair) -> tuple[str, str]:
        allowed, short = self._network.most_sites, round(repair.amount)
        return f"most_sites is {allowed}, {short} too few: {allowed + short} sites are {_needed(repair)}.", "sites"

    def _budget(self, repair: Repair) -> tuple[str, str]:
        currency, budget = self._study.settings.currency, self._network.one_off_budget
        return (
            f"The one-off budget of {shown(budget)} {currency} falls {shown(repair.amount)} {currency} short: "
            f"{shown(budget + repair.amount)} {currency} are {_needed(repair)}."
        ), currency

    def _rulings(self, repair: Repair) -> tuple[str, str]:
        ruling = {row.site: row.ruling.value for row in self._study.sites}
        ruling |= {row.supplier: row.ruling.value for row in self._study.suppliers}
        listed = _some([f"{place[0]} {ruling[place[0]]}" for place, _ in repair.parts])
        stand = "stands" if len(repair.parts) == 1 else "stand"
        return f"{_these(repair, 'ruling')} {stand} in the way: {listed}.", "rulings"

    def _rules(self, repair: Repair, conflicts: Sequence[Conflict]) -> tuple[str, str]:
        """Say which rules contradict each other, and which to take out."""
        said = []
        for conflict in conflicts:
            which = _rows(list(conflict.rules))
            if conflict.among_themselves and len(conflict.rules) > 1:
                said.append(f"{which} contradict each other.")
            else:
                said.append(f"{which} cannot be met together with the other requirements.")
        out = _rows([self._study.rules[int(place[0])] for place, _ in repair.parts])
        return " ".join([*said, f"Enough: take out {out[0].lower()}{out[1:]}."]), "rules"


def _reach_of(name: str, reach: float, km: Floats) -> str:
    """Return a customer with its reach and what is nearest, or nearest beyond it where what lies within is full."""
    nearest, beyond = float(np.nanmin(km)), km[km > reach]
    if nearest > reach or not beyond.size:
        return f"{name} (reach {shown(reach)} km, nearest {shown(nearest)} km)"
    return f"{name} (reach {shown(reach)} km, nearest beyond it {shown(float(beyond.min()))} km)"


def _km_to(customer: int, network: Network) -> Floats:
    """Return the road km of every lane to a customer."""
    legs = (network.outbound, network.direct)
    return np.concatenate([lanes.km[lanes.destination == customer] for lanes in legs])


def _needed(repair: Repair) -> str:
    """Return what a larger limit is: needed where it is the smallest, else only enough."""
    return "needed" if repair.smallest else "enough"


def _rows(rules: Sequence[RuleRow]) -> str:
    numbers = [str(row) for row in sorted(rule.row for rule in rules)]
    if len(numbers) == 1:
        return f"The rule in row {numbers[0]}"
    return f"The rules in rows {', '.join(numbers[:-1])} and {numbers[-1]}"


def _these(repair: Repair, noun: str) -> str:
    count = len(repair.parts)
    return f"This {noun}" if count == 1 else f"These {count} {noun}s"


def _names(repair: Repair) -> str:
    return _some([place[0] for place, _ in repair.parts])


def _some(names: Sequence[str]) -> str:
    listed = ", ".join(names[:NAMED])
    return listed if len(names) <= NAMED else f"{listed} and {len(names) - NAMED} more"


def _more(repair: Repair, unit: str) -> str:
    return _some([f"{_limit(place)} +{shown(amount)} {unit}" for place, amount in repair.parts if place])


def _less(repair: Repair, unit: str) -> str:
    return _some([f"{_limit(place)} -{shown(amount)} {unit}" for place, amount in repair.parts if place])


def _limit(place: tuple[str, ...]) -> str:
    return place[0] if len(place) == 1 else f"{place[0]}'s {place[1]}"
