"""Rules against the rulings and names of their members."""

from __future__ import annotations

import re

import pytest

from tests.builders import TINY, check_tables, with_cells


def faults_of(tables: dict[str, str]) -> list[str]:
    """Return the faults as they are shown."""
    return [str(fault) for fault in check_tables(tables).faults]


PINS = [
    (
        "one_of,Linz;Brno,",
        {2: "pinned-open", 3: "pinned-open"},
        r"one_of allows one member, but 'Linz' \(pinned-open\) and",
    ),
    ("one_of,Linz;Brno,", {2: "pinned-shut", 3: "pinned-shut"}, r"one_of asks for one member, but .* are out"),
    ("not_together,Linz;Brno,", {2: "pinned-open", 3: "pinned-open"}, r"not_together allows one member, but"),
    (
        "together,Linz;Brno,",
        {2: "pinned-open", 3: "pinned-shut"},
        r"together asks for all or none, but 'Linz' \(pinned-op",
    ),
    ("needs,Linz;Brno,", {3: "pinned-shut"}, r"'Linz' needs 'Brno' \(pinned-shut\)\. Free one of them, or change the"),
    ("needs,Linz;Brno,", {2: "pinned-open", 3: "pinned-shut"}, r"'Linz' needs 'Brno' \(pinned-shut\)"),
    ("at_most,Linz;Brno,1", {2: "pinned-open", 3: "pinned-open"}, r"at_most allows 1, but .* are in"),
    ("at_most,Linz;Brno,0", {2: "pinned-open"}, r"at_most allows 0, but 'Linz' \(pinned-open\) are in"),
    ("at_least,Linz;Brno,2", {2: "pinned-shut"}, r"at_least asks for 2, but 'Linz' \(pinned-shut\) are out"),
]


@pytest.mark.parametrize(("rule", "rulings", "message"), PINS)
def test_rulings_that_contradict_a_rule(rule: str, rulings: dict[int, str], message: str) -> None:
    """A rule that the pins of its members alone make impossible is a fault; with the pins gone it is none."""
    rules = {"rules": f"rule,members,number\n{rule}\n"}
    tables = with_cells(TINY, "sites", {row: {"ruling": ruling} for row, ruling in rulings.items()})
    found = faults_of({**tables, **rules})
    assert len(found) == 1, found
    assert re.search(message, found[0]), found[0]
    assert faults_of({**TINY, **rules}) == []


NO_PINS = [
    ("one_of,Linz;Brno,", {2: "pinned-open", 3: "pinned-shut"}),
    ("together,Linz;Brno,", {2: "pinned-open", 3: "pinned-open"}),
    ("needs,Linz;Brno,", {2: "pinned-shut", 3: "pinned-shut"}),
    ("needs,Linz;Brno,", {2: "pinned-shut"}),
    ("at_most,Linz;Brno,1", {2: "pinned-open"}),
    ("at_least,Linz;Brno,1", {2: "pinned-shut"}),
]


@pytest.mark.parametrize(("rule", "rulings"), NO_PINS)
def test_rulings_that_leave_a_rule_possible(rule: str, rulings: dict[int, str]) -> None:
    """Just short of a contradiction nothing is said."""
    tables = with_cells(TINY, "sites", {row: {"ruling": ruling} for row, ruling in rulings.items()})
    assert faults_of({**tables, "rules": f"rule,members,number\n{rule}\n"}) == []


def test_a_name_that_is_site_and_supplier_only_matters_to_rules() -> None:
    """The same name may be a site and a supplier, unless a rule has it as a member."""
    tables = with_cells(TINY, "suppliers", {2: {"supplier": "Linz"}})
    assert faults_of(tables) == []
    found = faults_of({**tables, "rules": "rule,members\ntogether,Linz;Brno\n"})
    assert len(found) == 1
    assert re.search(r"rules, row 2, column members, .*'Linz' is both a site and a supplier\. Rename", found[0])


def test_a_semicolon_in_a_name_only_matters_to_rules() -> None:
    """Members are separated by semicolons, so that no site or supplier of a study with rules may have one."""
    tables = with_cells(TINY, "sites", {2: {"site": "Linz;Port"}})
    assert faults_of(tables) == []
    found = faults_of({**tables, "rules": "rule,members\ntogether,Brno;Szombathely\n"})
    assert len(found) == 1
    assert re.search(r"sites, row 2, column site, value 'Linz;Port': the name holds a semicolon", found[0])
