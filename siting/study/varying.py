"""
Apply variants to a study: the result is a study of its own, checked like one that was read.

The study is never edited. Its tables become text, the variants change that text, and the same checks run over it, so
that a variant meets the same faults as a spreadsheet would; a fault names the change that led to it. Lanes that no
variant touches stay in the arrays of the study.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from siting.errors import Fault, StudyError
from siting.study.check import check_raw
from siting.study.check_lanes import Known
from siting.study.columns import SETTINGS, SOLVE_SETTINGS, TABLES
from siting.study.draft import KEYS
from siting.study.gathering import Gathering, did_you_mean
from siting.study.parse import parse_cell
from siting.study.raw import RawStudy, cell_text, table_from_rows
from siting.study.tables import IMPLIED_GOOD
from siting.study.variant_lanes import LanesAtWork
from siting.study.variant_rows import RowsAtWork
from siting.study.write import settings_to_write

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.study.tables import Study
    from siting.study.variant import CellChange, RowAdded, RowRemoved, Variant

BELONGING: Mapping[str, Mapping[str, str]] = {
    "sites": {"sizes": "site"},
    "suppliers": {"offers": "supplier"},
    "customers": {"demands": "customer"},
    "goods": {"demands": "good", "offers": "good"},
}
"""Tables whose rows go with a row that is removed, and the column that names it; lanes go with all four."""

SETTINGS_NAME = "study.toml"
SETTING_NAMES = frozenset(
    [*(column.name for column in SETTINGS), *(f"solve.{column.name}" for column in SOLVE_SETTINGS)]
)

Place = tuple[str, int | None, str]
"""Table, row and column."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Varied:
    """A study with variants applied."""

    study: Study
    """Of its own fingerprint; its warnings are those of the changed tables, and of changes that change nothing."""
    variants: tuple[Variant, ...]
    """In the order in which they were applied."""
    lines: tuple[str, ...]
    """What they change, one line each, such as `sites Graz yearly_charge: 410000 -> 450000`."""


def vary(study: Study, variants: Sequence[Variant]) -> Varied:
    """
    Apply variants to a study, one on top of the other.

    Parameters
    ----------
    study
        A checked study; it stays as it is.
    variants
        In the order in which to apply them; a later one may change what an earlier one changed.

    Returns
    -------
    varied
        The changed study and what was changed. Where a site, supplier, customer or good is removed, its rows in other
        tables go with it; rules that name it do not, and are a fault.

    Raises
    ------
    StudyError
        If a variant does not fit the study, or leaves one that has faults; each fault names the variant's change.
    """
    if not variants:
        return Varied(study=study, variants=(), lines=())
    work = _Work(study)
    for variant in variants:
        work.apply(variant)
    return Varied(study=work.finished(), variants=tuple(variants), lines=tuple(work.lines))


class _Work:
    """A study while variants are applied to it."""

    def __init__(self, study: Study) -> None:
        self._study = study
        self._tables: dict[str, RowsAtWork] = {
            name: RowsAtWork(study, name) for name in TABLES if name != "lanes" and getattr(study, name)
        }
        self._lanes = LanesAtWork(study)
        self._settings: dict[str, object] = dict(settings_to_write(study))
        self.lines: list[str] = []
        self._faults: list[Fault] = []
        self._warnings: list[Fault] = []
        self._places: dict[Place, tuple[str, str]] = {}
        """Which variant and change led to a cell, or, under a blank column, to a row."""
        self._names: list[str] = []
        self._variant = ""

    def apply(self, variant: Variant) -> None:
        """Apply one variant: settings, cells, rows removed, rows added."""
        self._variant = variant.name
        if variant.name in self._names:
            self._fault("", "", "two variants have this name", "Give each its own, or leave one out")
        self._names.append(variant.name)
        done: dict[tuple[object, ...], str] = {}
        for name, value in variant.settings.items():
            self._set(name, value)
        for number, change in enumerate(variant.changes, start=1):
            self._change(f"change {number} ({change.table} {_named(change.key)} {change.column})", change, done)
        for number, removed in enumerate(variant.removed, start=1):
            self._remove(f"remove {number} ({removed.table} {_named(removed.key)})", removed, done)
        for number, added in enumerate(variant.added, start=1):
            self._add(f"add {number} ({added.table} {_named(_key_of(added.table, added.row))})", added)

    def finished(self) -> Study:
        """
        Return the changed study.

        Raises
        ------
        StudyError
            If there is any fault.
        """
        if self._faults:
            raise StudyError(self._faults, self._warnings)
        raw = self._raw()
        gathering = Gathering()
        known = Known(**{table: self._names_of(table, key) for table, key in KEYS.items()})
        lanes = self._lanes.finished(known, gathering)
        faults, warnings = gathering.faults(), gathering.warnings()
        checked = check_raw(replace(raw, faults=faults, warnings=warnings), lanes)
        noted = (*self._warnings, *(self._placed(warning, to_blame=False) for warning in checked.warnings))
        if checked.study is None:
            raise StudyError([self._placed(fault, to_blame=True) for fault in checked.faults], noted)
        columns = dict(checked.study.columns)
        if self._lanes.header:
            columns["lanes"] = tuple(self._lanes.header)
        return replace(checked.study, columns=columns, warnings=noted)

    def _raw(self) -> RawStudy:
        settings = {name: value for name, value in self._settings.items() if not name.startswith("solve.")}
        solve = {name.removeprefix("solve."): self._settings[name] for name in self._settings.keys() - settings.keys()}
        return RawStudy(
            tables={
                name: table_from_rows(table.header, table.records, table.numbers)
                for name, table in self._tables.items()
                if table.records
            },
            settings={**settings, "solve": solve} if solve else settings,
            settings_name=SETTINGS_NAME,
        )

    def _names_of(self, table: str, key: str) -> tuple[str, ...]:
        if table in self._tables and self._tables[table].records:
            return tuple(self._tables[table].column(key))
        return (IMPLIED_GOOD,) if table == "goods" else ()

    def _fault(self, place: str, value: str, wrong: str, repair: str) -> None:
        self._faults.append(self._note(place, value, wrong, repair))

    def _warn(self, place: str, value: str, wrong: str, repair: str) -> None:
        self._warnings.append(self._note(place, value, wrong, repair))

    def _note(self, place: str, value: str, wrong: str, repair: str) -> Fault:
        return Fault(table=f"variant {self._variant!r}", column=place, value=value, wrong=wrong, repair=repair)

    def _placed(self, fault: Fault, *, to_blame: bool) -> Fault:
        """Return a fault of the changed study with the variant's change as its place."""
        cell = self._places.get((fault.table, fault.row, fault.column))
        row = self._places.get((fault.table, fault.row, "")) if fault.row is not None else None
        if cell is not None:
            return replace(fault, table=f"variant {cell[0]!r}", row=None, column=cell[1])
        if row is not None:
            column = f", column {fault.column}" if fault.column else ""
            return replace(fault, table=f"variant {row[0]!r}", row=None, column=f"{row[1]}{column}")
        if not to_blame:
            return fault
        names = ", ".join(repr(name) for name in self._names)
        return replace(fault, table=f"with variant {names}: {fault.table}")

    def _mark(self, place: Place, change: str) -> None:
        self._places[place] = (self._variant, change)

    def _set(self, name: str, value: object) -> None:
        place = f"settings {name}"
        before = self._present(name)
        known = name in SETTING_NAMES
        blank = known and value == ""
        if known and (before == value or (blank and before is None)):
            self._warn(place, cell_text(value), "changes nothing", "Leave it out, unless it should say so")
            return
        if blank:
            self._settings.pop(name, None)
        else:
            self._settings[name] = value
        self._mark((SETTINGS_NAME, None, name), place)
        self.lines.append(f"{place}: {_shown(cell_text(before))} -> {_shown(cell_text(value))}")

    def _present(self, name: str) -> object:
        """Return the value of a setting now; None where it is not set or not known."""
        if name in self._settings:
            return self._settings[name]
        held = self._study.settings.solve if name.startswith("solve.") else self._study.settings
        was_given = name in settings_to_write(self._study)
        return None if was_given else getattr(held, name.removeprefix("solve."), None)

    def _change(self, place: str, change: CellChange, done: dict[tuple[object, ...], str]) -> None:
        at = self._find(place, change.table, change.key)
        if at is None or not self._column_fits(place, change):
            return
        table = self._at_work(change.table)
        row = table.row(at)
        cell = (change.table, row, change.column)
        if cell in done:
            self._fault(place, change.value, f"the same cell as {done[cell]}", "Keep one of the two")
            return
        done[cell] = place.split(" (", maxsplit=1)[0]
        before = table.cell(at, change.column)
        if _same(change.table, change.column, before, change.value):
            self._warn(place, change.value, "changes nothing", "Leave it out, unless it should say so")
            return
        earlier = self._places.get((change.table, row, change.column))
        if earlier is not None and earlier[0] != self._variant:
            wrong = f"variant {earlier[0]!r} has changed this cell already"
            self._warn(place, change.value, wrong, "Nothing to do, if this change is to win")
        table.set(at, change.column, change.value)
        self._mark((change.table, row, change.column), place)
        self._mark((change.table, row, ""), place)
        name = f"{change.table} {_named(change.key)} {change.column}"
        self.lines.append(f"{name}: {_shown(before)} -> {_shown(change.value)}")

    def _remove(self, place: str, removed: RowRemoved, done: dict[tuple[object, ...], str]) -> None:
        at = self._find(place, removed.table, removed.key)
        if at is None:
            return
        row = (removed.table, self._at_work(removed.table).row(at))
        other = next((change for cell, change in done.items() if cell[:2] == row), None)
        if other is not None:
            self._fault(place, "", f"{other} changes the row", "Keep one of the two")
            return
        gone = self._belonging(removed.table, self._at_work(removed.table).cell(at, TABLES[removed.table].names[0]))
        self._at_work(removed.table).remove(at)
        also = ", ".join(f"{count} of {table}" for table, count in gone.items() if count)
        with_it = f", with rows that belong to it: {also}" if also else ""
        self.lines.append(f"{removed.table} {_named(removed.key)}: removed{with_it}")

    def _belonging(self, table: str, name: str) -> dict[str, int]:
        """Take away the rows of other tables that belong to a row, and return how many of each."""
        if table not in KEYS:
            return {}
        gone = {
            other: self._tables[other].remove_where(column, name)
            for other, column in BELONGING[table].items()
            if other in self._tables
        }
        return gone | {"lanes": self._lanes.remove_of(table, name)}

    def _add(self, place: str, added: RowAdded) -> None:
        spec = TABLES[added.table]
        key = _key_of(added.table, added.row)
        missing = [column.name for column in spec.columns if column.required and not added.row.get(column.name)]
        if missing:
            repair = f"Write the whole row, {', '.join(missing)} too"
            self._fault(place, "", f"the row has no {' and no '.join(missing)}", repair)
            return
        strange = [column for column in added.row if not self._knows(added.table, column)]
        for column in strange:
            self._fault(place, column, "no such column", did_you_mean(column, spec.names, "Leave it out"))
        table = self._at_work(added.table)
        if spec.key and added.table != "lanes" and table.find(key):
            self._fault(place, "", "the table has this row already", "Change its cells instead of adding it")
        elif not strange:
            row = table.add(added.row)
            self._mark((added.table, row, ""), place)
            rest = ", ".join(f"{name} {_shown(text)}" for name, text in added.row.items() if name not in key)
            self.lines.append(f"{added.table} {_named(key)}: added" + (f" ({rest})" if rest else ""))

    def _at_work(self, table: str) -> RowsAtWork | LanesAtWork:
        if table == "lanes":
            return self._lanes
        return self._tables.setdefault(table, RowsAtWork(self._study, table))

    def _knows(self, table: str, column: str) -> bool:
        return column in TABLES[table].names or column in self._at_work(table).header

    def _column_fits(self, place: str, change: CellChange) -> bool:
        spec = TABLES[change.table]
        if change.column in change.key or change.column in spec.key:
            repair = "Remove the row and add another"
            self._fault(place, change.value, f"{change.column} names the row and cannot be changed", repair)
            return False
        if not self._knows(change.table, change.column):
            repair = did_you_mean(change.column, spec.names, f"Write one of {', '.join(spec.names)}")
            self._fault(place, change.value, "no such column", repair)
            return False
        return True

    def _find(self, place: str, table: str, key: Mapping[str, str]) -> int | None:
        """Return the one row that a key singles out, or None after noting why there is none."""
        spec = TABLES[table]
        allowed = spec.key or spec.names
        strange = [column for column in key if column not in allowed]
        if strange:
            repair = did_you_mean(strange[0], allowed, f"Name the row by {', '.join(allowed)}")
            self._fault(place, strange[0], "the key has a column that names no row", repair)
            return None
        found = self._at_work(table).find(key)
        if len(found) == 1:
            return found[0]
        if found:
            more = [column for column in allowed if column not in key]
            self._fault(place, "", f"the key fits {len(found)} rows", f"Add {' or '.join(more)} to it")
            return None
        repair = "Check the key, or add the row with [[add]]"
        if len(key) == 1 and table in KEYS:
            (name,) = key.values()
            repair = did_you_mean(name, self._names_of(table, KEYS[table]), repair)
        self._fault(place, "", "the table has no such row", repair)
        return None


def _key_of(table: str, row: Mapping[str, str]) -> dict[str, str]:
    """Return the cells that name a row; those of a rule are what it asks and of whom."""
    columns = TABLES[table].key or TABLES[table].names[:2]
    return {column: row[column] for column in columns if row.get(column)}


def _named(key: Mapping[str, str]) -> str:
    return " / ".join(key.values())


def _shown(text: str) -> str:
    return text if text.strip() else "blank"


def _same(table: str, column: str, before: str, after: str) -> bool:
    """Return whether two texts of a cell mean the same."""
    if before == after or column not in TABLES[table].names or not (before.strip() and after.strip()):
        return before == after
    spec = TABLES[table].column(column)
    return parse_cell(spec, before) == parse_cell(spec, after)
