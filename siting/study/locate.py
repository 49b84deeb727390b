"""
Find the coordinates of places by name, without a network: among the towns that ship with the program.

Case, accents, hyphens and saints do not count; other names and near-spellings do. A name that fits several towns is
never decided here: its candidates are listed with their populations, for the user to choose.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from enum import StrEnum
from functools import lru_cache
from typing import TYPE_CHECKING

from siting.study.coordinates import rough_km
from siting.study.countries import country_code
from siting.study.gazetteer import Town, fold, gazetteer

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

import numpy as np

SAME_TOWN_KM = 10.0
"""Towns of one name this near to a larger one are parts of it."""

NEAR_SPELLING = 0.9
"""How alike, from 0 to 1, a name must be to count as a near-spelling."""

CLEARLY_NEARER = 0.05
"""By how much the best near-spelling must beat the next to be taken."""

LEAST_LETTERS = 4
"""Shorter names have too many near-spellings."""

MOST_CANDIDATES = 12

_POSTCODE = re.compile(r"^(?:[A-Z]{1,3}[- ]?)?\d[\d -]{2,6}[A-Z]{0,2}\s+|\s+\d{4,6}$")


class Match(StrEnum):
    """How a place was found."""

    EXACT = "exact"
    """By a town's own name."""
    OTHER_NAME = "other name"
    """By another name of it, such as in another language."""
    NEAR = "near-spelling"
    """By a name that is spelt nearly so."""
    CHOSEN = "chosen"
    """By the user's choice among candidates."""
    ONLINE = "online"
    """By a server the user asked for."""
    AMBIGUOUS = "ambiguous"
    """Several towns fit: nothing is taken."""
    UNKNOWN = "unknown"
    """No town fits."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Found:
    """What became of one place."""

    match: Match
    town: Town | None = None
    """Where it is; None where ambiguous or unknown."""
    confidence: float = 0.0
    """From 0 to 1: 1 for a name as it is, the likeness of a near-spelling; what a server says is 0.5."""
    candidates: tuple[Town, ...] = ()
    """Of an ambiguous place, the largest first; of a near-spelling, also those less alike."""


@lru_cache(maxsize=100_000)
def find_place(place: str, country: str) -> Found:
    """
    Return where a place is.

    Parameters
    ----------
    place
        Town, or an address with the town and perhaps its postcode in its last parts.
    country
        A code or a name; "" = any country, where names more often fit several towns.

    Returns
    -------
    found
        A country that is not known counts as any.
    """
    code = country_code(country)
    unclear = Found(match=Match.UNKNOWN)
    for name in _readings(place):
        for match in (Match.EXACT, Match.OTHER_NAME):
            towns = gazetteer()
            index = towns.own_names(code) if match is Match.EXACT else towns.other_names(code)
            candidates = _told_apart([towns.town(at) for at in index.get(name, ())])
            if len(candidates) == 1 and not _also_called(name, code, candidates[0], match):
                return Found(match=match, town=candidates[0], confidence=1.0, candidates=candidates)
            if candidates:
                others = _also_called(name, code, candidates[0], match) if len(candidates) == 1 else ()
                return Found(match=Match.AMBIGUOUS, candidates=(*candidates, *others)[:MOST_CANDIDATES])
        if unclear.match is Match.UNKNOWN:
            unclear = _near(name, code)
    return unclear


def _readings(place: str) -> Iterator[str]:
    """Yield the folded names that a text may hold, the likeliest first: itself, then its parts from the last on."""
    parts = [part for part in re.split(r"[,;/\n]", place) if part.strip()]
    seen = set()
    for part in (place, *reversed(parts)):
        for text in (part, part.split("(")[0]):
            name = fold(_POSTCODE.sub("", text.strip().upper()))
            if name and name not in seen and not name.isdecimal():
                seen.add(name)
                yield name


def _told_apart(towns: Sequence[Town]) -> tuple[Town, ...]:
    """Return the towns, the largest first, without those that are parts of a larger one."""
    kept: list[Town] = []
    for town in sorted(towns, key=lambda town: -town.population):
        if all(_km(town, other) > SAME_TOWN_KM for other in kept):
            kept.append(town)
    return tuple(kept)


def _also_called(name: str, code: str, town: Town, match: Match) -> tuple[Town, ...]:
    """Return larger towns that are called so too, where the one found by its own name is small: Frankfurt, Neustadt."""
    if match is not Match.EXACT:
        return ()
    towns = gazetteer()
    others = _told_apart([towns.town(at) for at in towns.other_names(code).get(name, ())])
    return tuple(other for other in others if other.population > town.population and _km(other, town) > SAME_TOWN_KM)


def _near(name: str, code: str) -> Found:
    """Return the town of the name most alike, if it is clearly so; in no country in particular, none is."""
    from rapidfuzz import process  # noqa: PLC0415  (only names that are not known need it)
    from rapidfuzz.distance import Indel  # noqa: PLC0415  (as above)

    if not code or len(name) < LEAST_LETTERS:
        return Found(match=Match.UNKNOWN)
    towns = gazetteer()
    names = towns.own_names(code) | {
        other: at for other, at in towns.other_names(code).items() if other not in towns.own_names(code)
    }
    alike = process.extract(
        name, names.keys(), scorer=Indel.normalized_similarity, score_cutoff=NEAR_SPELLING - CLEARLY_NEARER, limit=5
    )
    if not alike or alike[0][1] < NEAR_SPELLING:
        return Found(match=Match.UNKNOWN)
    best, second = alike[0][1], [key for key, likeness, _ in alike if likeness > alike[0][1] - CLEARLY_NEARER]
    candidates = _told_apart([towns.town(at) for key in second for at in names[key]])
    if len(candidates) == 1:
        return Found(match=Match.NEAR, town=candidates[0], confidence=float(best), candidates=candidates)
    return Found(match=Match.AMBIGUOUS, candidates=candidates[:MOST_CANDIDATES])


def _km(town: Town, other: Town) -> float:
    ends = (np.array(degrees) for degrees in (town.latitude, town.longitude, other.latitude, other.longitude))
    return float(rough_km(*ends))
