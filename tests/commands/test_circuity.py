"""`siting circuity`: the study again with a table of published factors to edit."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting import cli
from siting.study.read import read_study

if TYPE_CHECKING:
    from pathlib import Path

    import pytest


def test_the_demo_study_gets_its_table(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Germany, Hungary and Poland have published factors; the other countries are named; nothing is overwritten."""
    out = tmp_path / "mine"
    assert cli.main(["circuity", "demo", "--out", str(out)]) == 0
    said = capsys.readouterr().out
    assert "Germany (DE): 1.32  Ballou" in said
    assert "from memory" in said
    assert "1.3, as the settings say, holds there" in said
    study = read_study(out)
    assert {row.country: row.circuity for row in study.circuity} == {"DE": 1.32, "HU": 1.35, "PL": 1.21}
    assert cli.main(["circuity", "demo", "--out", str(out)]) == 2
    assert "already there, and may hold your data. Give another name with --out" in capsys.readouterr().err


def test_a_workbook_is_written_where_one_is_asked_for(tmp_path: Path) -> None:
    """--out that ends in .xlsx is a workbook of the same study."""
    assert cli.main(["circuity", "demo", "--out", str(tmp_path / "mine.xlsx")]) == 0
    assert len(read_study(tmp_path / "mine.xlsx").circuity) == 3
