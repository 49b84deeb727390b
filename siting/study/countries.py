"""Which country a text means: an ISO 3166 code of two or three letters, or its name in one of several languages."""

from __future__ import annotations

import re
from functools import cache
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping

LANGUAGES = ("en", "de", "fr", "es", "it", "pt", "nl", "pl", "cs", "sk", "hu", "sl", "hr", "ro", "sv", "da", "tr")
"""Languages whose names of countries are known."""

_IN_USE = {
    "england": "GB",
    "scotland": "GB",
    "wales": "GB",
    "great britain": "GB",
    "holland": "NL",
    "czech republic": "CZ",
    "republic of ireland": "IE",
}
"""Names in use that no list of countries has."""

_NO_COUNTRIES = frozenset({"EU", "EZ", "QO", "UN", "XA", "XB", "ZZ"})
"""Codes beside those of countries: unions, the unknown, and what tests of software use."""


@cache
def country_code(text: str) -> str:
    """
    Return the ISO 3166 code of two letters of a country as typed.

    Parameters
    ----------
    text
        A code of two or three letters or a name, in any case.

    Returns
    -------
    code
        Empty where the text is blank or no country is known by it.
    """
    typed = text.strip()
    if len(typed) in {2, 3} and typed.isalpha():
        code = _codes().get(typed.upper())
        if code:
            return code
    return _names().get(typed.casefold(), "")


def country_key(text: str) -> str:
    """
    Return what two texts that mean the same country have in common.

    Parameters
    ----------
    text
        A country as typed.

    Returns
    -------
    key
        Its code; where no country is known by the text, the text itself without regard to case; empty where blank.
    """
    return country_code(text) or text.strip().casefold()


def country_name(code: str) -> str:
    """
    Return the English name of a country.

    Parameters
    ----------
    code
        ISO 3166, two letters.

    Returns
    -------
    name
        The code itself where it is not known.
    """
    from babel import Locale  # noqa: PLC0415  (its data are read only where a country is named)

    return str(Locale("en").territories.get(code, code))


@cache
def _codes() -> dict[str, str]:
    from babel import Locale  # noqa: PLC0415  (as above)
    from babel.core import get_global  # noqa: PLC0415  (as above)

    territories = [str(code) for code in Locale("en").territories if re.fullmatch("[A-Z]{2}", str(code))]
    codes = {code: code for code in territories if code not in _NO_COUNTRIES}
    aliases: Mapping[str, list[str]] = get_global("territory_aliases")
    others = {code: held[0] for code, held in aliases.items() if held and code.isalpha()}
    return {**{code: new for code, new in others.items() if new in codes}, **codes} | {"UK": "GB"}


@cache
def _names() -> dict[str, str]:
    from babel import Locale  # noqa: PLC0415  (as above)

    known = set(_codes().values())
    names: dict[str, str] = {}
    for language in LANGUAGES:
        for code, name in Locale(language).territories.items():
            if code in known:
                names.setdefault(str(name).casefold(), code)
    return names | _IN_USE
