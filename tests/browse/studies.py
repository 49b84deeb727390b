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


def long_folder(folder: Path, *, sites: int = 60, customers: int = 200) -> Path:
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


TOWNS = {
    "sites": """\
site,latitude,longitude,standing,opening_charge,yearly_charge,closing_charge,capacity
Linz,48.30639,14.28611,running,0,13000,6000,900
Brno,49.19522,16.60796,running,0,12000,5000,1000
Graz,47.06667,15.45,proposed,20000,9000,0,700
Regensburg,49.01513,12.10161,proposed,30000,11000,0,1400
Vienna,48.20849,16.37208,proposed,40000,14000,0,1400
""",
    "suppliers": """\
supplier,latitude,longitude,standing,signing_charge,dropping_charge,yearly_charge,capacity,unit_price
Deggendorf,48.84085,12.96068,signed,0,5000,3000,1400,100
Szombathely,47.23088,16.62155,offered,8000,0,3000,1400,98
Ostrava,49.83465,18.28204,offered,9000,0,3000,1400,99
""",
    "customers": """\
customer,latitude,longitude,demand
Munich,48.13743,11.57549,210
Prague,50.08804,14.42076,260
Salzburg,47.79941,13.04399,90
Innsbruck,47.26266,11.39454,60
Klagenfurt,46.62472,14.30528,70
Maribor,46.55472,15.64667,80
Zagreb,45.81444,15.97798,120
Bratislava,48.14816,17.10674,150
Budapest,47.49801,19.03991,230
Olomouc,49.59552,17.25175,70
""",
}
"""Five sites, three suppliers, ten customers: solved in a second, and different verdicts cost little more."""


def towns_folder(folder: Path) -> Path:
    """Write the study of a few towns, on which every follow-up question has something to say, into the folder."""
    settings = TINY_SETTINGS.replace('"Tiny"', '"Towns"') + "service_km = 250\nservice_share = 0.5\n"
    return write_folder(folder, TOWNS, settings)
