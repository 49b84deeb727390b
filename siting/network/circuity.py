"""
Road distance over straight-line distance, for each pair of countries.

Within a country its own row of `circuity` holds; between two, the row of that pair, else the mean of their own. A
country without a row of its own, and a place without a country, goes by the circuity of the settings.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from siting.study.countries import country_key

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.arrays import Floats, Positions
    from siting.study.tables import CustomerRow, SiteRow, Study, SupplierRow

    Places = Sequence[SiteRow | CustomerRow | SupplierRow]


def countries_of(study: Study, rows: Places) -> tuple[tuple[str, ...], Positions]:
    """
    Return the different countries of places, as far as circuity depends on them.

    Parameters
    ----------
    study
        Without a `circuity` table, all places are of the one country "".
    rows
        Of any of the three tables of places.

    Returns
    -------
    keys, positions
        The countries as `country_key` gives them, and of shape (rows,) each place's position among them.
    """
    if not study.circuity:
        return ("",), np.zeros(len(rows), dtype=np.int32)
    keys = [country_key(row.country) for row in rows]
    at = {key: position for position, key in enumerate(dict.fromkeys([*keys, ""]))}
    return tuple(at), np.array([at[key] for key in keys], dtype=np.int32)


def factors_between(study: Study, starts: Sequence[str], stops: Sequence[str]) -> Floats:
    """
    Return road km per geodesic km between countries.

    Parameters
    ----------
    study
        Its `circuity` table and settings.
    starts, stops
        Countries as `countries_of` gives them.

    Returns
    -------
    factors
        Shape (starts, stops).
    """
    settled = {
        frozenset({country_key(row.country), country_key(row.other_country or row.country)}): row.circuity
        for row in study.circuity
    }
    default = study.settings.circuity
    factors = np.empty((len(starts), len(stops)))
    for i, start in enumerate(starts):
        for j, stop in enumerate(stops):
            own = [settled.get(frozenset({country}), default) for country in (start, stop)]
            factors[i, j] = settled.get(frozenset({start, stop}), (own[0] + own[1]) / 2)
    return factors
