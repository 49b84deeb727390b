"""Charts of pages and reports, all in the colours and words of `looks`. Each function returns an altair chart."""

from __future__ import annotations

from typing import TYPE_CHECKING, TypeVar

import altair as alt
import pandas as pd

from siting.plan.plan import CostLine
from siting.sharing import looks

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.listener import Progress
    from siting.plan.plan import Plan, Service

Drawn = TypeVar("Drawn", bound=alt.TopLevelMixin)

LINE_NAMES: Mapping[CostLine, str] = {
    CostLine.OPENING: "Opening, per year",
    CostLine.SITES: "Sites, yearly charges",
    CostLine.CLOSING: "Closing, per year",
    CostLine.SIGNING: "Signing, per year",
    CostLine.SUPPLIERS: "Suppliers, yearly charges",
    CostLine.DROPPING: "Dropping, per year",
    CostLine.GOODS: "Goods bought",
    CostLine.INBOUND: "Inbound freight",
    CostLine.HANDLING: "Handling at sites",
    CostLine.OUTBOUND: "Outbound freight",
    CostLine.DIRECT: "Direct freight",
    CostLine.DELIVERY: "Delivery charges",
    CostLine.CARBON: "Carbon",
}
"""What each cost line is called wherever it is shown."""

ROW_HEIGHT_PX = 24
"""Height of one row of a chart that has a row for each name."""


def styled(chart: Drawn) -> Drawn:
    """Return the chart with the fonts, inks and rules that all charts share."""
    made: Drawn = (
        chart.configure(background=looks.PAPER, font=looks.FONT_STACK)
        .configure_axis(
            labelColor=looks.INK,
            titleColor=looks.QUIET,
            titleFontWeight="normal",
            gridColor=looks.RULE,
            domainColor=looks.BORDER,
            tickColor=looks.BORDER,
            labelFontSize=12,
            titleFontSize=12,
            labelLimit=220,
        )
        .configure_legend(labelColor=looks.INK, titleColor=looks.QUIET, labelFontSize=12, orient="top")
        .configure_view(strokeWidth=0)
    )
    return made


def progress_chart(history: Sequence[Progress], currency: str) -> alt.Chart:
    """
    Draw best cost and bound over time while a solve runs.

    Parameters
    ----------
    history
        Every improvement, oldest first.
    currency
        ISO 4217 code for the axis.
    """
    rows = [
        {"seconds": step.elapsed_s, "money": value, "what": what}
        for step in history
        for what, value in (("best plan so far", step.cost), ("no plan is cheaper than", step.bound))
        if value is not None
    ]
    frame = pd.DataFrame(rows, columns=["seconds", "money", "what"])
    scale = alt.Scale(domain=_worth_seeing(history), clamp=True, nice=False)
    names = ["best plan so far", "no plan is cheaper than"]
    legend = alt.Legend(symbolType="stroke", symbolSize=400)
    made: alt.Chart = styled(
        alt.Chart(frame)
        .mark_line(interpolate="step-after", strokeWidth=2.5, point={"size": 26, "filled": True})
        .encode(
            x=alt.X("seconds:Q", title="seconds", scale=alt.Scale(zero=True), axis=alt.Axis(grid=False, tickCount=8)),
            y=alt.Y(
                "money:Q",
                title=f"{currency} a year",
                scale=scale,
                axis=alt.Axis(format=",.0f", tickCount=5, tickMinStep=1),
            ),
            color=alt.Color(
                "what:N",
                title=None,
                legend=legend,
                scale=alt.Scale(domain=names, range=[looks.TEAL, looks.OCHRE]),
            ),
            strokeDash=alt.StrokeDash(
                "what:N", title=None, legend=legend, scale=alt.Scale(domain=names, range=[[1, 0], [5, 3]])
            ),
            tooltip=[alt.Tooltip("what:N", title=" "), alt.Tooltip("money:Q", format=",.0f"), "seconds:Q"],
        )
        .properties(height=320)
    )
    return made


def _worth_seeing(history: Sequence[Progress]) -> list[float]:
    """Return the span of money around the latest cost and bound; early bounds far below it lie at its edge."""
    costs = [step.cost for step in history if step.cost is not None]
    bounds = [step.bound for step in history if step.bound is not None]
    high = max(costs[-4:] or bounds)
    low = min(max(bounds or costs), high)
    span = max(high - low, 1e-4 * abs(high), 1.0)
    return [low - span, high + span / 4]


def cost_chart(plan: Plan) -> alt.Chart:
    """
    Draw the cost lines of a plan and, where today can serve everything, of today beside it.

    Goods bought are left out: they would dwarf every other line.
    """
    rows = [
        {"line": LINE_NAMES[line], "whose": whose, "money": money}
        for whose, lines in _whose(plan)
        for line, money in lines.items()
        if line is not CostLine.GOODS
    ]
    frame = pd.DataFrame(rows)
    shown = {row["line"] for row in rows if row["money"]}
    frame = frame[frame["line"].isin(shown)]
    order = [LINE_NAMES[line] for line in CostLine if LINE_NAMES[line] in shown]
    whose = list(dict.fromkeys(frame["whose"]))
    made: alt.Chart = styled(
        alt.Chart(frame)
        .mark_bar(height={"band": 0.82}, stroke=looks.TEAL, strokeWidth=1)
        .encode(
            y=alt.Y("line:N", sort=order, title=None),
            yOffset=alt.YOffset("whose:N", sort=whose),
            x=alt.X("money:Q", title=f"{plan.currency} a year", axis=alt.Axis(format="~s")),
            fill=alt.Fill(
                "whose:N",
                title=None,
                sort=whose,
                scale=alt.Scale(domain=["this plan", "today"], range=[looks.TEAL, looks.PAPER]),
            ),
            tooltip=["whose:N", "line:N", alt.Tooltip("money:Q", format=",.0f", title=f"{plan.currency} a year")],
        )
        .properties(height=alt.Step(ROW_HEIGHT_PX / len(whose)))
    )
    return made


def _whose(plan: Plan) -> list[tuple[str, Mapping[CostLine, float]]]:
    before = plan.today.plan if plan.today else None
    return [("this plan", plan.cost_lines)] + ([("today", before.cost_lines)] if before else [])


def band_names(service: Service) -> list[str]:
    """Return the distance bands in words, such as `up to 50 km`, `50 to 100 km`, `over 400 km`."""
    names = []
    for band in service.bands:
        if band.to_km is None:
            names.append(f"over {band.above_km:g} km")
        elif band.above_km == 0:
            names.append(f"up to {band.to_km:g} km")
        else:
            names.append(f"{band.above_km:g} to {band.to_km:g} km")
    return names


def band_chart(service: Service, unit: str) -> alt.Chart:
    """Draw the share of load delivered within each band of road distance."""
    names = band_names(service)
    frame = pd.DataFrame(
        {
            "band": names,
            "share": [band.share for band in service.bands],
            "load": [band.load for band in service.bands],
        }
    )
    bars = (
        alt.Chart(frame)
        .mark_bar(color=looks.SLATE, height={"band": 0.7})
        .encode(
            y=alt.Y("band:N", sort=names, title=None),
            x=alt.X("share:Q", title="share of load", axis=alt.Axis(format=".0%", tickCount=5)),
            tooltip=["band:N", alt.Tooltip("share:Q", format=".1%"), alt.Tooltip("load:Q", format=",.0f", title=unit)],
        )
    )
    made: alt.Chart = styled(bars.properties(height=alt.Step(ROW_HEIGHT_PX)))
    return made
