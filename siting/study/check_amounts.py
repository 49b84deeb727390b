"""Check charges, prices, capacities and counts against one another and against the settings."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

from siting.cells import number_text
from siting.study.columns import ONE_OFF_CHARGES
from siting.study.tables import SiteRuling, SiteStanding

if TYPE_CHECKING:
    from collections.abc import Iterator

    from siting.study.check_rows import Parsed
    from siting.study.draft import Draft

_LEAST_OF = {
    "sites": "least_throughput",
    "sizes": "least_throughput",
    "suppliers": "least_yearly",
    "offers": "least_yearly",
}
"""The least volume that each table's capacity must allow."""

ONE_OFF_MONEY = {
    name: (*columns, "residual_value") if name in {"sites", "sizes"} else columns
    for name, columns in ONE_OFF_CHARGES.items()
}
"""Columns of money that is spread over the years, by table."""


def check_amounts(draft: Draft) -> None:
    """Note every fault among the amounts of a study."""
    _check_standing(draft)
    _check_yearly(draft)
    _check_prices(draft.offers if draft.offers.there else draft.suppliers, draft)
    for table_name, least in _LEAST_OF.items():
        _check_least(draft.tables[table_name], least, draft)
    _check_unlimited(draft)
    _check_residual(draft)
    _check_interest(draft)
    _check_counts(draft)


def _check_standing(draft: Draft) -> None:
    for table, word in ((draft.sites, "proposed"), (draft.suppliers, "offered")):
        name = table.spec.name
        if table.there and "standing" not in table.texts and not draft.gathering.hurt(name, None, "standing"):
            draft.gathering.warn(
                name, None, "standing", "", f"there is no such column: every row is taken as {word}, and there is no "
                "plan of today to measure savings from", "Add the column, to say what is there now",
            )  # fmt: skip


def _check_yearly(draft: Draft) -> None:
    """Note blank yearly charges of proposed sites: a forgotten charge makes a site look free."""
    sites = draft.sites
    if "yearly_charge" not in sites.texts or not draft.is_sound("sites"):
        return
    for index, site in enumerate(sites.rows):
        is_blank = not sites.typed(index, "yearly_charge")
        proposed = site.standing is SiteStanding.PROPOSED and not draft.gathering.hurt("sites", site.row, "standing")
        if is_blank and proposed and site.site not in draft.size_count:
            wrong = "blank at a proposed site, which would look free to run"
            draft.gathering.fault("sites", site.row, "yearly_charge", "", wrong, "Write the charge; type 0 if it is 0")


def _check_prices(table: Parsed[Any], draft: Draft) -> None:
    blank = [row for index, row in enumerate(table.rows) if not table.typed(index, "unit_price")]
    if len(blank) == len(table.rows):
        return
    for row in blank:
        wrong = "blank beside rows with a price, which would look free"
        draft.gathering.fault(table.spec.name, row.row, "unit_price", "", wrong, "Write the price; type 0 if it is 0")


def _check_least(table: Parsed[Any], least: str, draft: Draft) -> None:
    name = table.spec.name
    for index, row in enumerate(table.rows):
        capacity = math.inf if row.capacity is None else row.capacity
        if getattr(row, least) > capacity and not draft.gathering.hurt(name, row.row, "capacity", least):
            wrong = f"{least} is above the capacity ({number_text(capacity)})"
            repair = f"Write at most {number_text(capacity)}, or raise the capacity"
            draft.gathering.fault(name, row.row, least, table.typed(index, least), wrong, repair)


def _check_unlimited(draft: Draft) -> None:
    """Warn of capacities left blank, which count as unlimited."""
    own = {row.supplier for row in draft.suppliers.rows if row.capacity is not None}
    free: dict[str, list[Any]] = {
        "sites": [row for row in draft.sites.rows if row.site not in draft.size_count],
        "suppliers": [] if draft.offers.there else list(draft.suppliers.rows),
        "offers": [row for row in draft.offers.rows if row.supplier not in own],
    }
    for name, rows in free.items():
        blank = [row for row in rows if row.capacity is None and not draft.gathering.hurt(name, row.row, "capacity")]
        if blank and "capacity" not in draft.tables[name].texts:
            if not draft.gathering.hurt(name, None, "capacity"):
                wrong = "there is no such column: every capacity is taken as unlimited"
                draft.gathering.warn(
                    name, None, "capacity", "", wrong, "Add the column, and type unlimited where it is"
                )
            continue
        for row in blank:
            wrong = "blank, taken as unlimited"
            draft.gathering.warn(name, row.row, "capacity", "", wrong, "Write the capacity, or type unlimited")


def _check_residual(draft: Draft) -> None:
    """Warn of sites that give back more than opening them costs: they open to earn money, used or not."""
    for name in ("sites", "sizes"):
        table = draft.tables[name]
        for index, row in enumerate(table.rows):
            if name == "sites" and row.site in draft.size_count:
                continue
            doubtful = draft.gathering.hurt(name, row.row, "opening_charge", "residual_value", "standing")
            proposed = row.standing is SiteStanding.PROPOSED
            if proposed and row.residual_value > row.opening_charge and not doubtful:
                wrong = f"above the opening_charge ({number_text(row.opening_charge)}), as if opening earned money"
                repair = "Check both; the residual_value is what is got back of the opening_charge"
                draft.gathering.warn(
                    name, row.row, "residual_value", table.typed(index, "residual_value"), wrong, repair
                )


def _one_offs(draft: Draft) -> Iterator[tuple[str, int, str, float]]:
    for name, columns in ONE_OFF_MONEY.items():
        for row in draft.tables[name].rows:
            for column in columns:
                unused = column == "residual_value" and row.standing is SiteStanding.RUNNING
                if getattr(row, column) and not unused:
                    yield name, row.row, column, getattr(row, column)


def _check_interest(draft: Draft) -> None:
    """Note that one-off money cannot be spread over years without interest_rate and life_years."""
    place = draft.settings_name
    first = next(_one_offs(draft), None)
    if first is None or place in draft.unreadable:
        return
    table, row, column, value = first
    examples = {"interest_rate": "interest_rate = 0.08 for 8 %", "life_years": "life_years = 10"}
    for name, example in examples.items():
        if getattr(draft.settings, name) is None and not draft.gathering.hurt(place, None, name):
            wrong = f"the setting is missing, but {table} row {row} has a one-off {column} of {number_text(value)}"
            draft.gathering.fault(place, None, name, "", wrong, f"Add it, as in {example}")


def _check_counts(draft: Draft) -> None:
    """Note counts of sites that the table cannot meet."""
    settings, place, gathering = draft.settings, draft.settings_name, draft.gathering
    if not draft.is_sound("sites"):
        return
    available = sum(1 for site in draft.sites.rows if site.ruling is not SiteRuling.PINNED_SHUT)
    pinned = sum(1 for site in draft.sites.rows if site.ruling is SiteRuling.PINNED_OPEN)
    if settings.fewest_sites is not None and settings.fewest_sites > available:
        wrong = f"fewest_sites is above the number of sites that may open ({available})"
        repair = f"Write at most {available}, or add sites"
        gathering.fault(place, None, "fewest_sites", str(settings.fewest_sites), wrong, repair)
    if settings.most_sites is not None and settings.most_sites < pinned:
        wrong = f"most_sites is below the number of sites pinned open ({pinned})"
        repair = f"Write at least {pinned}, or free some of them"
        gathering.fault(place, None, "most_sites", str(settings.most_sites), wrong, repair)
