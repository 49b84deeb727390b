"""
The bounding engine on published problems, at any stop time: bound never above, cost never below the optimum.

References
----------
OR-Library: Beasley (1988), European Journal of Operational Research 33(3): 314-325; optima in its file `capopt`.
Recipe: Cornuejols, Sridharan & Thizy (1991), European Journal of Operational Research 50(3): 280-297; optima of the
three seeded instances by two independent solvers and, for the smallest, by enumeration.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest

from siting.listener import Silent, Stop
from siting.network.network import build_network
from siting.solving.bounding.engine import bounding
from siting.solving.flows import flows_for, price
from siting.study.settings import SolveSettings
from siting.study.tables import SiteRow
from tests.building import one_echelon
from tests.published.large_instances import BENCHMARKS, needs_benchmarks, orlib, published_optima, recipe
from tests.solving.solved import best

if TYPE_CHECKING:
    from siting.network.network import Network

RECIPES = [
    ((10, 20, 3, 1), 3973.858122, [4, 6]),
    ((20, 40, 3, 2), 7619.097243, [4, 5, 14, 16, 19]),
    ((30, 60, 5, 3), 7849.867624, [0, 4, 6, 20]),
]

CAPA = {8000: 19240822.449, 10000: 18438046.543, 12000: 17765201.949, 14000: 17160439.012}
"""Published optimum of the file capa at each capacity."""

ROUNDING = 0.005
"""Published optima are rounded to three decimals or so."""


def capa(capacity: float) -> Network:
    """Return the problem of 100 sites and 1,000 customers at a capacity; its file holds the word instead."""
    words = (BENCHMARKS / "orlib" / "capa.txt").read_text(encoding="ascii").split()
    sites, customers = int(words[0]), int(words[1])
    charges = np.array(words[3 : 2 + 2 * sites : 2], dtype=np.float64)
    body = np.array(words[2 + 2 * sites :], dtype=np.float64).reshape(customers, 1 + sites)
    assert body[:, 0].sum() == 50_886  # a damaged copy circulates
    rows = [SiteRow(site=f"S{n}", capacity=capacity, yearly_charge=float(charge)) for n, charge in enumerate(charges)]
    demand = {f"C{n}": float(amount) for n, amount in enumerate(body[:, 0])}
    return build_network(one_echelon("capa", rows, demand, (body[:, 1:] / body[:, :1]).T.tolist()))


@pytest.fixture(scope="module")
def capa_8000() -> Network:
    """Return the tightest of the four large problems."""
    needs_benchmarks()
    return capa(8000)


@pytest.mark.parametrize(("size", "optimum", "open_sites"), RECIPES)
def test_proves_the_recipe_instances(size: tuple[int, int, float, int], optimum: float, open_sites: list[int]) -> None:
    """Cost, open sites and bound of the seeded instances are the known ones."""
    found = best(build_network(recipe(*size)), bounding)
    assert found is not None
    assert found.cost == pytest.approx(optimum, abs=1e-6)
    assert found.options == open_sites
    assert optimum * (1 - 1e-6) <= found.bound <= optimum + 1e-6


@pytest.mark.parametrize("name", ["cap41", "cap64", "cap74", "cap84", "cap91", "cap103", "cap112", "cap124", "cap134"])
def test_proves_small_published_problems(name: str) -> None:
    """The published optimum is reached and proved on problems of every set."""
    needs_benchmarks()
    optimum = published_optima()[name]
    found = best(build_network(orlib(name)), bounding)
    assert found is not None
    assert found.cost == pytest.approx(optimum, abs=ROUNDING)
    assert optimum * (1 - 1e-6) <= found.bound <= optimum + ROUNDING


@pytest.mark.parametrize("capacity", sorted(CAPA))
def test_proves_the_large_published_problems(capacity: int) -> None:
    """All four problems of 100 sites and 1,000 customers are proved."""
    needs_benchmarks()
    found = best(capa(capacity), bounding)
    assert found is not None
    assert found.cost == pytest.approx(CAPA[capacity], abs=ROUNDING)
    assert CAPA[capacity] * (1 - 1e-6) <= found.bound <= CAPA[capacity] + ROUNDING


def test_counts_of_sites_are_bounded(capa_8000: Network) -> None:
    """The bound of the optimum's number of sites, 7, is below the optimum; 8 sites are proved dearer."""
    result = bounding(capa_8000, SolveSettings(gap=0.0), listener=Silent(), stop=Stop())
    assert result.decisions is not None
    assert result.decisions.option_open.sum() == 7
    assert result.site_count_bounds[7] <= CAPA[8000] < result.site_count_bounds[8]


@pytest.mark.parametrize("seconds", [0.02, 0.1, 0.5, 2.0])
@pytest.mark.parametrize("name", ["capa", "recipe"])
def test_stopped_by_time_both_sides_hold(name: str, seconds: float, capa_8000: Network) -> None:
    """Whenever time runs out, the bound is at most the optimum and the plan costs at least that."""
    network = capa_8000 if name == "capa" else build_network(recipe(30, 60, 5, 3))
    optimum = CAPA[8000] if name == "capa" else 7849.867624
    result = bounding(network, SolveSettings(gap=0.0, time_limit_s=seconds), listener=Silent(), stop=Stop())
    assert not result.impossible
    if result.bound is not None:
        assert result.bound <= optimum + ROUNDING
    if result.decisions is not None:
        amounts = flows_for(network, result.decisions)
        assert amounts is not None
        assert price(network, result.decisions, amounts) >= optimum - ROUNDING
