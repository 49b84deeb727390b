"""Tables under other names on the Inputs page: proposed, confirmed, and no longer offered once something was edited."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.browse.serve import STUDY_VARIABLE
from siting.study.fingerprint import fingerprint
from tests.browse.studies import tiny_folder
from tests.browse.test_pages import checked, draft_of, opened, press
from tests.builders import TINY, TINY_SETTINGS, tiny_study

if TYPE_CHECKING:
    from pathlib import Path

    from streamlit.testing.v1 import AppTest

NAMES = {"customers": "Kunden", "suppliers": "Lieferanten"}
OFFER = "2 tables may be there under other names"


@pytest.fixture
def app(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> AppTest:
    """Open the pages on a study whose customers and suppliers come under other names."""
    monkeypatch.setenv(STUDY_VARIABLE, str(tiny_folder(tmp_path / "tiny")))
    app = opened()
    [uploader] = [part for part in app.file_uploader if part.label.startswith("One .xlsx workbook")]
    files = [(f"{NAMES.get(name, name)}.csv", text.encode(), "text/csv") for name, text in TINY.items()]
    uploader.set_value([*files, ("study.toml", TINY_SETTINGS.encode(), "application/toml")])
    return press(checked(app.run()), "Open these files")


def offers(app: AppTest) -> list[str]:
    """Return what the page offers to open out."""
    return [part.label for part in app.expander]


def test_tables_are_read_once_confirmed(app: AppTest) -> None:
    """Nothing is read under another name before it is confirmed; then the study is whole."""
    assert OFFER in offers(app)
    assert draft_of(app).checked.study is None
    app = press(app, "Read these tables")
    assert OFFER not in offers(app)
    assert fingerprint(draft_of(app).checked.sound()) == fingerprint(tiny_study())


def test_edits_are_never_undone_by_it(app: AppTest) -> None:
    """After an edit the tables are not offered to be read again, since that would undo the edit."""
    draft_of(app).put_setting("title", "Edited")
    assert OFFER not in offers(checked(app.run()))
