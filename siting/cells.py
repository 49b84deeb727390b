"""
Text cells that no spreadsheet mistakes for a formula, and the one way CSV files are written.

Files follow RFC 4180 (2005): CRLF line ends, commas, text in double quotes, a quote inside doubled, UTF-8. A text that
a spreadsheet would run as a formula gets a single quote in front, as OWASP's page on CSV injection advises; plain
numbers are left alone. `read_cell` undoes what `safe_cell` does, whatever the text.
"""

from __future__ import annotations

import csv
import math
import re
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence
    from pathlib import Path

_RISKY = re.compile("'*[=+\\-@\t\r\n\uff1d\uff0b\uff0d\uff20]")
"""OWASP's characters, among them the full-width forms of = + - @, after any number of single quotes."""

_NUMBER = re.compile(r"-?[0-9]+(\.[0-9]+)?([eE][+-]?[0-9]+)?")

_WHOLE_LIMIT = 2.0**53


def is_plain_number(text: str) -> bool:
    """Return whether the text is a number as the tables accept it, such as ``1250``, ``-3``, ``0.5`` or ``1e3``."""
    return _NUMBER.fullmatch(text) is not None


def safe_cell(text: str) -> str:
    """
    Return a text that no spreadsheet runs as a formula.

    Parameters
    ----------
    text
        Any text.

    Returns
    -------
    safe
        The text, with a single quote in front where it could be run; a plain number such as ``-5.2`` stays as it is.

    References
    ----------
    OWASP Foundation, CSV Injection, https://owasp.org/www-community/attacks/CSV_Injection
    """
    if _RISKY.match(text) and not is_plain_number(text):
        return "'" + text
    return text


def read_cell(text: str) -> str:
    """Return the text that `safe_cell` made ``text`` from; any other text is returned unchanged."""
    return text[1:] if text.startswith("'") and _RISKY.match(text) else text


def number_text(value: float) -> str:
    """Return the shortest text that reads back to the same number; whole numbers without a decimal point."""
    if math.isinf(value):
        return "unlimited"
    if value.is_integer() and abs(value) < _WHOLE_LIMIT:
        return str(int(value))
    return repr(float(value))


def write_csv(path: Path, header: Sequence[str], rows: Iterable[Sequence[str | float | None]]) -> None:
    """
    Write a table as an RFC 4180 file whose text cells are safe in a spreadsheet.

    Parameters
    ----------
    path
        File to write; it is replaced.
    header
        Column names.
    rows
        Cells in the order of the header; None is blank, text is made safe, infinity is written ``unlimited``.
    """
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, quoting=csv.QUOTE_NONNUMERIC, lineterminator="\r\n")
        writer.writerow([safe_cell(name) for name in header])
        writer.writerows([_cell(value) for value in row] for row in rows)


def _cell(value: str | float | None) -> str | float:
    if value is None:
        return ""
    if isinstance(value, str):
        return safe_cell(value)
    if math.isinf(value):
        return number_text(value)
    return int(value) if float(value).is_integer() and abs(value) < _WHOLE_LIMIT else float(value)
