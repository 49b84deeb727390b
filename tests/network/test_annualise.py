"""Capital recovery against printed tables."""

from __future__ import annotations

import math

import pytest

from siting.errors import SettingsError
from siting.network.annualise import capital_recovery, factors_of, present_worth
from siting.study.settings import Settings

PRINTED = [
    # ASHRAE Pocket Guide for HVAC (2013), table of annual capital recovery factors
    (0.035, 10, 0.12024, 5e-6),
    (0.045, 8, 0.15161, 5e-6),
    (0.06, 12, 0.11928, 5e-6),
    (0.08, 4, 0.30192, 5e-6),
    (0.08, 10, 0.14903, 5e-6),
    (0.10, 10, 0.16275, 5e-6),
    (0.10, 18, 0.12193, 5e-6),
    # discrete cash-flow tables
    (0.0025, 12, 0.08469, 5e-6),
    (0.0025, 24, 0.04298, 5e-6),
    # Newnan et al., compound interest tables, p. 585 (four digits)
    (0.35, 10, 0.3683, 5e-5),
    # from memory of compound interest tables, recomputed
    (0.05, 20, 0.08024, 5e-6),
    (0.08, 15, 0.11683, 5e-6),
    (0.12, 15, 0.14682, 5e-6),
    (0.06, 30, 0.07265, 5e-6),
]


@pytest.mark.parametrize(("interest", "years", "printed", "tolerance"), PRINTED)
def test_reaches_printed_factors(interest: float, years: float, printed: float, tolerance: float) -> None:
    """Each printed factor to its last digit."""
    assert capital_recovery(interest, years) == pytest.approx(printed, abs=tolerance)


@pytest.mark.parametrize(
    ("interest", "years", "present", "tolerance"),
    [
        (0.0025, 12, 11.8073, 5e-5),
        (0.0025, 24, 23.2660, 5e-5),
        (0.35, 10, 2.715, 5e-4),
        (0.05, 20, 12.4622, 5e-5),
        (0.08, 15, 8.5595, 5e-5),
        (0.12, 15, 6.8109, 5e-5),
        (0.06, 30, 13.7648, 5e-5),
    ],
)
def test_reaches_printed_present_values(interest: float, years: float, present: float, tolerance: float) -> None:
    """P/A of the same tables is one over the factor."""
    assert 1 / capital_recovery(interest, years) == pytest.approx(present, abs=tolerance)


def test_million_at_eight_percent() -> None:
    """1,000,000 over ten years at 8 % is 149,029.49 a year; with 200,000 left at the end, 135,223.59."""
    a, worth = capital_recovery(0.08, 10), present_worth(0.08, 10)
    assert 1_000_000 * a == pytest.approx(149_029.49, abs=0.005)
    assert a * (1_000_000 - worth * 200_000) == pytest.approx(135_223.59, abs=0.005)
    assert (1_000_000 - 200_000) * a + 200_000 * 0.08 == pytest.approx(135_223.59, abs=0.005)


def test_present_worth_of_eight_percent() -> None:
    """P/F at 8 % and ten years is 0.4632 (compound interest tables, from memory, recomputed)."""
    assert present_worth(0.08, 10) == pytest.approx(0.4632, abs=5e-5)


def test_no_interest_spreads_evenly() -> None:
    """At interest 0 the factor is exactly 1/n, and a hair above 0 it is still 1/n to nine digits."""
    assert capital_recovery(0.0, 10) == 0.1
    assert capital_recovery(0.0, 7) == 1 / 7
    assert present_worth(0.0, 10) == 1.0
    assert capital_recovery(1e-9, 10) == pytest.approx(0.1, rel=1e-8)
    assert capital_recovery(1e-15, 10) == pytest.approx(0.1, rel=1e-12)


def test_extreme_lives() -> None:
    """One year pays back everything with interest; forever pays the interest only."""
    assert capital_recovery(0.08, 1) == pytest.approx(1.08, rel=1e-12)
    assert capital_recovery(0.08, 10_000) == pytest.approx(0.08, rel=1e-12)


@pytest.mark.parametrize("interest", [-0.01, math.inf, math.nan])
def test_refuses_impossible_interest(interest: float) -> None:
    """Interest is a fraction of at least 0."""
    with pytest.raises(SettingsError, match=r"interest_rate is a fraction of at least 0, got .*write 8 % as 0\.08"):
        capital_recovery(interest, 10)


@pytest.mark.parametrize("years", [0.0, -1.0, math.inf, math.nan])
def test_refuses_impossible_life(years: float) -> None:
    """A life is a finite number of years above 0."""
    with pytest.raises(SettingsError, match=r"life_years is a number of years above 0, got .*write ten years as 10"):
        present_worth(0.08, years)


def test_study_without_one_off_charges_needs_neither() -> None:
    """Where interest or life is not set, nothing is spread and both factors are 0."""
    assert factors_of(Settings()) == (0.0, 0.0)
    assert factors_of(Settings(interest_rate=0.08)) == (0.0, 0.0)
    assert factors_of(Settings(interest_rate=0.08, life_years=10)) == (
        capital_recovery(0.08, 10),
        present_worth(0.08, 10),
    )
