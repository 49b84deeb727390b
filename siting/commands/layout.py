"""Lay text out for a terminal: tables in columns, paragraphs in at most 100 columns."""

from __future__ import annotations

import textwrap
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Sequence

WIDTH = 100
"""Columns of text."""
BETWEEN = "  "
"""What stands between two columns of a table."""
WIDEST_NAME = 28
"""Characters of a name shown in a table; a longer one is cut."""


def paragraph(text: str, *, indent: str = "") -> str:
    """Return the text broken into lines of at most `WIDTH` columns, those after the first indented."""
    return textwrap.fill(text, WIDTH, subsequent_indent=indent, break_on_hyphens=False)


def bullets(texts: Sequence[str]) -> str:
    """Return each text as a point of a list."""
    return "\n".join(paragraph(f"- {text}", indent="  ") for text in texts)


def table(header: Sequence[str], rows: Sequence[Sequence[str]], *, words: int = 1) -> str:
    """
    Return rows in columns, words left-aligned and numbers right-aligned.

    Parameters
    ----------
    header
        Names of the columns.
    rows
        Cells, as many a row as the header has.
    words
        How many columns hold words; they come first.
    """
    lines = [[short(row[0]), *row[1:]] for row in (header, *rows)]
    widths = [max(len(line[column]) for line in lines) for column in range(len(header))]
    return "\n".join(
        BETWEEN.join(
            cell.ljust(width) if column < words else cell.rjust(width)
            for column, (cell, width) in enumerate(zip(line, widths, strict=True))
        ).rstrip()
        for line in lines
    )


def short(name: str) -> str:
    """Return a name, cut to `WIDEST_NAME` characters."""
    return name if len(name) <= WIDEST_NAME else name[: WIDEST_NAME - 3] + "..."
