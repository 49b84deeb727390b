"""Write a study as it was read, tables of text, whether or not it has faults."""

from __future__ import annotations

from typing import TYPE_CHECKING

import tomli_w

from siting.cells import write_csv

if TYPE_CHECKING:
    from pathlib import Path

    from siting.study.raw import RawStudy


def write_raw(raw: RawStudy, folder: Path) -> None:
    """
    Write tables of text as a folder of CSV files with `study.toml`.

    Parameters
    ----------
    raw
        A study as read.
    folder
        Made where it is missing.
    """
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "study.toml").write_text(tomli_w.dumps(raw.settings), encoding="utf-8", newline="\n")
    for name, table in raw.tables.items():
        columns = [column.to_pylist() for column in table.columns]
        write_csv(folder / f"{name}.csv", table.header, (list(row) for row in zip(*columns, strict=True)))
