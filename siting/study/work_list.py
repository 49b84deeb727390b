"""What is left to do on a study: its faults and warnings, table by table, each with the row it leads to."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from siting.study.words import counted

if TYPE_CHECKING:
    from siting.errors import Fault
    from siting.study.check import Checked


@dataclass(frozen=True, slots=True, kw_only=True)
class WorkItem:
    """One fault or warning, in the words of a list."""

    found: Fault
    is_fault: bool
    """False = a warning, which stops no plan."""

    @property
    def where(self) -> str:
        """The place inside the table, such as ``row 14, demand, 'abc'``; empty where the whole table is meant."""
        row = f"row {self.found.row}" if self.found.row is not None else ""
        return ", ".join(
            part for part in (row, self.found.column, repr(self.found.value) if self.found.value else "") if part
        )

    @property
    def what(self) -> str:
        """What is wrong, and the repair, as sentences."""
        wrong = self.found.wrong
        return f"{wrong[:1].upper()}{wrong[1:]}. {self.found.repair}."


@dataclass(frozen=True, slots=True, kw_only=True)
class WorkGroup:
    """All that is to be done on one table."""

    table: str
    items: tuple[WorkItem, ...]
    """Faults first, then warnings, each in the order of the rows."""
    faults: int
    warnings: int
    """How many there are, those beyond the cap of what is listed included."""

    @property
    def title(self) -> str:
        """The table and its counts, such as ``customers: 3 faults, 1 warning``."""
        parts = [
            counted(self.faults, "fault") if self.faults else "",
            counted(self.warnings, "warning") if self.warnings else "",
        ]
        return f"{self.table}: {', '.join(part for part in parts if part)}"

    def rows(self, *, faults_only: bool = True) -> tuple[int, ...]:
        """Return the rows to look at, in order, as the user's spreadsheet numbers them."""
        found = {item.found.row for item in self.items if item.is_fault or not faults_only}
        return tuple(sorted(row for row in found if row is not None))


def work_list(checked: Checked) -> tuple[WorkGroup, ...]:
    """
    Return what is left to do, table by table.

    Parameters
    ----------
    checked
        What became of a study as read.

    Returns
    -------
    groups
        Tables with a fault in the order of the tables, then those with warnings only. Repair one thing and check
        again, and it is gone.
    """
    tables = dict.fromkeys([*checked.fault_counts, *checked.warning_counts])
    items = [WorkItem(found=fault, is_fault=True) for fault in checked.faults]
    items += [WorkItem(found=warning, is_fault=False) for warning in checked.warnings]
    return tuple(
        WorkGroup(
            table=table,
            items=tuple(item for item in items if item.found.table == table),
            faults=checked.fault_counts.get(table, 0),
            warnings=checked.warning_counts.get(table, 0),
        )
        for table in tables
    )


def work_sentence(checked: Checked) -> str:
    """
    Return what is left to do in one sentence for a headline.

    Parameters
    ----------
    checked
        What became of a study as read.

    Returns
    -------
    sentence
        Such as ``3 faults in customers, 1 warning in lanes``, or that there is none.
    """
    parts = [f"{counted(count, 'fault')} in {table}" for table, count in checked.fault_counts.items()]
    parts += [f"{counted(count, 'warning')} in {table}" for table, count in checked.warning_counts.items()]
    return ", ".join(parts) if parts else "No fault, no warning"
