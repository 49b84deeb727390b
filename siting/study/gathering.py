"""Faults and warnings as they are found, so that all of them are reported at once."""

from __future__ import annotations

from collections import Counter
from functools import lru_cache
from typing import TYPE_CHECKING

from rapidfuzz import process
from rapidfuzz.distance import Indel

from siting.errors import Fault
from siting.study.columns import TABLES

if TYPE_CHECKING:
    from collections.abc import Iterable

MOST_LISTED = 200
"""Faults, and as many warnings, listed per table; the rest is counted in one last line."""


class Gathering:
    """Collects what is wrong and what is worth knowing, with a cap per table."""

    def __init__(self) -> None:
        self._faults = _Listed("faults")
        self._warnings = _Listed("warnings")
        self._hurt: set[tuple[str, int | None, str]] = set()
        self._unread: set[tuple[str, int | None, str]] = set()
        """Cells that could not be read, so that nothing more is said of them."""

    def fault(  # noqa: PLR0913, PLR0917  (the fields of a fault)
        self, table: str, row: int | None, column: str, value: str, wrong: str, repair: str
    ) -> None:
        """Note something wrong; the cell counts as hurt, so that no later check stumbles over it again."""
        if (table, row, column) in self._unread:
            return
        self._hurt.add((table, row, column))
        self._faults.add(Fault(table=table, row=row, column=column, value=value, wrong=wrong, repair=repair))

    def warn(  # noqa: PLR0913, PLR0917  (the fields of a fault)
        self, table: str, row: int | None, column: str, value: str, wrong: str, repair: str
    ) -> None:
        """Note something worth knowing that stops no plan."""
        self._warnings.add(Fault(table=table, row=row, column=column, value=value, wrong=wrong, repair=repair))

    def extend(self, faults: Iterable[Fault], warnings: Iterable[Fault]) -> None:
        """Take over what reading has found."""
        for fault in faults:
            self._hurt.add((fault.table, fault.row, fault.column))
            if fault.column:
                self._unread.add((fault.table, fault.row, fault.column))
            self._faults.add(fault)
        for warning in warnings:
            self._warnings.add(warning)

    def count_more(self, table: str, faults: int = 0, warnings: int = 0) -> None:
        """Count faults and warnings of a table beyond those listed one by one."""
        self._faults.more[table] += faults
        self._warnings.more[table] += warnings

    def hurt(self, table: str, row: int | None, *columns: str) -> bool:
        """Return whether any of these cells has a fault."""
        return any((table, row, column) in self._hurt for column in columns)

    def faults(self) -> tuple[Fault, ...]:
        """Return the faults in the order of the tables and rows."""
        return self._faults.listed()

    def warnings(self) -> tuple[Fault, ...]:
        """Return the warnings in the order of the tables and rows."""
        return self._warnings.listed()

    def fault_counts(self) -> dict[str, int]:
        """Return how many faults each table has, in the order they are listed, those not listed included."""
        return self._faults.counts()

    def warning_counts(self) -> dict[str, int]:
        """Return how many warnings each table has, likewise."""
        return self._warnings.counts()


class _Listed:
    def __init__(self, what: str) -> None:
        self._what = what
        self._lists: dict[str, list[Fault]] = {}
        self.more: Counter[str] = Counter()

    def add(self, fault: Fault) -> None:
        listed = self._lists.setdefault(fault.table, [])
        if fault in listed:
            return
        if len(listed) < MOST_LISTED:
            listed.append(fault)
        else:
            self.more[fault.table] += 1

    def counts(self) -> dict[str, int]:
        return {table: len(self._lists[table]) + self.more[table] for table in self._tables()}

    def _tables(self) -> list[str]:
        order = {name: place for place, name in enumerate(TABLES)}
        return sorted(self._lists, key=lambda name: order.get(name, -1))

    def listed(self) -> tuple[Fault, ...]:
        result: list[Fault] = []
        for table in self._tables():
            result += sorted(self._lists[table], key=lambda fault: fault.row or 0)
            if self.more[table]:
                result.append(
                    Fault(
                        table=table,
                        wrong=f"{self.more[table]} more {self._what} of this table are not listed",
                        repair="Repair those listed and check again",
                    )
                )
        return tuple(result)


def nearest(word: str, known: Iterable[str], cutoff: float = 0.6) -> str | None:
    """Return the known word most like this one, or None where none is alike; case and blanks do not count."""
    names = tuple(known)
    found = process.extractOne(_fold(word), _folded(names), scorer=Indel.normalized_similarity, score_cutoff=cutoff)
    return names[found[2]] if found else None


def did_you_mean(word: str, known: Iterable[str], otherwise: str) -> str:
    """Return a repair that names the nearest known word, or ``otherwise`` where none is near."""
    near = nearest(word, known)
    return f"Write {near!r} if that is meant, or {otherwise[0].lower()}{otherwise[1:]}" if near else otherwise


@lru_cache(maxsize=8)
def _folded(names: tuple[str, ...]) -> list[str]:
    return [_fold(name) for name in names]


def _fold(word: str) -> str:
    return "_".join(word.casefold().replace("-", " ").replace("_", " ").split())
