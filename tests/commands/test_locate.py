"""`siting locate`: what was found, what waits for a choice, and the choice made."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting import cli
from siting.study.read import read_raw

if TYPE_CHECKING:
    from pathlib import Path

    import pytest

CUSTOMERS = """\
customer,place,country,latitude,longitude,demand
A,Graz,AT,,,4
B,Frankfurt,DE,,,5
C,Nowhereville,AT,,,6
D,Insbruck,AT,,,7
E,Linz,AT,14.3,48.3,8
Brno,,CZ,,,9
"""


def test_from_names_to_coordinates_with_a_choice(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Everything is told; the candidates are marked in the file, and the second run takes the mark."""
    study, choices = tmp_path / "study", tmp_path / "choices.csv"
    study.mkdir()
    (study / "study.toml").write_text('currency = "EUR"\nunit = "t"\n', encoding="utf-8")
    (study / "customers.csv").write_text(CUSTOMERS, encoding="utf-8")
    given = ["locate", str(study), "--choices", str(choices), "--out"]
    assert cli.main([*given, str(tmp_path / "one")]) == 0
    said = capsys.readouterr().out
    for part in (
        "5 rows without coordinates: 2 exact, 1 near-spelling, 1 ambiguous, 1 unknown.",
        "1 of them have no place and were found by their own name.",
        "customers, row 5: 'Insbruck, AT' taken for Innsbruck (AT, 132,493 people, 47.26 11.39): near-spelling, confid",
        "customers, row 3: 'Frankfurt, DE' fits several towns, up to ",
        "customers, row 4: 'Nowhereville, AT' is not known; it stays without coordinates",
        "Worth a look: customers, row 6, column latitude, value '14.3, 48.3': ",
        "choices.csv: 1 places to choose. Write yes under choose, and locate again.",
        "Towns: GeoNames, CC BY 4.0.",
    ):
        assert part in said, part
    text = choices.read_text(encoding="utf-8")
    choices.write_text(text.replace('"DE","","Frankfurt am', '"DE","yes","Frankfurt am'), encoding="utf-8")
    assert cli.main([*given, str(tmp_path / "two")]) == 0
    said = capsys.readouterr().out
    assert "1 chosen, 1 unknown" in said
    assert "places to choose" not in said
    latitude = read_raw(tmp_path / "two").tables["customers"].column("latitude")
    assert latitude is not None
    assert [text[:4] for text in latitude.to_pylist()] == ["47.0", "50.1", "", "47.2", "14.3", "49.1"]
    assert cli.main([*given, str(tmp_path / "two")]) == 2
    assert "already there" in capsys.readouterr().err


def test_a_complete_study_has_nothing_to_find(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The demo study has all coordinates, each where its town is; no server is asked, --online or not."""
    online = ["--online", "http://127.0.0.1:9", "--cache", str(tmp_path / "c.json")]
    assert cli.main(["locate", "demo", "--out", str(tmp_path / "a"), *online]) == 0
    said = capsys.readouterr().out
    assert "Every row has coordinates." in said
    assert "Worth a look" not in said
    assert not (tmp_path / "c.json").exists()


def test_what_cannot_be_read_or_written_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A workbook as the target, and a study that is not there."""
    assert cli.main(["locate", "demo", "--out", str(tmp_path / "a.xlsx")]) == 2
    assert "Give --out a name without .xlsx" in capsys.readouterr().err
    assert cli.main(["locate", str(tmp_path / "none"), "--out", str(tmp_path / "b")]) == 2
    assert "there is no such folder or workbook" in capsys.readouterr().err
