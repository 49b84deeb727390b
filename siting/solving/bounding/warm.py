"""Compile the inner loops before the clock of a search starts, by solving a small problem that needs all of them."""

from __future__ import annotations

import numpy as np

from siting.listener import Silent, Stop
from siting.network.network import build_network
from siting.solving.bounding.run import Run
from siting.study.settings import Settings, SolveSettings
from siting.study.tables import CustomerRow, SiteRow, SizeRow, Study

SITES, CUSTOMERS = 12, 24
SEED = 5
"""Any: the problem has to branch, not to mean anything."""


def compile_loops() -> None:
    """Solve a small problem with sizes to the proof; what it answers is thrown away."""
    Run(build_network(_small_study()), SolveSettings(gap=0.0, time_limit_s=float("inf")), Silent(), Stop()).solve(None)


def _small_study() -> Study:
    numbers = np.random.default_rng(SEED)
    demand = numbers.uniform(5, 35, CUSTOMERS)
    capacity = numbers.uniform(10, 160, SITES)
    charge = numbers.uniform(0, 90, SITES) + 105 * np.sqrt(capacity)
    capacity *= 4 * demand.sum() / capacity.sum()
    at = numbers.uniform(0, 5, (SITES + CUSTOMERS, 2))
    names = [f"site {number}" for number in range(SITES)]
    return Study(
        settings=Settings(title="small", currency="XXX", unit="unit", outbound_rate=0.05),
        sites=tuple(
            SiteRow(site=name, latitude=float(north), longitude=float(east))
            for name, (north, east) in zip(names, at[:SITES], strict=True)
        ),
        sizes=tuple(
            SizeRow(site=name, size=size, yearly_charge=float(fee) * share**0.7, capacity=float(most) * share)
            for name, fee, most in zip(names, charge, capacity, strict=True)
            for size, share in (("small", 0.5), ("large", 1.0))
        ),
        customers=tuple(
            CustomerRow(customer=f"customer {number}", demand=float(need), latitude=float(north), longitude=float(east))
            for number, (need, (north, east)) in enumerate(zip(demand, at[SITES:], strict=True))
        ),
    )
