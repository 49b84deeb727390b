"""
Check a study as read, table by table and then across tables, and freeze it.

Every fault is gathered and reported at once. Nothing is guessed: what is not clear is a fault, what is clear but
unusual is a warning.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from siting.errors import Fault, StudyError
from siting.study.check_amounts import check_amounts
from siting.study.check_circuity import check_circuity
from siting.study.check_lanes import Known, parse_lanes
from siting.study.check_links import check_links
from siting.study.check_rows import parse_table
from siting.study.check_rules import check_rules
from siting.study.check_settings import check_settings
from siting.study.check_tariffs import check_tariffs
from siting.study.columns import TABLES
from siting.study.draft import KEYS, Draft
from siting.study.gathering import Gathering
from siting.study.numbers import with_plain_numbers
from siting.study.places import check_places
from siting.study.tables import Study

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.study.check_lanes import ParsedLanes
    from siting.study.raw import RawStudy


@dataclass(frozen=True, slots=True, kw_only=True)
class Checked:
    """What became of a study as read."""

    study: Study | None
    """None where there is any fault."""
    faults: tuple[Fault, ...]
    warnings: tuple[Fault, ...]
    fault_counts: Mapping[str, int] = field(default_factory=dict)
    """Faults by table, with those beyond the cap of what is listed."""
    warning_counts: Mapping[str, int] = field(default_factory=dict)
    """Warnings by table, likewise."""

    def sound(self) -> Study:
        """
        Return the study.

        Raises
        ------
        StudyError
            If there is any fault; the error lists all of them.
        """
        if self.study is None:
            raise StudyError(self.faults, self.warnings)
        return self.study


def check_raw(raw: RawStudy, lanes: ParsedLanes | None = None) -> Checked:
    """
    Check a study as read from files, a workbook or a page.

    Parameters
    ----------
    raw
        Tables of text and loose settings.
    lanes
        Lanes that were checked against the names of the other tables already; taken from ``raw`` where None.

    Returns
    -------
    checked
        The frozen study, or every fault; and the warnings either way.
    """
    raw = with_plain_numbers(raw)
    gathering = Gathering()
    gathering.extend(raw.faults, raw.warnings)
    settings = check_settings(raw, gathering)
    draft = Draft(
        settings=settings,
        settings_name=raw.settings_name,
        given_settings=frozenset(raw.settings),
        tables={
            name: parse_table(spec, raw.tables.get(name), gathering) for name, spec in TABLES.items() if name != "lanes"
        },
        unreadable=raw.unreadable,
        gathering=gathering,
    )
    check_links(draft)
    check_amounts(draft)
    check_rules(draft)
    check_tariffs(draft)
    check_circuity(draft)
    if lanes is None:
        known = Known(**draft.names) if draft.is_complete() and draft.is_sound(*KEYS) else None
        lanes = parse_lanes(raw.tables.get("lanes"), known, gathering)
    check_places(draft, lanes)
    study = Study(
        settings=settings,
        lanes=lanes.table,
        columns={name: table.header for name, table in raw.tables.items()},
        warnings=gathering.warnings(),
        **{name: table.rows for name, table in draft.tables.items()},
    )
    faults = gathering.faults()
    return Checked(
        study=None if faults else study,
        faults=faults,
        warnings=study.warnings,
        fault_counts=gathering.fault_counts(),
        warning_counts=gathering.warning_counts(),
    )
