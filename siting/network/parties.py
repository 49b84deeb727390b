"""Who sends, holds and receives: the part of a study that decides which lanes exist and what they cost."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from typing import Self

    from siting.arrays import Flags, Floats, Positions
    from siting.study.tables import Study


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Parties:
    """
    Who sends, holds and receives, by position, as far as lanes depend on it.

    Shapes: S sites, O options, K suppliers, C customers, G goods.
    """

    sites: tuple[str, ...]
    suppliers: tuple[str, ...]
    customers: tuple[str, ...]
    goods: tuple[str, ...]
    load: Floats
    """(G,)"""
    weight_t: Floats
    """(G,)"""
    demand: Floats
    """(C, G) units a year."""
    single_source: Flags
    """(C,)"""
    option_site: Positions
    """(O,)"""
    option_capacity: Floats
    """(O,) load a year; inf = unlimited."""
    supplier_capacity: Floats
    """(K,) load a year; inf = unlimited."""
    offered: Flags
    """(K, G)"""
    offer_price: Floats
    """(K, G) money per unit; 0 where not offered."""
    offer_capacity: Floats
    """(K, G) units a year; 0 where not offered, inf = unlimited."""
    offer_least: Floats
    """(K, G) units a year."""

    @classmethod
    def of(cls, study: Study) -> Self:
        """Return the parties of a checked study."""
        sites = tuple(row.site for row in study.sites)
        suppliers = tuple(row.supplier for row in study.suppliers)
        customers = tuple(row.customer for row in study.customers)
        goods = tuple(row.good for row in study.all_goods)
        site_at, supplier_at, customer_at, good_at = map(_positions, (sites, suppliers, customers, goods))
        demand = np.zeros((len(customers), len(goods)))
        for need in study.all_demands:
            demand[customer_at[need.customer], good_at[need.good]] = need.demand
        shape = (len(suppliers), len(goods))
        offered, price, capacity, least = np.zeros(shape, np.bool_), np.zeros(shape), np.zeros(shape), np.zeros(shape)
        for offer in study.all_offers:
            at = supplier_at[offer.supplier], good_at[offer.good]
            offered[at], price[at], least[at] = True, offer.unit_price, offer.least_yearly
            capacity[at] = or_unlimited(offer.capacity)
        return cls(
            sites=sites,
            suppliers=suppliers,
            customers=customers,
            goods=goods,
            load=np.array([row.load for row in study.all_goods], dtype=np.float64),
            weight_t=np.array([row.weight_t for row in study.all_goods], dtype=np.float64),
            demand=demand,
            single_source=np.array([study.is_single_sourced(row) for row in study.customers], dtype=np.bool_),
            option_site=np.array([site_at[option.site] for option in study.options], dtype=np.int32),
            option_capacity=np.array([option.capacity for option in study.options], dtype=np.float64),
            supplier_capacity=np.array([or_unlimited(row.capacity) for row in study.suppliers], dtype=np.float64),
            offered=offered,
            offer_price=price,
            offer_capacity=capacity,
            offer_least=least,
        )

    def every_good(self, places: int) -> Flags:
        """Return (places, G), True throughout: a place that takes whatever comes."""
        return np.ones((places, len(self.goods)), dtype=np.bool_)

    def largest(self) -> Floats:
        """Return (S,) the capacity of each site's largest option, in load a year."""
        largest = np.zeros(len(self.sites))
        np.maximum.at(largest, self.option_site, self.option_capacity)
        return largest


def or_unlimited(limit: float | None) -> float:
    """Return the limit, or inf where it is blank."""
    return math.inf if limit is None else limit


def _positions(names: tuple[str, ...]) -> dict[str, int]:
    return {name: i for i, name in enumerate(names)}
