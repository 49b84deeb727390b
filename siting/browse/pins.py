"""Pins set from a page: rulings written into a draft's tables, every other cell as it was."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.study.tables import SiteRuling, SupplierRuling

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.browse.drafts import Draft

TABLES = {"site": "sites", "supplier": "suppliers"}
RULING = "ruling"

IN, OUT, FREE = "in", "out", "free"
"""What a tick asks for: always open or signed, never, or whatever is best."""

RULINGS: Mapping[str, Mapping[str, str]] = {
    "site": {IN: SiteRuling.PINNED_OPEN, OUT: SiteRuling.PINNED_SHUT, FREE: SiteRuling.FREE},
    "supplier": {IN: SupplierRuling.PINNED_SIGNED, OUT: SupplierRuling.PINNED_UNSIGNED, FREE: SupplierRuling.FREE},
}


def pins_of(draft: Draft) -> dict[tuple[str, str], str]:
    """
    Return what is pinned in the tables as they are, by kind and name; empty while they have faults.

    Parameters
    ----------
    draft
        Its tables.

    Returns
    -------
    pins
        `IN`, `OUT` or `FREE` of every site and supplier.
    """
    study = draft.checked.study
    if study is None:
        return {}
    words = {kind: {ruling: pin for pin, ruling in rulings.items()} for kind, rulings in RULINGS.items()}
    pins = {("site", row.site): words["site"][row.ruling] for row in study.sites}
    return pins | {("supplier", row.supplier): words["supplier"][row.ruling] for row in study.suppliers}


def put_pins(draft: Draft, pins: Mapping[tuple[str, str], str]) -> bool:
    """
    Write pins into the draft's tables as rulings; returns whether anything changed.

    Parameters
    ----------
    draft
        Its tables; only the column `ruling` of the rows that are named is written, and only where it differs.
    pins
        `IN`, `OUT` or `FREE` by kind and name.
    """
    now, changed = pins_of(draft), False
    for kind, table in TABLES.items():
        asked = {name: pin for (of, name), pin in pins.items() if of == kind and now.get((kind, name), FREE) != pin}
        if not asked or table not in draft.raw.tables:
            continue
        frame = draft.table(table)
        names = frame[kind].fillna("").str.strip()
        for name, pin in asked.items():
            frame.loc[names == name, RULING] = str(RULINGS[kind][pin])
        changed = draft.put_table(table, frame) or changed
    return changed
