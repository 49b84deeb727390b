"""How faults are collected, and how near a word must be to be suggested."""

from __future__ import annotations

import pytest

from siting.errors import Fault
from siting.study.gathering import Gathering, did_you_mean, nearest


@pytest.mark.parametrize(
    ("word", "found"),
    [
        ("capcity", "capacity"),
        ("Capacity", "capacity"),
        ("opening charge", "opening_charge"),
        ("xyz", None),
        ("", None),
    ],
)
def test_the_nearest_word(word: str, found: str | None) -> None:
    """Slips, case, blanks and hyphens are seen through; what is not alike is not suggested."""
    assert nearest(word, ["opening_charge", "capacity"]) == found


def test_a_repair_names_the_nearest_word_or_says_what_else_to_do() -> None:
    """The other way out is always there."""
    assert (
        did_you_mean("Brnno", ["Brno", "Graz"], "Delete the row") == "Write 'Brno' if that is meant, or delete the row"
    )
    assert did_you_mean("Qqq", ["Brno", "Graz"], "Delete the row") == "Delete the row"


def test_a_cell_that_could_not_be_read_is_not_blamed_again() -> None:
    """What reading says of a cell is the last word on it."""
    gathering = Gathering()
    unread = Fault(table="sites", row=2, column="capacity", wrong="unreadable", repair="Repair it")
    gathering.extend([unread], [])
    gathering.fault("sites", 2, "capacity", "x", "not a number", "Write a number")
    assert gathering.faults() == (unread,)
    assert gathering.hurt("sites", 2, "site", "capacity")
    assert not gathering.hurt("sites", 3, "capacity")


def test_the_same_fault_is_listed_once() -> None:
    """Two checks that find the same thing are one line."""
    gathering = Gathering()
    for _ in range(2):
        gathering.fault("rules", 2, "members", "A;B", "wrong", "Repair it")
    assert len(gathering.faults()) == 1
