"""Tables of a report as HTML: every text escaped, numbers right-aligned, units in the header."""

from __future__ import annotations

import base64
import html
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence


MOST_WHOLE = 30
"""Rows a table shows at once; a longer one scrolls in a frame of its own."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Heading:
    """One column of a report table."""

    text: str
    number: bool = False
    """Right-aligned."""
    verdict: bool = False
    """Set in bold, never broken."""
    name: bool = False
    """A name of the user's: wide enough to be read, broken where it is too long."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """One row of a report table."""

    cells: tuple[str, ...]
    kind: str = ""
    """`total` for sums, `faint` for what matters less; empty otherwise."""
    mark: str = ""
    """SVG of ours put before the first cell."""
    wide: bool = False
    """The second cell takes the room of all that follow it, which are not shown."""


def report_table(headings: Sequence[Heading], lines: Iterable[Line], *, caption: str = "") -> str:
    """
    Return a table as HTML in which no text of the user's can act.

    Parameters
    ----------
    headings
        The columns.
    lines
        The rows, as many cells each as there are columns.
    caption
        What the table shows, for readers and screen readers.
    """
    head = "".join(f'<th scope="col"{_class(heading)}>{html.escape(heading.text)}</th>' for heading in headings)
    body = "".join(_row(headings, line) for line in lines)
    caption_html = f"<caption>{html.escape(caption)}</caption>" if caption else ""
    table = f'<table class="report">{caption_html}<thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>'
    return f'<div class="frame tall" tabindex="0">{table}</div>' if body.count("<tr") > MOST_WHOLE else table


def _row(headings: Sequence[Heading], line: Line) -> str:
    shown = list(zip(headings, line.cells, strict=True))
    span, mark = "", _image(line.mark)
    if line.wide:
        span, shown = f' colspan="{len(shown) - 1}"', shown[:2]
    cells = "".join(
        f"<td{span if span and position else _class(heading)}>{'' if position else mark}{html.escape(cell)}</td>"
        for position, (heading, cell) in enumerate(shown)
    )
    kind = f' class="{line.kind}"' if line.kind else ""
    return f"<tr{kind}>{cells}</tr>"


def _image(svg: str) -> str:
    """Return the drawing as an image: inline SVG does not survive the cleaning of a page's HTML."""
    if not svg:
        return ""
    return f'<img alt="" src="data:image/svg+xml;base64,{base64.b64encode(svg.encode()).decode()}">'


def _class(heading: Heading) -> str:
    names = " ".join(
        name for name, on in (("n", heading.number), ("verdict", heading.verdict), ("name", heading.name)) if on
    )
    return f' class="{names}"' if names else ""
