"""
Drafts: what an analyst has typed on the pages, kept in the server as typed, whatever its faults.

A draft is found by an unguessable token that its page carries in its address, so that a reload finds it again and
nobody else does. Nothing here imports Streamlit.
"""

from __future__ import annotations

import secrets
import threading
from collections import OrderedDict
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from siting.browse.jobs import job_key
from siting.cells import number_text
from siting.study.check import Checked, check_raw
from siting.study.check_settings import settings_from_cells
from siting.study.columns import SETTINGS, SOLVE_SETTINGS, TABLES
from siting.study.mapping import apply_mapping, mapping_from
from siting.study.raw import FIRST_ROW, table_from_rows

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.browse.remembered import Remembered
    from siting.study.propose import Proposal
    from siting.study.raw import RawStudy, RawTable

MOST_DRAFTS = 64
"""Drafts kept; the one untouched for longest goes first."""

MOST_EDITED_ROWS = 20_000
"""Largest table that is edited in place; a longer one is edited where it came from and opened again."""

SETTINGS_TABLE = "settings"
"""What the pages call the settings beside the tables."""

SETTING, VALUE = "setting", "value"

CONFIRMED = "your confirmation"
"""What warnings call the names of columns that were confirmed on a page."""

_SETTLED = "It was edited since it was read; see that nothing is missing"
"""Repair of what was wrong with a table when it was read, once somebody has edited it."""

ROW = "#"
"""Column of an edited table that holds the row numbers faults speak of."""


@dataclass(slots=True, kw_only=True, eq=False)
class Draft:
    """Tables and settings as typed. Change it through `put_table` and `put_setting` only."""

    token: str
    source: str
    """Where it came from, in words: a file name or `demo`."""
    raw: RawStudy
    """As read, with every edit since."""
    version: int = 0
    """Raised by every edit."""
    asked: str = ""
    """Key of the solve last asked for; empty before the first."""
    before: str = ""
    """Token of the draft it was opened from; empty for the first of a session."""
    questions: dict[str, str] = field(default_factory=dict)
    """Key of the job last asked for, by question."""
    plans: list[Remembered] = field(default_factory=list)
    """Plans found so far, oldest first."""
    _checked: tuple[int, Checked] | None = None
    _key: tuple[int, str] | None = None
    _lock: threading.RLock = field(default_factory=threading.RLock)

    @property
    def checked(self) -> Checked:
        """The draft checked: a study, or its faults; computed once per edit."""
        with self._lock:
            if self._checked is None or self._checked[0] != self.version:
                self._checked = (self.version, check_raw(self.raw))
            return self._checked[1]

    @property
    def key(self) -> str:
        """Key of the solve of the draft as it is, computed once per edit; empty while it has faults."""
        study = self.checked.study
        with self._lock:
            if self._key is None or self._key[0] != self.version:
                self._key = (self.version, job_key(study) if study is not None else "")
            return self._key[1]

    def table(self, name: str) -> pd.DataFrame:
        """
        Return a table to edit: text, one column for every column known or typed, and the row numbers in `ROW`.

        Parameters
        ----------
        name
            A table of a study, there or not.
        """
        raw = self.raw.tables.get(name)
        rows = raw.rows if raw else np.zeros(0, dtype=np.int32)
        frame = pd.DataFrame({ROW: pd.array(rows, dtype="Int64")})
        for column, cells in zip(self.labels(name), raw.columns if raw else (), strict=True):
            frame[column] = pd.array(cells.to_pylist(), dtype="string")
        for column in TABLES[name].names:
            if column not in frame.columns:
                frame[column] = pd.array([""] * len(rows), dtype="string")
        return frame

    def labels(self, name: str) -> list[str]:
        """Return what the typed columns of a table are called on a page: their names, told apart where they agree."""
        raw = self.raw.tables.get(name)
        labels = [ROW]
        for position, column in enumerate(raw.header if raw else (), start=1):
            label = column
            while not label or label in labels:
                label = f"{label or 'no name'} (column {position})"
            labels.append(label)
        return labels[1:]

    def strangers(self, name: str) -> list[str]:
        """Return the labels of the columns that are not ours, or there a second time."""
        return [label for label in self.labels(name) if label not in TABLES[name].names]

    def put_table(self, name: str, frame: pd.DataFrame) -> bool:
        """
        Take an edited table; returns whether anything changed.

        Rows keep their numbers, new ones follow the last. Columns of ours that nobody filled in are left out again, and
        a table without a filled cell that was not there before stays absent.

        Parameters
        ----------
        name
            A table of a study.
        frame
            As `table` returned it, cells changed, rows added (blank `ROW`) or removed.
        """
        given = dict(zip(self.labels(name), self.raw.tables[name].header, strict=True)) if self._has(name) else {}
        text = frame.drop(columns=ROW).astype("string").fillna("")
        kept = [column for column in text.columns if column in given or (text[column] != "").any()]
        numbers, last = [], FIRST_ROW - 1
        for number in frame[ROW]:
            last = last + 1 if pd.isna(number) else max(int(number), last + 1)
            numbers.append(last)
        header = [given.get(column, column) for column in kept]
        table = table_from_rows(header, text[kept].itertuples(index=False), numbers) if kept else None
        with self._lock:
            before = self.raw.tables.get(name)
            if _same(table, before):
                return False
            if table is not None and before is not None:
                table = replace(table, form=before.form)
            self._put(name, table)
        return True

    def rename_column(self, name: str, label: str, new: str | None) -> None:
        """
        Give a column of a table another name, or take it out.

        Parameters
        ----------
        name
            A table that is there.
        label
            The column, as `labels` calls it.
        new
            Its name from now on; None takes it out with all its cells.
        """
        with self._lock:
            raw = self.raw.tables[name]
            at = self.labels(name).index(label)
            header = [*raw.header[:at], *([] if new is None else [new]), *raw.header[at + 1 :]]
            columns = raw.columns if new is not None else (*raw.columns[:at], *raw.columns[at + 1 :])
            old, texts = raw.header[at], dict(raw.form.text_cells)
            if old in texts and raw.header.count(old) == 1:
                texts[new or ""] = texts.pop(old)
            form = replace(raw.form, text_cells=texts)
            self._put(name, replace(raw, header=tuple(header), columns=columns, form=form) if header else None)

    def confirm(self, proposals: Sequence[Proposal]) -> None:
        """
        Give columns the names that were proposed for them and confirmed.

        Parameters
        ----------
        proposals
            Those of `siting.study.propose.propose_mapping` that the analyst confirmed, corrected or not.
        """
        with self._lock:
            self.raw = apply_mapping(self.raw, replace(mapping_from(self.raw, proposals), name=CONFIRMED))
            self.version += 1

    def read_again(self, raw: RawStudy) -> None:
        """
        Put the same files, read in another way, in the place of what was read.

        Parameters
        ----------
        raw
            The study as read now.
        """
        with self._lock:
            self.raw = raw
            self.version += 1

    def _has(self, name: str) -> bool:
        return name in self.raw.tables

    def _put(self, name: str, table: RawTable | None) -> None:
        tables = {key: value for key, value in self.raw.tables.items() if key != name}
        if table is not None:
            tables[name] = table
        self._replace(tables=tables, mended=name)

    def setting_text(self, name: str) -> str:
        """Return a setting as typed; `[solve]` settings are called `solve.gap` and so on. Empty = not set."""
        section, _, key = name.rpartition(".")
        place = self.raw.settings.get(section, {}) if section else self.raw.settings
        value = place.get(key) if isinstance(place, dict) else None
        if isinstance(value, bool):
            return "yes" if value else "no"
        return number_text(value) if isinstance(value, float) else "" if value is None else str(value)

    def settings_frame(self) -> pd.DataFrame:
        """Return all settings to edit: columns `setting`, `value`, `unit`, `meaning`; unknown ones at the end."""
        known = {**{c.name: c for c in SETTINGS}, **{f"solve.{c.name}": c for c in SOLVE_SETTINGS}}
        names = [*known, *(name for name in self._typed_settings() if name not in known)]
        return pd.DataFrame(
            {
                SETTING: names,
                VALUE: [self.setting_text(name) for name in names],
                "unit": [known[name].unit if name in known else "" for name in names],
                "meaning": [known[name].meaning.replace("`", "") if name in known else "" for name in names],
            },
            dtype="string",
        )

    def put_setting(self, name: str, text: str) -> bool:
        """Take a setting as typed (empty = not set); returns whether anything changed."""
        text = text.strip()
        with self._lock:
            if text == self.setting_text(name):
                return False
            typed = {known: self.setting_text(known) for known in self._typed_settings()}
            self._replace(settings=settings_from_cells(typed | {name: text}), mended=self.raw.settings_name)
        return True

    def _typed_settings(self) -> list[str]:
        solve = self.raw.settings.get("solve")
        names = [name for name in self.raw.settings if name != "solve"]
        return names + ([f"solve.{key}" for key in solve] if isinstance(solve, dict) else [])

    def _replace(
        self,
        *,
        mended: str,
        tables: Mapping[str, RawTable] | None = None,
        settings: Mapping[str, object] | None = None,
    ) -> None:
        """
        Put new tables or settings in place.

        What reading the old ones had found wrong is settled by that, but kept as warnings: cells or rows that could not
        be read are still not there.
        """
        settled = [replace(fault, repair=_SETTLED) for fault in self.raw.faults if fault.table == mended]
        self.raw = replace(
            self.raw,
            tables=self.raw.tables if tables is None else tables,
            settings=self.raw.settings if settings is None else settings,
            faults=tuple(fault for fault in self.raw.faults if fault.table != mended),
            warnings=(*self.raw.warnings, *settled),
            unreadable=self.raw.unreadable - {mended},
        )
        self.version += 1


def _same(one: RawTable | None, other: RawTable | None) -> bool:
    if one is None or other is None:
        return one is other
    return one.header == other.header and all(a.equals(b) for a, b in zip(one.columns, other.columns, strict=True))


_drafts: OrderedDict[str, Draft] = OrderedDict()
_guard = threading.Lock()


def keep_draft(raw: RawStudy, source: str, *, before: str = "") -> Draft:
    """Keep a study as read under a new token and return its draft; `before` is the token of the one it follows."""
    draft = Draft(token=secrets.token_urlsafe(16), source=source, raw=raw, before=before)
    with _guard:
        while len(_drafts) >= MOST_DRAFTS:
            _drafts.popitem(last=False)
        _drafts[draft.token] = draft
    return draft


def find_draft(token: str) -> Draft | None:
    """Return the draft of that token, or None where the server does not have it (any more)."""
    with _guard:
        draft = _drafts.get(token)
        if draft is not None:
            _drafts.move_to_end(token)
    return draft
