"""
The location problem that the bounding engine works on, as flat arrays.

Everything is load (amount x the good's load). A *row* is a customer and a good with demand; an *option* is a way a site
may be open. Lanes lie by row, cheapest first; the options of a site lie together, greatest capacity first.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from siting.arrays import Flags, Floats, Positions

Starts = "NDArray[np.int64]"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Problem:
    """One echelon: sites with options, rows with demand. Shapes: S sites, O options, R rows, L lanes."""

    demand: Floats
    """(R,) load a year, above 0."""
    row_start: NDArray[np.int64]
    """(R + 1,) first lane of each row."""
    lane_site: Positions
    """(L,)"""
    lane_cost: Floats
    """(L,) money per load; ascending within a row."""
    site_option: NDArray[np.int64]
    """(S + 1,) first option of each site."""
    charge: Floats
    """(O,) money a year that opening the option adds (a closing charge saved is taken off)."""
    capacity: Floats
    """(O,) load a year; finite: an unlimited option holds all that its lanes can bring."""
    must_open: Flags
    """(S,)"""
    must_shut: Flags
    """(S,)"""
    fewest: int
    """Least number of open sites."""
    most: int
    """Greatest number of open sites."""
    constant: float = 0.0
    """Money a year that no decision changes."""

    @property
    def sites(self) -> int:
        """Return the number of sites."""
        return int(self.site_option.shape[0]) - 1

    @property
    def rows(self) -> int:
        """Return the number of rows."""
        return int(self.demand.shape[0])
