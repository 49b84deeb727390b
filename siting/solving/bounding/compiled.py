"""
Compile the inner loops, once a machine: the machine code is kept in the user's own cache folder.

The package's folder may be read-only and a source tree stays clean, so nothing is written beside the sources. Where no
folder can be written, the loops are compiled anew in each run.
"""

from __future__ import annotations

import os
import sys
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING, Any, cast

import numba

if TYPE_CHECKING:
    from collections.abc import Callable


def cache_folder() -> Path | None:
    """Return the folder the machine code is kept in, or None where none can be written."""
    given = os.environ.get("NUMBA_CACHE_DIR")
    folder = Path(given) if given else _user_cache() / "siting" / "compiled"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return folder
    except OSError:
        return None


def _user_cache() -> Path:
    home = Path(os.path.expanduser("~"))  # noqa: PTH111  Path.home() raises where there is no home, this does not
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA") or home / "AppData" / "Local")
    if sys.platform == "darwin":
        return home / "Library" / "Caches"
    return Path(os.environ.get("XDG_CACHE_HOME") or home / ".cache")


_FOLDER = cache_folder()


def is_compiled() -> bool:
    """Return whether machine code from an earlier run is there, so that nobody waits for the compiler."""
    return _FOLDER is not None and any(_FOLDER.rglob("*.nbi"))


def compiled(function: Callable[..., Any]) -> Callable[..., Any]:
    """Return `function` compiled on its first call, without the interpreter's lock, kept in the user's cache."""
    if _FOLDER is None:
        return cast("Callable[..., Any]", numba.njit(nogil=True, error_model="numpy")(function))
    before = numba.config.CACHE_DIR  # type: ignore[attr-defined] # set by numba when it starts
    numba.config.CACHE_DIR = str(_FOLDER)  # type: ignore[attr-defined]
    try:
        return cast("Callable[..., Any]", numba.njit(nogil=True, cache=True, error_model="numpy")(function))
    finally:
        numba.config.CACHE_DIR = before  # type: ignore[attr-defined]
