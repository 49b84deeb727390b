"""
Check a study as read, table by table and then across tables, and freeze it.

Every fault is gathered and reported at once. Nothing is guessed: what is not clear is a fault, what is clear but
unusual is a warning.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from siting.errors import Fault, StudyError
from siting.study.check_lanes import Known, parse_lanes
from siting.study.check_rows import Parsed, parse_table
from siting.study.check_settings import check_settings
from siting.study.columns import TABLES
from siting.study.gathering import Gathering
from siting.study.tables import IMPLIED_GOOD, Study

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.study.raw import RawStudy


@dataclass(frozen=True, slots=True, kw_only=True)
class Checked:
    """What became of a study as read."""

    study: Study | None
    """None where there is any fault."""
    faults: tuple[Fault, ...]
    warnings: tuple[Fault, ...]

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


def check_raw(raw: RawStudy) -> Checked:
    """
    Check a study as read from files, a workbook or a page.

    Parameters
    ----------
    raw
        Tables of text and loose settings.

    Returns
    -------
    checked
        The frozen study, or every fault; and the warnings either way.
    """
    gathering = Gathering()
    gathering.extend(raw.faults, raw.warnings)
    settings = check_settings(raw, gathering)
    tables: Mapping[str, Parsed[Any]] = {
        name: parse_table(spec, raw.tables.get(name), gathering) for name, spec in TABLES.items() if name != "lanes"
    }
    rows = {name: parsed.rows for name, parsed in tables.items()}
    known = Known(
        sites={row.site for row in rows["sites"]},
        suppliers={row.supplier for row in rows["suppliers"]},
        customers={row.customer for row in rows["customers"]},
        goods={row.good for row in rows["goods"]} or {IMPLIED_GOOD},
    )
    lanes = parse_lanes(raw.tables.get("lanes"), known, gathering)
    study = Study(
        settings=settings,
        lanes=lanes,
        columns={name: table.header for name, table in raw.tables.items()},
        warnings=gathering.warnings(),
        **rows,
    )
    faults = gathering.faults()
    return Checked(study=None if faults else study, faults=faults, warnings=study.warnings)
