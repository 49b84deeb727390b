"""Places to coordinates: what the towns that ship with the program say about a draft's places and coordinates."""

from __future__ import annotations

import html
from collections import Counter
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd
import pyarrow.compute as pc
import streamlit as st

from siting.browse.filling import put_coordinates
from siting.browse.shell import notices
from siting.study.coordinates import PLACED
from siting.study.countries import country_name
from siting.study.gazetteer import CREDIT
from siting.study.locate import Match
from siting.study.locate_study import LocatedStudy, furthest_apart_km, locate_study
from siting.study.numbers import with_plain_numbers
from siting.study.words import counted

if TYPE_CHECKING:
    from collections.abc import Sequence

    from siting.arrays import Flags
    from siting.browse.drafts import Draft
    from siting.errors import Fault
    from siting.study.gazetteer import Town
    from siting.study.locate_study import Located
    from siting.study.raw import RawTable

LOOKED_UP, WANTED = "places_looked_up", "places_wanted"
"""Names in the session of what was looked up, and of the draft for which that was asked."""

MOST_PLACED, MOST_BLANK = 2_000, 300
"""Rows with coordinates, and without, up to which they are looked up unasked: about a second each."""

MOST_CHOOSERS, MOST_LISTED = 25, 30
"""Ambiguous places that can be chosen at once, the others following; places not known that are listed."""

LEAST_TICKED = 0.9
"""Confidence from which what was found is ticked at first, unless it was found by the name of the row alone."""

BLANK = "leave blank"

Towns = dict[tuple[str, int], "Town"]


def odd_places(draft: Draft) -> tuple[Fault, ...]:
    """
    Return coordinates of a draft that do not fit the place or country of their row, or lie far from any town.

    Parameters
    ----------
    draft
        Its tables.

    Returns
    -------
    warnings
        Empty where there are too many rows to look up unasked, and nobody asked.
    """
    looked_up = _looked_up(draft)
    return () if looked_up is None else looked_up.warnings


def show_places(draft: Draft) -> None:
    """Draw the section; nothing where every row has coordinates."""
    looked_up = _looked_up(draft)
    if looked_up is None:
        with st.expander("Places to coordinates"):
            st.caption(f"{sum(_counts(draft)):,} rows are too many to look up with every edit.")
            if st.button("Look all places up"):
                st.session_state[WANTED] = (draft.token, draft.version)
                st.rerun()
    elif looked_up.rows:
        proposed = sum(row.found.town is not None or bool(row.found.candidates) for row in looked_up.rows)
        blank = counted(len(looked_up.rows), "row")
        with st.expander(f"Places to coordinates: {blank} without any, proposals for {proposed:,} of them"):
            _show(draft, looked_up.rows)


def _looked_up(draft: Draft) -> LocatedStudy | None:
    """Return what the towns say, looked up once per edit; None where that would take long and nobody asked."""
    key = (draft.token, draft.version)
    kept = st.session_state.get(LOOKED_UP)
    if kept is not None and kept[0] == key:
        held: LocatedStudy = kept[1]
        return held
    placed, blank = _counts(draft)
    if (placed > MOST_PLACED or blank > MOST_BLANK) and st.session_state.get(WANTED) != key:
        return None
    with st.spinner("Looking places up"):
        found = locate_study(with_plain_numbers(draft.raw))
    st.session_state[LOOKED_UP] = (key, found)
    return found


def _counts(draft: Draft) -> tuple[int, int]:
    """Return how many rows have a coordinate, and how many have none."""
    placed = blank = 0
    for name, key in PLACED.items():
        table = draft.raw.tables.get(name)
        if table is not None and key in table.header:
            here = int((_filled(table, "latitude") | _filled(table, "longitude")).sum())
            placed, blank = placed + here, blank + len(table) - here
    return placed, blank


def _filled(table: RawTable, column: str) -> Flags:
    cells = table.column(column)
    if cells is None:
        return np.zeros(len(table), dtype=np.bool_)
    flags: Flags = pc.not_equal(pc.utf8_trim_whitespace(cells), "").to_numpy(zero_copy_only=False)
    return flags


def _show(draft: Draft, rows: Sequence[Located]) -> None:
    st.caption(
        "Looked up offline among the towns of 1,000 people and more that come with the program, in the file "
        f"siting/study/towns/towns.parquet. {CREDIT}."
    )
    counts = Counter(row.found.match for row in rows)
    told = ", ".join(f"{counts[match]:,} {match}" for match in Match if counts[match])
    st.html(f'<p class="second">{html.escape(told)}.</p>')
    towns = _found(draft, [row for row in rows if row.found.town is not None])
    towns |= _chosen(draft, [row for row in rows if row.found.match is Match.AMBIGUOUS])
    _unknown([row for row in rows if row.found.match is Match.UNKNOWN])
    title = f"Fill in {counted(len(towns), 'pair')} of coordinates"
    if st.button(title, type="primary", disabled=not towns, key="fill-places"):
        put_coordinates(draft, towns)
        st.rerun()


def _found(draft: Draft, rows: Sequence[Located]) -> Towns:
    """Show what was found; returns the towns of the rows that are ticked."""
    found = [(row, row.found.town) for row in rows if row.found.town is not None]
    if not found:
        return {}
    table = pd.DataFrame(
        {
            "use": [row.found.confidence >= LEAST_TICKED and not row.by_name for row, _ in found],
            "row": [f"{row.table}, row {row.row}" for row, _ in found],
            "as typed": [", ".join(filter(None, (row.place, row.country))) for row, _ in found],
            "town": [f"{town.name}, {country_name(town.country)}" for _, town in found],
            "people": [town.population for _, town in found],
            "latitude": [town.latitude for _, town in found],
            "longitude": [town.longitude for _, town in found],
            "confidence": [row.found.confidence for row, _ in found],
            "how": [f"{row.found.match}{', by the name of the row' if row.by_name else ''}" for row, _ in found],
        }
    )
    edited = st.data_editor(
        table,
        key=f"places-{draft.token}-{draft.version}",
        hide_index=True,
        disabled=[column for column in table.columns if column != "use"],
        column_config={
            "people": st.column_config.NumberColumn(format="localized"),
            "confidence": st.column_config.NumberColumn(format="percent"),
        },
    )
    return {(row.table, row.row): town for (row, town), use in zip(found, edited["use"], strict=True) if use}


def _chosen(draft: Draft, rows: Sequence[Located]) -> Towns:
    """Let the analyst choose among the towns that fit a name; returns the towns of the rows that were chosen for."""
    asked: dict[tuple[str, str], list[Located]] = {}
    for row in rows:
        asked.setdefault((row.place, row.country), []).append(row)
    towns: Towns = {}
    for number, ((place, country), group) in enumerate(list(asked.items())[:MOST_CHOOSERS]):
        candidates = group[0].found.candidates
        name, chooser = st.columns([1, 1.4], vertical_alignment="center")
        where = f"{group[0].table}, row {group[0].row}" + (f" and {len(group) - 1} more" if len(group) > 1 else "")
        apart = f"{len(candidates)} towns fit, up to {furthest_apart_km(candidates):,.0f} km apart"
        typed = html.escape(", ".join(filter(None, (place, country))))
        name.html(f'<p class="second"><b>{typed}</b> ({html.escape(where)}): {apart}</p>')
        chosen = chooser.selectbox(
            f"Which town is meant, number {number + 1}",
            range(-1, len(candidates)),
            format_func=[*map(_town, candidates), BLANK].__getitem__,  # -1 is the last one
            key=f"town-{draft.token}-{draft.version}-{number}",
            label_visibility="collapsed",
        )
        if chosen >= 0:
            towns |= {(row.table, row.row): candidates[chosen] for row in group}
    if len(asked) > MOST_CHOOSERS:
        st.caption(
            f"{len(asked) - MOST_CHOOSERS:,} more places fit several towns; they follow once these are filled in."
        )
    return towns


def _town(town: Town) -> str:
    people = counted(town.population, "inhabitant")
    return f"{town.name}, {country_name(town.country)}: {people}, at {town.latitude:.2f} {town.longitude:.2f}"


def _unknown(rows: Sequence[Located]) -> None:
    said = [f"{row.table}, row {row.row}: {', '.join(filter(None, (row.place, row.country)))}" for row in rows]
    more = [f"And {len(rows) - MOST_LISTED:,} more."] if len(rows) > MOST_LISTED else []
    notices(
        [*said[:MOST_LISTED], *more],
        kind="stale",
        title="Not known: give these coordinates by hand, or correct the spelling",
    )
