"""
Time the adding up of order lines: `python -m tests.benchmarks.bench_rollup [--lines N]`.

Writes a CSV file of order lines into a temporary folder, adds it up, and prints seconds and the greatest memory the
process held. The target is 10 million lines in 20 s within 1 GB on a machine at rest.
"""

from __future__ import annotations

import argparse
import logging
import resource
import tempfile
import time
from pathlib import Path

import duckdb

from siting.study.orders import OrderColumns, roll_up

KIB_PER_MB = 1024.0
COLUMNS = OrderColumns(customer="customer", good="product", quantity="quantity", date="shipped")

logger = logging.getLogger(__name__)


def write_orders(file: Path, lines: int) -> None:
    """
    Write order lines: up to 20,000 customers, 41 goods, one year, 2 % returns, a note on each line.

    Parameters
    ----------
    file
        To write.
    lines
        How many.
    """
    with duckdb.connect() as db:
        db.execute("SELECT setseed(0.5)").fetchall()
        db.sql(
            f"""
            SELECT
                'C' || CAST(random() * random() * 20000 AS INTEGER) AS customer,
                'P' || CAST(random() * random() * 40 AS INTEGER) AS product,
                round(exp(random() * 6 - 2), 3) * (CASE WHEN random() < 0.02 THEN -1 ELSE 1 END) AS quantity,
                DATE '2025-01-01' + CAST(random() * 364 AS INTEGER) AS shipped,
                'order ' || line AS note
            FROM range({lines:d}) AS lines(line)
            """  # noqa: S608  (a whole number)
        ).write_csv(str(file))


def bench(lines: int) -> dict[str, float]:
    """
    Return what adding up took.

    Parameters
    ----------
    lines
        Order lines in the file.

    Returns
    -------
    figures
        `seconds` by the clock, `processor` seconds of all threads, `memory` in MB (the most the process ever held).
    """
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "orders.csv"
        write_orders(file, lines)
        clock, processor = time.perf_counter(), time.process_time()
        roll_up(file, COLUMNS)
        return {
            "seconds": time.perf_counter() - clock,
            "processor": time.process_time() - processor,
            "memory": resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / KIB_PER_MB,
        }


def main() -> None:
    """Run from the command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--lines", type=int, default=10_000_000)
    lines = parser.parse_args().lines
    logging.basicConfig(level=logging.INFO, format="%(message)s")
    figures = bench(lines)
    logger.info(
        "%s lines: %.1f s (%.1f s of processors), %.0f MB",
        f"{lines:,}", figures["seconds"], figures["processor"], figures["memory"],
    )  # fmt: skip


if __name__ == "__main__":
    main()
