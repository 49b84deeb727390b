"""Whatever bytes a file holds, reading answers with tables or faults, never with an exception, and soon."""

from __future__ import annotations

import io
import tempfile
import zipfile
from pathlib import Path

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from siting.errors import StudyError
from siting.study.check import Checked, check_raw
from siting.study.mapping import apply_mapping, mapping_from, read_mapping
from siting.study.propose import propose_mapping
from siting.study.read import read_raw
from siting.study.work_list import work_list, work_sentence
from siting.study.write import write_workbook
from tests.builders import tiny_goods, tiny_study, write_folder

TABLES = tiny_goods()
ENCODINGS = ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "cp1252", "utf-32", "cp1250"]

CELLS = st.one_of(
    st.sampled_from(
        ["", "1", "1.234", "1,234", "1.234,5", "1 234", "\u22125", "8 %", "12-May", "unlimited", '"', "\0", "\r",
         "#N/A", "=1+1", "1e999", "Linz", "Vienna", "yes", "running", "G\u0151r", "\ufeff", "sep=;"]
    ),
    st.text(max_size=6),
    st.floats().map(str),
)  # fmt: skip


def ask(path: Path) -> Checked:
    """Read, check, propose and apply a study, and list the work on it; every answer must be in words."""
    raw = read_raw(path)
    checked = check_raw(raw)
    assert (checked.study is None) == bool(checked.faults)
    assert bool(work_list(checked)) == bool(checked.faults or checked.warnings)
    assert work_sentence(checked)
    for fault in (*checked.faults, *checked.warnings):
        assert not fault.wrong.endswith(".")
        assert not fault.repair.endswith(".")
    check_raw(apply_mapping(raw, mapping_from(raw, propose_mapping(raw))))
    return checked


@st.composite
def files(draw: st.DrawFn) -> tuple[str, bytes]:
    """Return a table of the tiny study written in some form, with cells changed and bytes damaged."""
    name = draw(st.sampled_from(sorted(TABLES)))
    lines = [line.split(",") for line in TABLES[name].splitlines()]
    for _ in range(draw(st.integers(0, 4))):
        row = draw(st.integers(0, len(lines) - 1))
        lines[row][draw(st.integers(0, len(lines[row]) - 1))] = draw(CELLS)
    text = draw(st.sampled_from(["\n", "\r\n"])).join(draw(st.sampled_from(",;\t|")).join(line) for line in lines)
    content = text.encode(draw(st.sampled_from(ENCODINGS)), errors="ignore")
    for _ in range(draw(st.integers(0, 2))):
        at = draw(st.integers(0, max(0, len(content) - 1)))
        content = content[:at] + draw(st.binary(max_size=3)) + content[at + draw(st.integers(0, 2)) :]
    return name, content


@settings(max_examples=200, deadline=2000)
@given(files())
@example(("customers", b""))
@example(("customers", b"\xff\xfe"))
@example(("customers", b"\xef\xbb\xbf"))
@example(("customers", b"sep=;"))
@example(("lanes", b"\0"))
@example(("rules", b"\r"))
def test_any_text_file(file: tuple[str, bytes]) -> None:
    """One table of an otherwise sound study, damaged."""
    name, content = file
    with tempfile.TemporaryDirectory() as folder:
        path = write_folder(Path(folder), TABLES)
        (path / f"{name}.csv").write_bytes(content)
        ask(path)


@pytest.fixture(scope="module")
def parts(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """Return the parts of the tiny study as a workbook."""
    path = tmp_path_factory.mktemp("book") / "study.xlsx"
    write_workbook(tiny_study(TABLES), path)
    with zipfile.ZipFile(path) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


TAGS = [
    b"<row>", b"</row>", b'<c t="n">', b'<c t="e"><v>#REF!</v></c>', b'<c t="d"><v>x</v></c>',
    b'<c t="s"><v>99</v></c>', b'<c r="XFD1048576"><v>1</v></c>', b'<c r="A0"><v>1</v></c>', b"<f>1</f>",
    b'<mergeCell ref="A1:XFD1048576"/>', b'<mergeCell ref="A2:B3"/>', b'r="1048577"', b't="inlineStr"',
    b"<is><t>x</t></is>", b"<v>1e999</v>", b"<v></v>", b'<row r="9" hidden="1">', b"&#0;", b"&amp;", b"<!-- -->",
    b"\xff", b"<v>" + b"9" * 5000 + b"</v>",
]  # fmt: skip


@settings(max_examples=100, deadline=4000)
@given(data=st.data())
def test_any_workbook(parts: dict[str, bytes], data: st.DataObject) -> None:
    """One part of an otherwise sound workbook with pieces cut out and put in, or the whole file cut."""
    name = data.draw(st.sampled_from(sorted(parts)))
    content = parts[name]
    for _ in range(data.draw(st.integers(1, 3))):
        at = data.draw(st.integers(0, len(content)))
        put = data.draw(st.one_of(st.sampled_from(TAGS), st.binary(max_size=8)))
        content = content[:at] + put + content[at + data.draw(st.integers(0, 20)) :]
    held = io.BytesIO()
    with zipfile.ZipFile(held, "w") as archive:
        for part, given_part in parts.items():
            archive.writestr(part, content if part == name else given_part)
    whole = held.getvalue()
    if data.draw(st.integers(0, 9)) == 0:
        whole = whole[: data.draw(st.integers(0, len(whole)))]
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "study.xlsx"
        path.write_bytes(whole)
        ask(path)


@settings(max_examples=100, deadline=None)
@given(st.one_of(st.binary(max_size=60), st.text(max_size=60).map(str.encode)))
@example(b'layout = [{table = "sites", header = "x", columns = {a = ["b"]}}]')
@example(b'layout = [{table = ["sites"], header = "x", decimal = []}]')
def test_any_mapping(content: bytes) -> None:
    """A mapping is read or refused in words."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "mapping.toml"
        path.write_bytes(content)
        try:
            read_mapping(path)
        except StudyError as error:
            assert error.faults  # noqa: PT017  (either outcome is right)
