"""Whatever the tables hold, checking answers with a study or with faults, never with an exception."""

from __future__ import annotations

import csv
import io

from hypothesis import given, settings
from hypothesis import strategies as st

from siting.study.check import check_raw
from siting.study.fingerprint import fingerprint
from siting.study.raw import RawStudy, RawTable, table_from_rows
from tests.builders import tiny_goods, tiny_study

TABLES = {name: list(csv.reader(io.StringIO(text))) for name, text in tiny_goods().items()}
SETTINGS: dict[str, object] = {
    "currency": "EUR", "unit": "t", "outbound_rate": 0.2, "inbound_rate": 0.1, "interest_rate": 0.08, "life_years": 10,
}  # fmt: skip

ODD_CELLS = st.sampled_from(
    ["", " ", "x", "-1", "0", "1e999", "nan", "unlimited", "yes", "running", "signed", "pinned-open", "pinned-shut",
     "Linz", "Brno", "Vienna", "Deggendorf", "Linz;Brno", ";", "pots", "inbound", "direct", "91", "1,5", "'=1",
     "\u00a0", "\n"]
)  # fmt: skip
ODD_VALUES = st.one_of(
    st.none(), st.booleans(), st.integers(), st.floats(), st.text(max_size=3), st.just({}), st.just([1])
)


@st.composite
def damaged(draw: st.DrawFn) -> RawStudy:
    """Return the tiny study with cells, columns, rows, tables and settings changed at random."""
    tables: dict[str, RawTable] = {}
    for name, (header, *records) in TABLES.items():
        if draw(st.integers(0, 11)) == 0:
            continue
        rows = [list(record) for record in records]
        for _ in range(draw(st.integers(0, 2))):
            row = draw(st.integers(0, len(rows) - 1))
            rows[row][draw(st.integers(0, len(header) - 1))] = draw(ODD_CELLS)
        names = list(header)
        if draw(st.integers(0, 7)) == 0:
            names[draw(st.integers(0, len(names) - 1))] = draw(
                st.sampled_from(["", "site", "capcity", "demand", "other"])
            )
        if draw(st.integers(0, 7)) == 0:
            rows.append(rows[0])
        tables[name] = table_from_rows(names, rows)
    values = dict(SETTINGS)
    for name in draw(
        st.lists(st.sampled_from([*SETTINGS, "solve", "most_sites", "service_km", "title", "odd"]), max_size=2)
    ):
        values[name] = draw(ODD_VALUES)
    return RawStudy(tables=tables, settings=values)


@settings(max_examples=300, deadline=None)
@given(damaged())
def test_checking_always_answers(raw: RawStudy) -> None:
    """Never an exception, never both a study and faults; every fault says what is wrong, where, and the repair."""
    checked = check_raw(raw)
    assert (checked.study is None) == bool(checked.faults)
    for fault in (*checked.faults, *checked.warnings):
        assert fault.table
        assert fault.wrong
        assert fault.repair
        assert not fault.wrong.endswith(".")
        assert not fault.repair.endswith(".")
    if checked.study is not None:
        assert len(fingerprint(checked.study)) == 64


def test_tables_from_a_page_are_the_same_study() -> None:
    """The undamaged tables, handed over in memory, are the study that the files give."""
    tables = {name: table_from_rows(header, records) for name, (header, *records) in TABLES.items()}
    checked = check_raw(RawStudy(tables=tables, settings={**SETTINGS, "title": "Tiny"}))
    assert fingerprint(checked.sound()) == fingerprint(tiny_study(tiny_goods()))
