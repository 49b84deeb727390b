"""Check the `circuity` table: one factor for each pair of countries, and countries that places are in."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.study.check_tariffs import countries_of
from siting.study.countries import country_key

if TYPE_CHECKING:
    from siting.study.draft import Draft


def check_circuity(draft: Draft) -> None:
    """Note pairs of countries that are there twice, and warn of countries without a place."""
    if not draft.circuity.rows:
        return
    there, first = countries_of(draft), dict[frozenset[str], int]()
    for row in draft.circuity.rows:
        if draft.gathering.hurt("circuity", row.row, "country"):
            continue
        pair = frozenset(country_key(country) for country in (row.country, row.other_country or row.country))
        before = first.setdefault(pair, row.row)
        if before != row.row:
            wrong = f"the same countries are already in row {before}, in whichever order"
            draft.gathering.fault("circuity", row.row, "country", row.country, wrong, "Delete one of the two rows")
        for column, country in (("country", row.country), ("other_country", row.other_country)):
            if country.strip() and country_key(country) not in there:
                wrong = "no place of the study has this country, so that no distance goes by the row"
                repair = "Write it as in sites, suppliers or customers; codes such as AT and names both do"
                draft.gathering.warn("circuity", row.row, column, country, wrong, repair)
