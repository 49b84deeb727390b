"""Show what is left to do on a study as HTML: a group for each table, each item with its row. Knows no Streamlit."""

from __future__ import annotations

import html
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable

    from siting.study.work_list import WorkGroup, WorkItem

MOST_SHOWN = 50
"""Items of a group that are shown; the others are counted."""


def work_list_html(groups: Iterable[WorkGroup], *, opened: str = "") -> str:
    """
    Return a work list as HTML.

    Parameters
    ----------
    groups
        As `siting.study.work_list.work_list` gives them.
    opened
        Table whose group is open at first; by default the first one.

    Returns
    -------
    html
        A `details` element for each table; empty where there is nothing to do.
    """
    listed = list(groups)
    first = opened or (listed[0].table if listed else "")
    return "".join(_group(group, is_open=group.table == first) for group in listed)


def _group(group: WorkGroup, *, is_open: bool) -> str:
    items = [_item(item) for item in group.items[:MOST_SHOWN]]
    more = group.faults + group.warnings - len(items)
    if more > 0:
        items.append(f'<p class="second">And {more:,} more.</p>')
    title = f"<summary>{html.escape(group.title)}</summary>"
    return f'<details class="work"{" open" if is_open else ""}>{title}{"".join(items)}</details>'


def _item(item: WorkItem) -> str:
    where = f"<b>{html.escape(item.where)}</b> " if item.where else ""
    return f'<p class="notice {"fault" if item.is_fault else "stale"}">{where}{html.escape(item.what)}</p>'
