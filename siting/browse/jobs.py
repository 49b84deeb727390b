"""
Solves that run beside the pages, a process each.

A job is started once per key (same study, same settings), is found again by any page that asks with that key, and dies
with the server: the worker stops when its standard input ends. Nothing here imports Streamlit.
"""

from __future__ import annotations

import atexit
import itertools
import json
import shutil
import subprocess
import sys
import tempfile
import threading
import time
from dataclasses import asdict, dataclass, field, replace
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Any

from siting.listener import Progress
from siting.study.fingerprint import fingerprint
from siting.study.write import write_study

if TYPE_CHECKING:
    from siting.study.tables import Study

STOP_GRACE_S = 10.0
"""Seconds a worker gets to hand over its best plan after Stop, before it is killed."""

KEEP_ENDED = 16
"""Ended jobs kept in memory; older ones are forgotten first."""


class JobState(StrEnum):
    """Where a job is."""

    RUNNING = "running"
    STOPPING = "stopping"
    DONE = "done"
    FAILED = "failed"


@dataclass(frozen=True, slots=True, kw_only=True)
class JobView:
    """What a page sees of a job: a copy, safe to keep."""

    key: str
    number: int
    """Differs for every job started, also under the same key."""
    study: Study
    """What is being solved."""
    state: JobState
    progress: Progress
    """Best cost and bound so far."""
    history: tuple[Progress, ...]
    """Every improvement, oldest first."""
    answer: dict[str, Any] | None
    """The object of plan.json once done."""
    error: str
    """Why it failed, fit for the user; empty otherwise."""

    @property
    def running(self) -> bool:
        """True until the job has ended."""
        return self.state in {JobState.RUNNING, JobState.STOPPING}


@dataclass(slots=True, kw_only=True)
class _Job:
    """A job as the reader thread changes it, under `lock`."""

    key: str
    number: int
    study: Study
    folder: Path
    process: subprocess.Popen[str]
    started: float
    lock: threading.Lock = field(default_factory=threading.Lock)
    state: JobState = JobState.RUNNING
    progress: Progress = field(default_factory=lambda: Progress(elapsed_s=0.0))
    history: list[Progress] = field(default_factory=list)
    answer: dict[str, Any] | None = None
    error: str = ""

    def view(self) -> JobView:
        with self.lock:
            running = self.state in {JobState.RUNNING, JobState.STOPPING}
            elapsed = time.monotonic() - self.started if running else self.progress.elapsed_s
            return JobView(
                key=self.key,
                number=self.number,
                study=self.study,
                state=self.state,
                progress=replace(self.progress, elapsed_s=elapsed),
                history=tuple(self.history),
                answer=self.answer,
                error=self.error,
            )


_jobs: dict[str, _Job] = {}
_guard = threading.Lock()
_numbers = itertools.count(1)


def job_key(study: Study) -> str:
    """Return the key of solving this study: its fingerprint with its `[solve]` settings."""
    solve = study.settings.solve
    return f"{fingerprint(study)}:{solve.engine}:{solve.gap!r}:{solve.time_limit_s!r}"


def start_job(study: Study) -> JobView:
    """Start solving, or return the job that already runs for the same study and settings."""
    key = job_key(study)
    with _guard:
        job = _jobs.get(key)
        if job is not None and job.view().running:
            return job.view()
        _forget_old()
        _jobs[key] = job = _launch(key, study)
    return job.view()


def find_job(key: str) -> JobView | None:
    """Return the job of that key, running or ended; None where there is none."""
    with _guard:
        job = _jobs.get(key)
    return job.view() if job else None


def stop_job(key: str) -> None:
    """Ask the job to stop and keep its best plan; kill it if it does not within `STOP_GRACE_S`."""
    with _guard:
        job = _jobs.get(key)
    if job is None:
        return
    with job.lock:
        if job.state is not JobState.RUNNING:
            return
        job.state = JobState.STOPPING
    _tell(job, "stop")
    timer = threading.Timer(STOP_GRACE_S, job.process.kill)
    timer.daemon = True
    timer.start()


def _launch(key: str, study: Study) -> _Job:
    folder = Path(tempfile.mkdtemp(prefix="siting-job-"))
    write_study(study, folder / "study")
    process = subprocess.Popen(  # noqa: S603 - our own interpreter and module, no text of the user's
        [sys.executable, "-P", "-u", "-m", "siting.browse.worker", str(folder / "study")],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        encoding="utf-8",
    )
    job = _Job(key=key, number=next(_numbers), study=study, folder=folder, process=process, started=time.monotonic())
    _tell(job, json.dumps(asdict(study.settings.solve)))
    threading.Thread(target=_follow, args=(job,), name=f"siting-job-{key[:8]}", daemon=True).start()
    return job


def _tell(job: _Job, line: str) -> None:
    """Write a line to the worker; a worker that has gone is found out by `_follow`."""
    if job.process.stdin is None:
        return
    try:
        job.process.stdin.write(line + "\n")
        job.process.stdin.flush()
    except (BrokenPipeError, ValueError, OSError):
        return


def _follow(job: _Job) -> None:
    """Read the worker's lines until it ends; runs in a thread of its own."""
    errors: list[str] = []
    drain = threading.Thread(target=lambda: errors.extend(job.process.stderr or ()), daemon=True)
    drain.start()
    for line in job.process.stdout or ():
        try:
            event = json.loads(line)
        except ValueError:
            continue
        _take(job, event)
    job.process.wait()
    drain.join(timeout=1.0)
    for pipe in (job.process.stdin, job.process.stdout, job.process.stderr):
        if pipe is not None:
            try:
                pipe.close()
            except OSError:
                continue
    with job.lock:
        if job.answer is not None:
            job.state = JobState.DONE
        else:
            job.state = JobState.FAILED
            job.error = job.error or _last_words(job.process.returncode, errors)
    shutil.rmtree(job.folder, ignore_errors=True)


def _take(job: _Job, event: dict[str, Any]) -> None:
    with job.lock:
        if event["event"] == "progress":
            latest = Progress(**event["progress"])
            if (latest.cost, latest.bound) != (job.progress.cost, job.progress.bound):
                job.history.append(latest)
            job.progress = latest
        elif event["event"] == "answer":
            job.answer = event["answer"]
            job.progress = replace(job.progress, elapsed_s=time.monotonic() - job.started)
        elif event["event"] == "error":
            job.error = event["message"]


def _last_words(code: int | None, errors: list[str]) -> str:
    last = errors[-1].strip() if errors else ""
    return f"The solve ended without an answer (exit code {code}). {last}".strip()


def _forget_old() -> None:
    """Drop the oldest ended jobs; called under `_guard`."""
    ended = [key for key, job in _jobs.items() if not job.view().running]
    for key in ended[: max(0, len(ended) - KEEP_ENDED + 1)]:
        del _jobs[key]


@atexit.register
def _end_all() -> None:
    """Leave no process and no folder behind when the server ends."""
    for job in _jobs.values():
        if job.process.poll() is None:
            job.process.kill()
        shutil.rmtree(job.folder, ignore_errors=True)
