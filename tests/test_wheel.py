"""What ends up in the wheel: everything a user needs who never sees the checkout."""

from __future__ import annotations

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Build the wheel from the checkout."""
    folder = tmp_path_factory.mktemp("wheel")
    build = [sys.executable, "-m", "pip", "wheel", "--quiet", "--no-deps", "--wheel-dir", str(folder), str(ROOT)]
    subprocess.run(build, check=True, capture_output=True, timeout=300)  # noqa: S603  (our own command)
    (built,) = folder.glob("siting-*.whl")
    return built


def test_wheel_holds_the_demo_the_schema_and_the_types(wheel: Path) -> None:
    """The demo study as in the checkout, the JSON Schema of plan.json and the marker of typed packages are inside."""
    with zipfile.ZipFile(wheel) as archive:
        names = set(archive.namelist())
        demo = {path.name: path.read_bytes() for path in (ROOT / "demo_data" / "study").iterdir()}
        assert {name: archive.read(f"siting/demo/{name}") for name in demo} == demo
    assert "siting/py.typed" in names
    assert [name for name in names if name.startswith("siting/") and name.endswith("schema.json")]


def test_wheel_holds_every_module_and_no_test(wheel: Path) -> None:
    """Each module of the checkout is inside, and nothing of `tests`."""
    with zipfile.ZipFile(wheel) as archive:
        names = set(archive.namelist())
    assert {str(path.relative_to(ROOT)) for path in (ROOT / "siting").rglob("*.py")} <= names
    assert not [name for name in names if name.startswith("tests/")]


def test_command_works_from_the_wheel_alone(wheel: Path, tmp_path: Path) -> None:
    """Unpacked far from the checkout, the package finds its demo study."""
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(tmp_path)
    script = "from siting.study.demo import demo_folder; print(demo_folder())"
    done = subprocess.run([sys.executable, "-c", script], cwd=tmp_path, capture_output=True, text=True, check=True)  # noqa: S603
    assert Path(done.stdout.strip()) == tmp_path / "siting" / "demo"
