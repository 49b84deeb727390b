"""The towns that ship with the program: their names in all spellings known, where they are and how large."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from functools import cache, cached_property
from importlib.resources import files
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from siting.arrays import Floats, Positions

CREDIT = "Towns: GeoNames, CC BY 4.0"
"""What the licence asks to be said."""

DECIMALS = 10_000
"""Coordinates of the file are in 1/10,000 degree."""

_LETTERS = str.maketrans(
    {
        "ß": "ss",
        "ø": "o",
        "ł": "l",
        "đ": "d",
        "ð": "d",
        "þ": "th",
        "æ": "ae",
        "œ": "oe",
        "\u0131": "i",
        "ħ": "h",
        "ŋ": "n",
    }
)
_SAINTS = re.compile(r"\b(sankt|saint|santa|santo|sant|sveti|szent|sv|ste)\b")
_OTHERS = re.compile(r"[^\w]+|_+")


def fold(name: str) -> str:
    """
    Return what all spellings of a name have in common.

    Parameters
    ----------
    name
        As typed.

    Returns
    -------
    folded
        Without case, accents, hyphens and dots; saints are all `st`.
    """
    bare = unicodedata.normalize("NFKD", name.casefold().translate(_LETTERS))
    letters = "".join(letter for letter in bare if not unicodedata.combining(letter))
    words = _OTHERS.sub(" ", letters.replace("'", "").replace("\u2019", "")).strip()
    return _SAINTS.sub("st", words)


@dataclass(frozen=True, slots=True, kw_only=True)
class Town:
    """One town."""

    name: str
    country: str
    """ISO 3166, two letters."""
    latitude: float
    longitude: float
    population: int


@dataclass(frozen=True, kw_only=True, eq=False)
class Gazetteer:
    """All towns; every array of shape (towns,), by country and then the largest first."""

    names: tuple[str, ...]
    others: tuple[str, ...]
    """Other names of each, separated by `|`."""
    countries: tuple[str, ...]
    latitude: Floats
    longitude: Floats
    population: Positions

    def town(self, at: int) -> Town:
        """Return one town."""
        return Town(
            name=self.names[at],
            country=self.countries[at],
            latitude=float(self.latitude[at]),
            longitude=float(self.longitude[at]),
            population=int(self.population[at]),
        )

    def own_names(self, country: str) -> dict[str, list[int]]:
        """Return the towns of a country ("" = of all) by each folded name of their own, the largest first."""
        return self._index("own", country)

    def other_names(self, country: str) -> dict[str, list[int]]:
        """Return the towns of a country ("" = of all) by each other folded name, the largest first."""
        return self._index("other", country)

    def _index(self, kind: str, country: str) -> dict[str, list[int]]:
        key = kind, country
        if key not in self._indexes:
            found: dict[str, list[int]] = {}
            for at in self.of_country.get(country, range(0)) if country else range(len(self.names)):
                for name in [self.names[at]] if kind == "own" else filter(None, self.others[at].split("|")):
                    found.setdefault(fold(name), []).append(at)
            self._indexes[key] = found
        return self._indexes[key]

    @cached_property
    def _indexes(self) -> dict[tuple[str, str], dict[str, list[int]]]:
        return {}

    @cached_property
    def of_country(self) -> dict[str, range]:
        """The towns of each country."""
        starts: dict[str, int] = {}
        for at, country in enumerate(self.countries):
            starts.setdefault(country, at)
        stops = [*list(starts.values())[1:], len(self.countries)]
        return {country: range(start, stop) for (country, start), stop in zip(starts.items(), stops, strict=True)}


@cache
def gazetteer() -> Gazetteer:
    """
    Return the towns, read once.

    Returns
    -------
    gazetteer
        Towns of 1,000 people and more, and seats of government.
    """
    import pyarrow.parquet as pq  # noqa: PLC0415  (only whoever looks up towns pays for it)

    with files("siting.study.towns").joinpath("towns.parquet").open("rb") as file:
        table = pq.read_table(file)
    columns = {name: table.column(name) for name in table.column_names}
    latitude, longitude = (columns[name].to_numpy() / DECIMALS for name in ("latitude", "longitude"))
    return Gazetteer(
        names=tuple(columns["name"].to_pylist()),
        others=tuple(columns["others"].to_pylist()),
        countries=tuple(columns["country"].to_pylist()),
        latitude=np.asarray(latitude, dtype=np.float64),
        longitude=np.asarray(longitude, dtype=np.float64),
        population=columns["population"].to_numpy().astype(np.int32),
    )
