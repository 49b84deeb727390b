"""What the tests of the pages share: studies read, jobs that end, and a look at what is left on the machine."""

from __future__ import annotations

import tempfile
import time
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from siting.browse import jobs
from siting.study.read import read_raw, read_study
from tests.browse.studies import long_folder, tiny_folder

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from siting.browse.jobs import JobView
    from siting.study.raw import RawStudy
    from siting.study.tables import Study

PATIENCE_S = 60.0


@pytest.fixture
def raw(tmp_path: Path) -> RawStudy:
    """Read the tiny study without judging it."""
    return read_raw(tiny_folder(tmp_path / "tiny"))


@pytest.fixture
def tiny(tmp_path: Path) -> Study:
    """Read the tiny study."""
    return read_study(tiny_folder(tmp_path / "tiny"))


@pytest.fixture(scope="session")
def long_study(tmp_path_factory: pytest.TempPathFactory) -> Study:
    """Read the study whose proof takes minutes."""
    return read_study(long_folder(tmp_path_factory.mktemp("long") / "study"))


@pytest.fixture(autouse=True)
def scratch(tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch) -> None:
    """Give each test a folder of its own for temporary files, so that tests running beside it are not seen there."""
    folder = str(tmp_path_factory.mktemp("scratch"))
    monkeypatch.setattr(tempfile, "tempdir", folder)
    monkeypatch.setenv("TMPDIR", folder)


@pytest.fixture(autouse=True)
def no_job_left(scratch: None) -> Iterator[None]:  # noqa: ARG001 - it ends before the folder is another
    """End every job a test has started, and forget it."""
    yield
    for key in list(jobs._jobs):  # noqa: SLF001 - tests alone need to end all
        jobs.stop_job(key)
    wait_until(lambda: not any(job.view().running for job in jobs._jobs.values()))  # noqa: SLF001
    jobs._jobs.clear()  # noqa: SLF001


def wait_until(done: Callable[[], bool], seconds: float = PATIENCE_S) -> None:
    """Wait until something is so, and fail where it does not come to be."""
    end = time.monotonic() + seconds
    while not done():
        assert time.monotonic() < end, "it did not come to be in time"
        time.sleep(0.02)


def ended(key: str) -> JobView:
    """Return the job of a key once it has ended."""
    wait_until(lambda: not view_of(key).running)
    return view_of(key)


def view_of(key: str) -> JobView:
    """Return the job of a key, which is there."""
    job = jobs.find_job(key)
    assert job is not None
    return job


def job_folders() -> set[Path]:
    """Return the folders of jobs that are on the disk."""
    return set(Path(tempfile.gettempdir()).glob("siting-job-*"))
