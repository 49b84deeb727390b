"""Check the `lanes` table, column by column: there may be millions of rows, so nothing here loops over good ones."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from siting.study.check_rows import blank_refusal, check_header, refuse
from siting.study.columns import LANES, Column
from siting.study.gathering import MOST_LISTED, did_you_mean
from siting.study.parse import NO, YES, Refusal, parse_cell
from siting.study.tables import LaneTable, Leg, no_lanes

if TYPE_CHECKING:
    from collections.abc import Callable, Collection, Mapping, Sequence

    from siting.arrays import Flags, Floats, Positions
    from siting.study.gathering import Gathering
    from siting.study.raw import RawTable

_PLAIN_NUMBER = r"^-?[0-9]+(\.[0-9]+)?([eE][+-]?[0-9]+)?$"
_BLANK = r"^\s*$"
_ABSENT = -1


@dataclass(frozen=True, slots=True, kw_only=True)
class Known:
    """Names that lanes may use."""

    sites: Collection[str]
    suppliers: Collection[str]
    customers: Collection[str]
    goods: Collection[str]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ParsedLanes:
    """The lanes as columns, and which rows not to trust."""

    table: LaneTable
    """In rows with a fault, refused cells are blank and unknown legs are -1."""
    hurt: Flags
    """(rows,) True where a row has a fault."""


def parse_lanes(raw: RawTable | None, known: Known | None, gathering: Gathering) -> ParsedLanes:
    """
    Return the lanes as columns; every refused cell, unknown name and repeated lane becomes a fault.

    Parameters
    ----------
    raw
        The table as text, None where the study does not have it.
    known
        Names of the other tables; None where they cannot be relied upon, so that only the cells are checked.
    gathering
        Takes faults and warnings, at most `MOST_LISTED` of each; the others are counted.

    Returns
    -------
    parsed
        One row for each record, in order, and which of them have a fault.
    """
    if raw is None:
        return ParsedLanes(table=no_lanes(), hurt=np.zeros(0, dtype=np.bool_))
    attributes = check_header(LANES, raw.header, gathering)
    cells = {name: raw.column(name) for name in LANES.names}
    notes = _Notes(raw.rows, cells, gathering)
    origin, destination, good = (_factorised(cells[name], len(raw)) for name in ("origin", "destination", "good"))
    names, (origin_at, destination_at, good_at) = _merged([origin, destination, good])
    _check_blank_names(names, origin_at, destination_at, notes, raw.header)
    if known is None:
        unknown = np.ones(len(raw), dtype=np.bool_)
        leg = np.full(len(raw), _ABSENT, dtype=np.int32)
    else:
        unknown = _check_names(names, origin_at, destination_at, good_at, known, notes)
        leg = _legs(names, origin_at, destination_at, cells["leg"], unknown, known, notes)
    barred = _barred(cells["barred"], len(raw), notes)
    lanes = LaneTable(
        names=names,
        origin=origin_at,
        destination=destination_at,
        good=good_at,
        leg=leg,
        road_km=_numbers(LANES.column("road_km"), cells["road_km"], len(raw), notes),
        unit_cost=_numbers(LANES.column("unit_cost"), cells["unit_cost"], len(raw), notes),
        barred=barred,
        row=raw.rows,
        attributes={name: _factorised(raw.column(name), len(raw)) for name in attributes},
    )
    _check_repeats(lanes, ~unknown & (leg != _ABSENT), notes)
    return ParsedLanes(table=lanes, hurt=notes.hurt | unknown)


class _Notes:
    """Turns flagged rows into faults with their cells, up to the cap."""

    def __init__(self, rows: Positions, cells: Mapping[str, pa.Array | None], gathering: Gathering) -> None:
        self.rows = rows
        self._cells = cells
        self._gathering = gathering
        self.hurt = np.zeros(rows.shape, dtype=np.bool_)
        """(rows,) True where a fault was noted."""

    def fault(self, wrong: Flags, column: str, why: Callable[[int, str], Refusal]) -> None:
        """Note a fault for every row flagged; ``why`` gets the position of the row and the cell as typed."""
        self.hurt |= wrong
        places = np.flatnonzero(wrong)
        cells = self._cells.get(column)
        for place in places[:MOST_LISTED].tolist():
            text = "" if cells is None else cells[place].as_py()
            refuse(self._gathering, LANES.name, int(self.rows[place]), column, text, why(place, text))
        self._gathering.count_more(LANES.name, faults=max(0, places.size - MOST_LISTED))


def _factorised(cells: pa.Array | None, count: int) -> tuple[tuple[str, ...], Positions]:
    """Return the different texts and the position of each cell among them; -1 where the cell or column is blank."""
    if cells is None:
        return (), np.full(count, _ABSENT, dtype=np.int32)
    coded = cells.dictionary_encode()
    words = tuple(coded.dictionary.to_pylist())
    positions = coded.indices.to_numpy(zero_copy_only=False).astype(np.int32)
    if "" in words:
        positions = np.where(positions == words.index(""), np.int32(_ABSENT), positions)
    return words, positions


def _merged(columns: Sequence[tuple[tuple[str, ...], Positions]]) -> tuple[tuple[str, ...], list[Positions]]:
    """Return one tuple of names for several factorised columns, and their positions in it."""
    names: dict[str, int] = {}
    merged = []
    for words, positions in columns:
        new = np.array(
            [names.setdefault(word, len(names)) if word else _ABSENT for word in words] + [_ABSENT], np.int32
        )
        merged.append(new[positions])
    return tuple(names), merged


def _is_one_of(names: Sequence[str], known: Collection[str]) -> Flags:
    """Return, for each name and for the absent one at the end, whether it is known."""
    return np.array([*(name in known for name in names), False], dtype=np.bool_)


def _check_blank_names(
    names: Sequence[str], origin: Positions, destination: Positions, notes: _Notes, there: Collection[str]
) -> None:
    """Note blank names, unless the whole column is missing, which is a fault of its own."""
    only_blanks = np.array([*(not name.strip() for name in names), True], dtype=np.bool_)
    for column, positions in (("origin", origin), ("destination", destination)):
        refusal = blank_refusal(LANES.column(column))
        if column in there:
            notes.fault(only_blanks[positions], column, _always(refusal))


def _check_names(  # noqa: PLR0913, PLR0917  (three columns of one table)
    names: Sequence[str], origin: Positions, destination: Positions, good: Positions, known: Known, notes: _Notes
) -> Flags:
    """Note names that no table defines and return the rows that have one (or a blank)."""
    hurt = np.zeros(origin.shape, dtype=np.bool_)
    starts = [*known.sites, *known.suppliers]
    ends = [*known.sites, *known.customers]
    for column, positions, allowed, what in (
        ("origin", origin, starts, "neither a site nor a supplier"),
        ("destination", destination, ends, "neither a site nor a customer"),
        ("good", good, known.goods, "not a good"),
    ):
        is_known = _is_one_of(names, set(allowed))
        blank = positions == _ABSENT
        wrong = ~is_known[positions] & ~blank
        hurt |= wrong | (blank if column != "good" else False)
        stripped = np.array([bool(name.strip()) for name in names] + [True], dtype=np.bool_)
        notes.fault(wrong & stripped[positions], column, _unknown_name(what, allowed))
    return hurt


def _always(refusal: Refusal) -> Callable[[int, str], Refusal]:
    return lambda *_: refusal


def _unknown_name(what: str, allowed: Collection[str]) -> Callable[[int, str], Refusal]:
    def why(_: int, text: str) -> Refusal:
        return Refusal(f"{what} of the study", did_you_mean(text, allowed, "Add it to its table, or delete the row"))

    return why


def _legs(  # noqa: PLR0913, PLR0917  (columns of one table)
    names: Sequence[str],
    origin: Positions,
    destination: Positions,
    cells: pa.Array | None,
    unknown: Flags,
    known: Known,
    notes: _Notes,
) -> Positions:
    """Return the leg of each row as a position in `LaneTable.LEGS`; -1 where it is not clear."""
    site, supplier, customer = (
        _is_one_of(names, known_names) for known_names in (known.sites, known.suppliers, known.customers)
    )
    fits = np.stack(
        [
            supplier[origin] & site[destination],
            site[origin] & customer[destination],
            supplier[origin] & customer[destination],
        ]
    )
    words, at = _factorised(cells, origin.shape[0])
    legs = [str(leg) for leg in LaneTable.LEGS]
    typed = np.array([legs.index(word) if word in legs else _ABSENT for word in words] + [_ABSENT], dtype=np.int32)[at]
    misspelt = (at != _ABSENT) & (typed == _ABSENT)
    notes.fault(misspelt, "leg", _refused_leg)
    count = fits.sum(axis=0)
    sound = ~unknown & ~misspelt
    same = origin == destination
    notes.fault(
        sound & (count == 0) & (typed == _ABSENT), "destination",
        lambda place, _: Refusal(
            "a lane cannot lead from a place to itself" if same[place] else
            "these two names fit no leg: lanes run from a supplier to a site, from a site to a customer, or from a "
            "supplier to a customer",
            "Correct origin or destination, or delete the row",
        ),
    )  # fmt: skip
    is_open = sound & (typed == _ABSENT) & (count > 1)
    notes.fault(
        is_open, "leg",
        lambda place, _: Refusal(
            "the two names fit more than one leg",
            f"Write {' or '.join(legs[leg] for leg in np.flatnonzero(fits[:, place]))} in the column leg",
        ),
    )  # fmt: skip
    does_fit = np.take_along_axis(fits, np.maximum(typed, 0)[None, :], axis=0)[0]
    notes.fault(
        sound & (typed != _ABSENT) & ~does_fit, "leg",
        lambda place, text: Refusal(
            f"the two names are not those of a lane of this leg: {_ENDS[Leg(text)]}",
            f"Write {' or '.join(legs[leg] for leg in np.flatnonzero(fits[:, place]))}" if count[place]
            else "Correct origin or destination, or delete the row",
        ),
    )  # fmt: skip
    clear = np.where(count == 1, np.argmax(fits, axis=0), _ABSENT)
    return np.where(typed != _ABSENT, np.where(does_fit, typed, _ABSENT), clear).astype(np.int32)


_ENDS = {
    Leg.INBOUND: "inbound runs from a supplier to a site",
    Leg.OUTBOUND: "outbound runs from a site to a customer",
    Leg.DIRECT: "direct runs from a supplier to a customer",
}


def _refused_leg(_: int, text: str) -> Refusal:
    refusal = parse_cell(LANES.column("leg"), text)
    return refusal if isinstance(refusal, Refusal) else Refusal("not a leg", "Write inbound, outbound or direct")


def _numbers(column: Column, cells: pa.Array | None, count: int, notes: _Notes) -> Floats:
    """Return the numbers of a column; NaN where blank or refused."""
    if cells is None:
        return np.full(count, np.nan)
    blank = pc.equal(cells, "").to_numpy(zero_copy_only=False)
    plain = pc.match_substring_regex(cells, _PLAIN_NUMBER).to_numpy(zero_copy_only=False)
    texts = pc.if_else(pa.array(plain), cells, pa.scalar(None, pa.string()))
    values: Floats = pc.cast(texts, pa.float64()).to_numpy(zero_copy_only=False).copy()
    low = 0.0 if column.low is None else column.low
    wrong = ~blank & ~(plain & np.isfinite(values) & (values >= low))
    values[wrong] = np.nan
    notes.fault(wrong, column.name, lambda _, text: _refused_number(column, text))
    return values


def _refused_number(column: Column, text: str) -> Refusal:
    if not text.strip():
        return Refusal("only blanks", "Clear the cell")
    refusal = parse_cell(column, text)
    return refusal if isinstance(refusal, Refusal) else Refusal("not a number", "Write a number such as 1250")


def _barred(cells: pa.Array | None, count: int, notes: _Notes) -> Flags:
    words, at = _factorised(cells, count)
    folded = [word.casefold() for word in words]
    wrong = np.array([word != "" and word not in YES | NO for word in folded] + [False], dtype=np.bool_)
    notes.fault(wrong[at], "barred", _always(Refusal("neither yes nor no", "Write yes or no")))
    return np.array([word in YES for word in folded] + [False], dtype=np.bool_)[at]


def _check_repeats(lanes: LaneTable, sound: Flags, notes: _Notes) -> None:
    """Note every lane that an earlier row has already."""
    size = np.int64(len(lanes.names) + 1)
    key = ((lanes.leg.astype(np.int64) * size + lanes.origin) * size + lanes.destination) * size + lanes.good + 1
    places = np.flatnonzero(sound)
    order = places[np.argsort(key[places], kind="stable")]
    same = key[order][1:] == key[order][:-1]
    repeated = np.zeros(len(lanes), dtype=np.bool_)
    repeated[order[1:][same]] = True
    if not repeated.any():
        return
    first = {int(key[place]): int(lanes.row[place]) for place in order[~np.concatenate([[False], same])].tolist()}
    notes.fault(
        repeated, "destination",
        lambda place, _: Refusal(
            f"the same lane is already in row {first[int(key[place])]}", "Delete one of the two rows"
        ),
    )  # fmt: skip
