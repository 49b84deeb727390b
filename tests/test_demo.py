"""The demo study: what it holds, that its two forms are one study, that its plan is what it is there to show."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

import siting
from siting.plan.plan import SiteVerdict, SupplierVerdict, TodayOutcome
from siting.study import demo
from siting.study.demo import DEMO, demo_folder, study_path
from siting.study.tables import SiteStanding, SupplierStanding

ROOT = Path(__file__).resolve().parent.parent


@pytest.fixture(scope="module")
def study() -> siting.Study:
    """Read the demo study."""
    return siting.read_study(demo_folder())


def test_holds_what_its_readme_says(study: siting.Study) -> None:
    """5 running and 12 proposed sites, 3 of 9 suppliers signed, 150 towns, two goods, sizes at six sites, 3 rules."""
    assert sum(row.standing is SiteStanding.RUNNING for row in study.sites) == 5
    assert sum(row.standing is SiteStanding.PROPOSED for row in study.sites) == 12
    assert sum(row.standing is SupplierStanding.SIGNED for row in study.suppliers) == 3
    assert len(study.suppliers) == 9
    assert len(study.customers) == 150
    assert [row.good for row in study.goods] == ["media", "trellis"]
    assert len({row.site for row in study.sizes}) == 6
    assert len(study.rules) == 3


def test_reads_without_a_warning(study: siting.Study) -> None:
    """The tables a new user copies from are beyond reproach."""
    assert study.warnings == ()


def test_folder_and_workbook_are_one_study(study: siting.Study) -> None:
    """The workbook holds the same tables and settings: same fingerprint."""
    workbook = siting.read_study(ROOT / "demo_data" / "demo.xlsx")
    assert siting.fingerprint(workbook) == siting.fingerprint(study)


def test_towns_lie_in_central_europe(study: siting.Study) -> None:
    """No coordinate is swapped or mistyped: all lie in the box 45-52.5 N, 9-25 E."""
    towns = [(row.latitude, row.longitude) for row in study.sites]
    towns += [(row.latitude, row.longitude) for row in study.customers]
    towns += [(row.latitude, row.longitude) for row in study.suppliers]
    for latitude, longitude in towns:
        assert latitude is not None
        assert longitude is not None
        assert 45.0 < latitude < 52.5
        assert 9.0 < longitude < 25.0


def test_plan_closes_opens_and_signs_and_saves(study: siting.Study) -> None:
    """Within 0.01 %, depots close, proposed sites open, suppliers are signed; today serves all and costs more."""
    answer = siting.solve(study)
    plan = answer.plan
    assert plan is not None
    assert answer.proof.outcome in {siting.Outcome.PROVED, siting.Outcome.WITHIN_GAP}
    assert answer.proof.gap is not None
    assert answer.proof.gap <= 1e-4
    verdicts = [line.verdict for line in plan.sites]
    assert {SiteVerdict.KEEP, SiteVerdict.OPEN, SiteVerdict.CLOSE, SiteVerdict.LEAVE} == set(verdicts)
    assert SupplierVerdict.SIGN in [line.verdict for line in plan.suppliers]
    assert plan.today is not None
    assert plan.today.outcome is TodayOutcome.SERVED
    assert plan.saving is not None
    assert plan.saving > 0
    assert siting.audit(study, plan).faults == ()


def test_the_word_demo_means_the_demo_study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Unless a file or folder of that name is there, which then is meant."""
    monkeypatch.chdir(tmp_path)
    assert study_path(DEMO) == demo_folder()
    assert study_path("my-study") == Path("my-study")
    (tmp_path / DEMO).mkdir()
    assert study_path(DEMO) == Path(DEMO)


def test_the_folder_of_a_plan_is_no_study(tmp_path: Path) -> None:
    """Its tables of results have names of study tables too; the user is sent to the study inside."""
    shutil.copytree(demo_folder(), tmp_path / "study")
    (tmp_path / "plan.json").write_text("{}", encoding="utf-8")
    with pytest.raises(
        siting.StudyError, match=r"the folder of a plan, not of a study\. Give the study in it, .*study\."
    ):
        study_path(str(tmp_path))


def test_the_demo_of_an_installed_package_comes_first(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """In a wheel the study lies inside the package; without either place the installation is damaged."""
    monkeypatch.setattr(demo, "__file__", str(tmp_path / "siting" / "study" / "demo.py"))
    with pytest.raises(FileNotFoundError, match=r"the demo study is in neither .* Install siting again\."):
        demo_folder()
    shutil.copytree(ROOT / "demo_data" / "study", tmp_path / "siting" / "demo")
    assert demo_folder() == tmp_path / "siting" / "demo"
