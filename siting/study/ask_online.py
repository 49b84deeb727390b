"""Ask a server that the user names for places: at most one question a second, each only once, under one's own name."""

from __future__ import annotations

import json
from importlib.metadata import version
from pathlib import Path
from typing import TYPE_CHECKING
from urllib.parse import urlsplit

from siting.errors import DataFileError
from siting.study.countries import country_code, country_name
from siting.study.gazetteer import Town

if TYPE_CHECKING:
    from collections.abc import Callable

SECONDS_APART = 1.0
"""Between two questions; what public servers ask for."""

TIMEOUT_S = 10.0


def cache_file() -> Path:
    """Return where answers are kept from one run to the next."""
    return Path.home() / ".cache" / "siting" / "places.json"


def ask_online(
    url: str, *, contact: str = "", cache: Path | None = None, seconds_apart: float = SECONDS_APART
) -> Callable[[str, str], Town | None]:
    """
    Return a function that asks a server for a place.

    Parameters
    ----------
    url
        Of a server of the kind of Nominatim, such as https://nominatim.example.org.
    contact
        E-mail address of the user, told to the server with the program's name.
    cache
        File that keeps answers, also that there was none; None = only for this run.
    seconds_apart
        Between two questions.

    Returns
    -------
    ask
        Takes place and country as typed; None where the server knows nothing.

    Raises
    ------
    DataFileError
        If geopy is not installed or the address is none; later, from the function, if the server does not answer.
    """
    try:
        from geopy.exc import GeopyError  # noqa: PLC0415  (an extra)
        from geopy.extra.rate_limiter import RateLimiter  # noqa: PLC0415  (an extra)
        from geopy.geocoders import Nominatim  # noqa: PLC0415  (an extra)
    except ImportError:
        msg = "asking a server needs geopy. Install it: pip install 'siting[online]'"
        raise DataFileError(msg) from None
    parts = urlsplit(url)
    if parts.scheme not in {"http", "https"} or not parts.netloc:
        msg = f"{url!r} is not the address of a server; write one such as https://nominatim.example.org"
        raise DataFileError(msg)
    agent = f"siting/{version('siting')}" + (f" ({contact})" if contact else "")
    server = Nominatim(
        user_agent=agent, domain=f"{parts.netloc}{parts.path.rstrip('/')}", scheme=parts.scheme, timeout=TIMEOUT_S
    )
    geocode = RateLimiter(
        server.geocode,
        min_delay_seconds=seconds_apart,
        error_wait_seconds=seconds_apart,
        max_retries=0,  # geopy would log a traceback before it tries again
        swallow_exceptions=False,
    )
    answers = _read(cache)

    def ask(place: str, country: str) -> Town | None:
        code = country_code(country)
        key = json.dumps([url, place, code or country])
        if key not in answers:
            try:
                found = geocode(
                    f"{place}, {country_name(code) if code else country}".rstrip(", "),
                    country_codes=code.lower() or None,
                )
            except GeopyError as error:
                why = str(error) or type(error).__name__
                msg = f"{url}: the server does not answer ({why}). Try later, or leave --online out."
                raise DataFileError(msg) from error
            answers[key] = None if found is None else [found.address, found.latitude, found.longitude]
            _write(cache, answers)
        answer = answers[key]
        if answer is None:
            return None
        name, latitude, longitude = answer
        return Town(name=str(name), country=code, latitude=float(latitude), longitude=float(longitude), population=0)

    return ask


def _read(cache: Path | None) -> dict[str, list[str | float] | None]:
    if cache is None or not cache.is_file():
        return {}
    try:
        held = json.loads(cache.read_text("utf-8"))
    except ValueError:
        held = None
    if not isinstance(held, dict):
        msg = f"{cache}: this is no file of answers. Delete it, or give another with --cache."
        raise DataFileError(msg)
    return held


def _write(cache: Path | None, answers: dict[str, list[str | float] | None]) -> None:
    if cache is not None:
        cache.parent.mkdir(parents=True, exist_ok=True)
        cache.write_text(json.dumps(answers, ensure_ascii=False, indent=1), encoding="utf-8")
