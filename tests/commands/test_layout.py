"""Tables and paragraphs fit a terminal of 100 columns."""

from __future__ import annotations

from siting.commands.layout import WIDEST_NAME, WIDTH, bullets, paragraph, short, table


def test_numbers_stand_under_each_other() -> None:
    """Words are left-aligned, numbers right-aligned; no blanks trail."""
    lines = table(["site", "load", "full"], [["Brno", "21,000", "9 %"], ["Linz", "900", "100 %"]]).splitlines()
    assert lines == ["site    load   full", "Brno  21,000    9 %", "Linz     900  100 %"]
    assert table(["site", "verdict", "load"], [["Brno", "keep", "9"]], words=2).splitlines()[1] == "Brno  keep        9"


def test_long_text_is_broken_and_indented() -> None:
    """No line is wider than the page, and the lines of a point stand under its first word."""
    lines = bullets(["word " * 60]).splitlines()
    assert max(len(line) for line in lines) <= WIDTH
    assert lines[0].startswith("- word")
    assert all(line.startswith("  word") for line in lines[1:])
    assert len(paragraph("word " * 60).splitlines()) == 3


def test_names_are_cut_only_when_too_long() -> None:
    """A name of 28 characters stands in full, one of 29 is cut to 28."""
    assert short("n" * WIDEST_NAME) == "n" * WIDEST_NAME
    assert short("n" * (WIDEST_NAME + 1)) == "n" * (WIDEST_NAME - 3) + "..."
