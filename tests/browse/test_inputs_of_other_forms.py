"""Drafts of files of other forms: what was read stays known while they are edited, and names are confirmed."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.browse.drafts import Draft, keep_draft
from siting.study.fingerprint import fingerprint
from siting.study.propose import propose_mapping
from siting.study.read import read_raw
from tests.builders import TINY, tiny_study, write_folder

if TYPE_CHECKING:
    from pathlib import Path

HEAD, *ROWS = TINY["customers"].splitlines()


def draft_of(folder: Path, customers: str) -> Draft:
    """Return the draft of the tiny study with other customers."""
    return keep_draft(read_raw(write_folder(folder, {**TINY, "customers": customers})), "test")


def test_an_edit_does_not_settle_what_can_be_read_in_two_ways(tmp_path: Path) -> None:
    """A number that was refused because of the form of its file stays refused while another cell is edited."""
    text = "\n".join([HEAD, *ROWS]).replace(",40,", ",1.234,").replace(",", ";")
    draft = draft_of(tmp_path, text)
    assert [(fault.row, fault.column) for fault in draft.checked.faults] == [(2, "demand")]
    frame = draft.table("customers")
    frame.loc[1, "demand"] = "21"
    assert draft.put_table("customers", frame)
    assert [(fault.row, fault.column) for fault in draft.checked.faults] == [(2, "demand")]
    frame.loc[0, "demand"] = "1234"
    assert draft.put_table("customers", frame)
    assert draft.checked.faults == ()


def test_confirmed_names_make_the_study(tmp_path: Path) -> None:
    """All proposals confirmed, the draft is the study; a warning says what was renamed."""
    draft = draft_of(tmp_path, "\n".join([HEAD.replace("customer", "Kunde").replace("demand", "Menge"), *ROWS]))
    assert draft.checked.study is None
    version = draft.version
    draft.confirm(propose_mapping(draft.raw))
    assert draft.version > version
    assert fingerprint(draft.checked.sound()) == fingerprint(tiny_study())
    assert [str(warning).partition(". ")[0] for warning in draft.checked.warnings] == [
        "customers: columns were read as your confirmation says: 'Kunde' as customer, 'Menge' as demand"
    ]
    assert propose_mapping(draft.raw) == ()
