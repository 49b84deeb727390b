"""Look into a workbook before it is opened: refuse what must not be, and note what the reader would not see."""

from __future__ import annotations

import re
import zipfile
from collections import Counter
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

MOST_BYTES = 200_000_000
"""Size of the largest workbook read."""

MOST_UNPACKED_BYTES = 1_500_000_000
"""Size of the largest workbook read once it is unpacked; a million lanes take about 200 MB."""

MOST_WHOLE_BYTES = 300_000_000
"""Size of the largest part that is held in memory as a whole, such as the texts of all sheets."""

MOST_PARTS = 5_000
"""Parts of a workbook; one of 200 sheets has about 500."""

MOST_MERGED = 100_000
"""Merged ranges of a workbook."""

MOST_ROWS = 1_048_576
"""Rows of a sheet, as the format has it."""

MOST_ROW_BYTES = 16_000_000
"""Size of the longest row, or of all that stands below the rows: held in memory whole. 16,384 cells take 1 MB."""

BOMB_BYTES, BOMB_RATIO = 50_000_000, 200.0
"""A part above this size that is packed tighter than this is no table: sheets of numbers shrink 5 to 40 times."""

CORRUPT = "Open it in a spreadsheet program and save it again as .xlsx"

_UNPROTECTED = "Save it as .xlsx without a password"
_AS_FOLDER = "Give the study as a folder of CSV tables"

_COMPOUND_FILE = bytes.fromhex("d0cf11e0a1b11ae1")
"""First bytes of encrypted workbooks and of the .xls format before 2007."""

_MACROS = re.compile(r"(^|/)(vbaProject\.bin|macrosheets/.*)$", re.IGNORECASE)
_MACRO_TYPE = re.compile(rb"macroEnabled", re.IGNORECASE)
_BINARY = re.compile(r"(^|/)workbook\.bin$", re.IGNORECASE)
_ENTITY = re.compile(rb"<!(DOCTYPE|ENTITY)")
_FORMULA = re.compile(rb"<(?:\w+:)?f[ />]")
_MERGED = re.compile(rb'<(?:\w+:)?mergeCell ref="([A-Z]{1,3}[0-9]{1,7}:[A-Z]{1,3}[0-9]{1,7})"')
_ROW = re.compile(rb"<(/?)(?:\w+:)?row[\s/>]")
_HIDDEN_ROW = re.compile(rb'<(?:\w+:)?row [^>]{0,200}hidden="(?:1|true)"')
_BLOCK = 1 << 20
_OVERLAP = 256

_METHODS = frozenset({zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED})
"""How parts of a workbook are packed; other methods of zip files may ask for gigabytes of memory."""


class RefusedError(Exception):
    """The workbook cannot be used; the arguments are what is wrong and the repair."""


@dataclass(slots=True)
class Inspection:
    """What a look into the parts of a workbook found."""

    formulas: bool = False
    """Whether there are any."""
    merged: dict[str, set[str]] = field(default_factory=dict)
    """Merged ranges by the part that holds their sheet."""
    hidden_rows: set[str] = field(default_factory=set)
    """Parts of sheets with hidden rows."""
    rows: Counter[str] = field(default_factory=Counter)
    """Rows by part."""


def inspect_workbook(path: Path) -> Inspection:
    """
    Return what the parts of a workbook hold besides values.

    Parameters
    ----------
    path
        The file.

    Raises
    ------
    RefusedError
        If the file must not be opened: no workbook, encrypted, with macros, too large, damaged on purpose.
    """
    size = path.stat().st_size
    if size > MOST_BYTES:
        wrong = f"the workbook has {size / 1e6:.0f} MB, more than {MOST_BYTES / 1e6:.0f} MB"
        raise RefusedError(wrong, _AS_FOLDER)
    with path.open("rb") as file:
        if file.read(len(_COMPOUND_FILE)) == _COMPOUND_FILE:
            wrong = "the workbook is protected by a password, or in the .xls format of before 2007"
            raise RefusedError(wrong, _UNPROTECTED)
    if not zipfile.is_zipfile(path):
        wrong = "the file is not an .xlsx workbook, or is damaged"
        raise RefusedError(wrong, CORRUPT)
    found = Inspection()
    with zipfile.ZipFile(path) as archive:
        members = archive.infolist()
        _refuse_members(members)
        for member in members:
            if member.filename.endswith((".xml", ".rels")):
                _inspect_member(archive, member, found)
    return found


def _refuse_members(members: Sequence[zipfile.ZipInfo]) -> None:
    """Refuse a workbook for what its table of contents says."""
    unpacked = sum(member.file_size for member in members)
    if unpacked > MOST_UNPACKED_BYTES:
        wrong = f"the workbook unpacks to {unpacked / 1e6:.0f} MB, more than {MOST_UNPACKED_BYTES / 1e6:.0f} MB"
        raise RefusedError(wrong, _AS_FOLDER)
    if any(member.flag_bits & 1 for member in members):
        wrong = "the workbook is protected by a password"
        raise RefusedError(wrong, _UNPROTECTED)
    if any(_MACROS.search(member.filename) for member in members):
        wrong = "the workbook holds macros"
        raise RefusedError(wrong, "Save it as .xlsx, which has none")
    if any(_BINARY.search(member.filename) for member in members):
        wrong = "the workbook is in the binary .xlsb format"
        raise RefusedError(wrong, "Save it as .xlsx")
    if any(map(_is_bomb, members)):
        wrong = "the workbook is packed tighter than any table can be, so that it may be meant to fill the memory"
        raise RefusedError(wrong, CORRUPT)
    if len(members) > MOST_PARTS or any(member.compress_type not in _METHODS for member in members):
        wrong = "the workbook is not packed as spreadsheet programs do"
        raise RefusedError(wrong, CORRUPT)


def _is_bomb(member: zipfile.ZipInfo) -> bool:
    if member.file_size > MOST_WHOLE_BYTES and "/worksheets/" not in member.filename:
        return True
    return member.file_size > BOMB_BYTES and member.file_size > BOMB_RATIO * member.compress_size


def _inspect_member(archive: zipfile.ZipFile, member: zipfile.ZipInfo, found: Inspection) -> None:
    """Note what a part of the workbook holds; refuse one that declares entities or macros."""
    kept = b""
    since_row = 0
    with archive.open(member) as part:
        while block := part.read(_BLOCK):
            text = kept + block
            if _ENTITY.search(text):
                wrong = "the workbook declares XML entities, which no spreadsheet program writes"
                raise RefusedError(wrong, CORRUPT)
            if member.filename == "[Content_Types].xml" and _MACRO_TYPE.search(text):
                wrong = "the workbook is meant for macros"
                raise RefusedError(wrong, "Save it as .xlsx, which has none")
            if "/worksheets/" in member.filename:
                _inspect_sheet(text, member.filename, found)
                since_row = _count_rows(block, since_row, member.filename, found)
            kept = text[-_OVERLAP:]


def _count_rows(block: bytes, since_row: int, part: str, found: Inspection) -> int:
    """Count the rows that start in a block; return how many bytes have gone by since the last start or end of one."""
    last = 0
    for tag in _ROW.finditer(block):
        found.rows[part] += not tag[1]
        since_row, last = 0, tag.end()
    since_row += len(block) - last
    if found.rows[part] > MOST_ROWS or since_row > MOST_ROW_BYTES:
        wrong = "a sheet has more or longer rows than a sheet can have"
        raise RefusedError(wrong, CORRUPT)
    return since_row


def _inspect_sheet(text: bytes, part: str, found: Inspection) -> None:
    found.formulas = found.formulas or _FORMULA.search(text) is not None
    if part not in found.hidden_rows and _HIDDEN_ROW.search(text):
        found.hidden_rows.add(part)
    merged = {match.decode() for match in _MERGED.findall(text)}
    if merged:
        ranges = found.merged.setdefault(part, set())
        ranges |= merged
        if len(ranges) > MOST_MERGED:
            wrong = f"a sheet has more than {MOST_MERGED} merged ranges"
            raise RefusedError(wrong, "Unmerge all cells")
