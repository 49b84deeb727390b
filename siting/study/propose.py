"""
Propose which columns of a file are which of ours, by their names and by what is in them.

A proposal is never applied by itself: the analyst confirms or corrects it (`mapping.py` keeps the answer).
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING

from rapidfuzz.distance import Indel
from rapidfuzz.fuzz import token_sort_ratio

from siting.study.columns import TABLES, Column, Kind
from siting.study.draft import KEYS
from siting.study.parse import NO, UNLIMITED, YES
from siting.study.synonyms import SYNONYMS, TABLE_SYNONYMS

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Mapping, Sequence

    from siting.study.columns import TableSpec
    from siting.study.raw import RawStudy, RawTable

SAMPLE_ROWS = 1_000
"""Rows at the start of a table by which its columns are judged."""

LEAST_CONFIDENCE = 0.5
"""Confidence below which nothing is proposed."""

_LEAST_ALIKE = 0.72
"""How alike two names must be to count as alike, from 0 to 1."""

_LEAST_ALIKE_TABLE = 0.85
"""Likewise of tables, whose contents are not looked at."""

_FITS = 0.9
"""Share of the cells that must be of a column's kind."""

_BY_NAME, _BY_BOTH = 0.8, 0.2
"""Weight of the name, and of contents that fit it."""

_BY_PLACES, _BY_KEY, _BY_REFERENCE = 0.65, 0.55, 0.85
"""Confidence by contents alone: coordinates, names that all differ, names of another table."""

_BRACKETS = re.compile(r"[\(\[\{].*?[\)\]\}]")
_HUMP = re.compile(r"(?<=[a-z0-9])(?=[A-Z])")
_NUMBER = re.compile(r"\s*[-+\u2212]?[0-9][0-9.,'\u2019\s]*(?:[eE][-+]?[0-9]+)?\s*")
_LATITUDE_LIMIT, _LONGITUDE_LIMIT = 90.0, 180.0

REFERENCES: Mapping[tuple[str, str], tuple[str, ...]] = {
    ("sizes", "site"): ("sites",),
    ("demands", "customer"): ("customers",),
    ("demands", "good"): ("goods",),
    ("offers", "supplier"): ("suppliers",),
    ("offers", "good"): ("goods",),
    ("lanes", "origin"): ("suppliers", "sites"),
    ("lanes", "destination"): ("sites", "customers"),
    ("lanes", "good"): ("goods",),
}
"""Tables whose names a column repeats."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Proposal:
    """That a column of a file may be one of ours."""

    table: str
    typed: str
    """The column as the file has it."""
    column: str
    """The column of ours."""
    confidence: float
    """From 0 to 1; 1 = the name says it and the cells fit."""
    reasons: tuple[str, ...]
    """Why, in words for the analyst."""


def propose_mapping(raw: RawStudy) -> tuple[Proposal, ...]:
    """
    Propose a column of ours for every column that has another name, where anything speaks for one.

    Parameters
    ----------
    raw
        A study as read.

    Returns
    -------
    proposals
        At most one for each column as typed and each column of ours, in the order of tables and columns.
    """
    found: dict[str, list[Proposal]] = {}
    names: dict[str, frozenset[str]] = {}
    for name in (*KEYS, *TABLES):
        if name in raw.tables and name not in found:
            found[name] = _propose_table(TABLES[name], raw.tables[name], names)
            if name in KEYS:
                names[name] = _names(raw.tables[name], KEYS[name], found[name])
    return tuple(proposal for name in raw.tables if name in found for proposal in found[name])


def _names(table: RawTable, key: str, proposals: Iterable[Proposal]) -> frozenset[str]:
    """Return the names a table defines, in its key column or in the one proposed for it."""
    typed = next((each.typed for each in proposals if each.column == key), key)
    cells = table.column(typed)
    return frozenset() if cells is None else frozenset(cells.to_pylist())


def _propose_table(spec: TableSpec, table: RawTable, names: Mapping[str, frozenset[str]]) -> list[Proposal]:
    free = [column for column in spec.columns if column.name not in table.header]
    typed = [name for name in dict.fromkeys(table.header) if name.strip() and name not in spec.names]
    samples = {name: _sample(table, name) for name in typed}
    all_of_them = [
        proposal
        for name in typed
        for column in free
        if (proposal := _judge(spec, column, name, samples[name], names)) is not None
    ]
    all_of_them += _by_range(spec, free, samples)
    chosen: dict[str, Proposal] = {}
    taken: set[str] = set()
    for proposal in sorted(all_of_them, key=lambda each: -each.confidence):
        if proposal.typed not in chosen and proposal.column not in taken:
            chosen[proposal.typed] = proposal
            taken.add(proposal.column)
    return [chosen[name] for name in typed if name in chosen]


def _sample(table: RawTable, name: str) -> list[str]:
    cells = table.columns[table.header.index(name)]
    texts: list[str] = cells.slice(0, SAMPLE_ROWS).to_pylist()
    return [text for text in texts if text.strip()]


def _judge(
    spec: TableSpec, column: Column, typed: str, sample: Sequence[str], names: Mapping[str, frozenset[str]]
) -> Proposal | None:
    alike, word = _likeness(typed, column.name)
    fits, said = _fit(spec, column, sample, names)
    confidence = 0.0
    reasons: list[str] = []
    if alike >= _LEAST_ALIKE and fits is not False:
        confidence = alike * _BY_NAME + (_BY_BOTH if fits or not sample else 0.0)
        reasons.append(f"the name is {'' if alike == 1.0 else 'like '}{word!r}")
    if fits and (alone := _alone(spec, column)) > confidence:
        confidence = alone
    if confidence < LEAST_CONFIDENCE:
        return None
    return Proposal(
        table=spec.name, typed=typed, column=column.name, confidence=round(confidence, 2),
        reasons=(*reasons, *([said] if said and fits else [])),
    )  # fmt: skip


def _alone(spec: TableSpec, column: Column) -> float:
    """Return the confidence that contents which fit give without a name."""
    if (spec.name, column.name) in REFERENCES:
        return _BY_REFERENCE
    return _BY_KEY if spec.key == (column.name,) else 0.0


def propose_sources(raw: RawStudy) -> dict[str, str]:
    """
    Propose which table a file or sheet of another name holds, by its name.

    Parameters
    ----------
    raw
        A study as read.

    Returns
    -------
    sources
        Tables that are not there, by the name of what was not read; each at most once.
    """
    free = [name for name in TABLES if name not in raw.tables and name not in raw.unreadable]
    sources: dict[str, str] = {}
    for stranger in raw.strangers:
        likeness = {name: _likeness(stranger, name, TABLE_SYNONYMS)[0] for name in free if name not in sources.values()}
        best = max(likeness, key=likeness.__getitem__, default="")
        if best and likeness[best] >= _LEAST_ALIKE_TABLE:
            sources[stranger] = best
    return sources


def _likeness(typed: str, ours: str, synonyms: Mapping[str, tuple[str, ...]] = SYNONYMS) -> tuple[float, str]:
    """Return how alike two names are, from 0 to 1, and the word of ours, or its synonym, that comes nearest."""
    word = fold(typed)
    best, nearest = 0.0, ours
    for known in (ours.replace("_", " "), *synonyms.get(ours, ())):
        likeness = max(Indel.normalized_similarity(word, known), token_sort_ratio(word, known) / 100)
        if len(known) <= 3 and likeness < 1.0:  # noqa: PLR2004  (such short words are alike by chance)
            continue
        if likeness > best:
            best, nearest = likeness, known
    return best, nearest


def fold(name: str) -> str:
    """Return a column name in small letters without accents, brackets and what parts its words but blanks."""
    text = _HUMP.sub(" ", _BRACKETS.sub(" ", name))
    bare = "".join(letter for letter in unicodedata.normalize("NFKD", text) if not unicodedata.combining(letter))
    return " ".join(re.sub(r"[\W_]+", " ", bare.casefold()).split())


def _fit(
    spec: TableSpec, column: Column, sample: Sequence[str], names: Mapping[str, frozenset[str]]
) -> tuple[bool | None, str]:
    """Return whether cells are of a column's kind, None where that says nothing, and what they are in words."""
    reference = REFERENCES.get((spec.name, column.name))
    fits: bool | None = None
    said = ""
    if not sample:
        return None, ""
    if column.kind in {Kind.NUMBER, Kind.WHOLE}:
        fits, said = _share(sample, _is_number) >= _FITS, "its cells are numbers"
    elif column.kind in {Kind.CHOICE, Kind.YES_NO}:
        words = frozenset(column.choices or YES | NO)
        fits, said = (_share(sample, lambda text: text.casefold() in words) >= _FITS or None), "its words are ours"
    elif reference and (known := frozenset().union(*(names.get(table, ()) for table in reference))):
        share = _share(sample, known.__contains__)
        fits, said = share >= _FITS, f"{share:.0%} of its texts are in {' and '.join(reference)}"
    elif spec.key == (column.name,) and len(set(sample)) == len(sample) and _share(sample, _is_number) < 1 - _FITS:
        fits, said = True, "its texts all differ, as names do"
    return fits, said


def _is_number(text: str) -> bool:
    return text == UNLIMITED or _NUMBER.fullmatch(text) is not None


def _share(sample: Sequence[str], holds: Callable[[str], bool]) -> float:
    return sum(map(holds, sample)) / len(sample)


def _by_range(spec: TableSpec, free: Iterable[Column], samples: Mapping[str, list[str]]) -> list[Proposal]:
    """Propose latitude and longitude for two columns in a row that hold numbers of their range, with decimals."""
    if not {"latitude", "longitude"} <= {column.name for column in free}:
        return []
    held = [(name, _degrees(sample)) for name, sample in samples.items()]
    for (first, north), (second, east) in pairwise(held):
        if north and east and max(map(abs, north)) <= _LATITUDE_LIMIT and max(map(abs, east)) <= _LONGITUDE_LIMIT:
            return [
                Proposal(
                    table=spec.name, typed=typed, column=column, confidence=_BY_PLACES,
                    reasons=(f"numbers with decimals from {min(values):g} to {max(values):g}, as {column}s are",),
                )
                for typed, column, values in ((first, "latitude", north), (second, "longitude", east))
            ]  # fmt: skip
    return []


def _degrees(sample: Sequence[str]) -> list[float]:
    """Return the numbers of a column that may be degrees; none where it holds anything else, or whole numbers only."""
    values = []
    for text in sample:
        plain = text.strip().replace("\u2212", "-").replace(",", ".")
        if not re.fullmatch(r"-?[0-9]{1,3}(\.[0-9]+)?", plain):
            return []
        values.append(float(plain))
    return values if any(value != int(value) for value in values) else []
