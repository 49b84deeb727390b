"""
The lanes of a study while variants are applied to them.

There may be millions: rows that no variant touches stay in the study's own arrays, only those touched become text and
are checked as if they had been read.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np

from siting.study.check_lanes import ParsedLanes, parse_lanes
from siting.study.check_rows import check_header
from siting.study.columns import LANES
from siting.study.raw import FIRST_ROW, cell_text, table_from_rows
from siting.study.tables import LaneTable, Leg
from siting.study.write import header_to_write, rows_to_write

if TYPE_CHECKING:
    from collections.abc import Mapping

    from numpy.typing import NDArray

    from siting.arrays import Flags, Positions
    from siting.study.check_lanes import Known
    from siting.study.gathering import Gathering
    from siting.study.tables import Study

BLANK = -1
"""Position of a blank name or attribute."""


class LanesAtWork:
    """The lanes with what variants have done to them so far."""

    def __init__(self, study: Study) -> None:
        self._study = study
        self._lanes = study.lanes
        self._kept = np.ones(len(study.lanes), dtype=np.bool_)
        self._changed: dict[int, dict[str, str]] = {}
        """Cells as text, by position."""
        self._added: list[dict[str, str]] = []
        self.header = list(header_to_write(study, "lanes")) if len(study.lanes) else []

    def find(self, key: Mapping[str, str]) -> list[int]:
        """Return the rows that have all these cells; those added count on from the last of the study."""
        lanes, place = self._lanes, {name: at for at, name in enumerate(self._lanes.names)}
        fits = self._kept.copy()
        for column, text in key.items():
            if column == "leg":
                legs = [str(leg) for leg in LaneTable.LEGS]
                fits &= lanes.leg == (legs.index(text) if text in legs else len(legs))
            else:
                fits &= getattr(lanes, column) == (place.get(text, len(place)) if text else BLANK)
        among = [
            len(lanes) + at
            for at, row in enumerate(self._added)
            if row and all(row.get(column, "") == text for column, text in key.items())
        ]
        return [*np.flatnonzero(fits).tolist(), *among]

    def cell(self, at: int, column: str) -> str:
        """Return the text of a cell."""
        return self._record(at).get(column, "")

    def set(self, at: int, column: str, text: str) -> None:
        """Change a cell."""
        self._record(at)[column] = text
        self._widen([column])

    def add(self, row: Mapping[str, str]) -> int:
        """Add a row and return its number."""
        self._added.append(dict(row))
        self._widen([*LANES.key[:2], *row])
        return self.row(len(self._lanes) + len(self._added) - 1)

    def remove(self, at: int) -> None:
        """Take a row away."""
        if at < len(self._lanes):
            self._kept[at] = False
            self._changed.pop(at, None)
        else:
            self._added[at - len(self._lanes)] = {}

    def remove_of(self, table: str, name: str) -> int:
        """Take away the rows that name a site, supplier, customer or good, and return how many there were."""
        lanes = self._lanes
        gone = self._kept & self._of(table, name)
        self._kept &= ~gone
        for at in np.flatnonzero(gone).tolist():
            self._changed.pop(at, None)
        ends = {"sites": ("origin", "destination"), "suppliers": ("origin",), "customers": ("destination",)}
        columns = ends.get(table, ("good",))
        among = [at for at, row in enumerate(self._added) if any(row.get(column) == name for column in columns)]
        for at in among:
            self.remove(len(lanes) + at)
        return int(gone.sum()) + len(among)

    def row(self, at: int) -> int:
        """Return the number of a row as the user's spreadsheet shows it; added ones follow the last."""
        if at < len(self._lanes):
            return int(self._lanes.row[at])
        last = int(self._lanes.row.max(initial=FIRST_ROW - 1))
        return last + 1 + at - len(self._lanes)

    def finished(self, known: Known, gathering: Gathering) -> ParsedLanes:
        """
        Return the lanes, the rows touched checked as if they had been read.

        Parameters
        ----------
        known
            Names of the other tables, changes made.
        gathering
            Takes faults and warnings.

        Returns
        -------
        parsed
            The study's own table where nothing touched it.
        """
        added = [at for at, row in enumerate(self._added) if row]
        if self._kept.all() and not self._changed and not added:
            if self.header:
                check_header(LANES, self.header, gathering)
            return ParsedLanes(table=self._lanes, hurt=~self._kept)
        header = tuple(dict.fromkeys(self.header))
        changed = sorted(self._changed)
        records = [self._changed[at] for at in changed] + [self._added[at] for at in added]
        numbers = [self.row(at) for at in changed] + [self.row(len(self._lanes) + at) for at in added]
        texts = [[record.get(name, "") for name in header] for record in records]
        parsed = parse_lanes(table_from_rows(header, texts, numbers), known, gathering)
        if parsed.hurt.any():
            return parsed
        self._refuse_repeats(parsed.table, len(changed), gathering)
        rest = _taken(self._lanes, np.flatnonzero(self._kept))
        place = np.searchsorted(np.flatnonzero(self._kept), changed)
        table = _merged(rest, parsed.table, place.astype(np.int32))
        return ParsedLanes(table=table, hurt=np.zeros(len(table), dtype=np.bool_))

    def _refuse_repeats(self, touched: LaneTable, changed: int, gathering: Gathering) -> None:
        """Note added lanes that the study has already."""
        for at in range(changed, len(touched)):
            key = {
                "origin": touched.names[touched.origin[at]],
                "destination": touched.names[touched.destination[at]],
                "good": touched.names[touched.good[at]] if touched.good[at] != BLANK else "",
                "leg": str(LaneTable.LEGS[touched.leg[at]]),
            }
            there = [place for place in self.find(key) if place < len(self._lanes)]
            if there:
                wrong = f"the same lane is already in row {self.row(there[0])}"
                repair = "Change that row instead of adding one"
                gathering.fault("lanes", int(touched.row[at]), "destination", key["destination"], wrong, repair)

    def _of(self, table: str, name: str) -> Flags:
        lanes = self._lanes
        if name not in lanes.names:
            return np.zeros(len(lanes), dtype=np.bool_)
        at = lanes.names.index(name)
        inbound = lanes.leg == LaneTable.LEGS.index(Leg.INBOUND)
        outbound = lanes.leg == LaneTable.LEGS.index(Leg.OUTBOUND)
        ends: Mapping[str, Flags] = {
            "sites": np.where(inbound, lanes.destination == at, outbound & (lanes.origin == at)),
            "suppliers": ~outbound & (lanes.origin == at),
            "customers": ~inbound & (lanes.destination == at),
            "goods": lanes.good == at,
        }
        return ends[table]

    def _record(self, at: int) -> dict[str, str]:
        """Return the cells of a row as text, from now on those that count."""
        if at >= len(self._lanes):
            return self._added[at - len(self._lanes)]
        if at not in self._changed:
            one = replace(self._study, lanes=_taken(self._lanes, np.array([at])))
            names = tuple(dict.fromkeys([*LANES.names, *self.header]))
            (cells,) = rows_to_write(one, "lanes", names)
            self._changed[at] = {name: cell_text(value) for name, value in zip(names, cells, strict=True)}
            self._widen([*LANES.key])
        return self._changed[at]

    def _widen(self, columns: list[str]) -> None:
        self.header += [name for name in dict.fromkeys(columns) if name not in self.header]


def _taken(lanes: LaneTable, at: NDArray[np.integer]) -> LaneTable:
    """Return some rows of the lanes, in the order asked."""
    return replace(
        lanes,
        origin=lanes.origin[at],
        destination=lanes.destination[at],
        good=lanes.good[at],
        leg=lanes.leg[at],
        road_km=lanes.road_km[at],
        unit_cost=lanes.unit_cost[at],
        barred=lanes.barred[at],
        row=lanes.row[at],
        attributes={name: (words, places[at]) for name, (words, places) in lanes.attributes.items()},
    )


def _merged(lanes: LaneTable, touched: LaneTable, place: Positions) -> LaneTable:
    """Return the lanes with the first rows of `touched` in the places given, and its other rows after the last."""
    names = {name: at for at, name in enumerate(lanes.names)}
    new = np.array([names.setdefault(name, len(names)) for name in touched.names] + [BLANK], dtype=np.int32)
    count = place.size

    def joined(ours: NDArray[Any], theirs: NDArray[Any]) -> NDArray[Any]:
        both = np.concatenate([ours, theirs[count:]])
        both[place] = theirs[:count]
        return both

    attributes = {}
    for name in dict.fromkeys([*lanes.attributes, *touched.attributes]):
        ours, at = lanes.attributes.get(name, ((), np.full(len(lanes), BLANK, dtype=np.int32)))
        theirs, their_at = touched.attributes.get(name, ((), np.full(len(touched), BLANK, dtype=np.int32)))
        words = {word: position for position, word in enumerate(ours)}
        moved = np.array([words.setdefault(word, len(words)) for word in theirs] + [BLANK], dtype=np.int32)
        attributes[name] = (tuple(words), joined(at, moved[their_at]))
    return LaneTable(
        names=tuple(names),
        origin=joined(lanes.origin, new[touched.origin]),
        destination=joined(lanes.destination, new[touched.destination]),
        good=joined(lanes.good, new[touched.good]),
        leg=joined(lanes.leg, touched.leg),
        road_km=joined(lanes.road_km, touched.road_km),
        unit_cost=joined(lanes.unit_cost, touched.unit_cost),
        barred=joined(lanes.barred, touched.barred),
        row=joined(lanes.row, touched.row),
        attributes=attributes,
    )
