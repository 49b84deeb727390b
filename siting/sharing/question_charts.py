"""Charts of the follow-up questions, in the colours and words of `looks`. Each function returns an altair chart."""

from __future__ import annotations

from typing import TYPE_CHECKING

import altair as alt
import pandas as pd

from siting.plan.plan import CostLine
from siting.questions.shortlist import Firmness
from siting.sharing import looks
from siting.sharing.charts import LINE_NAMES, ROW_HEIGHT_PX, styled

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.questions.counts_result import Counts
    from siting.questions.shortlist import ShortlistLine

Layered = alt.LayerChart | alt.FacetChart
"""What `alt.layer` returns."""

HEIGHT_PX = 290
HALF = 0.5
"""Money a year that rounds to nothing."""

FIRMNESS_LOOKS: Mapping[Firmness, tuple[str, str, str]] = {
    Firmness.IRREPLACEABLE: ("square", looks.TEAL, looks.TEAL),
    Firmness.ROBUST: ("circle", looks.TEAL, looks.TEAL),
    Firmness.REPLACEABLE: ("circle", looks.TEAL, looks.PAPER),
    Firmness.STAND_IN: ("diamond", looks.OCHRE, looks.PAPER),
    Firmness.NEVER: ("cross", looks.FAINT, looks.FAINT),
    Firmness.PINNED: ("triangle-up", looks.SLATE, looks.SLATE),
    Firmness.UNKNOWN: ("triangle-down", looks.SHUT, looks.PAPER),
}
"""Shape, outline and fill of the dot of each word: the shape alone or the fill alone tells them apart."""

COST_PARTS = (("fixed", looks.TEAL), ("freight", looks.SLATE), ("rest", looks.PAPER))


def label_of(line: ShortlistLine) -> str:
    """Return what a site or supplier is called on a chart."""
    return looks.label(line.name) if line.kind == "site" else f"{looks.label(line.name)} (supplier)"


def _firmness_scales(lines: Sequence[ShortlistLine]) -> Mapping[str, object]:
    """Return the encodings that draw each word its own way, one legend for all."""
    words = [word for word in Firmness if any(line.firmness is word for line in lines)]
    names = [str(word) for word in words]
    shapes, strokes, fills = zip(*(FIRMNESS_LOOKS[word] for word in words), strict=True)

    def scale(values: Sequence[str]) -> alt.Scale:
        return alt.Scale(domain=names, range=list(values))

    legend = alt.Legend(symbolSize=110, columns=4, title=None)
    return {
        "shape": alt.Shape("word:N", title=None, scale=scale(shapes), legend=legend),
        "stroke": alt.Stroke("word:N", title=None, scale=scale(strokes), legend=legend),
        "fill": alt.Fill("word:N", title=None, scale=scale(fills), legend=legend),
    }


def stays_chart(lines: Sequence[ShortlistLine], count: int) -> Layered:
    """
    Draw in how many near-best plans each site and supplier is used, a dot a row.

    Parameters
    ----------
    lines
        In the order of the rows.
    count
        Number of near-best plans.
    """
    frame = pd.DataFrame(
        {
            "name": [label_of(line) for line in lines],
            "used": [line.used_in for line in lines],
            "word": [str(line.firmness) for line in lines],
            "verdict": [line.verdict for line in lines],
        }
    )
    base = alt.Chart(frame).encode(y=alt.Y("name:N", sort=list(frame["name"]), title=None))
    x = alt.X(
        "used:Q",
        title=f"near-best plans that use it, of {count}",
        scale=alt.Scale(domain=[0, count], nice=False),
        axis=alt.Axis(tickMinStep=1, format="d", grid=False, tickCount=min(count, 10)),
    )
    stem = base.mark_rule(color=looks.RULE, strokeWidth=1).encode(x=alt.X("used:Q"), x2=alt.datum(0))
    dots = base.mark_point(size=120, strokeWidth=2, opacity=1).encode(
        x=x,
        **_firmness_scales(lines),
        tooltip=["name:N", "word:N", "verdict:N", alt.Tooltip("used:Q", title=f"of {count} plans")],
    )
    return styled(alt.layer(stem, dots).properties(height=alt.Step(ROW_HEIGHT_PX)))


def headroom_chart(lines: Sequence[ShortlistLine], currency: str, limit: float) -> Layered:
    """
    Draw the headroom of each site and supplier, a dot a row in the order of `stays_chart`.

    Parameters
    ----------
    lines
        In the order of the rows.
    currency
        ISO 4217 code.
    limit
        Money a year that separates what is near the best from what is not; a rule marks it.
    """
    rows = [
        {
            "name": label_of(line),
            "money": line.headroom.yearly,
            "word": str(line.firmness),
            "how": "may rise by" if line.headroom.inside else "must fall by",
        }
        for line in lines
    ]
    frame = pd.DataFrame(rows, columns=["name", "money", "word", "how"])
    order = list(frame["name"])
    known = frame.dropna(subset="money")
    # Every row keeps its place: what has no number is there without a dot.
    base = alt.Chart(frame).encode(y=alt.Y("name:N", sort=order, title=None, axis=alt.Axis(labels=False, ticks=False)))
    room = alt.Chart(known).encode(y=alt.Y("name:N", sort=order))
    x = alt.X("money:Q", title=f"headroom, {currency} a year", axis=alt.Axis(format="~s", tickCount=6))
    stem = room.mark_rule(strokeWidth=1.5, color=looks.BORDER).encode(x=x, x2=alt.datum(0))
    dots = room.mark_point(size=90, strokeWidth=2, opacity=1).encode(
        x=x,
        **_firmness_scales(lines),
        tooltip=["name:N", "word:N", "how:N", alt.Tooltip("money:Q", format=",.0f", title=f"{currency} a year")],
    )
    rule = (
        alt.Chart(pd.DataFrame({"limit": [limit]}))
        .mark_rule(color=looks.OCHRE, strokeDash=[5, 3], strokeWidth=1.5)
        .encode(x="limit:Q", tooltip=[alt.Tooltip("limit:Q", format=",.0f", title="near the best, up to")])
    )
    holder = base.mark_point(opacity=0).encode(x=alt.datum(0))
    return styled(alt.layer(holder, stem, dots, rule).properties(height=alt.Step(ROW_HEIGHT_PX)))


def counts_chart(found: Counts) -> Layered:
    """Draw the best cost for each number of sites, and down to the proved bound a band."""
    best = found.best
    frame = pd.DataFrame(
        [
            {
                "sites": line.count,
                "cost": line.cost,
                "bound": line.bound if line.bound is not None else line.cost,
                "what": "ruled out by the study"
                if not line.allowed
                else "best"
                if best and line.count == best.count
                else "other",
            }
            for line in found.lines
            if line.cost is not None
        ]
    )
    x = alt.X("sites:O", title="open sites", axis=alt.Axis(labelAngle=0))
    money = alt.Axis(format=",.0f", tickCount=5, tickMinStep=1)
    low, high = float(frame["bound"].min()), float(frame["cost"].max())
    room = max(high - low, 1.0) / 6
    scale = alt.Scale(domain=[low - room, high + room / 2], zero=False, nice=False)
    base = alt.Chart(frame).encode(x=x)
    band = base.mark_area(color=looks.OCHRE, opacity=0.28, line={"color": looks.OCHRE, "strokeDash": [5, 3]}).encode(
        y=alt.Y("bound:Q", title=f"{found.currency} a year", axis=money, scale=scale), y2="cost:Q"
    )
    line = base.mark_line(color=looks.TEAL, strokeWidth=2.5).encode(y=alt.Y("cost:Q", scale=scale))
    kinds = ["best", "other", "ruled out by the study"]
    dots = base.mark_point(size=130, strokeWidth=2, opacity=1, stroke=looks.TEAL).encode(
        y=alt.Y("cost:Q", scale=scale),
        fill=alt.Fill(
            "what:N",
            title=None,
            scale=alt.Scale(domain=kinds, range=[looks.TEAL, looks.PAPER, looks.PAPER]),
            legend=None,
        ),
        shape=alt.Shape(
            "what:N", title=None, scale=alt.Scale(domain=kinds, range=["circle", "circle", "cross"]), legend=None
        ),
        tooltip=[
            alt.Tooltip("sites:O", title="open sites"),
            alt.Tooltip("cost:Q", format=",.0f", title=f"cost, {found.currency} a year"),
            alt.Tooltip("bound:Q", format=",.0f", title="no plan costs less than"),
            "what:N",
        ],
    )
    text = (
        alt.Chart(frame[frame["what"] == "best"])
        .mark_text(dy=20, color=looks.INK, fontWeight="bold", fontSize=12, text="best")
        .encode(x=x, y=alt.Y("cost:Q", scale=scale))
    )
    return styled(alt.layer(band, line, dots, text).properties(height=HEIGHT_PX))


def split_chart(found: Counts) -> alt.Chart:
    """Draw by how much fixed charges, freight and the rest differ from those of the best number, for each number."""
    best = found.best
    parts = [part for part, _ in COST_PARTS]
    frame = pd.DataFrame(
        [
            {"sites": line.count, "part": part, "money": (getattr(line, part) or 0.0) - (getattr(best, part) or 0.0)}
            for line in found.lines
            if line.cost is not None
            for part in parts
        ]
    )
    made: alt.Chart = styled(
        alt.Chart(frame)
        .mark_bar(stroke=looks.SLATE, strokeWidth=0.8)
        .encode(
            x=alt.X("sites:O", title="open sites", axis=alt.Axis(labelAngle=0)),
            xOffset=alt.XOffset("part:N", sort=parts),
            y=alt.Y(
                "money:Q",
                title=f"{found.currency} a year against the best",
                axis=alt.Axis(format="+~s", tickCount=6),
            ),
            color=alt.Color(
                "part:N",
                title=None,
                sort=parts,
                scale=alt.Scale(domain=parts, range=[colour for _, colour in COST_PARTS]),
            ),
            tooltip=["sites:O", "part:N", alt.Tooltip("money:Q", format="+,.0f", title=f"{found.currency} a year")],
        )
        .properties(height=HEIGHT_PX)
    )
    return made


def distance_chart(found: Counts) -> Layered | None:
    """Draw the average road distance for each number of sites; None where it is not known."""
    rows = [
        {"sites": line.count, "value": line.average_km}
        for line in found.lines
        if line.cost is not None and line.average_km is not None
    ]
    return _small(rows, "Road km on average", ",.0f") if rows else None


def service_chart(found: Counts) -> Layered | None:
    """Draw the share of weight within the service distance for each number of sites; None where none is set."""
    rows = [
        {"sites": line.count, "value": line.share_within}
        for line in found.lines
        if line.cost is not None and line.share_within is not None
    ]
    return _small(rows, f"Share of weight within {found.service_km:g} km", ".0%") if rows else None


def _small(rows: Sequence[Mapping[str, object]], title: str, form: str) -> Layered:
    x = alt.X("sites:O", title=None, axis=alt.Axis(labelAngle=0))
    y = alt.Y("value:Q", title=None, scale=alt.Scale(zero=False), axis=alt.Axis(format=form, tickCount=3))
    base = alt.Chart(pd.DataFrame(rows)).encode(x=x, y=y)
    dots = base.mark_point(filled=True, color=looks.SLATE, size=60, opacity=1).encode(
        tooltip=[alt.Tooltip("sites:O", title="open sites"), alt.Tooltip("value:Q", format=form, title=title)]
    )
    said = alt.TitleParams(title, anchor="start", color=looks.QUIET, fontSize=12, fontWeight="normal")
    line = base.mark_line(color=looks.SLATE, strokeWidth=2)
    return styled(alt.layer(line, dots).properties(height=HEIGHT_PX // 2, title=said))


def extra_chart(lines: Mapping[CostLine, float], currency: str) -> alt.Chart | None:
    """Draw by how much each cost line differs: solid where it costs more, hollow where less; None where none does."""
    rows = [
        {"line": LINE_NAMES[line], "money": lines[line], "what": "more" if lines[line] > 0 else "less"}
        for line in CostLine
        if abs(lines.get(line, 0.0)) >= HALF
    ]
    if not rows:
        return None
    names = [str(row["line"]) for row in rows]
    made: alt.Chart = styled(
        alt.Chart(pd.DataFrame(rows))
        .mark_bar(height={"band": 0.66}, strokeWidth=1.5)
        .encode(
            y=alt.Y("line:N", sort=names, title=None),
            x=alt.X("money:Q", title=f"difference, {currency} a year", axis=alt.Axis(format="+~s", tickCount=6)),
            fill=alt.Fill(
                "what:N", title=None, scale=alt.Scale(domain=["more", "less"], range=[looks.OCHRE, looks.PAPER])
            ),
            stroke=alt.Stroke(
                "what:N",
                title=None,
                legend=None,
                scale=alt.Scale(domain=["more", "less"], range=[looks.OCHRE, looks.TEAL]),
            ),
            tooltip=["line:N", alt.Tooltip("money:Q", format="+,.0f", title=f"{currency} a year")],
        )
        .properties(height=alt.Step(ROW_HEIGHT_PX))
    )
    return made
