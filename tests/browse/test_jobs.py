"""Solves in processes of their own: one a key, stopped with their best plan, dead with the server, leaving nothing."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import threading
import time
from dataclasses import asdict, replace
from itertools import pairwise
from typing import TYPE_CHECKING

import pytest

from siting.browse import jobs
from siting.browse.jobs import JobState, find_job, job_key, start_job, stop_job
from siting.browse.kept import kept_answer
from siting.browse.tasks import PLAN
from siting.listener import Progress
from siting.plan.audit import audit
from siting.plan.proof import Outcome
from siting.study.settings import SolveSettings
from tests.browse.conftest import ended, job_folders, view_of, wait_until

if TYPE_CHECKING:
    from pathlib import Path

    from siting.browse.jobs import JobView
    from siting.study.tables import Study

STOP_TARGET_S = 1.0
BUSY_FACTOR = 8.0
"""How much longer a machine that runs other tests at the same time may take."""


def with_solve(study: Study, **solve: object) -> Study:
    """Return the study with other `[solve]` settings."""
    settings = replace(study.settings.solve, **solve)  # type: ignore[arg-type] # names are checked when made
    return replace(study, settings=replace(study.settings, solve=settings))


def with_a_plan(key: str) -> JobView:
    """Return the job of a key once it has told of a plan."""
    wait_until(lambda: view_of(key).progress.cost is not None)
    return view_of(key)


def test_solves_and_leaves_nothing_behind(tiny: Study) -> None:
    """A job ends with an audited answer to its study, and its folder is gone."""
    before = job_folders()
    job = ended(start_job(tiny).key)
    assert job.state is JobState.DONE, job.error
    plan = kept_answer(job).answer.plan
    assert plan is not None
    assert audit(tiny, plan).passed
    assert plan.cost == pytest.approx(job.progress.cost)
    wait_until(lambda: job_folders() <= before)


def test_the_key_is_the_study_and_how_hard_to_search(tiny: Study) -> None:
    """Engine, gap and time limit tell keys apart; the same study read twice does not."""
    keys = {
        job_key(with_solve(tiny, **changed)) for changed in ({}, {"gap": 0.5}, {"time_limit_s": 7.0}, {"engine": "cbc"})
    }
    assert len(keys) == 4
    assert job_key(replace(tiny)) == job_key(tiny)


def test_started_once_however_many_ask(long_study: Study) -> None:
    """Twenty pages that press Run at the same moment get one job."""
    barrier, numbers = threading.Barrier(20), []

    def ask() -> None:
        barrier.wait()
        numbers.append(start_job(long_study).number)

    threads = [threading.Thread(target=ask) for _ in range(20)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(set(numbers)) == 1
    assert len(numbers) == 20


def test_stop_keeps_the_best_plan(long_study: Study) -> None:
    """Stopped in mid-search, the plan is audited, no dearer than the best told of, and there within about a second."""
    key = start_job(long_study).key
    best = with_a_plan(key).progress.cost
    assert best is not None
    began = time.monotonic()
    stop_job(key)
    assert view_of(key).state is JobState.STOPPING
    job = ended(key)
    assert time.monotonic() - began < STOP_TARGET_S * BUSY_FACTOR
    assert job.state is JobState.DONE, job.error
    plan = kept_answer(job).answer.plan
    assert plan is not None
    assert plan.proof.outcome is Outcome.STOPPED
    assert plan.cost <= best * (1 + 1e-6)
    assert audit(long_study, plan).passed


def test_stop_before_the_worker_has_started(long_study: Study) -> None:
    """Stop pressed at once reaches the worker all the same: an answer without a plan, or with the first one."""
    key = start_job(long_study).key
    stop_job(key)
    job = ended(key)
    assert job.state is JobState.DONE, job.error
    assert kept_answer(job).answer.proof.outcome in {Outcome.NO_PLAN_YET, Outcome.STOPPED}


def test_run_again_after_it_ended(tiny: Study) -> None:
    """The same study solved anew is another job with an answer of its own."""
    first = ended(start_job(tiny).key)
    second = ended(start_job(tiny).key)
    assert second.number > first.number
    assert kept_answer(second) is not kept_answer(first)
    assert kept_answer(second) is kept_answer(second)
    assert kept_answer(first).answer.plan is not None


def test_cost_and_bound_only_improve(long_study: Study) -> None:
    """Whatever a worker says, the history a page draws never goes back."""
    key = start_job(long_study).key
    job = jobs._jobs[key]  # noqa: SLF001 - to play the worker
    with_a_plan(key)
    said = [(5e9, -5e9), (4e9, None), (4.5e9, -1e9), (None, -2e9), (4e9, 3e9)]
    for cost, bound in said:
        jobs._take(job, {"event": "progress", "progress": asdict(Progress(elapsed_s=1.0, cost=cost, bound=bound))})  # noqa: SLF001
    history = view_of(key).history
    assert all(b.cost <= a.cost for a, b in pairwise(history) if a.cost is not None and b.cost is not None)
    assert all(b.bound >= a.bound for a, b in pairwise(history) if a.bound is not None and b.bound is not None)
    assert all(b.cost is not None for a, b in pairwise(history) if a.cost is not None)
    assert view_of(key).progress.bound == 3e9


def test_a_worker_that_dies_is_told_of(long_study: Study) -> None:
    """Killed from outside, a job fails with its exit code; what follows can be run again."""
    key = start_job(long_study).key
    with_a_plan(key)
    process = jobs._jobs[key].process  # noqa: SLF001
    assert process is not None
    process.kill()
    job = ended(key)
    assert job.state is JobState.FAILED
    assert job.error.startswith("The search ended without an answer (exit code -9).")
    assert start_job(long_study).number > job.number


def test_an_error_of_the_program_reaches_the_page(tiny: Study) -> None:
    """An engine that does not exist is refused in the words of the settings."""
    job = ended(start_job(with_solve(tiny, engine="nobody")).key)
    assert job.state is JobState.FAILED
    assert "nobody" in job.error
    assert "direct" in job.error


def test_a_worker_that_cannot_start_is_told_of(tiny: Study, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where no process can be made, the job fails and says so, and its folder is gone."""
    before = job_folders()
    monkeypatch.setattr(sys, "executable", "/nowhere/python")
    job = ended(start_job(tiny).key)
    assert job.state is JobState.FAILED
    assert job.error.startswith("The search could not be started.")
    assert job_folders() <= before


def test_stop_of_an_unknown_or_ended_job_does_nothing(tiny: Study) -> None:
    """Stop is safe to press late."""
    stop_job("nothing")
    assert find_job("nothing") is None
    job = ended(start_job(tiny).key)
    stop_job(job.key)
    assert view_of(job.key).state is JobState.DONE


def test_only_so_many_ended_jobs_are_kept(tiny: Study, monkeypatch: pytest.MonkeyPatch) -> None:
    """The oldest ended job goes when there are too many."""
    monkeypatch.setattr(jobs, "KEEP_ENDED", 2)
    keys = [ended(start_job(with_solve(tiny, gap=gap)).key).key for gap in (0.1, 0.2, 0.3)]
    assert [find_job(key) is not None for key in keys] == [False, True, True]


SERVER = """
import sys, time
from siting.browse import jobs
from siting.study.read import read_study
key = jobs.start_job(read_study(sys.argv[1])).key
while jobs.find_job(key).progress.cost is None:
    time.sleep(0.05)
print(jobs._jobs[key].process.pid, flush=True)
time.sleep(600)
"""


@pytest.mark.skipif(not hasattr(os, "killpg"), reason="processes are killed the POSIX way")
@pytest.mark.parametrize("how", [signal.SIGKILL, signal.SIGTERM])
def test_the_worker_dies_with_its_server(long_study: Study, tmp_path: Path, how: signal.Signals) -> None:
    """However the server ends, its worker is gone within seconds, with its folder."""
    from siting.study.write import write_study  # noqa: PLC0415 - one test needs it

    write_study(long_study, tmp_path / "study")
    before = job_folders()
    with subprocess.Popen(  # noqa: S603 - our own script
        [sys.executable, "-c", SERVER, str(tmp_path / "study")], stdout=subprocess.PIPE, text=True
    ) as server:
        assert server.stdout is not None
        worker = int(server.stdout.readline())
        assert _runs(worker)
        server.send_signal(how)
        server.wait()
    wait_until(lambda: not _runs(worker), seconds=20)
    wait_until(lambda: job_folders() <= before, seconds=5)


def _runs(pid: int) -> bool:
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    return True


def test_the_worker_says_lines_of_json(tiny: Study, tmp_path: Path) -> None:
    """On its own, a worker writes progress and one answer, also where its input ends, and clears its folder."""
    from siting.study.write import write_study  # noqa: PLC0415 - one test needs it

    folder = tmp_path / "job"
    folder.mkdir()
    write_study(tiny, folder / "study")
    done = subprocess.run(  # noqa: S603 - our own module
        [sys.executable, "-m", "siting.browse.worker", str(folder)],
        input=json.dumps({"question": PLAN, "parameters": {}, "settings": asdict(SolveSettings())}) + "\n",
        capture_output=True,
        text=True,
        check=True,
    )
    events = [json.loads(line) for line in done.stdout.splitlines()]
    assert {event["event"] for event in events} == {"progress", "answer"}
    assert [event["event"] for event in events].count("answer") == 1
    assert done.stderr == ""
    assert not folder.exists()
