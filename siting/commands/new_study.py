"""What commands share that write a study of their own making: where to, and that nothing is overwritten."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import argparse

    from siting.study.tables import Study


def add_out(parser: argparse.ArgumentParser) -> None:
    """Add the option --out."""
    parser.add_argument(
        "--out",
        metavar="STUDY2",
        required=True,
        help="folder to write the study to, or an .xlsx workbook; it must not be there yet",
    )


def refuse_taken(given: str) -> Path:
    """
    Return the path to write to.

    Parameters
    ----------
    given
        What --out was given.

    Returns
    -------
    path
        Where nothing is yet, or an empty folder.

    Raises
    ------
    DataFileError
        If something is there already.
    """
    from siting.errors import DataFileError

    path = Path(given)
    if path.exists() and not (path.is_dir() and not any(path.iterdir())):
        msg = f"{path}: already there, and may hold your data. Give another name with --out, or delete it first."
        raise DataFileError(msg)
    return path


def write_new(study: Study, path: Path) -> None:
    """
    Write a study where nothing is yet.

    Parameters
    ----------
    study
        Its tables need not have been checked together.
    path
        A workbook where it ends in .xlsx, else a folder.
    """
    from siting.study.write import write_study, write_workbook

    if path.suffix.lower() == ".xlsx":
        write_workbook(study, path)
    else:
        write_study(study, path)
