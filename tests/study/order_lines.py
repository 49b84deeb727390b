"""Order lines by chance, and what they add up to, worked out with pandas."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

if TYPE_CHECKING:
    from siting.arrays import Floats


def order_lines(count: int, seed: int = 1) -> pd.DataFrame:
    """Return lines of a year: some returns, some blanks, a few far out."""
    draw = np.random.default_rng(seed)
    logarithm: Floats = np.clip(draw.standard_normal(count), -4, 4)
    quantity: Floats = np.exp(1 + 0.8 * logarithm).round(3)
    quantity[draw.random(count) < 0.02] *= -1
    quantity[:3] = 1e6
    frame = pd.DataFrame(
        {
            "customer": "C" + pd.Series((draw.random(count) ** 2 * count / 50).astype(int)).astype(str),
            "product": "P" + pd.Series(draw.integers(0, 12, count)).astype(str),
            "kg": quantity,
            "shipped": pd.Timestamp("2025-01-01") + pd.to_timedelta(draw.integers(0, 365, count), unit="D"),
            "town": "Linz",
        }
    )
    frame.loc[3:7, "customer"] = None
    return frame


def expected(frame: pd.DataFrame) -> dict[tuple[str, str], float]:
    """Return demand by customer and product, in tonnes, returns taken off, nothing left where they eat it up."""
    sums = frame.dropna(subset=["customer"]).groupby(["customer", "product"])["kg"].sum() / 1000
    above = sums[sums > 0].reset_index().to_numpy().tolist()
    return {(customer, good): held for customer, good, held in above}
