"""Turn the text of a table into typed rows and check each row by itself: headers, cells, keys."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Generic, TypeVar

from siting.study.columns import Column, Kind, TableSpec
from siting.study.gathering import nearest
from siting.study.parse import Refusal, check_text, parse_cell

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.study.gathering import Gathering
    from siting.study.raw import RawTable

RowT = TypeVar("RowT")

NEAR_MISS = 0.78
"""How alike, from 0 to 1, an unknown column and a known one must be for the unknown one to be a slip."""

SHORTEST_START = 3
"""Letters from which the beginning of a column's name, such as `lat`, counts as a slip of it."""

_STAND_INS: Mapping[Kind, object] = {Kind.NUMBER: 0.0, Kind.WHOLE: 0, Kind.NAMES: ()}


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Parsed(Generic[RowT]):
    """A table with typed rows. Where a cell was refused, the row holds the default: ask `Gathering.hurt` first."""

    spec: TableSpec
    there: bool
    """Whether the study has the table."""
    header: tuple[str, ...]
    rows: tuple[RowT, ...]
    texts: Mapping[str, Sequence[str]]
    """Cells as typed, of each known column that is there."""

    def typed(self, index: int, column: str) -> str:
        """Return the cell as typed; blank where the column is not there."""
        return self.texts[column][index] if column in self.texts else ""


def check_header(spec: TableSpec, header: Sequence[str], gathering: Gathering) -> tuple[str, ...]:
    """
    Check the column names of a table.

    Parameters
    ----------
    spec
        What the table should hold.
    header
        Column names as typed.
    gathering
        Takes missing, repeated and misspelt columns as faults, other unknown ones as one warning.

    Returns
    -------
    attributes
        Unknown columns that are carried along.
    """
    for name in dict.fromkeys(header):
        if header.count(name) > 1 and name:
            gathering.fault(
                spec.name,
                None,
                name,
                "",
                "the column is there more than once",
                "Keep one of them and delete the others",
            )
    attributes = []
    for name in dict.fromkeys(header):
        if name in spec.names:
            continue
        near = _slip_of(name, spec.names)
        if not name.strip():
            gathering.fault(
                spec.name, 1, "", "", "a column with cells in it has no name", "Name the column or clear it"
            )
        elif near:
            wrong = f"unknown column {name!r}, which looks like a slip of {near!r}"
            gathering.fault(spec.name, None, near, "", wrong, f"Rename it to {near}, or to something less alike")
        else:
            attributes.append(name)
    for column in spec.columns:
        if column.required and column.name not in header and not gathering.hurt(spec.name, None, column.name):
            gathering.fault(
                spec.name, None, column.name, "", "the column is missing", f"Add it: {_lower(column.meaning)}"
            )
    if attributes:
        listed = ", ".join(attributes)
        gathering.warn(
            spec.name, None, "", "", f"columns the program does not know are carried along unused: {listed}",
            "Nothing to do, unless one of them should have been a known column",
        )  # fmt: skip
    return tuple(attributes)


def parse_table(spec: TableSpec, raw: RawTable | None, gathering: Gathering) -> Parsed[Any]:
    """
    Return the typed rows of a table; every refused cell and repeated key becomes a fault.

    Parameters
    ----------
    spec
        What the table should hold; not `lanes`.
    raw
        The table as text, None where the study does not have it.
    gathering
        Takes faults and warnings.

    Returns
    -------
    parsed
        One row for each record, in order.
    """
    if raw is not None and not len(raw):
        gathering.warn(spec.name, None, "", "", "the table has no rows and counts as absent", "Fill it, or delete it")
    if raw is None or not len(raw):
        return Parsed(spec=spec, there=False, header=(), rows=(), texts={})
    attributes = check_header(spec, raw.header, gathering)
    texts = {name: raw.columns[raw.header.index(name)].to_pylist() for name in dict.fromkeys(raw.header) if name}
    numbers = raw.rows.tolist()
    for name in attributes:
        for row, text in zip(numbers, texts[name], strict=True):
            refusal = check_text(text)
            if refusal:
                refuse(gathering, spec.name, row, name, text, refusal)
    kinds = {
        column.name: [_cell(spec, column, *cell, gathering) for cell in zip(numbers, texts[column.name], strict=True)]
        for column in spec.columns
        if column.name in texts
    }
    rows = []
    row_type: Any = spec.row_type
    for index, number in enumerate(numbers):
        values = {name: cells[index] for name, cells in kinds.items() if cells[index] is not None}
        for column in spec.columns:
            if column.required and column.name not in values:
                values[column.name] = _stand_in(column)
        held = {name: texts[name][index] for name in attributes}
        rows.append(row_type(**values, attributes=held, row=number) if held else row_type(**values, row=number))
    parsed: Parsed[Any] = Parsed(spec=spec, there=True, header=raw.header, rows=tuple(rows), texts=texts)
    _check_keys(parsed, gathering)
    return parsed


def refuse(  # noqa: PLR0913, PLR0917  (the fields of a fault)
    gathering: Gathering, table: str, row: int | None, column: str, value: str, refusal: Refusal
) -> None:
    """Note a refused cell as a fault."""
    gathering.fault(table, row, column, value, refusal.wrong, refusal.repair)


def blank_refusal(column: Column) -> Refusal:
    """Return the refusal of a blank cell in a column that may not be blank."""
    if column.choices:
        return Refusal("blank", f"Write one of {', '.join(column.choices)}")
    if column.kind is Kind.NUMBER:
        unlimited = ", or unlimited" if column.unlimited else ""
        return Refusal("blank", f"Write a number, 0 if that is meant{unlimited}")
    return Refusal("blank", f"Fill it in: {_lower(column.meaning)}")


def _cell(spec: TableSpec, column: Column, row: int, text: str, gathering: Gathering) -> object:
    """Return the value of a cell, or None where it is blank or refused."""
    if not text.strip():
        if column.required or not column.blank:
            refuse(gathering, spec.name, row, column.name, text, blank_refusal(column))
        elif text:
            refuse(gathering, spec.name, row, column.name, text, Refusal("only blanks", "Clear the cell"))
        return None
    value = parse_cell(column, text)
    if isinstance(value, Refusal):
        refuse(gathering, spec.name, row, column.name, text, value)
        return None
    return value


def _stand_in(column: Column) -> object:
    return next(iter(column.enum)) if column.enum else _STAND_INS.get(column.kind, "")


def _check_keys(parsed: Parsed[Any], gathering: Gathering) -> None:
    key = parsed.spec.key
    if not key:
        return
    seen: dict[tuple[str, ...], int] = {}
    for row in parsed.rows:
        names = tuple(getattr(row, column) for column in key)
        if not all(names) or gathering.hurt(parsed.spec.name, row.row, *key):
            continue
        first = seen.setdefault(names, row.row)
        if first != row.row:
            repair = "Delete one of the two rows"
            if len(key) == 1:
                repair = "Give each its own name, or delete one of the two rows"
            gathering.fault(parsed.spec.name, row.row, key[-1], names[-1], _twice(key, names, first), repair)


def _twice(key: tuple[str, ...], names: tuple[str, ...], first: int) -> str:
    if len(key) == 1:
        return f"the same {key[0]} is already in row {first}"
    pair = " and ".join(f"{column} {name!r}" for column, name in zip(key, names, strict=True))
    return f"{pair} are together already in row {first}"


def _slip_of(name: str, known: Sequence[str]) -> str | None:
    folded = "_".join(name.casefold().replace("-", " ").split())
    if len(folded) >= SHORTEST_START:
        for word in known:
            if word.startswith(folded):
                return word
    return nearest(name, known, NEAR_MISS)


def _lower(text: str) -> str:
    return text[0].lower() + text[1:]
