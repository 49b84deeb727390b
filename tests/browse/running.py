"""A server of the pages in a process of its own, as `siting browse` starts it."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
import urllib.error
import urllib.request
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from siting.browse.serve import free_port

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

PATIENCE_S = 60.0
NOTHING: Mapping[str, str] = {}


@dataclass(frozen=True, slots=True)
class Running:
    """A server that answers."""

    url: str
    port: int
    process: subprocess.Popen[bytes]
    log: Path


@contextmanager
def running(
    study: Path | None = None, *, folder: Path | None = None, more: Mapping[str, str] = NOTHING
) -> Iterator[Running]:
    """
    Serve the pages for a while.

    Parameters
    ----------
    study
        Study to open; None opens the demo.
    folder
        Current folder of the server; a new one where None.
    more
        Environment variables beside those of the tests.
    """
    with tempfile.TemporaryDirectory() as scratch:
        port, log = free_port("127.0.0.1"), Path(scratch) / "log"
        command = [str(Path(sys.executable).parent / "siting"), "browse", *([str(study)] if study else [])]
        with (
            log.open("wb") as out,
            subprocess.Popen(  # noqa: S603 - our own command
                [*command, "--port", str(port)],
                cwd=folder or scratch,
                env={**os.environ, **more},
                stdout=out,
                stderr=out,
            ) as process,
        ):
            try:
                server = Running(f"http://127.0.0.1:{port}", port, process, log)
                _wait_for(server)
                yield server
            finally:
                process.terminate()
                process.wait()


def _wait_for(server: Running) -> None:
    """Return once the server answers."""
    end = time.monotonic() + PATIENCE_S
    while True:
        assert server.process.poll() is None, server.log.read_text()
        try:
            with urllib.request.urlopen(f"{server.url}/_stcore/health") as answer:  # noqa: S310 - our own server
                assert answer.status == 200
                return
        except urllib.error.URLError:
            assert time.monotonic() < end, server.log.read_text()
            time.sleep(0.05)
