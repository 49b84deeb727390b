"""A study while it is being checked: typed rows that may still be at odds with one another."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

from siting.study.gathering import did_you_mean
from siting.study.tables import IMPLIED_GOOD

if TYPE_CHECKING:
    from collections.abc import Collection, Mapping

    from siting.study.check_rows import Parsed
    from siting.study.gathering import Gathering
    from siting.study.settings import Settings
    from siting.study.tables import (
        CircuityRow,
        CustomerRow,
        DemandRow,
        GoodRow,
        OfferRow,
        RuleRow,
        SiteRow,
        SizeRow,
        SupplierRow,
        TariffRow,
    )

KEYS: Mapping[str, str] = {"sites": "site", "suppliers": "supplier", "customers": "customer", "goods": "good"}
"""The column that names the rows of each table other tables refer to."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Draft:
    """Settings and typed tables, and where to note what is wrong with them. Lanes are checked beside it."""

    settings: Settings
    settings_name: str
    given_settings: Collection[str]
    """Names of the settings that were typed."""
    tables: Mapping[str, Parsed[Any]]
    unreadable: Collection[str]
    gathering: Gathering

    @property
    def sites(self) -> Parsed[SiteRow]:
        """The table `sites`."""
        return self.tables["sites"]

    @property
    def suppliers(self) -> Parsed[SupplierRow]:
        """The table `suppliers`."""
        return self.tables["suppliers"]

    @property
    def customers(self) -> Parsed[CustomerRow]:
        """The table `customers`."""
        return self.tables["customers"]

    @property
    def sizes(self) -> Parsed[SizeRow]:
        """The table `sizes`."""
        return self.tables["sizes"]

    @property
    def goods(self) -> Parsed[GoodRow]:
        """The table `goods`."""
        return self.tables["goods"]

    @property
    def demands(self) -> Parsed[DemandRow]:
        """The table `demands`."""
        return self.tables["demands"]

    @property
    def offers(self) -> Parsed[OfferRow]:
        """The table `offers`."""
        return self.tables["offers"]

    @property
    def rules(self) -> Parsed[RuleRow]:
        """The table `rules`."""
        return self.tables["rules"]

    @property
    def tariffs(self) -> Parsed[TariffRow]:
        """The table `tariffs`."""
        return self.tables["tariffs"]

    @property
    def circuity(self) -> Parsed[CircuityRow]:
        """The table `circuity`."""
        return self.tables["circuity"]

    def has(self, table: str) -> bool:
        """Return whether the study has the table, readable or not."""
        return self.tables[table].there or table in self.unreadable

    def is_complete(self) -> bool:
        """Return whether the tables that no study can do without are there."""
        return self.has("customers") and (self.has("sites") or self.has("suppliers"))

    def is_sound(self, *tables: str) -> bool:
        """Return whether the names of these tables can be relied upon, so that others may be held against them."""
        return not any(
            table in self.unreadable or (table in KEYS and self.gathering.hurt(table, None, KEYS[table]))
            for table in tables
        )

    @cached_property
    def names(self) -> Mapping[str, Collection[str]]:
        """
        The names of sites, suppliers, customers and goods.

        A name refused for the blanks around it counts as it should be written, so that it is reported once.
        """
        found: dict[str, dict[str, None]] = {}
        for table, key in KEYS.items():
            typed = self.tables[table].texts.get(key, ())
            found[table] = dict.fromkeys(name for text in typed for name in (text, text.strip()) if name)
        if not self.has("goods"):
            found["goods"] = {IMPLIED_GOOD: None}
        return found

    @cached_property
    def size_count(self) -> Counter[str]:
        """Number of sizes of each site that has any."""
        return Counter(row.site for row in self.sizes.rows if row.site)

    def check_known(self, table: str, row: int, column: str, name: str, of: str) -> bool:
        """Return whether ``name`` is one of the names of the table ``of``, after noting a fault where it is not."""
        if not name or self.gathering.hurt(table, row, column) or not self.is_sound(of):
            return False
        if name in self.names[of]:
            return True
        repair = did_you_mean(name, self.names[of], f"Add it to {of}, or delete the row")
        self.gathering.fault(table, row, column, name, f"no such {KEYS[of]} in {of}", repair)
        return False
