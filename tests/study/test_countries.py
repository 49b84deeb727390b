"""Which country a text means."""

from __future__ import annotations

import pytest

from siting.study.countries import country_code, country_key, country_name


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("AT", "AT"),
        ("aut", "AT"),
        (" Austria ", "AT"),
        ("Österreich", "AT"),
        ("Rakousko", "AT"),
        ("UK", "GB"),
        ("USA", "US"),
        ("England", "GB"),
        ("Czech Republic", "CZ"),
        ("Česko", "CZ"),
        ("Magyarország", "HU"),
        ("EU", ""),
        ("Nowhere", ""),
        ("", ""),
        ("  ", ""),
    ],
)
def test_codes_and_names_are_known(text: str, code: str) -> None:
    """ISO 3166 codes of two and three letters, and names in several languages; a union is no country."""
    assert country_code(text) == code


def test_what_is_no_country_is_compared_as_it_is() -> None:
    """Zones of the user's own compare without regard to case and blanks around them."""
    assert country_key("Zone North ") == country_key("zone north") == "zone north"
    assert country_key("Germany") == country_key("DEU") == "DE"
    assert country_key(" ") == ""


def test_a_code_has_an_english_name() -> None:
    """An unknown code is shown as it is."""
    assert country_name("AT") == "Austria"
    assert country_name("Q9") == "Q9"
