"""
Published circuity factors by country, to start a `circuity` table from.

The values are from memory and may be off by 0.02: each row says so, and is there to be edited. A factor is a mean over
sample pairs of places; water and mountains inflate it, and short trips are longer than it says.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from siting.study.countries import country_code, country_key
from siting.study.tables import CircuityRow

if TYPE_CHECKING:
    from siting.study.tables import CustomerRow, SiteRow, Study, SupplierRow

SOURCE = "Ballou, Rahman & Sakurada (2002), from memory, +-0.02"

FACTORS = {
    "AR": 1.22, "AU": 1.28, "BY": 1.12, "BR": 1.23, "CA": 1.30, "CN": 1.33, "EG": 2.10, "GB": 1.40, "FR": 1.65,
    "DE": 1.32, "HU": 1.35, "IN": 1.31, "ID": 1.43, "IT": 1.18, "JP": 1.41, "MX": 1.46, "NZ": 2.05, "PL": 1.21,
    "RU": 1.37, "SA": 1.34, "ES": 1.58, "ZA": 1.23, "TH": 1.42, "UA": 1.29, "US": 1.20,
}  # fmt: skip
"""Road over great-circle distance by ISO 3166 code; that of GB is England's."""


@dataclass(frozen=True, slots=True, kw_only=True)
class WithFactors:
    """A study with published factors in its `circuity` table."""

    study: Study
    added: tuple[str, ...]
    """Codes of the countries that have got a row."""
    without: tuple[str, ...]
    """Countries of the study that have no row and no published factor: the factor of the settings holds there."""


def with_published_factors(study: Study) -> WithFactors:
    """
    Return a study with a `circuity` row for each of its countries that a factor is published for.

    Parameters
    ----------
    study
        Checked. Rows it has already stay as they are.

    Returns
    -------
    with_factors
        The study, and which countries were added or have no published factor.

    References
    ----------
    Ballou, Rahman & Sakurada (2002), Selected country circuity factors for road travel distance estimation,
    Transportation Research A 36: 843-848 (values from memory).
    """
    rows: tuple[SiteRow | SupplierRow | CustomerRow, ...] = (*study.sites, *study.suppliers, *study.customers)
    there = sorted({country_key(row.country) for row in rows if row.country.strip()})
    held = {country_key(row.country) for row in study.circuity if not row.other_country.strip()}
    added = tuple(code for code in there if code in FACTORS and code not in held)
    last = max((row.row for row in study.circuity), default=1)
    new = tuple(
        CircuityRow(country=code, circuity=FACTORS[code], source=SOURCE, row=last + number)
        for number, code in enumerate(added, start=1)
    )
    names = {country_key(row.country): row.country.strip() for row in rows}
    without = tuple(country_code(names[key]) or names[key] for key in there if key not in held and key not in FACTORS)
    return WithFactors(study=replace(study, circuity=(*study.circuity, *new)), added=added, without=without)
