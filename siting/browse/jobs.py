"""
Solves and follow-up questions that run beside the pages, a process each.

A job is started once per key (same study, settings, question and parameters), is found again by any page that asks with
that key, and dies with the server: the worker stops when its standard input ends. All files of a job, those of its
solver too, lie in one folder, which the worker removes where the server cannot. The searches that questions make are
kept for the next question on the same study. Nothing here imports Streamlit.
"""

from __future__ import annotations

import atexit
import itertools
import json
import logging
import os
import shutil
import signal
import subprocess
import sys
import tempfile
import threading
import time
from collections import OrderedDict
from dataclasses import asdict, dataclass, field, replace
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Any

from siting.browse.tasks import NOTHING, PLAN, told_key
from siting.browse.worker import KEPT_FILE, PLAN_FILE
from siting.listener import Progress
from siting.study.fingerprint import fingerprint
from siting.study.write import write_study

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

    from siting.study.tables import Study

logger = logging.getLogger(__name__)

STOP_GRACE_S = 10.0
"""Seconds a worker gets to hand over its best plan after Stop, before it is killed."""

KEEP_ENDED = 32
"""Ended jobs kept in memory; older ones are forgotten first."""

KEEP_SEARCHES = 8
"""Studies whose questions' searches are kept; those not asked about for longest are forgotten first."""


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
    """The object of plan.json once done, or the JSON of the question's result."""
    error: str
    """Why it failed, fit for the user; empty otherwise."""
    question: str = PLAN
    """What is asked."""
    parameters: Mapping[str, Any] = field(default_factory=dict)
    """What it is asked with."""
    plan: dict[str, Any] | None = None
    """The object of plan.json that a question is about."""

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
    question: str
    parameters: Mapping[str, Any]
    plan: dict[str, Any] | None
    started: float = field(default_factory=time.monotonic)
    process: subprocess.Popen[str] | None = None
    """None until it has been started."""
    lock: threading.RLock = field(default_factory=threading.RLock)
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
                question=self.question,
                parameters=self.parameters,
                plan=self.plan,
            )


_jobs: dict[str, _Job] = {}
_searches: OrderedDict[str, dict[str, Any]] = OrderedDict()
"""What questions have searched, by the fingerprint of the study asked about."""
_guard = threading.Lock()
_numbers = itertools.count(1)


def job_key(study: Study, question: str = PLAN, parameters: Mapping[str, Any] = NOTHING) -> str:
    """Return the key of asking this of the study: its fingerprint, its `[solve]` settings, question and parameters."""
    solve = study.settings.solve
    return question_key(
        f"{fingerprint(study)}:{solve.engine}:{solve.gap!r}:{solve.time_limit_s!r}", question, parameters
    )


def question_key(plan_key: str, question: str, parameters: Mapping[str, Any] = NOTHING) -> str:
    """Return the key of asking something of the study whose plan has the key; the fingerprint is its first part."""
    return plan_key if question == PLAN else f"{plan_key}:{question}:{json.dumps(parameters, sort_keys=True)}"


def study_mark(key: str) -> str:
    """Return the fingerprint of the study that a job's key is about."""
    return key.partition(":")[0]


def start_job(
    study: Study,
    question: str = PLAN,
    parameters: Mapping[str, Any] = NOTHING,
    *,
    plan: dict[str, Any] | None = None,
) -> JobView:
    """
    Start solving or asking, or return the job that already runs under the same key.

    Parameters
    ----------
    study
        What it is about.
    question
        `PLAN`, or one of `siting.browse.tasks.QUESTIONS`.
    parameters
        What the question is asked with; values for `json.dumps`.
    plan
        The object of plan.json of the study, which a question is about.

    Returns
    -------
    job
        As it is now.
    """
    key = job_key(study, question, parameters)
    with _guard:
        job = _jobs.get(key)
        if job is not None and job.view().running:
            return job.view()
        _forget_old()
        folder = Path(tempfile.mkdtemp(prefix="siting-job-"))
        _jobs[key] = job = _Job(
            key=key,
            number=next(_numbers),
            study=study,
            folder=folder,
            question=question,
            parameters=dict(parameters),
            plan=plan,
        )
    threading.Thread(target=_run, args=(job,), name=f"siting-job-{job.number}", daemon=True).start()
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
    timer = threading.Timer(STOP_GRACE_S, _kill, args=(job,))
    timer.daemon = True
    timer.start()


def _run(job: _Job) -> None:
    """Start the worker and follow it to its end; runs in a thread of its own."""
    try:
        write_study(job.study, job.folder / "study")
        _hand_over(job)
        errors = _follow(job, _launch(job))
    except Exception as error:
        logger.exception("a solve could not be run")
        errors = [str(error)]
    with job.lock:
        _kill(job)
    shutil.rmtree(job.folder, ignore_errors=True)
    with job.lock:
        if job.answer is not None:
            job.state = JobState.DONE
        else:
            job.error = job.error or _last_words(job, errors)
            job.state = JobState.FAILED


def _hand_over(job: _Job) -> None:
    """Write what a question builds on: the plan, and the searches of questions before it."""
    if job.question == PLAN:
        return
    if job.plan is not None:
        (job.folder / PLAN_FILE).write_text(json.dumps(job.plan), encoding="utf-8")
    with _guard:
        kept = list(_searches.get(study_mark(job.key), {}).values())
    if kept:
        (job.folder / KEPT_FILE).write_text(json.dumps(kept), encoding="utf-8")


def _launch(job: _Job) -> subprocess.Popen[str]:
    """Start the worker in a group of its own, so that its solver can be ended with it, and hand it its settings."""
    process = subprocess.Popen(  # noqa: S603 - our own interpreter and module, no text of the user's
        [sys.executable, "-P", "-u", "-m", "siting.browse.worker", str(job.folder)],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        encoding="utf-8",
        env={**os.environ, "TMPDIR": str(job.folder), "PYTHONIOENCODING": "utf-8"},
        start_new_session=True,
    )
    with job.lock:
        job.process = process
        order = {
            "question": job.question,
            "parameters": job.parameters,
            "settings": asdict(job.study.settings.solve),
        }
        _tell(job, json.dumps(order))
        if job.state is JobState.STOPPING:
            _tell(job, "stop")
    return process


def _tell(job: _Job, line: str) -> None:
    """Write a line to the worker, if it has started; a worker that has gone is found out by `_follow`."""
    if job.process is None or job.process.stdin is None:
        return
    try:
        job.process.stdin.write(line + "\n")
        job.process.stdin.flush()
    except (BrokenPipeError, ValueError, OSError):
        return


def _kill(job: _Job) -> None:
    """End the worker and all it started; nothing happens where it has ended as it should."""
    if job.process is None or job.process.poll() == 0:
        return
    try:
        os.killpg(job.process.pid, signal.SIGKILL)
    except AttributeError:  # no process groups on this system
        job.process.kill()
    except (ProcessLookupError, PermissionError):
        return


def _follow(job: _Job, process: subprocess.Popen[str]) -> list[str]:
    """Read the worker's lines until it ends, and return what it wrote on standard error."""
    errors: list[str] = []
    drain = threading.Thread(target=lambda: errors.extend(process.stderr or ()), daemon=True)
    drain.start()
    for line in process.stdout or ():
        try:
            event = json.loads(line)
        except ValueError:
            continue
        if not isinstance(event, dict):
            continue
        if event.get("event") == "kept":
            _keep_search(job, event)
        else:
            _take(job, event)
    process.wait()
    drain.join(timeout=1.0)
    for pipe in (process.stdin, process.stdout, process.stderr):
        if pipe is not None:
            try:
                pipe.close()
            except OSError:
                continue
    return errors


def _take(job: _Job, event: dict[str, Any]) -> None:
    """Take what the worker says. Cost and bound only improve, whatever it says."""
    with job.lock:
        match event.get("event"):
            case "progress":
                latest = Progress(**event["progress"])
                before = job.progress
                job.progress = replace(
                    latest, cost=_best(min, latest.cost, before.cost), bound=_best(max, latest.bound, before.bound)
                )
                if (job.progress.cost, job.progress.bound) != (before.cost, before.bound):
                    job.history.append(job.progress)
            case "answer":
                job.answer = event["answer"]
                job.progress = replace(job.progress, elapsed_s=time.monotonic() - job.started)
            case "error":
                job.error = event["message"]


def _keep_search(job: _Job, event: dict[str, Any]) -> None:
    """Keep a search for the questions on the same study that come after."""
    mark = study_mark(job.key)
    told = {"key": event["key"], "resolved": event["resolved"]}
    with _guard:
        _searches.setdefault(mark, {})[told_key(told)] = told
        _searches.move_to_end(mark)
        while len(_searches) > KEEP_SEARCHES:
            _searches.popitem(last=False)


def _best(better: Callable[[float, float], float], one: float | None, other: float | None) -> float | None:
    """Return the better of two numbers, either of which may be missing."""
    if one is None or other is None:
        return other if one is None else one
    return better(one, other)


def _last_words(job: _Job, errors: list[str]) -> str:
    """Return why there is no answer, for the user; called under the job's lock."""
    if job.state is JobState.STOPPING:
        return (
            f"The search did not hand over what it had within {STOP_GRACE_S:g} s of Stop and was ended. Run it again."
        )
    last = errors[-1].strip() if errors else ""
    code = job.process.returncode if job.process else None
    how = "could not be started" if code is None else f"ended without an answer (exit code {code})"
    return f"The search {how}. {last}".strip()


def _forget_old() -> None:
    """Drop the oldest ended jobs; called under `_guard`."""
    ended = [key for key, job in _jobs.items() if not job.view().running]
    for key in ended[: max(0, len(ended) - KEEP_ENDED + 1)]:
        del _jobs[key]


@atexit.register
def _end_all() -> None:
    """Leave no process and no folder behind when the server ends."""
    for job in list(_jobs.values()):
        if job.process is not None and job.process.poll() is None:
            _kill(job)
            job.process.wait()
        shutil.rmtree(job.folder, ignore_errors=True)
