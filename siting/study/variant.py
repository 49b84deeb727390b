"""
Variants: named change sets on a study, as files.

A variant is a TOML file::

    name = "Higher rents"
    note = "Landlords' letters of March"

    [settings]
    outbound_rate = 0.21

    [[change]]
    table = "sites"
    key = { site = "Graz" }
    column = "yearly_charge"
    value = 450000

    [[add]]
    table = "customers"
    row = { customer = "Bratislava", demand = 120 }

    [[remove]]
    table = "sites"
    key = { site = "Brno" }

A blank value, ``""``, clears a cell or a setting. Here a variant is only read and written; `varying` applies it.
"""

from __future__ import annotations

import datetime as dt
import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

import tomli_w

from siting.errors import Fault, StudyError
from siting.study.columns import TABLES
from siting.study.gathering import did_you_mean
from siting.study.raw import cell_text

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    Cells = Mapping[str, str]
    """Texts by column, as they would be typed into the table."""

PARTS: Mapping[str, tuple[str, ...]] = {
    "change": ("table", "key", "column", "value"),
    "add": ("table", "row"),
    "remove": ("table", "key"),
}
"""What each kind of entry consists of; further kinds and parts may join them."""

_EXAMPLES = {
    "table": 'table = "sites"',
    "key": 'key = { site = "Graz" }',
    "row": 'row = { customer = "Bratislava", demand = 120 }',
    "column": 'column = "yearly_charge"',
    "value": "value = 450000",
}
_NAMED = ("name", "note", "settings", *PARTS)


@dataclass(frozen=True, slots=True, kw_only=True)
class CellChange:
    """One cell that takes another value."""

    table: str
    key: Cells
    """Columns that single the row out."""
    column: str
    value: str
    """As typed; blank clears the cell."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RowAdded:
    """One row more."""

    table: str
    row: Cells
    """Columns left out are blank."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RowRemoved:
    """One row less, with the rows of other tables that belong to it."""

    table: str
    key: Cells


@dataclass(frozen=True, slots=True, kw_only=True)
class Variant:
    """A named change set."""

    name: str
    note: str = ""
    changes: tuple[CellChange, ...] = ()
    added: tuple[RowAdded, ...] = ()
    removed: tuple[RowRemoved, ...] = ()
    settings: Mapping[str, object] = field(default_factory=dict)
    """As `study.toml` holds them, those of `[solve]` as ``solve.gap``; blank text clears one."""


def read_variant(path: Path | str) -> Variant:
    """
    Read a variant from its file.

    Parameters
    ----------
    path
        A TOML file.

    Returns
    -------
    variant
        Complete in itself; whether it fits a study is found out by applying it.

    Raises
    ------
    StudyError
        If the file cannot be read or is no variant; the error lists every fault.
    """
    path = Path(path)
    faults: list[Fault] = []
    held = _held(path, faults)
    if held is None:
        raise StudyError(faults)
    read = _Reader(path.name, faults)
    variant = read.variant(held)
    if faults:
        raise StudyError(faults)
    return variant


def write_variant(variant: Variant, path: Path | str) -> None:
    """
    Write a variant as a file that reads back to an equal one.

    Parameters
    ----------
    variant
        What to write.
    path
        The file; it is replaced.
    """
    Path(path).write_text(tomli_w.dumps(_as_toml(variant)), encoding="utf-8", newline="\n")


def variants_text(variants: Sequence[Variant]) -> str:
    """Return several variants as the text of one TOML file, each under ``[[variant]]``."""
    return tomli_w.dumps({"variant": [_as_toml(variant) for variant in variants]})


def variant_names(text: str) -> tuple[str, ...]:
    """Return the names of the variants that `variants_text` wrote."""
    return tuple(str(entry["name"]) for entry in tomllib.loads(text)["variant"])


def _as_toml(variant: Variant) -> dict[str, Any]:
    settings: dict[str, Any] = {name: value for name, value in variant.settings.items() if "." not in name}
    solve = {name.split(".", 1)[1]: value for name, value in variant.settings.items() if "." in name}
    if solve:
        settings["solve"] = solve
    return {
        "name": variant.name,
        **({"note": variant.note} if variant.note else {}),
        **({"settings": settings} if settings else {}),
        **_entries("change", [_parts(change) for change in variant.changes]),
        **_entries("add", [_parts(row) for row in variant.added]),
        **_entries("remove", [_parts(row) for row in variant.removed]),
    }


def _entries(kind: str, entries: list[dict[str, Any]]) -> dict[str, Any]:
    return {kind: entries} if entries else {}


def _parts(entry: CellChange | RowAdded | RowRemoved) -> dict[str, Any]:
    return {name: dict(value) if not isinstance(value, str) else value for name, value in _values(entry).items()}


def _values(entry: CellChange | RowAdded | RowRemoved) -> dict[str, Any]:
    return {name: getattr(entry, name) for name in entry.__dataclass_fields__}


def _held(path: Path, faults: list[Fault]) -> dict[str, Any] | None:
    """Return what the file holds, or None after noting why it cannot be read."""
    try:
        return tomllib.loads(path.read_bytes().decode("utf-8-sig"))
    except FileNotFoundError:
        wrong, repair = "there is no such file", "Give the TOML file of a variant"
    except UnicodeDecodeError:
        wrong, repair = "the file is not text in UTF-8", "Save it as UTF-8"
    except tomllib.TOMLDecodeError as error:
        wrong, repair = f"the file is not TOML ({error})", 'Write it as in name = "Higher rents", one entry a line'
    except OSError as error:
        wrong, repair = f"the file cannot be read ({error.strerror})", "Check that you may read it"
    faults.append(Fault(table="variant", value=str(path), wrong=wrong, repair=repair))
    return None


class _Reader:
    """Turns what a file holds into a variant, noting every fault on the way."""

    def __init__(self, place: str, faults: list[Fault]) -> None:
        self._place = place
        self._faults = faults

    def variant(self, held: dict[str, Any]) -> Variant:
        for name in held:
            if name not in _NAMED:
                self._fault(name, "", "unknown entry", did_you_mean(name, _NAMED, "Delete it"))
        name = self._text(held, "name")
        if not name.strip():
            self._fault("name", "", "the variant has no name", 'Add one, as in name = "Higher rents"')
        changes = tuple(
            CellChange(table=entry["table"], key=entry["key"], column=entry["column"], value=entry["value"])
            for entry in self._kind(held, "change")
        )
        variant = Variant(
            name=name.strip(),
            note=self._text(held, "note"),
            changes=changes,
            added=tuple(RowAdded(table=entry["table"], row=entry["row"]) for entry in self._kind(held, "add")),
            removed=tuple(RowRemoved(table=entry["table"], key=entry["key"]) for entry in self._kind(held, "remove")),
            settings=self._settings(held),
        )
        if not any(held.get(kind) for kind in ("settings", *PARTS)):
            self._fault("", "", "the variant holds no change", "Add a [[change]], [[add]], [[remove]] or [settings]")
        return variant

    def _fault(self, column: str, value: str, wrong: str, repair: str) -> None:
        self._faults.append(
            Fault(table=f"variant {self._place}", column=column, value=value, wrong=wrong, repair=repair)
        )

    def _text(self, held: Mapping[str, Any], name: str) -> str:
        value = held.get(name, "")
        if isinstance(value, str):
            return value
        self._fault(name, str(value), "not a text", f'Write it in quotes, as in {name} = "..."')
        return "?"

    def _settings(self, held: Mapping[str, Any]) -> dict[str, object]:
        given = held.get("settings", {})
        if not isinstance(given, dict):
            self._fault("settings", str(given), "not a section", "Write [settings] on a line of its own")
            return {}
        flat = {name: value for name, value in given.items() if name != "solve"}
        solve = given.get("solve", {})
        if not isinstance(solve, dict):
            self._fault("settings solve", str(solve), "not a section", "Write [settings.solve] on a line of its own")
            return flat
        return flat | {f"solve.{name}": value for name, value in solve.items()}

    def _kind(self, held: Mapping[str, Any], kind: str) -> list[dict[str, Any]]:
        """Return the sound entries of one kind, their cells as text."""
        entries = held.get(kind, [])
        if not isinstance(entries, list) or not all(isinstance(entry, dict) for entry in entries):
            self._fault(kind, "", "not a list of entries", f"Write [[{kind}]] on a line of its own before each")
            return []
        sound = [self._entry(kind, f"{kind} {place}", entry) for place, entry in enumerate(entries, start=1)]
        return [entry for entry in sound if entry is not None]

    def _entry(self, kind: str, place: str, entry: dict[str, Any]) -> dict[str, Any] | None:
        before = len(self._faults)
        for name in entry:
            if name not in PARTS[kind]:
                self._fault(f"{place} {name}", "", "unknown part", did_you_mean(name, PARTS[kind], "Delete it"))
        read: dict[str, Any] = {}
        for part in PARTS[kind]:
            if part not in entry:
                self._fault(f"{place} {part}", "", "missing", f"Add it, as in {_EXAMPLES[part]}")
            elif part in {"key", "row"}:
                read[part] = self._cells(f"{place} {part}", part, entry[part])
            elif part == "value":
                read[part] = self._cell(f"{place} value", entry[part])
            else:
                read[part] = self._name(f"{place} {part}", part, entry[part])
        return read if len(self._faults) == before else None

    def _name(self, place: str, part: str, value: object) -> str:
        if not isinstance(value, str):
            self._fault(place, str(value), "not a text", f"Write it in quotes, as in {_EXAMPLES[part]}")
            return ""
        if part == "table" and value not in TABLES:
            self._fault(place, value, "no such table", did_you_mean(value, TABLES, f"Write one of {', '.join(TABLES)}"))
        return value

    def _cells(self, place: str, part: str, value: object) -> dict[str, str]:
        if not isinstance(value, dict) or not value:
            self._fault(place, "" if value == {} else str(value), "no cells", f"Write it as in {_EXAMPLES[part]}")
            return {}
        return {name: self._cell(f"{place} {name}", cell) for name, cell in value.items()}

    def _cell(self, place: str, value: object) -> str:
        if isinstance(value, str | bool | int | float | dt.date | dt.time):
            return cell_text(value)
        self._fault(place, str(value), "not a cell", "Write a text in quotes, a number, true or false")
        return ""
