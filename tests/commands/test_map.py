"""`siting map`: what it writes, and what it refuses."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.cli import main

if TYPE_CHECKING:
    from pathlib import Path


@pytest.fixture(scope="module")
def kept(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Plan the demo study once, coarsely, and return its PLAN folder."""
    folder = tmp_path_factory.mktemp("map") / "plan"
    assert main(["plan", "demo", "--gap", "0.05", "--quiet", "--out", str(folder)]) == 0
    return folder


def test_writes_into_the_plan_folder_and_elsewhere(
    kept: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Without --out the map lies beside plan.json; with it, where it is asked for."""
    (kept / "map.html").unlink()
    assert main(["map", str(kept)]) == 0
    elsewhere = tmp_path / "mine.html"
    assert main(["map", str(kept), "--out", str(elsewhere)]) == 0
    assert "opens without a network" in capsys.readouterr().out
    assert "Katowice" in (kept / "map.html").read_text(encoding="utf-8")
    assert "Katowice" in elsewhere.read_text(encoding="utf-8")


def test_refuses_a_folder_without_a_plan(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A folder that is not a PLAN folder is bad input, said in words."""
    assert main(["map", str(tmp_path)]) == 2
    assert "plan.json" in capsys.readouterr().err


def test_refuses_tables_that_are_not_the_plans(kept: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A table edited after planning changes the fingerprint, so that no map shows a plan of other data."""
    table = kept / "study" / "customers.csv"
    before = table.read_bytes()
    table.write_bytes(before.replace(b"48.13743", b"48.13744"))
    try:
        assert main(["map", str(kept)]) == 2
    finally:
        table.write_bytes(before)
    assert "fingerprint" in capsys.readouterr().err


def test_says_where_it_cannot_write(kept: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A file in a folder that does not exist is refused with the repair."""
    assert main(["map", str(kept), "--out", str(tmp_path / "none" / "map.html")]) == 2
    assert "Give another file with --out" in capsys.readouterr().err
