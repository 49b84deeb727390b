"""The rules of the house that no linter knows: words, sizes, docstrings, the README's commands."""

from __future__ import annotations

import importlib
import inspect
import pkgutil
import re
from pathlib import Path
from typing import TYPE_CHECKING

import pytest
from numpydoc.validate import validate

import siting

if TYPE_CHECKING:
    from collections.abc import Iterator

ROOT = Path(__file__).resolve().parent.parent
FOLDERS = ("siting", "pages", "tests", "demo_data", ".ci")
TEXT = {".py", ".md", ".toml", ".csv", ".json", ".js", ".html", ".css", ".typed", ""}
MOST_LINES = {"siting": 500, "pages": 500, "tests": 600}
"""Lines of a file; tests may be longer, since lists of cases are."""

UNFINISHED = ("TO" + "DO", "FIX" + "ME", "XX" + "X:", "NotImplemented" + "Error", "assert " + "True")
"""What stands for work not done. Composed, so that this file does not contain it."""

WORDS_OF_ELSEWHERE = (
    "tran" + "script",
    "seed " + "document",
    "lec" + "ture",
    "video" + "-01",
    "the spea" + "ker",
    "/wo" + "rk/",
    r"\.libr" + "ary/",
    "farm-" + "(studio|bench)",
    "sub" + "agent",
)
"""Words about how the program came to be, which is none of its user's business."""


def house_files() -> list[Path]:
    """Return every text file of the project."""
    inside = (path for folder in FOLDERS for path in (ROOT / folder).rglob("*"))
    found = [path for path in (*ROOT.glob("*.*"), *inside) if path.is_file() and path.suffix in TEXT]
    return [path for path in found if "__pycache__" not in path.parts]


def public_functions() -> Iterator[str]:
    """Return the import path of each public function and method of the package that has parameters to document."""
    for module_info in pkgutil.walk_packages(siting.__path__, "siting."):
        if module_info.name.endswith((".app", ".__main__")):
            continue
        module = importlib.import_module(module_info.name)
        for name, value in vars(module).items():
            if name.startswith("_") or getattr(value, "__module__", None) != module_info.name:
                continue
            if inspect.isfunction(value):
                yield f"{module_info.name}.{name}"
            elif inspect.isclass(value):
                methods = [pair for pair in vars(value).items() if inspect.isfunction(pair[1])]
                yield from (
                    f"{module_info.name}.{name}.{method}" for method, _ in methods if not method.startswith("_")
                )


def places_of(pattern: str, flags: re.RegexFlag = re.NOFLAG) -> list[str]:
    """Return where a pattern stands in the project, as path:line."""
    wanted = re.compile(pattern, flags)
    return [
        f"{path.relative_to(ROOT)}:{number}: {line.strip()[:80]}"
        for path in house_files()
        for number, line in enumerate(path.read_text(encoding="utf-8").splitlines(), start=1)
        if wanted.search(line)
    ]


@pytest.mark.parametrize("word", UNFINISHED)
def test_nothing_is_left_unfinished(word: str) -> None:
    """No file holds a marker of work not done."""
    assert places_of(rf"\b{word}") == []


@pytest.mark.parametrize("word", WORDS_OF_ELSEWHERE)
def test_no_word_tells_how_the_program_came_to_be(word: str) -> None:
    """The product speaks of its user's job only."""
    assert places_of(word, re.IGNORECASE) == []


def test_a_file_holds_one_job() -> None:
    """A file of code has at most 500 lines, one of tests 600."""
    too_long = [
        f"{path}: {lines} lines"
        for folder, most in MOST_LINES.items()
        for path in (ROOT / folder).rglob("*.py")
        if (lines := len(path.read_text(encoding="utf-8").splitlines())) > most
    ]
    assert too_long == []


def test_docstrings_speak_of_the_parameters_that_exist() -> None:
    """Numpydoc finds a docstring everywhere (GL08), no unknown parameter (PR02), none undescribed (PR07, RT03)."""
    wrong = [
        f"{path}: {text}"
        for path in sorted(set(public_functions()))
        for code, text in validate(path)["errors"]
        if code in {"GL08", "PR02", "PR07", "RT03"}
    ]
    assert wrong == []


def test_public_names_are_all_there() -> None:
    """Each name the package offers can be fetched, and no name is offered twice."""
    assert len(set(siting.__all__)) == len(siting.__all__)
    for name in siting.__all__:
        assert getattr(siting, name) is not None


def test_unknown_names_are_refused() -> None:
    """A name the package does not have is an AttributeError that says which."""
    with pytest.raises(AttributeError, match="module 'siting' has no attribute 'slove'"):
        getattr(siting, "slove")  # noqa: B009  (a plain attribute would fail the type check)


def test_the_readme_has_two_commands_that_set_themselves_up() -> None:
    """One line plans the demo study, one runs the tests; each makes its own virtual environment."""
    commands = [line for line in (ROOT / "README.md").read_text(encoding="utf-8").splitlines() if " -m venv " in line]
    assert len(commands) == 2
    assert all(line.startswith("python3 -m venv .venv && .venv/bin/pip install -q ") for line in commands)
    assert commands[0].endswith(".venv/bin/siting plan demo_data/study --out my-plan")
    assert commands[1].endswith(".venv/bin/python -m tests.run")


def test_ci_runs_the_readme_command() -> None:
    """The continuous check takes its command from the README, so that the two cannot differ."""
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    found = re.search(r"grep -m 1 -- '(?P<pattern>[^']+)' README\.md", script)
    assert found is not None
    lines = (ROOT / "README.md").read_text(encoding="utf-8").splitlines()
    assert len([line for line in lines if re.search(found["pattern"], line)]) == 1
