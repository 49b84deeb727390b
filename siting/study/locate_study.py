"""
Fill in the coordinates that a study lacks, from the places it names; what has coordinates keeps them and is checked.

Works on a study as read, since one without coordinates has faults.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa

from siting.study.coordinates import PLACED, rough_km
from siting.study.locate import Found, Match, find_place
from siting.study.near_towns import placed_oddly

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

    from siting.errors import Fault
    from siting.study.gazetteer import Town
    from siting.study.raw import RawStudy, RawTable

Asked = tuple[str, str]
"""A place and its country, as typed."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Located:
    """One row whose coordinates were blank."""

    table: str
    row: int
    """As the user's spreadsheet numbers it."""
    name: str
    place: str
    country: str
    found: Found
    by_name: bool
    """True where the row has no place, so that its own name was taken for one."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LocatedStudy:
    """A study with the coordinates that were found."""

    raw: RawStudy
    rows: tuple[Located, ...]
    """Every row whose coordinates were blank, found or not, by table."""
    warnings: tuple[Fault, ...]
    """Coordinates, given before, that do not fit their place or country, or lie far from any town."""


def locate_study(
    raw: RawStudy,
    *,
    choices: Mapping[Asked, Town] | None = None,
    online: Callable[[str, str], Town | None] | None = None,
) -> LocatedStudy:
    """
    Return a study with coordinates for the places it names.

    Parameters
    ----------
    raw
        As read; numbers plain.
    choices
        What the user chose for ambiguous places, by place and country as typed.
    online
        Asked for places that are not known here; None = nobody is asked.

    Returns
    -------
    located
        Only rows with both coordinates blank are filled. A row without a place is looked up by its own name.
    """
    rows: list[Located] = []
    tables = dict(raw.tables)
    warnings: list[Fault] = []
    for table in PLACED:
        if table in raw.tables and PLACED[table] in raw.tables[table].header:
            held = _Rows(table, raw.tables[table])
            found = [_locate(held, at, choices or {}, online) for at in held.blank]
            rows += found
            tables[table] = held.filled({at: each.found.town for at, each in zip(held.blank, found, strict=True)})
            warnings += placed_oddly(table, held.given())
    return LocatedStudy(raw=replace(raw, tables=tables), rows=tuple(rows), warnings=tuple(warnings))


class _Rows:
    """The columns of a table that say where its rows are."""

    def __init__(self, table: str, raw: RawTable) -> None:
        self.table, self._raw = table, raw
        self.numbers = raw.rows.tolist()
        self.names, self.places, self.countries, self.latitude, self.longitude = (
            self._texts(column) for column in (PLACED[table], "place", "country", "latitude", "longitude")
        )
        blank = zip(self.latitude, self.longitude, strict=True)
        self.blank = [at for at, degrees in enumerate(blank) if not any(text.strip() for text in degrees)]
        """Rows with neither coordinate."""

    def _texts(self, name: str) -> list[str]:
        cells = self._raw.column(name)
        return [""] * len(self._raw) if cells is None else cells.to_pylist()

    def given(self) -> list[tuple[int, str, str, float, float]]:
        """Return row, place, country, latitude and longitude of each row that has coordinates."""
        found = []
        for at, degrees in enumerate(zip(self.latitude, self.longitude, strict=True)):
            try:
                latitude, longitude = map(float, degrees)
            except ValueError:
                continue  # blank, or a fault that the check reports
            if abs(latitude) <= 90 and abs(longitude) <= 180:  # noqa: PLR2004  (degrees)
                found.append((self.numbers[at], self.places[at].strip(), self.countries[at], latitude, longitude))
        return found

    def filled(self, towns: Mapping[int, Town | None]) -> RawTable:
        """Return the table with the coordinates of these towns."""
        latitude, longitude = list(self.latitude), list(self.longitude)
        for at, town in towns.items():
            if town is not None:
                latitude[at], longitude[at] = f"{town.latitude:.5f}", f"{town.longitude:.5f}"
        header, columns = list(self._raw.header), list(self._raw.columns)
        for name, texts in (("latitude", latitude), ("longitude", longitude)):
            cells = pa.array(texts, pa.string())
            if name in header:
                columns[header.index(name)] = cells
            elif any(texts):
                header.append(name)
                columns.append(cells)
        return replace(self._raw, header=tuple(header), columns=tuple(columns))


def _locate(
    held: _Rows, at: int, choices: Mapping[Asked, Town], online: Callable[[str, str], Town | None] | None
) -> Located:
    """Return what became of one row."""
    typed, country = held.places[at].strip(), held.countries[at].strip()
    place = typed or held.names[at].strip()
    found = find_place(place, country) if place else Found(match=Match.UNKNOWN)
    if (place, country) in choices:
        found = Found(match=Match.CHOSEN, town=choices[place, country], confidence=1.0)
    elif found.match is Match.UNKNOWN and place and online is not None:
        town = online(place, country)
        found = found if town is None else Found(match=Match.ONLINE, town=town, confidence=0.5)
    return Located(
        table=held.table,
        row=held.numbers[at],
        name=held.names[at],
        place=place,
        country=country,
        found=found,
        by_name=not typed,
    )


def furthest_apart_km(towns: tuple[Town, ...]) -> float:
    """
    Return how far the candidates of a place are from the first of them.

    Parameters
    ----------
    towns
        At least one.

    Returns
    -------
    km
        On a sphere; the error that a wrong choice would make at most.
    """
    latitude, longitude = np.array([(town.latitude, town.longitude) for town in towns]).T
    first = np.full(latitude.shape, latitude[0]), np.full(latitude.shape, longitude[0])
    return float(rough_km(latitude, longitude, *first).max())
