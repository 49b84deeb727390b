"""Places to coordinates on the Inputs page: found, chosen, not known, filled in; and what looks odd on the map."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from siting.browse import places_view
from siting.browse.drafts import Draft, keep_draft
from siting.study.locate_study import LocatedStudy, locate_study
from siting.study.read import read_raw
from tests.browse.studies import HOSTILE
from tests.browse.test_pages import checked, draft_of, opened, press, said
from tests.builders import TINY, TINY_SETTINGS, write_folder

if TYPE_CHECKING:
    from pathlib import Path

    from streamlit.testing.v1 import AppTest

    from siting.study.raw import RawStudy

PLACES = """\
customer,place,country,latitude,longitude,demand
K1,Wien,AT,,,40
K2,Neustadt,Germany,,,20
K3,Grats,AT,,,30
K4,Nowhere at all,AT,,,10
Regensburg,,DE,,,10
K6,Neustadt,Germany,,,5
K7,Brno,CZ,49.19522,16.60796,5
"""


def draft_with(folder: Path, customers: str) -> Draft:
    """Return the draft of the tiny study with other customers."""
    return keep_draft(
        read_raw(write_folder(folder / "places", {**TINY, "customers": customers}, TINY_SETTINGS)), "test"
    )


def coordinates(draft: Draft) -> dict[str, tuple[str, str]]:
    """Return coordinates as typed by customer."""
    rows = draft.table("customers").to_dict("records")
    return {row["customer"]: (row["latitude"], row["longitude"]) for row in rows}


def fill(app: AppTest) -> AppTest:
    """Press the button that fills coordinates in."""
    return checked(app.button(key="fill-places").click().run())


def test_what_is_found_is_shown_and_filled_in(tmp_path: Path) -> None:
    """Places found are ticked, those by the name of the row are not; ambiguous and unknown ones stay blank."""
    app = opened(draft_with(tmp_path, PLACES))
    text = said(app)
    assert "2 ambiguous" in text
    assert "<b>Neustadt, Germany</b> (customers, row 3 and 1 more): " in text
    assert "customers, row 5: Nowhere at all, AT" in text
    [found] = [table.value for table in app.dataframe if "confidence" in table.value]
    assert found["as typed"].tolist()[0] == "Wien, AT"
    assert dict(zip(found["row"], found["use"].tolist(), strict=True))["customers, row 6"] is False
    assert found["how"].tolist()[-1] == "exact, by the name of the row"
    assert "GeoNames" in " ".join(caption.value for caption in app.caption)
    placed = coordinates(draft_of(fill(app)))
    assert placed["K1"] == ("48.2085", "16.3721")
    assert placed["K2"] == placed["K6"] == placed["K4"] == placed["Regensburg"] == ("", "")
    assert placed["K7"] == ("49.19522", "16.60796")


def test_a_choice_fills_all_rows_of_the_place(tmp_path: Path) -> None:
    """The candidates are listed with country, people and coordinates; choosing one settles every row that names it."""
    app = opened(draft_with(tmp_path, PLACES))
    [chooser] = [box for box in app.selectbox if box.label.startswith("Which town is meant")]
    assert chooser.options[0] == "leave blank"
    assert all("Germany" in option and "inhabitants, at " in option for option in chooser.options[1:])
    placed = coordinates(draft_of(fill(checked(chooser.set_value(1).run()))))
    assert placed["K2"] == placed["K6"] != ("", "")


def test_hostile_places_are_text(tmp_path: Path) -> None:
    """A place that is markup is shown as typed."""
    text = "customer,place,country,latitude,longitude,demand\n"
    text += "".join(f"'C{at}',\"{name.replace(chr(34), chr(34) * 2)}\",,,,5\n" for at, name in enumerate(HOSTILE))
    app = opened(draft_with(tmp_path, text))
    assert "&lt;script&gt;window.ran=1&lt;/script&gt;" in said(app)
    assert "<script" not in said(app)


def test_nothing_is_said_where_nothing_is_blank(tmp_path: Path) -> None:
    """With coordinates everywhere the section is not there."""
    app = opened(draft_with(tmp_path, TINY["customers"]))
    assert not [part for part in app.expander if part.label.startswith("Places to coordinates")]
    assert "worth a look" not in said(app)


def test_odd_coordinates_are_named_above_the_map_and_on_it(tmp_path: Path) -> None:
    """Another country's coordinates and a place in the sea are warned of, without being faults."""
    text = TINY["customers"].replace("customer,", "customer,country,").replace("Vienna,", "Vienna,FR,")
    text = text.replace("Munich,", "Munich,,").replace("Prague,", "Prague,,").replace("Graz,", "Graz,,")
    app = opened(draft_with(tmp_path, text.replace("47.06667,15.45", "47.0,-8.0")))
    assert "2 places worth a look" in said(app)
    assert "from the nearest town of France, which the row names" in said(app)
    assert "km from the nearest town, perhaps in the sea" in said(app)
    assert draft_of(app).checked.faults == ()
    page = app.session_state["given_map"][1]
    assert "perhaps in the sea" in page


def test_places_are_looked_up_once_per_edit(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A re-run looks nothing up; an edit does."""
    app = opened(draft_with(tmp_path, PLACES))
    asked: list[RawStudy] = []

    def counted_look(raw: RawStudy) -> LocatedStudy:
        asked.append(raw)
        return locate_study(raw)

    monkeypatch.setattr(places_view, "locate_study", counted_look)
    checked(app.run())
    assert asked == []
    draft_of(app).put_setting("title", "Renamed")
    checked(app.run())
    assert len(asked) == 1


@pytest.mark.parametrize(("most", "unasked"), [(6, True), (5, False)])
def test_many_places_are_looked_up_on_request(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, most: int, *, unasked: bool
) -> None:
    """Above the limit nothing is looked up before the button is pressed."""
    monkeypatch.setattr(places_view, "MOST_BLANK", most)
    app = opened(draft_with(tmp_path, PLACES))
    assert ("2 ambiguous" in said(app)) is unasked
    if not unasked:
        assert "2 ambiguous" in said(press(app, "Look all places up"))
