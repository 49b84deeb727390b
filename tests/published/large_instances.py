"""
Larger problems with known optima: the OR-Library warehouse files and the seeded recipe.

References
----------
OR-Library files: Beasley (1988), "An algorithm for solving large capacitated warehouse location problems", European
Journal of Operational Research 33(3): 314-325; optima in its file `capopt`.
Recipe: Cornuejols, Sridharan & Thizy (1991), European Journal of Operational Research 50(3): 280-297.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from siting.study.tables import SiteRow, Study
from tests.building import one_echelon

BENCHMARKS = Path(__file__).resolve().parents[2].parent / "shared" / "benchmarks"
TOTAL_DEMAND = 58_268
"""Of every small OR-Library file; a damaged copy with 40,539 circulates."""


def needs_benchmarks() -> None:
    """Skip the test where the OR-Library files are not beside the checkout."""
    if not (BENCHMARKS / "optima.csv").is_file():
        pytest.skip(f"the OR-Library files are not at {BENCHMARKS.name} beside the checkout; see tests/published")


def published_optima() -> dict[str, float]:
    """Return the published optimum of each of the 37 small files."""
    with (BENCHMARKS / "optima.csv").open(newline="", encoding="utf-8") as file:
        return {row["file"]: float(row["optimum"]) for row in csv.DictReader(file) if not row["capacity"]}


def orlib(name: str) -> Study:
    """Return an OR-Library file as a study; its costs cover a customer's whole demand."""
    words = (BENCHMARKS / "orlib" / f"{name}.txt").read_text(encoding="ascii").split()
    sites, customers = int(words[0]), int(words[1])
    head = np.array(words[2 : 2 + 2 * sites], dtype=np.float64).reshape(sites, 2)
    body = np.array(words[2 + 2 * sites :], dtype=np.float64).reshape(customers, 1 + sites)
    demand = body[:, 0]
    if demand.sum() != TOTAL_DEMAND:
        msg = f"{name} holds a total demand of {demand.sum():g}, not {TOTAL_DEMAND}: get an undamaged copy"
        raise ValueError(msg)
    return one_echelon(
        name,
        [
            SiteRow(site=f"S{n}", capacity=float(capacity), yearly_charge=float(charge))
            for n, (capacity, charge) in enumerate(head)
        ],
        {f"C{n}": float(amount) for n, amount in enumerate(demand)},
        (body[:, 1:] / demand[:, None]).T.tolist(),
    )


def recipe(sites: int, customers: int, ratio: float, seed: int) -> Study:
    """Return a seeded instance; charges use the capacity before it is scaled to `ratio` times the demand."""
    random = np.random.default_rng(seed)
    at_site, at_customer = random.random((sites, 2)), random.random((customers, 2))
    demand = random.uniform(5, 35, customers)
    capacity = random.uniform(10, 160, sites)
    charge = random.uniform(0, 90, sites) + random.uniform(100, 110, sites) * np.sqrt(capacity)
    capacity *= ratio * demand.sum() / capacity.sum()
    gap = at_site[:, None, :] - at_customer[None, :, :]
    return one_echelon(
        f"recipe {sites} x {customers}",
        [
            SiteRow(site=f"S{n}", capacity=float(holds), yearly_charge=float(costs))
            for n, (holds, costs) in enumerate(zip(capacity, charge, strict=True))
        ],
        {f"C{n}": float(amount) for n, amount in enumerate(demand)},
        (10 * np.hypot(gap[..., 0], gap[..., 1])).tolist(),
    )
