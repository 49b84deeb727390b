"""The benchmark of the questions runs, on a small study."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tests.benchmarks import bench_questions
from tests.published.large_instances import recipe

if TYPE_CHECKING:
    import pytest


def test_runs(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    """Plan, closing test and planning from scratch are timed, each against the plan."""
    monkeypatch.setattr(bench_questions, "large_study", lambda _: recipe(10, 20, 3, 1))
    bench_questions.main(["8000", "direct"])
    lines = capsys.readouterr().out.splitlines()
    assert [line.split()[0] for line in lines] == ["plan", "closing", "scratch,"]
    assert "1.0 x clock    1.0 x processor" in lines[0]
