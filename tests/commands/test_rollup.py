"""`siting rollup`: a study to be completed, and everything said about how its demand came about."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import pytest

from siting import cli
from siting.study.read import read_raw
from tests.study.order_lines import order_lines

if TYPE_CHECKING:
    from pathlib import Path


def test_order_lines_become_customers_goods_and_demands(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The tables are written, all that was done is said, months too; a second time nothing is replaced."""
    order_lines(5000).to_csv(tmp_path / "orders.csv", index=False)
    given = ["rollup", str(tmp_path / "orders.csv"), "--by", "customer,product", "--quantity", "kg",
             "--date", "shipped", "--factor", "0.001", "--unit", "t", "--currency", "EUR",
             "--carry", "place=town", "--quiet"]  # fmt: skip
    assert cli.main([*given, "--out", str(tmp_path / "mine")]) == 0
    said = capsys.readouterr().out
    for pattern in (
        r"5,000 lines, 4,995 of them added up: [\d,]+ t a year for [\d,]+ customers\.",
        r"Left out: 5 lines without a customer\.",
        r"Returns: \d+ negative lines?, [\d.]+ t, taken off\.",
        r"Far above the other lines of their good: 3 lines, 3,000 t, kept\. The largest: C\d+ P\d+ 1,000 t \(above",
        r"Period: 2025-01-01 to 2025-12-31, 365 days, a year\.",
        r"Season: the strongest month, 2025-\d\d, moves \d+% of an average month",
        r"2025-01  [\d.,]+ t  \d+%",
        r"add sites or suppliers, what customers lack and the settings, then: siting check",
    ):
        assert re.search(pattern, said), pattern
    raw = read_raw(tmp_path / "mine")
    assert set(raw.tables) == {"customers", "goods", "demands"}
    assert raw.settings == {"currency": "EUR", "unit": "t"}
    places = raw.tables["customers"].column("place")
    assert places is not None
    assert set(places.to_pylist()) == {"Linz"}
    assert cli.main([*given, "--out", str(tmp_path / "mine")]) == 2
    assert "already there" in capsys.readouterr().err


def test_a_part_of_a_year_says_what_it_cannot_know(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The factor is shown, and that the missing months are not in the lines; without dates it is taken as a year."""
    (tmp_path / "o.csv").write_text("who,much,day\nA,5,2025-01-01\nA,-9,2025-01-02\nB,5,2025-03-31\n", encoding="utf-8")
    given = ["rollup", str(tmp_path / "o.csv"), "--by", "who", "--quantity", "much", "--quiet"]
    dated = [*given, "--date", "day", "--without-returns", "--without-far-out"]
    assert cli.main([*dated, "--out", str(tmp_path / "a")]) == 0
    said = capsys.readouterr().out
    assert "90 days, made a year by x 4.056." in said
    assert "Returns: 1 negative line, 9, left out." in said
    assert "Less than a year: what the missing months would move is not in these lines." in said
    assert cli.main([*given, "--out", str(tmp_path / "b")]) == 0
    said = capsys.readouterr().out
    assert "No dates: the lines are taken as one year's." in said
    assert "No demand is left of 1 pair of customer and good" in said


@pytest.mark.parametrize(
    ("given", "message"),
    [
        (["--by", "a,b,c"], "--by takes the customer's column and the good's, got 'a,b,c'"),
        (["--by", "who", "--carry", "town=x"], "--carry takes NAME=COLUMN with a NAME of place, country, latitude"),
        (["--by", "who", "--carry", "place"], "got 'place'. Write --carry place=town"),
    ],
)
def test_what_is_written_wrongly_is_refused(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], given: list[str], message: str
) -> None:
    """With how to write it."""
    assert cli.main(["rollup", "x.csv", "--quantity", "q", *given, "--out", str(tmp_path / "a")]) == 2
    assert message in capsys.readouterr().err


@pytest.mark.parametrize(
    ("given", "message"),
    [
        (["--from", "1.2.2025"], "'1.2.2025' is not a day; write one as 2025-01-31"),
        (["--factor", "0"], "'0' is not a factor above 0; write 0.001 from kg to t"),
        (["--factor", "x"], "'x' is not a factor above 0"),
    ],
)
def test_days_and_factors_are_checked(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], given: list[str], message: str
) -> None:
    """By the command line itself."""
    with pytest.raises(SystemExit, match="2"):
        cli.main(["rollup", "x.csv", "--by", "who", "--quantity", "q", *given, "--out", str(tmp_path / "a")])
    assert message in capsys.readouterr().err
