"""Charts: what they draw is what the plan and the search say, in the colours and words of `looks`."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import pytest

from siting.listener import Progress
from siting.plan.plan import CostLine
from siting.sharing import looks
from siting.sharing.charts import LINE_NAMES, band_chart, band_names, cost_chart, progress_chart
from siting.sharing.symbols import symbol_svg
from tests.sharing.map_cases import hand_case

if TYPE_CHECKING:
    import altair as alt


def records(chart: alt.Chart) -> list[dict[str, Any]]:
    """Return the rows a chart draws."""
    [rows] = chart.to_dict()["datasets"].values()
    drawn: list[dict[str, Any]] = rows
    return drawn


def test_progress_draws_every_improvement() -> None:
    """Each cost and each bound told of is a point; what was not known yet is none."""
    history = [Progress(elapsed_s=1, bound=90.0), Progress(elapsed_s=2, cost=110.0, bound=95.0)]
    drawn = {(row["seconds"], row["money"], row["what"]) for row in records(progress_chart(history, "EUR"))}
    assert drawn == {
        (1, 90.0, "no plan is cheaper than"),
        (2, 95.0, "no plan is cheaper than"),
        (2, 110.0, "best plan so far"),
    }


@pytest.mark.parametrize(("cost", "bound"), [(100.0, 100.0), (0.0, 0.0), (-5.0, -6.0), (1e9, 1e9 - 1)])
def test_the_span_of_money_is_never_empty(cost: float, bound: float) -> None:
    """Also where cost and bound meet, or are nothing, the axis has room for both."""
    chart = progress_chart([Progress(elapsed_s=1, cost=cost, bound=bound)], "EUR").to_dict()
    low, high = chart["encoding"]["y"]["scale"]["domain"]
    assert low < bound <= cost <= high
    assert chart["encoding"]["y"]["title"] == "EUR a year"


def test_costs_are_the_plans_lines_without_goods() -> None:
    """Every line with money in it is drawn once for the plan; goods bought are left out."""
    _, plan = hand_case()
    drawn = {row["line"]: row["money"] for row in records(cost_chart(plan)) if row["whose"] == "this plan"}
    for line, money in plan.cost_lines.items():
        if line is not CostLine.GOODS and money:
            assert drawn[LINE_NAMES[line]] == pytest.approx(money)
    assert LINE_NAMES[CostLine.GOODS] not in drawn


def test_bands_are_the_services() -> None:
    """The shares drawn are those of the plan, under names that say where each band ends."""
    _, plan = hand_case()
    drawn = [(row["band"], row["share"]) for row in records(band_chart(plan.service, "t"))]
    shares = [band.share for band in plan.service.bands]
    assert drawn == list(zip(band_names(plan.service), shares, strict=True))
    assert band_names(plan.service)[0].startswith("up to ")


@pytest.mark.parametrize("symbol", [*looks.SITE_SYMBOLS.values(), *looks.SUPPLIER_SYMBOLS.values()])
def test_symbols_differ_without_colour(symbol: looks.Symbol) -> None:
    """Bars and dashes are drawn as the symbol says, so that colour alone never tells."""
    svg = symbol_svg(symbol)
    assert ("M3 17 L17 3" in svg) == symbol.barred
    assert ("stroke-dasharray" in svg) == symbol.dashed


@pytest.mark.parametrize(("fill", "height"), [(-1.0, 0.0), (0.0, 0.0), (0.5, 6.0), (1.0, 12.0), (1.5, 12.0)])
def test_squares_fill_like_tanks(fill: float, height: float) -> None:
    """A square fills from the bottom with its utilisation, never beyond its walls."""
    symbol = next(symbol for symbol in looks.SITE_SYMBOLS.values() if symbol.fill)
    assert f'y="{16 - height:.2f}" width="12" height="{height:.2f}"' in symbol_svg(symbol, fill=fill)
