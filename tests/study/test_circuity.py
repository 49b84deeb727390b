"""The table `circuity`, and what starts it."""

from __future__ import annotations

from dataclasses import replace

import pytest

from siting.study.published_circuity import FACTORS, SOURCE, with_published_factors
from siting.study.tables import CircuityRow
from tests.builders import TINY, check_tables, tiny_study, with_cells

PLACED = with_cells(
    with_cells(TINY, "sites", {2: {"country": "AT"}, 3: {"country": "CZ"}}), "suppliers", {2: {"country": "Germany"}}
)


def faults_of(rows: str) -> list[str]:
    """Return the faults of the tiny study with these rows."""
    tables = {**PLACED, "circuity": f"country,other_country,circuity\n{rows}\n"}
    return [str(fault) for fault in check_tables(tables).faults]


@pytest.mark.parametrize(
    ("rows", "message"),
    [
        ("AT,,1\nCZ,,5\nAT,CZ,1.4", ""),
        ("AT,,0.99", "circuity, row 2, column circuity, value '0.99': out of range"),
        ("AT,,5.01", "out of range"),
        ("AT,,", "circuity, row 2, column circuity: blank"),
        (",,1.2", "circuity, row 2, column country: blank"),
        ("AT,,1.2\nAustria,,1.3", "the same countries are already in row 2, in whichever order"),
        ("AT,,1.2\nAT,AT,1.3", "the same countries are already in row 2"),
        ("AT,CZ,1.2\nCZ,AT,1.3", "the same countries are already in row 2"),
    ],
)
def test_a_pair_of_countries_has_one_factor(rows: str, message: str) -> None:
    """Factors run from 1 to 5, and each pair of countries is there once, whatever it is called."""
    found = faults_of(rows)
    assert len(found) == bool(message)
    assert all(message in fault for fault in found)


def test_a_country_without_places_is_warned_of() -> None:
    """Its row changes no distance."""
    checked = check_tables({**PLACED, "circuity": "country,other_country,circuity\nAT,France,1.2\n"})
    assert [(warning.table, warning.column, warning.value) for warning in checked.warnings] == [
        ("circuity", "other_country", "France")
    ]


def test_published_factors_start_the_table() -> None:
    """Each says that it is from memory; rows that are there stay; countries without one are told."""
    found = with_published_factors(tiny_study(PLACED))
    assert (found.added, found.without) == (("DE",), ("AT", "CZ"))
    assert found.study.circuity == (CircuityRow(country="DE", circuity=1.32, source=SOURCE, row=2),)
    assert "from memory" in SOURCE
    again = with_published_factors(replace(found.study, circuity=(CircuityRow(country="Deutschland", circuity=1.5),)))
    assert again.added == ()
    assert [row.circuity for row in again.study.circuity] == [1.5]


def test_published_factors_can_be_used_as_they_are() -> None:
    """Every value is within what the table takes."""
    assert all(1.0 <= factor <= 5.0 for factor in FACTORS.values())
    assert (FACTORS["US"], FACTORS["GB"], FACTORS["EG"]) == (1.20, 1.40, 2.10)
