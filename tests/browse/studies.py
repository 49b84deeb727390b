"""Studies for the tests of the pages: a tiny one in files, one that takes long, one with hostile names everywhere."""

from __future__ import annotations

import csv
import io
import random
from typing import TYPE_CHECKING

from tests.builders import TINY, TINY_SETTINGS, write_folder

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence
    from pathlib import Path

SEED = 20261201

HOSTILE = (
    "<script>window.ran=1</script>",
    '"><img src=x onerror="window.ran=2">',
    "</script><script>window.ran=3</script>",
    "${window.ran=4}",
    "`${window.ran=5}`",
    "{{ 7*7 }}",
    "{% x %}",
    "[link](javascript:window.ran=6)",
    "![remote](https://example.org/x.png)",
    "$\\LaTeX$ **bold** :red[red]",
    ":material/delete:",
)
"""Names that run, load or vanish where a page takes them for anything but text."""


def tiny_folder(folder: Path) -> Path:
    """Write the tiny study, which is solved at once, into the folder."""
    return write_folder(folder, TINY, TINY_SETTINGS)


def long_folder(folder: Path, *, sites: int = 90, customers: int = 400) -> Path:
    """Write a study whose proof takes minutes, while its first plan is there within seconds, into the folder."""
    draw = random.Random(SEED)  # noqa: S311 - figures for a test
    places = [(f"S{i}", 46 + 6 * draw.random(), 8 + 14 * draw.random()) for i in range(sites)]
    demand = [(f"C{j}", 46 + 6 * draw.random(), 8 + 14 * draw.random(), draw.randint(5, 35)) for j in range(customers)]
    total = sum(row[3] for row in demand)
    tables = {
        "sites": _csv(
            ("site", "latitude", "longitude", "standing", "opening_charge", "yearly_charge", "capacity"),
            (
                (
                    name,
                    f"{lat:.4f}",
                    f"{lon:.4f}",
                    "proposed",
                    0,
                    draw.randint(9_000, 16_000),
                    round(total * draw.uniform(0.05, 0.12)),
                )
                for name, lat, lon in places
            ),
        ),
        "customers": _csv(
            ("customer", "latitude", "longitude", "demand"),
            ((name, f"{lat:.4f}", f"{lon:.4f}", need) for name, lat, lon, need in demand),
        ),
    }
    settings = 'title = "Long"\ncurrency = "EUR"\nunit = "t"\noutbound_rate = 0.05\n'
    solve = '[solve]\nengine = "direct"\ngap = 0.0\ntime_limit_s = 600\n'
    return write_folder(folder, tables, settings + solve)


def hostile_folder(folder: Path) -> Path:
    """Write the tiny study with a hostile text wherever a user can type a name, into the folder."""
    texts = [f"{text} {number}" for number, text in enumerate(HOSTILE)]
    names = dict(
        zip(("Linz", "Brno", "Deggendorf", "Szombathely", "Vienna", "Munich", "Prague", "Graz"), texts, strict=False)
    )
    tables = {}
    for table, text in TINY.items():
        header, *rows = csv.reader(io.StringIO(text))
        renamed = [[names.get(cell, cell) for cell in row] for row in rows]
        extra = [[*row, texts[8 + number % 3]] for number, row in enumerate(renamed)]
        tables[table] = _csv([*header, HOSTILE[1]], extra)
    settings = TINY_SETTINGS.replace('"Tiny"', f"'{HOSTILE[0]}'").replace('"t"', f"'{HOSTILE[7]}'")
    return write_folder(folder, tables, settings)


def _csv(header: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    text = io.StringIO()
    csv.writer(text, lineterminator="\n").writerows([header, *rows])
    return text.getvalue()
