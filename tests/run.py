"""
Every check of the project behind one command: `python -m tests.run`.

Linter, formatter, types, import rules, then the tests, all of them even where one fails. The exit code is 0 only where
all pass. Further arguments go to pytest.
"""

from __future__ import annotations

import subprocess
import sys
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
BIN = Path(sys.executable).parent

CHECKS: tuple[tuple[str, ...], ...] = (
    ("ruff", "check", "."),
    ("ruff", "format", "--check", "."),
    ("mypy",),
    ("lint-imports",),
)
PYTEST = ("pytest", "-n", "2", "--dist", "worksteal")


def main(for_pytest: list[str]) -> int:
    """Run the checks, then the tests, whose closing line comes last; return 1 where any failed, else 0."""
    failed = [command for command in CHECKS if _fails(command)]
    if failed:
        _say(f"FAILED: {'; '.join(' '.join(command) for command in failed)}. The tests run all the same.")
    tests_failed = _fails((*PYTEST, *for_pytest))
    return int(bool(failed) or tests_failed)


def _fails(command: tuple[str, ...]) -> bool:
    _say(f"$ {' '.join(command)}")
    began = time.monotonic()
    code = subprocess.run([BIN / command[0], *command[1:]], cwd=ROOT, check=False).returncode  # noqa: S603  (our own)
    if command[0] != "pytest":
        _say(f"  {'passed' if code == 0 else 'FAILED'} in {time.monotonic() - began:.1f} s")
    return code != 0


def _say(text: str) -> None:
    sys.stdout.write(text + "\n")
    sys.stdout.flush()


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
