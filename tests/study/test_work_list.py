"""Faults and warnings as a list of work: grouped, counted, and gone once repaired."""

from __future__ import annotations

from siting.study.work_list import work_list, work_sentence
from tests.builders import TINY, check_tables, with_cells

BROKEN = with_cells(
    with_cells(TINY, "customers", {3: {"demand": "x"}, 5: {"demand": "-1", "reach_km": "0"}}),
    "sites", {2: {"capacity": ""}},
)  # fmt: skip


def test_the_list_is_grouped_by_table_with_faults_first() -> None:
    """Tables with faults come first, then those with warnings only; each item has its place, its wrong, its repair."""
    groups = work_list(check_tables(BROKEN))
    assert [group.title for group in groups] == ["customers: 3 faults", "sites: 1 warning"]
    assert groups[0].rows() == (3, 5)
    assert groups[1].rows() == ()
    assert groups[1].rows(faults_only=False) == (2,)
    assert [item.where for item in groups[0].items] == [
        "row 3, demand, 'x'", "row 5, demand, '-1'", "row 5, reach_km, '0'"
    ]  # fmt: skip
    assert groups[0].items[0].what == "Not a number. Write a number such as 1250 or 1250.5."
    assert [item.is_fault for group in groups for item in group.items] == [True, True, True, False]


def test_the_sentence_counts_by_table() -> None:
    """As in the headline of the page; without anything to do it says so."""
    assert work_sentence(check_tables(BROKEN)) == "3 faults in customers, 1 warning in sites"
    assert work_sentence(check_tables(with_cells(BROKEN, "sites", {2: {"capacity": "9"}}))) == "3 faults in customers"
    assert work_sentence(check_tables(TINY)) == "No fault, no warning"
    assert work_list(check_tables(TINY)) == ()


def test_repairing_one_thing_removes_it() -> None:
    """The other items stay as they are."""
    before = work_list(check_tables(BROKEN))[0].items
    after = work_list(check_tables(with_cells(BROKEN, "customers", {3: {"demand": "20"}})))[0].items
    assert after == before[1:]


def test_what_is_not_listed_counts_all_the_same() -> None:
    """Of 603 faults in one table 200 are listed and one line says how many are not; the counts are whole."""
    rows = [f"C{n},x,y,z" for n in range(201)]
    checked = check_tables({**TINY, "customers": "\n".join(["customer,latitude,longitude,demand", *rows])})
    assert work_sentence(checked) == "603 faults in customers"
    assert len(work_list(checked)[0].items) == 201
    lanes = "\n".join(["origin,destination,unit_cost", *(f"Linz,Nowhere{n},x" for n in range(300))])
    assert work_sentence(check_tables({**TINY, "lanes": lanes})) == "600 faults in lanes"
