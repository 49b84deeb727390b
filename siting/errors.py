"""Every error the program raises on purpose. Each carries the exit code of the command line."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, ClassVar

if TYPE_CHECKING:
    from collections.abc import Sequence


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """
    One thing that is wrong, or (as a warning) worth knowing, in a study.

    Printed as ``customers, row 14, column demand, value 'abc': not a number. Write a number such as 1250.``
    """

    table: str
    """Table name such as ``customers``, or ``study.toml``."""

    row: int | None = None
    """Row as the user's spreadsheet numbers it (the header is row 1); None when the whole table is meant."""

    column: str = ""
    """Column or setting; empty when the whole row or table is meant."""

    value: str = ""
    """What the user typed, as typed; empty when nothing was."""

    wrong: str
    """What is wrong, without a full stop."""

    repair: str
    """What to do about it, as an order, without a full stop."""

    def __str__(self) -> str:
        """Return the fault as one sentence and its repair."""
        place = [self.table]
        if self.row is not None:
            place.append(f"row {self.row}")
        if self.column:
            place.append(f"column {self.column}" if self.row is not None else self.column)
        if self.value:
            place.append(f"value {self.value!r}")
        return f"{', '.join(place)}: {self.wrong}. {self.repair}."


class SitingError(Exception):
    """Base of all errors raised on purpose; the message is fit for the user."""

    exit_code: ClassVar[int] = 1


class StudyError(SitingError):
    """The study cannot be used as it is; `faults` lists every reason."""

    exit_code: ClassVar[int] = 2

    def __init__(self, faults: Sequence[Fault], warnings: Sequence[Fault] = ()) -> None:
        self.faults = tuple(faults)
        self.warnings = tuple(warnings)
        count = len(self.faults)
        head = "1 fault in the study" if count == 1 else f"{count} faults in the study"
        super().__init__("\n".join([f"{head}:", *(f"  {fault}" for fault in self.faults)]))


class SettingsError(SitingError):
    """A setting has a value the program cannot take."""

    exit_code: ClassVar[int] = 2


class PlanFileError(SitingError):
    """A PLAN folder or plan.json cannot be read, or is not the one it says it is."""

    exit_code: ClassVar[int] = 2


class AuditError(SitingError):
    """A plan failed its audit; it is never shown as an answer."""

    exit_code: ClassVar[int] = 5


class EngineError(SitingError):
    """A solver gave up for a reason of its own (never for an impossible study)."""


class DataFileError(SitingError):
    """A file given to a command cannot be used, or what it should write cannot be written."""

    exit_code: ClassVar[int] = 2
