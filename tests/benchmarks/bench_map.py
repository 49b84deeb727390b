"""
Time the map of a large plan: `python -m tests.benchmarks.bench_map [--sites N] [--customers N] [--flows N]`.

Prints seconds to write the file, its size, and, where Chromium is installed, seconds until it is drawn. Targets for
30 sites, 1,000 customers and 1,500 flows: written in 1 s, drawn in 1 s, under 2 MB.
"""

from __future__ import annotations

import argparse
import logging
import shutil
import tempfile
import time
from pathlib import Path

import numpy as np

from siting.plan.plan import (
    CostLine,
    CustomerLine,
    Flow,
    Plan,
    Service,
    SiteLine,
    SiteVerdict,
    SupplierLine,
    SupplierVerdict,
)
from siting.plan.proof import Outcome, Proof
from siting.sharing.map import write_map
from siting.study.settings import Settings
from siting.study.tables import CustomerRow, Leg, SiteRow, Study, SupplierRow

KB = 1000.0
SUPPLIERS = 10

logger = logging.getLogger(__name__)


def large_case(*, sites: int, customers: int, flows: int) -> tuple[Study, Plan]:
    """
    Return a study across Europe and a plan of the given size; figures are drawn at random with a fixed seed.

    Parameters
    ----------
    sites, customers, flows
        How many of each; flows beyond one a customer split customers and come in.

    Returns
    -------
    case
        A study, and a plan that looks like its answer (nothing is solved).
    """
    random = np.random.default_rng(20)

    def spots(count: int) -> list[tuple[float, float]]:
        latitudes, longitudes = random.uniform(40, 58, count), random.uniform(-5, 25, count)
        return [(round(float(a), 5), round(float(b), 5)) for a, b in zip(latitudes, longitudes, strict=True)]

    site_rows = [SiteRow(site=f"Site {i}", latitude=a, longitude=b) for i, (a, b) in enumerate(spots(sites))]
    supplier_rows = [
        SupplierRow(supplier=f"Supplier {i}", latitude=a, longitude=b) for i, (a, b) in enumerate(spots(SUPPLIERS))
    ]
    customer_rows = [
        CustomerRow(customer=f"Customer {i}", latitude=a, longitude=b, demand=float(d))
        for i, ((a, b), d) in enumerate(zip(spots(customers), random.lognormal(4, 1, customers), strict=True))
    ]
    moved = [
        Flow(
            leg=Leg.INBOUND if i % 15 == 0 and i >= customers else Leg.OUTBOUND,
            origin=f"Supplier {i % SUPPLIERS}" if i % 15 == 0 and i >= customers else f"Site {i % sites}",
            destination=f"Site {i % sites}" if i % 15 == 0 and i >= customers else f"Customer {i % customers}",
            good="goods",
            amount=float(random.lognormal(4, 1)),
            km=float(random.uniform(5, 900)),
            km_given=False,
            cost=float(random.uniform(100, 90_000)),
        )
        for i in range(flows)
    ]
    plan = Plan(
        title="Large",
        currency="EUR",
        unit="t",
        fingerprint="0" * 64,
        proof=Proof(outcome=Outcome.PROVED, cost=1e7, bound=1e7, gap_asked=1e-4, seconds=1.0, engine="direct"),
        sites=tuple(
            SiteLine(
                site=row.site,
                verdict=SiteVerdict.OPEN,
                size="",
                throughput=700.0,
                capacity=1000.0,
                customers=40,
                charge=1e5,
                one_off=1e5,
            )
            for row in site_rows
        ),
        suppliers=tuple(
            SupplierLine(
                supplier=row.supplier,
                verdict=SupplierVerdict.SIGN,
                volume=900.0,
                capacity=None,
                charge=1e4,
                one_off=0.0,
            )
            for row in supplier_rows
        ),
        flows=tuple(moved),
        customers=tuple(
            CustomerLine(
                customer=row.customer,
                origins=(f"Site {i % sites}",),
                load=row.demand or 0.0,
                km=300.0,
                cost_to_serve=5e3,
                marginal_cost={"goods": 41.5},
            )
            for i, row in enumerate(customer_rows)
        ),
        cost_lines={CostLine.OUTBOUND: 1e7},
        service=Service(average_km=300.0, bands=(), share_within=None, estimated_share=1.0),
        tonnes_co2e=None,
        one_off=0.0,
        today=None,
    )
    settings = Settings(title="Large", currency="EUR", unit="t")
    study = Study(
        settings=settings, sites=tuple(site_rows), customers=tuple(customer_rows), suppliers=tuple(supplier_rows)
    )
    return study, plan


def seconds_to_draw(path: Path) -> float | None:
    """Return seconds from opening the file to the end of its first drawing; None without Chromium."""
    if shutil.which("chromium") is None:
        return None
    from tests.browser.chromium import chromium  # noqa: PLC0415 - needs playwright, which only this step does

    with chromium() as browser:
        page = browser.new_page(viewport={"width": 1366, "height": 768})
        page.goto("about:blank")
        start = time.perf_counter()
        page.goto(path.as_uri())
        page.evaluate("new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))")
        return time.perf_counter() - start


def main() -> None:
    """Write one map and log what it took."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--sites", type=int, default=30)
    parser.add_argument("--customers", type=int, default=1000)
    parser.add_argument("--flows", type=int, default=1500)
    given = parser.parse_args()
    logging.basicConfig(level=logging.INFO, format="%(message)s")
    study, plan = large_case(sites=given.sites, customers=given.customers, flows=given.flows)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "map.html"
        for run in ("first", "second"):
            start = time.perf_counter()
            write_map(path, study, plan, headline="A large plan.")
            logger.info("%s write: %.2f s, %.0f kB", run, time.perf_counter() - start, path.stat().st_size / KB)
        drawn = seconds_to_draw(path)
        logger.info("drawn: %s", "no Chromium here" if drawn is None else f"{drawn:.2f} s")


if __name__ == "__main__":
    main()
