"""Read what a page was handed: files in memory, under names that are never trusted as paths."""

from __future__ import annotations

import tempfile
from pathlib import Path, PurePosixPath, PureWindowsPath
from typing import TYPE_CHECKING

from siting.study.read import read_raw

if TYPE_CHECKING:
    from collections.abc import Mapping

    from siting.study.raw import RawStudy

UPLOAD_TYPES = ["xlsx", "csv", "toml"]
"""Endings of the files a page takes."""


def read_upload(files: Mapping[str, bytes]) -> RawStudy:
    """
    Return a study from files in memory.

    Parameters
    ----------
    files
        Content by file name: one .xlsx workbook alone, or the CSV tables and study.toml of a study. No file at all is a
        study without tables.

    Returns
    -------
    raw
        As `read_raw` gives it from a folder or workbook of these files; nothing stays on the disk.
    """
    with tempfile.TemporaryDirectory(prefix="siting-upload-") as scratch:
        folder = Path(scratch)
        for name, content in files.items():
            (folder / _bare(name)).write_bytes(content)
        workbooks = sorted(folder.glob("*.[xX][lL][sS][xX]"))
        return read_raw(workbooks[0] if len(files) == 1 and workbooks else folder)


def _bare(name: str) -> str:
    """Return the last part of a file name, whichever system's separators it uses."""
    bare = PureWindowsPath(PurePosixPath(name).name).name
    return bare if bare.strip(". ") else "unnamed"
