"""
One-off money as money a year: capital recovery, and the value left at the end of the life.

A one-off charge P spread over n years at interest i is P x a a year, a = i / (1 - (1+i)^-n). A residual value r, got
back after n years, takes r x (1+i)^-n off what has to be spread.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from siting.errors import SettingsError

if TYPE_CHECKING:
    from siting.study.settings import Settings


def _check(interest_rate: float, life_years: float) -> None:
    if not 0.0 <= interest_rate < math.inf:
        msg = f"interest_rate is a fraction of at least 0, got {interest_rate!r}; write 8 % as 0.08"
        raise SettingsError(msg)
    if not 0.0 < life_years < math.inf:
        msg = f"life_years is a number of years above 0, got {life_years!r}; write ten years as 10"
        raise SettingsError(msg)


def capital_recovery(interest_rate: float, life_years: float) -> float:
    """
    Return the capital recovery factor a = i / (1 - (1+i)^-n): money a year per one-off money.

    Parameters
    ----------
    interest_rate
        Interest a year as a fraction, at least 0; at 0 the factor is exactly 1/n.
    life_years
        Years n over which the charge is spread, above 0.

    Returns
    -------
    factor
        Per year, above 0.

    Raises
    ------
    SettingsError
        If either number is out of its range. The message says how to write it.

    References
    ----------
    The factor is common practice (A/P of compound interest tables); it is computed through `expm1` and `log1p`, since
    1 - (1+i)^-n loses all digits where i is small.
    """
    _check(interest_rate, life_years)
    if interest_rate == 0.0:
        return 1.0 / life_years
    return interest_rate / -math.expm1(-life_years * math.log1p(interest_rate))


def present_worth(interest_rate: float, life_years: float) -> float:
    """
    Return (1+i)^-n: what one unit of money got back after n years is worth now.

    Parameters
    ----------
    interest_rate
        Interest a year as a fraction, at least 0.
    life_years
        Years n, above 0.

    Returns
    -------
    factor
        In (0, 1]; 1 at interest 0.

    Raises
    ------
    SettingsError
        If either number is out of its range. The message says how to write it.
    """
    _check(interest_rate, life_years)
    return math.exp(-life_years * math.log1p(interest_rate))


def factors_of(settings: Settings) -> tuple[float, float]:
    """
    Return capital recovery and present worth of a study, or (0, 0) where it sets no interest rate or life.

    Parameters
    ----------
    settings
        Of a checked study: a study with any one-off charge sets both.

    Returns
    -------
    annuity, worth
        Yearly money per one-off money, and the present worth of one unit of residual value.

    Raises
    ------
    SettingsError
        If either setting is out of its range.
    """
    if settings.interest_rate is None or settings.life_years is None:
        return 0.0, 0.0
    return (
        capital_recovery(settings.interest_rate, settings.life_years),
        present_worth(settings.interest_rate, settings.life_years),
    )
