"""
Time the reading of a large study: `python -m tests.benchmarks.bench_read [--lanes N] [--sites N] [--customers N]`.

Writes a study with coordinates and a full `lanes` table into a temporary folder, reads it, and prints seconds and the
greatest memory the process held.
"""

from __future__ import annotations

import argparse
import logging
import resource
import tempfile
import time
from pathlib import Path

import numpy as np

from siting.cells import write_csv
from siting.study.fingerprint import fingerprint
from siting.study.read import read_study

KIB_PER_MB = 1024.0

logger = logging.getLogger(__name__)


def write_large_study(folder: Path, *, sites: int, customers: int, lanes: int) -> None:
    """
    Write a study of the given size; figures are drawn at random with a fixed seed.

    Parameters
    ----------
    folder
        Where to write it.
    sites, customers
        Rows of the two tables.
    lanes
        Rows of `lanes`: the first so many pairs of site and customer.
    """
    draw = np.random.default_rng(2)
    folder.mkdir(parents=True, exist_ok=True)
    settings = 'currency = "EUR"\nunit = "t"\noutbound_rate = 0.2\n'
    (folder / "study.toml").write_text(settings, encoding="utf-8")
    places = {name: draw.uniform((46, 5), (54, 20), (count, 2)) for name, count in (("S", sites), ("C", customers))}
    write_csv(
        folder / "sites.csv",
        ["site", "latitude", "longitude", "standing", "yearly_charge", "capacity"],
        [[f"S{n}", *place, "proposed", 1000.0, "unlimited"] for n, place in enumerate(places["S"].tolist())],
    )
    write_csv(
        folder / "customers.csv",
        ["customer", "latitude", "longitude", "demand"],
        [[f"C{n}", *place, 10.0] for n, place in enumerate(places["C"].tolist())],
    )
    apart = np.hypot(*(111.0 * (places["S"][:, None, :] - places["C"][None, :, :])).transpose(2, 0, 1)).ravel()
    costs = draw.uniform(5, 50, lanes).tolist()
    write_csv(
        folder / "lanes.csv",
        ["origin", "destination", "road_km", "unit_cost"],
        ([f"S{n // customers}", f"C{n % customers}", float(apart[n]), costs[n]] for n in range(lanes)),
    )


def bench(*, sites: int, customers: int, lanes: int) -> dict[str, float]:
    """
    Return how long reading and fingerprinting a study of the given size take.

    Parameters
    ----------
    sites, customers, lanes
        Rows of the tables.

    Returns
    -------
    seconds
        ``read`` and ``fingerprint`` in seconds, ``memory`` the greatest resident size of the process in MB.
    """
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name) / "study"
        write_large_study(folder, sites=sites, customers=customers, lanes=lanes)
        start = time.perf_counter()
        study = read_study(folder)
        read = time.perf_counter()
        fingerprint(study)
        end = time.perf_counter()
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / KIB_PER_MB
    return {"read": read - start, "fingerprint": end - read, "memory": memory}


def main() -> None:
    """Print the seconds for the sizes on the command line."""
    parser = argparse.ArgumentParser(description="Time the reading of a large study.")
    parser.add_argument("--sites", type=int, default=100)
    parser.add_argument("--customers", type=int, default=1000)
    parser.add_argument("--lanes", type=int, default=100_000)
    sizes = parser.parse_args()
    seconds = bench(sites=sizes.sites, customers=sizes.customers, lanes=sizes.lanes)
    logger.info(
        "%d sites x %d customers, %d lanes: read %.2f s, fingerprint %.2f s, at most %.0f MB",
        sizes.sites, sizes.customers, sizes.lanes, seconds["read"], seconds["fingerprint"], seconds["memory"],
    )  # fmt: skip


if __name__ == "__main__":
    logging.basicConfig(level=logging.INFO, format="%(message)s")
    main()
