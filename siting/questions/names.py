"""The sites and suppliers a question is asked about."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.errors import SettingsError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.study.tables import Study

Entry = tuple[str, str]
"""("site" or "supplier", name)."""


def entries(study: Study, sites: Sequence[str] | None, suppliers: Sequence[str] | None) -> tuple[Entry, ...]:
    """
    Return what a question is asked about, in the order of the tables.

    Parameters
    ----------
    study
        The study asked about.
    sites, suppliers
        Names. Everything where both are None; where one is given, the other is empty.

    Returns
    -------
    entries
        Kind and name of each, once.

    Raises
    ------
    SettingsError
        If the study has no site or supplier of a name.
    """
    there = [("site", row.site) for row in study.sites] + [("supplier", row.supplier) for row in study.suppliers]
    if sites is None and suppliers is None:
        return tuple(there)
    wanted = dict.fromkeys([("site", name) for name in sites or ()] + [("supplier", name) for name in suppliers or ()])
    for kind, name in wanted:
        if (kind, name) not in there:
            names = [known for of, known in there if of == kind]
            choose = f"choose one of {', '.join(names)}" if names else f"it has no {kind} at all"
            msg = f"the study has no {kind} {name!r}; {choose}"
            raise SettingsError(msg)
    return tuple(entry for entry in there if entry in wanted)
