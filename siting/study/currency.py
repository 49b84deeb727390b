"""Which currency codes a study may use: those of ISO 4217 that are in force."""

from __future__ import annotations

import datetime as dt
from functools import lru_cache

from babel.core import get_global

from siting.study.gathering import did_you_mean
from siting.study.parse import Refusal


def check_currency(code: str, today: dt.date | None = None) -> Refusal | None:
    """
    Return why a currency code cannot be used, or None where it can.

    Parameters
    ----------
    code
        As typed. XXX, ISO 4217's code for no currency, is accepted: published test studies have none.
    today
        Day on which the code must be in force; by default the present day.

    Returns
    -------
    refusal
        None where the code is in force.

    References
    ----------
    ISO 4217 as recorded, with the dates of use, by the Unicode Common Locale Data Repository that babel carries.
    """
    ends = _last_days()
    day = dt.datetime.now(tz=dt.UTC).date() if today is None else today
    if code not in ends:
        return Refusal(
            "not a currency code of ISO 4217", did_you_mean(code, _in_force(day), "Write a code such as EUR")
        )
    last = ends[code]
    if last is not None and last < day:
        return Refusal(
            f"a currency code that was retired on {last.isoformat()}", "Write the code of the money in use, such as EUR"
        )
    return None


def _in_force(day: dt.date) -> list[str]:
    """Return the codes in force on a day."""
    return [code for code, last in _last_days().items() if last is None or last >= day]


@lru_cache(maxsize=1)
def _last_days() -> dict[str, dt.date | None]:
    """Return the last day of each code anywhere; None = in force."""
    ends: dict[str, dt.date | None] = {}
    for uses in get_global("territory_currencies").values():
        for code, _, end, _ in uses:
            last = None if end is None else dt.date(*end)
            known = ends.get(code, last)
            ends[code] = None if known is None or last is None else max(known, last)
    return ends
