"""Currency codes in force, retired and unknown."""

from __future__ import annotations

import datetime as dt
import re

import pytest

from siting.study.currency import check_currency

DAY = dt.date(2026, 1, 15)


@pytest.mark.parametrize("code", ["EUR", "USD", "CZK", "HUF", "PLN", "JPY", "CLF", "KWD", "XXX", "XTS"])
def test_codes_in_force(code: str) -> None:
    """ISO 4217 codes as the Unicode CLDR records them, with XXX (no currency) and XTS (testing)."""
    assert check_currency(code, DAY) is None


@pytest.mark.parametrize("code", ["HRK", "DEM", "ATS", "SKK", "LTL", "ZWL"])
def test_retired_codes(code: str) -> None:
    """Codes that were once in force are told apart from slips."""
    refusal = check_currency(code, DAY)
    assert refusal is not None
    assert refusal.wrong.startswith("a currency code that was retired on ")
    assert refusal.repair == "Write the code of the money in use, such as EUR"


@pytest.mark.parametrize("code", ["", "eur", "EURO", "ABC", "\u20ac"])
def test_unknown_codes(code: str) -> None:
    """Anything else is no code, whatever its case."""
    refusal = check_currency(code, DAY)
    assert refusal is not None
    assert refusal.wrong == "not a currency code of ISO 4217"


@pytest.mark.parametrize("code", ["XAA", "AFB", "DEN"])
def test_a_slip_is_never_mended_with_a_retired_code(code: str) -> None:
    """AFA and DEM are nearest to these, and would be refused in turn."""
    refusal = check_currency(code, DAY)
    assert refusal is not None
    meant = re.match("Write '([A-Z]{3})' if that is meant", refusal.repair)
    assert meant is not None
    assert check_currency(meant[1], DAY) is None


def test_a_code_is_in_force_through_its_last_day() -> None:
    """The Croatian kuna ended with the change to the euro of 1 January 2023 (CLDR: in use until 14 January)."""
    last = max(day for day in (dt.date(2023, 1, n) for n in range(1, 31)) if check_currency("HRK", day) is None)
    refusal = check_currency("HRK", last + dt.timedelta(days=1))
    assert refusal is not None
    assert refusal.wrong == f"a currency code that was retired on {last.isoformat()}"
