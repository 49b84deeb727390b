"""Read what a page was handed: files in memory, under names that are never trusted as paths."""

from __future__ import annotations

import tempfile
from collections import Counter
from pathlib import Path, PurePosixPath, PureWindowsPath
from types import MappingProxyType
from typing import TYPE_CHECKING

from siting.errors import Fault, StudyError
from siting.study.mapping import ColumnMapping, Layout
from siting.study.read import read_raw

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.study.raw import RawStudy

UPLOAD_TYPES = ["xlsx", "csv", "toml"]
"""Endings of the files a page takes."""

LONGEST_NAME = 100
"""Characters of a file name that are kept, counted from its end."""

NOTHING: Mapping[str, str] = MappingProxyType({})


def read_upload(files: Sequence[tuple[str, bytes]], sources: Mapping[str, str] = NOTHING) -> RawStudy:
    """
    Return a study from files in memory.

    Parameters
    ----------
    files
        File names with their content: one .xlsx workbook alone, or the CSV tables and study.toml of a study. No file
        at all is a study without tables.
    sources
        Tables by the name of the sheet, or of the file without its ending, that holds them under another name.

    Returns
    -------
    raw
        As `read_raw` gives it from a folder or workbook of these files; nothing stays on the disk.

    Raises
    ------
    StudyError
        If a workbook comes with other files, or two files have one name: which of them counts is not guessed.
    """
    names = [_bare(name) for name, _ in files]
    _refuse_doubt(names)
    with tempfile.TemporaryDirectory(prefix="siting-upload-") as scratch:
        folder = Path(scratch)
        for name, (_, content) in zip(names, files, strict=True):
            (folder / name).write_bytes(content)
        layouts = tuple(Layout(table=table, header="", source=source) for source, table in sources.items())
        path = folder / names[0] if len(names) == 1 and _is_workbook(names[0]) else folder
        return read_raw(path, ColumnMapping(layouts=layouts))


def _refuse_doubt(names: Sequence[str]) -> None:
    faults = [
        Fault(table="study", value=name, wrong=f"{count} files have this name", repair="Give each table once")
        for name, count in Counter(names).items()
        if count > 1
    ]
    if len(names) > 1:
        wrong, repair = (
            "a workbook together with other files",
            "Give the workbook alone, or only CSV tables and study.toml",
        )
        faults += [Fault(table="study", value=name, wrong=wrong, repair=repair) for name in names if _is_workbook(name)]
    if faults:
        raise StudyError(faults)


def _is_workbook(name: str) -> bool:
    return name.lower().endswith(".xlsx")


def _bare(name: str) -> str:
    """Return the last part of a file name, whichever system's separators it uses."""
    bare = PureWindowsPath(PurePosixPath(name.replace("\0", "")).name).name[-LONGEST_NAME:]
    return bare if bare.strip(". ") else "unnamed"
