"""A file of candidates for ambiguous places, in which the user marks the right ones."""

from __future__ import annotations

import csv
from typing import TYPE_CHECKING

from siting.cells import read_cell, write_csv
from siting.errors import DataFileError
from siting.study.gazetteer import Town
from siting.study.parse import YES

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping
    from pathlib import Path

    from siting.study.locate_study import Asked, Located

HEADER = ("place", "country", "choose", "town", "town_country", "latitude", "longitude", "population")


def read_choices(path: Path) -> dict[Asked, Town]:
    """
    Return what the user chose.

    Parameters
    ----------
    path
        A file as `write_choices` wrote it, with yes (or x) under `choose` in the row of the right candidate.

    Returns
    -------
    choices
        By place and country as typed; places without a mark are not there.

    Raises
    ------
    DataFileError
        If it is not such a file, a place has two marks, or a mark is not understood. The message gives the row.
    """
    choices: dict[Asked, Town] = {}
    with path.open(encoding="utf-8-sig", newline="") as file:
        reader = csv.DictReader(file)
        missing = [name for name in HEADER if name not in (reader.fieldnames or ())]
        if missing:
            msg = f"{path}: the columns {', '.join(missing)} are missing. Give a file that siting locate wrote."
            raise DataFileError(msg)
        for row in reader:
            mark = (row["choose"] or "").strip().casefold()
            asked = read_cell(row["place"]), read_cell(row["country"])
            if mark in {"", "no"}:
                continue
            if mark not in YES | {"x"}:
                why = f"{row['choose']!r} under choose is neither yes nor blank. Write yes."
                msg = f"{path}, row {reader.line_num}: {why}"
                raise DataFileError(msg)
            if asked in choices:
                msg = f"{path}, row {reader.line_num}: {asked[0]!r} is chosen twice. Leave yes in one row only."
                raise DataFileError(msg)
            choices[asked] = _town(path, reader.line_num, row)
    return choices


def _town(path: Path, number: int, row: Mapping[str, str]) -> Town:
    try:
        return Town(
            name=read_cell(row["town"]),
            country=row["town_country"],
            latitude=float(row["latitude"]),
            longitude=float(row["longitude"]),
            population=int(float(row["population"] or 0)),
        )
    except (TypeError, ValueError):
        msg = f"{path}, row {number}: latitude, longitude or population is no number. Write them as siting locate did."
        raise DataFileError(msg) from None


def write_choices(path: Path, located: Iterable[Located], chosen: Mapping[Asked, Town]) -> int:
    """
    Write the candidates of ambiguous places, those chosen before first.

    Parameters
    ----------
    path
        It is replaced.
    located
        Rows of a study; only ambiguous ones are listed, each place once.
    chosen
        What was chosen before; it is kept.

    Returns
    -------
    places
        How many places still wait for a choice.
    """
    rows = [_row(asked, town, "yes") for asked, town in chosen.items()]
    waiting = {(row.place, row.country): row.found.candidates for row in located if row.found.town is None}
    waiting = {asked: candidates for asked, candidates in waiting.items() if candidates}
    rows += [_row(asked, town, "") for asked, candidates in waiting.items() for town in candidates]
    write_csv(path, HEADER, rows)
    return len(waiting)


def _row(asked: Asked, town: Town, mark: str) -> tuple[str | float, ...]:
    return (*asked, mark, town.name, town.country, town.latitude, town.longitude, town.population)
