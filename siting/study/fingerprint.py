"""The fingerprint of a study: the same for the same tables and settings, however and in whatever order given."""

from __future__ import annotations

import dataclasses
import hashlib
import json
import math
from typing import TYPE_CHECKING
from weakref import WeakKeyDictionary

import numpy as np

from siting.study.columns import TABLES

if TYPE_CHECKING:
    from siting.arrays import Floats, Positions
    from siting.study.tables import LaneTable, Study

_FORM = b"siting study, form 3\n"
"""Changes whenever the canonical form does, so that fingerprints of two forms never agree by accident."""

_known: WeakKeyDictionary[Study, str] = WeakKeyDictionary()
"""Fingerprints of studies still in use, which never change: each is asked for several times."""

TABLES_KEPT = 16
"""Tables whose digests are kept: those of two studies, the oldest forgotten first."""

_tables: dict[int, tuple[object, bytes]] = {}
"""By identity, each with the table itself, so that no other can take its place in memory meanwhile."""


def fingerprint(study: Study) -> str:
    """
    Return the fingerprint of a study.

    Parameters
    ----------
    study
        A checked study.

    Returns
    -------
    digest
        SHA-256, 64 hexadecimal digits, of the settings and the tables with their attributes in a canonical form: rows
        sorted, numbers as doubles, blank attributes left out. Row numbers, the order of rows and columns, warnings and
        columns that are blank throughout do not matter.
    """
    known = _known.get(study)
    if known is None:
        known = _known[study] = _digest(study)
    return known


def _digest(study: Study) -> str:
    digest = hashlib.sha256(_FORM)
    digest.update(_text(dataclasses.asdict(study.settings)))
    for name in TABLES:
        digest.update(f"\n{name}\n".encode())
        digest.update(_table_digest(getattr(study, name)))
    return digest.hexdigest()


def _table_digest(table: tuple[object, ...] | LaneTable) -> bytes:
    """Return the digest of a table; studies made from one another share most of their tables."""
    kept = _tables.pop(id(table), None)
    found = _digest_of(table) if kept is None else kept[1]
    _tables[id(table)] = table, found
    while len(_tables) > TABLES_KEPT:
        _tables.pop(next(iter(_tables)), None)
    return found


def _digest_of(table: tuple[object, ...] | LaneTable) -> bytes:
    digest = hashlib.sha256()
    if isinstance(table, tuple):
        digest.update(b"".join(sorted(_text(_row(row)) for row in table)))
    else:
        _add_lanes(digest, table)
    return digest.digest()


def _row(row: object) -> dict[str, object]:
    values = {field.name: getattr(row, field.name) for field in dataclasses.fields(row)}  # type: ignore[arg-type]
    del values["row"]
    values["attributes"] = {name: text for name, text in values["attributes"].items() if text}
    return values


def _text(value: object) -> bytes:
    return (json.dumps(_plain(value), sort_keys=True, ensure_ascii=True, allow_nan=False) + "\n").encode()


def _plain(value: object) -> object:
    if isinstance(value, dict):
        return {name: _plain(held) for name, held in value.items()}
    if isinstance(value, tuple):
        return [_plain(held) for held in value]
    if isinstance(value, int | float) and not isinstance(value, bool):
        return float(value) + 0.0 if math.isfinite(value) else str(float(value))
    return str(value) if isinstance(value, str) else value


def _add_lanes(digest: hashlib._Hash, lanes: LaneTable) -> None:
    """Add the lanes column by column, sorted by leg, origin, destination and good."""
    used = sorted({lanes.names[at] for at in np.unique([lanes.origin, lanes.destination, lanes.good]) if at >= 0})
    place = {name: at for at, name in enumerate(used)}
    ranks = np.array([place.get(name, -1) for name in lanes.names] + [-1], dtype=np.int32)
    keys = [ranks[lanes.good], ranks[lanes.destination], ranks[lanes.origin], lanes.leg]
    order = np.lexsort(keys)
    digest.update(_text(tuple(used)))
    for column in reversed(keys):
        digest.update(_bytes(column[order]))
    for numbers in (lanes.road_km, lanes.unit_cost):
        digest.update(_number_bytes(numbers[order]))
    digest.update(lanes.barred[order].tobytes())
    for name, (words, at) in sorted(lanes.attributes.items()):
        held = sorted({words[position] for position in np.unique(at) if position >= 0})
        if held:
            held_at = {word: position for position, word in enumerate(held)}
            new = np.array([held_at.get(word, -1) for word in words] + [-1], dtype=np.int32)
            digest.update(_text((name, tuple(held))))
            digest.update(_bytes(new[at][order]))


def _bytes(positions: Positions) -> bytes:
    return positions.astype("<i4").tobytes()


def _number_bytes(numbers: Floats) -> bytes:
    return np.where(np.isnan(numbers), np.nan, numbers + 0.0).astype("<f8").tobytes()
