"""The 37 small OR-Library problems, seeded recipe instances, and what tight links are worth on them."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from tests.answers import open_sites, proved, relaxation
from tests.published.large_instances import needs_benchmarks, orlib, published_optima, recipe

if TYPE_CHECKING:
    from siting.study.settings import SolveSettings

SMALL_FILES = [
    f"cap{number}"
    for numbers in (
        "41 42 43 44 51 61 62 63 64 71 72 73 74 81 82 83 84 91 92 93 94",
        "101 102 103 104 111 112 113 114 121 122 123 124 131 132 133 134",
    )
    for number in numbers.split()
]


def test_there_are_37_small_files() -> None:
    """The list of files to solve is the list of published optima."""
    needs_benchmarks()
    assert sorted(published_optima()) == sorted(SMALL_FILES)
    assert len(SMALL_FILES) == 37


@pytest.mark.parametrize("name", SMALL_FILES)
def test_reaches_the_published_optimum(name: str, exact: SolveSettings) -> None:
    """Every small OR-Library problem is proved at its published optimum, to a cent."""
    needs_benchmarks()
    assert proved(orlib(name), exact).proof.cost == pytest.approx(published_optima()[name], abs=0.01)


@pytest.mark.parametrize(
    ("name", "weak", "strong"),
    [
        ("cap41", 2.14, 0.0),
        ("cap44", 2.50, 0.277),
        ("cap51", 8.18, 0.041),
        ("cap63", 11.03, 0.132),
        ("cap84", 10.31, 0.178),
        ("cap94", 21.1, 0.403),
        ("cap124", 23.9, 0.416),
        ("cap134", 30.2, 0.0),
    ],
)
def test_tight_links_close_the_gap(name: str, weak: float, strong: float) -> None:
    """Of the optimum, capacity links alone leave 2 to 30 %, tight links at most 0.42 % (calculated)."""
    needs_benchmarks()
    optimum = published_optima()[name]
    study = orlib(name)
    for links, per_cent in (("capacity", weak), ("tight", strong)):
        gap = 100 * (optimum - relaxation(study, links)) / optimum  # type: ignore[arg-type]  # one of the two words
        digits = 0.05 if per_cent > 12 else 0.005 if links == "capacity" else 0.0005
        assert gap == pytest.approx(per_cent, abs=digits * 1.01)


@pytest.mark.parametrize(
    ("shape", "total", "optimum", "sites", "strong", "weak"),
    [
        ((10, 20, 3, 1), 437.696489, 3973.858122, (4, 6), 3951.6667, 3720.4655),
        ((20, 40, 3, 2), 824.463882, 7619.097243, (4, 5, 14, 16, 19), 7416.2651, 7117.1324),
        ((30, 60, 5, 3), 1263.064910, 7849.867624, (0, 4, 6, 20), 7785.6106, 6963.3751),
    ],
)
def test_seeded_recipe_instances(  # noqa: PLR0917 - one row of the table
    shape: tuple[int, int, float, int],
    total: float,
    optimum: float,
    sites: tuple[int, ...],
    strong: float,
    weak: float,
) -> None:
    """Seeded instances of the recipe, solved before by two independent solvers that agreed (calculated)."""
    study = recipe(*shape)
    assert sum(row.demand for row in study.all_demands) == pytest.approx(total, abs=1e-6)
    plan = proved(study)
    assert plan.proof.cost == pytest.approx(optimum, abs=1e-5)
    assert open_sites(plan) == {f"S{number}" for number in sites}
    assert relaxation(study, "tight") == pytest.approx(strong, rel=1e-6)
    assert relaxation(study, "capacity") == pytest.approx(weak, rel=1e-6)
