"""`siting zones`: the study of zones, whose members are told, and the measured error."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import pytest

from siting import cli
from siting.study.demo import demo_folder
from siting.study.read import read_study

if TYPE_CHECKING:
    from pathlib import Path


def test_the_demo_study_in_twelve_zones(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Written, read back without a fault, measured by a plan; every customer's zone is in the file of members."""
    out, members = tmp_path / "zones", tmp_path / "members.csv"
    given = ["zones", "demo", "--zones", "12", "--out", str(out), "--members", str(members), "--gap", "0.01", "--quiet"]
    assert cli.main(given) == 0
    said = capsys.readouterr().out
    assert re.search(r"customers in 12 zones, the largest of \d+ customers\.", said)
    assert re.search(
        r"(under|over)state it by [\d.]+ %\. Of the way to customers alone they (under|over)state it", said
    )
    before, after = read_study(demo_folder()), read_study(out)
    assert len(after.customers) == 12
    for good in after.goods:
        sums = [sum(row.demand for row in study.demands if row.good == good.good) for study in (before, after)]
        assert sums[0] == pytest.approx(sums[1])
    lines = members.read_text(encoding="utf-8").splitlines()
    assert lines[0] == '"customer","zone"'
    assert len(lines) == len(before.customers) + 1
    assert {line.rsplit(",", 1)[1].strip('"') for line in lines[1:]} == {row.customer for row in after.customers}


def test_measuring_can_be_left_out(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Then nothing is planned, and nothing claimed."""
    assert cli.main(["zones", "demo", "--by", "place", "--unmeasured", "--out", str(tmp_path / "z.xlsx")]) == 0
    assert "easured:" not in capsys.readouterr().out
    assert read_study(tmp_path / "z.xlsx").customers


@pytest.mark.parametrize(
    ("given", "message"),
    [
        (["--zones", "0"], "a number of zones is a whole number of at least 1, got 0; write 150"),
        (["--zones", "1.5"], "a number of zones is a whole number of at least 1, got 1.5; write 150"),
    ],
)
def test_a_number_of_zones_is_a_whole_number(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], given: list[str], message: str
) -> None:
    """The command line says so itself."""
    with pytest.raises(SystemExit, match="2"):
        cli.main(["zones", "demo", *given, "--out", str(tmp_path / "z")])
    assert message in capsys.readouterr().err


def test_zones_need_a_number_by_default(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """By where customers are, there is no natural number of zones."""
    assert cli.main(["zones", "demo", "--out", str(tmp_path / "z")]) == 2
    assert "give a whole number of at least 1, such as --zones 150" in capsys.readouterr().err
    assert not (tmp_path / "z").exists()
