"""
Find out how a text file of a table was written: its encoding, and what stands between its cells.

Only forms that tell themselves apart are taken: a byte order mark, UTF-16 by its zero bytes, UTF-8 by its rules, and
Windows-1252 for what is none of these. Separators are told by the column names and by rows of equal length.
"""

from __future__ import annotations

import codecs
import contextlib
import csv
import io
import re
from dataclasses import dataclass
from itertools import islice
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from siting.study.columns import TableSpec

SEPARATORS = (",", ";", "\t")

SAMPLE_BYTES = 65_536
"""Bytes at the start of a file from which its form is told."""

SAMPLE_RECORDS = 50

MOST_ZEROS, LEAST_ZEROS = 0.05, 0.4
"""Shares of zero bytes at odd and even places: text in UTF-16 has many at one of them and next to none at the other."""

NOT_TEXT = "the file is not text in UTF-8, UTF-16 or Windows-1252"

_MARKS = ((codecs.BOM_UTF8, "utf-8-sig"), (codecs.BOM_UTF16_LE, "utf-16"), (codecs.BOM_UTF16_BE, "utf-16"))
_UTF_32 = (codecs.BOM_UTF32_LE, codecs.BOM_UTF32_BE)
_HINT = re.compile(r"sep=(?P<separator>[,;\t])\r?\n?")
"""A first line by which spreadsheet programs tell one another the separator; they do not show it."""

STRANGE_INSIDE = r"[\p{L}][¹³¿£¼¾¯¥¡][\p{L}]|(^|\s)[£¯][\p{L}]"
"""Signs inside words, which betray another single-byte encoding such as Windows-1250 (an Arrow expression)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Start:
    """What the start of a file tells."""

    encodings: tuple[str, ...]
    """To be tried in this order; empty = not text."""
    content: bytes


def read_start(path: Path) -> Start:
    """
    Return the start of a file and the encodings it may have.

    Raises
    ------
    OSError
        If the file cannot be read.
    """
    with path.open("rb") as file:
        content = file.read(SAMPLE_BYTES)
    return Start(encodings=_encodings(content), content=content)


def _encodings(content: bytes) -> tuple[str, ...]:
    if content.startswith(_UTF_32):
        return ()
    for mark, name in _MARKS:
        if content.startswith(mark):
            return (name,)
    if b"\0" not in content:
        return ("utf-8", "cp1252")
    even, odd = (content[place::2].count(0) / max(1, len(content[place::2])) for place in (0, 1))
    if odd >= LEAST_ZEROS and even <= MOST_ZEROS:
        return ("utf-16-le",)
    if even >= LEAST_ZEROS and odd <= MOST_ZEROS:
        return ("utf-16-be",)
    return ("utf-8",) if max(even, odd) <= MOST_ZEROS else ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Separation:
    """What stands between cells."""

    separator: str
    """Empty where it cannot be told."""
    hinted: bool = False
    """Whether the first line does nothing but name the separator."""


def find_separator(start: Start, encoding: str, spec: TableSpec) -> Separation:
    """
    Return what stands between the cells of a file.

    Parameters
    ----------
    start
        Start of the file.
    encoding
        Encoding to read it with.
    spec
        The table it should hold: a file with commas around its first column is of the form the program writes, and
        is looked at no further.
    """
    text = codecs.getincrementaldecoder(encoding)(errors="replace").decode(start.content)
    is_cut = len(start.content) == SAMPLE_BYTES
    hint = _HINT.match(text)
    if hint:
        return Separation(separator=hint["separator"], hinted=True)
    samples = {separator: _sample(text, separator, is_cut=is_cut) for separator in SEPARATORS}
    if any(spec.columns[0].name in record for record in samples[","]):
        return Separation(separator=",")
    scores = {separator: _score(records, spec) for separator, records in samples.items()}
    best = max(scores.values())
    found = [separator for separator, score in scores.items() if score == best]
    return Separation(separator=found[0] if len(found) == 1 or best[1] == 0.0 else "")


def _sample(text: str, separator: str, *, is_cut: bool) -> list[list[str]]:
    records: list[list[str]] = []
    with contextlib.suppress(csv.Error):  # it is reported when the whole file is read
        records.extend(islice(csv.reader(io.StringIO(text, newline=""), delimiter=separator), SAMPLE_RECORDS))
    if is_cut and 1 < len(records) < SAMPLE_RECORDS:
        records.pop()
    return [record for record in records if any(record)]


def _score(records: Sequence[Sequence[str]], spec: TableSpec) -> tuple[int, float, int]:
    """Return how many column names are known, which share of the records has one length, and that length."""
    if not records:
        return 0, 0.0, 0
    known = [len(set(spec.names).intersection(record)) for record in records]
    header = known.index(max(known))
    width = len(records[header])
    if width == 1:
        return max(known), 0.0, 0
    below = records[header:]
    return max(known), sum(len(record) == width for record in below) / len(below), width
