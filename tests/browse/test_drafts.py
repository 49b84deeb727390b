"""Drafts: what is typed is kept as typed, faults name the rows of the page, and edits change nothing else."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pandas as pd
import pytest

from siting.browse import drafts
from siting.browse.drafts import ROW, Draft, find_draft, keep_draft
from siting.errors import Fault
from siting.study.raw import RawStudy, table_from_rows

if TYPE_CHECKING:
    from siting.study.raw import RawStudy as Raw


@pytest.fixture
def draft(raw: Raw) -> Draft:
    """Keep the tiny study."""
    return keep_draft(raw, "tiny")


def with_cell(frame: pd.DataFrame, row: int, column: str, value: str) -> pd.DataFrame:
    """Return the table with one cell changed."""
    changed = frame.copy()
    changed.loc[row, column] = value
    return changed


def with_row(frame: pd.DataFrame, **cells: str) -> pd.DataFrame:
    """Return the table with a row added as an editor adds it: without a number, blanks missing."""
    return pd.concat([frame, pd.DataFrame([cells]).astype("string")], ignore_index=True)


def test_untouched_tables_change_nothing(draft: Draft) -> None:
    """Each table put back as it was shown is no edit: same version, same study."""
    for name in ("sites", "customers", "suppliers", "goods", "lanes", "rules"):
        assert not draft.put_table(name, draft.table(name))
    assert draft.version == 0
    assert set(draft.raw.tables) == {"sites", "customers", "suppliers"}


def test_a_fault_is_found_kept_and_mended(draft: Draft) -> None:
    """Text for a number is a fault in the row the page shows; it stays; mended, the key is the first one again."""
    key, before = draft.key, draft.table("customers")
    assert draft.put_table("customers", with_cell(before, 1, "demand", "abc"))
    [fault] = draft.checked.faults
    assert (fault.table, fault.row, fault.column, fault.value) == ("customers", 3, "demand", "abc")
    assert draft.key == ""
    assert draft.table("customers").loc[1, "demand"] == "abc"
    assert draft.put_table("customers", before)
    assert draft.checked.faults == ()
    assert draft.key == key


def test_rows_keep_their_numbers(draft: Draft) -> None:
    """Row 3 deleted and one added: rows 2, 4, 5 stay so, and the new one is 6, in the editor and in faults."""
    frame = with_row(draft.table("customers").drop(index=1), customer="Ostrava", demand="x")
    assert draft.put_table("customers", frame)
    assert draft.table("customers")[ROW].tolist() == [2, 4, 5, 6]
    assert [(fault.row, fault.column) for fault in draft.checked.faults if fault.value == "x"] == [(6, "demand")]


def test_two_rows_added_follow_each_other(draft: Draft) -> None:
    """New rows are numbered on from the last."""
    frame = with_row(with_row(draft.table("customers"), customer="Ostrava"), customer="Wels")
    draft.put_table("customers", frame)
    assert draft.table("customers")[ROW].tolist() == [2, 3, 4, 5, 6, 7]


def test_blank_rows_are_left_out(draft: Draft) -> None:
    """A row added and not filled in does not count."""
    assert not draft.put_table("customers", with_row(draft.table("customers"), customer=""))


def test_columns_nobody_filled_in_stay_absent(draft: Draft) -> None:
    """A known column is offered; it becomes part of the table with its first filled cell."""
    assert "residual_value" in draft.table("sites")
    draft.put_table("sites", with_cell(draft.table("sites"), 0, "ruling", "pinned-open"))
    assert "residual_value" not in draft.raw.tables["sites"].header
    draft.put_table("sites", with_cell(draft.table("sites"), 0, "residual_value", "5"))
    assert draft.raw.tables["sites"].header[-1] == "residual_value"


def test_a_new_table_comes_with_its_first_cell(draft: Draft) -> None:
    """A table that was absent is made by filling in a row."""
    assert draft.put_table("rules", with_row(draft.table("rules"), rule="one_of", members="Linz;Brno"))
    assert draft.raw.tables["rules"].header == ("rule", "members")
    assert draft.checked.study is not None


def test_strange_headers_are_told_apart_and_kept() -> None:
    """Columns named twice, not at all or like the row numbers are shown apart and written back as typed."""
    table = table_from_rows(("site", "site", "", "#"), [("Linz", "Linz B", "c", "7")])
    draft = keep_draft(RawStudy(tables={"sites": table}), "strange")
    frame = draft.table("sites")
    assert list(frame.columns[:5]) == [ROW, "site", "site (column 2)", "no name (column 3)", "# (column 4)"]
    assert frame.loc[0, "# (column 4)"] == "7"
    assert draft.put_table("sites", with_cell(frame, 0, "site (column 2)", "Brno"))
    assert draft.raw.tables["sites"].header == ("site", "site", "", "#")
    assert [column.to_pylist() for column in draft.raw.tables["sites"].columns] == [["Linz"], ["Brno"], ["c"], ["7"]]


def test_a_slip_in_a_header_is_repaired_by_renaming(raw: Raw) -> None:
    """A column `demnad` is a fault; renamed to `demand` its cells are in place; taken out it is gone."""
    customers = raw.tables["customers"]
    slip = replace(customers, header=tuple("demnad" if name == "demand" else name for name in customers.header))
    draft = keep_draft(replace(raw, tables={**raw.tables, "customers": slip}), "slip")
    assert draft.strangers("customers") == ["demnad"]
    assert draft.checked.study is None
    draft.rename_column("customers", "demnad", "demand")
    assert draft.checked.study is not None
    assert draft.checked.study.customers[0].demand == 40
    draft.rename_column("customers", "demand", None)
    assert "demand" not in draft.raw.tables["customers"].header


def test_what_could_not_be_read_is_not_forgotten(draft: Draft) -> None:
    """A fault of reading holds until its table is edited, then stays as a warning; those of other tables hold on."""
    ragged = Fault(table="customers", row=3, wrong="the row has 9 cells, the header has 6", repair="Use quotes")
    other = Fault(table="sites", wrong="something", repair="Something else")
    draft.raw = replace(draft.raw, faults=(ragged, other))
    draft.put_table("customers", with_cell(draft.table("customers"), 0, "demand", "41"))
    assert draft.raw.faults == (other,)
    assert [(warning.row, warning.wrong) for warning in draft.raw.warnings] == [(3, ragged.wrong)]


def test_settings_are_kept_as_typed(draft: Draft) -> None:
    """A setting typed wrong is a fault with its text kept; mended or emptied it is none."""
    assert draft.put_setting("life_years", "ten")
    assert draft.setting_text("life_years") == "ten"
    assert [fault.column for fault in draft.checked.faults] == ["life_years"]
    assert draft.put_setting("life_years", " 10 ")
    assert not draft.put_setting("life_years", "10")
    assert draft.checked.faults == ()


def test_solve_settings_and_yes_no(draft: Draft) -> None:
    """`solve.` settings land in their section, and yes and no read back as typed."""
    assert draft.put_setting("solve.gap", "0.01")
    assert draft.put_setting("single_source", "yes")
    assert draft.checked.study is not None
    assert draft.checked.study.settings.solve.gap == 0.01
    assert draft.checked.study.settings.single_source is True
    assert draft.setting_text("single_source") == "yes"
    frame = draft.settings_frame().set_index("setting")
    assert frame.loc["solve.gap", "value"] == "0.01"
    assert draft.put_setting("solve.gap", "")
    assert draft.checked.study.settings.solve.gap != 0.01


def test_an_unknown_setting_is_shown(draft: Draft) -> None:
    """A setting nobody knows is in the list, so that it can be emptied."""
    draft.put_setting("surprise", "1")
    assert draft.settings_frame()["setting"].tolist()[-1] == "surprise"


def test_a_draft_is_found_by_its_token_alone(raw: Raw) -> None:
    """Two drafts of one study differ, and no other token finds any."""
    one, two = keep_draft(raw, "one"), keep_draft(raw, "two")
    assert one.token != two.token
    assert len(one.token) >= 22
    assert find_draft(one.token) is one
    assert find_draft("") is None
    one.put_setting("title", "Only here")
    assert two.setting_text("title") == "Tiny"


def test_the_oldest_untouched_draft_goes_first(raw: Raw, monkeypatch: pytest.MonkeyPatch) -> None:
    """With room for two, the one looked at last stays."""
    monkeypatch.setattr(drafts, "MOST_DRAFTS", 2)
    one, two = keep_draft(raw, "one"), keep_draft(raw, "two")
    find_draft(one.token)
    three = keep_draft(raw, "three")
    assert [find_draft(draft.token) is not None for draft in (one, two, three)] == [True, False, True]
