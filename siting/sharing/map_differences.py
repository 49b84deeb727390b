"""The map that shows only what differs between two plans: lanes that carry more or less, and who is touched by it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.plan.plan import LOAD_TOLERANCE
from siting.sharing import looks, map_facts
from siting.sharing.map_data import dots_json, frame_json, loads_of, located, plan_json
from siting.study.tables import Leg
from siting.study.words import counted

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from siting.plan.plan import Plan
    from siting.sharing.map_data import Json, Located
    from siting.study.tables import Study

LESS, MORE = "less", "more"
PENS: Mapping[str, tuple[str, str]] = {LESS: (looks.OCHRE, "9 6"), MORE: (looks.TEAL, "")}
"""Colour and dashes of what carries less or more: never colour alone."""

LANE_HEADS = ("Leg", "Change", "Before", "After")
ENDS = {
    Leg.OUTBOUND: ("sites", "customers"),
    Leg.INBOUND: ("suppliers", "sites"),
    Leg.DIRECT: ("suppliers", "customers"),
}

Lane = tuple[Leg, str, str]
Loads = dict[str, float]
"""Units of each good on a lane."""


def differences_json(  # noqa: PLR0913 - two plans with their names, and how they are told
    study: Study,
    before: Plan,
    after: Plan,
    *,
    names: tuple[str, str],
    headline: str,
    locale: str = "en",
) -> Json:
    """
    Return the map of what differs between two plans.

    Parameters
    ----------
    study
        The study of the plan after; places that only the other's study has are counted, not drawn.
    before, after
        The plans.
    names
        What they are called.
    headline
        One sentence; empty for a map inside a page that says it already.
    locale
        Whose separators numbers carry.

    Returns
    -------
    payload
        Of the form of `map_data.plan_json`, with only the lanes over which not the same moves, the customers at their
        ends, and the sites and suppliers at their ends or with another verdict or size.
    """
    where = located(study, locale)
    whole = plan_json(study, after, headline=headline, locale=locale)
    rows = {
        "sites": {row.site: at for at, row in enumerate(study.sites)},
        "suppliers": {row.supplier: at for at, row in enumerate(study.suppliers)},
        "customers": {row.customer: at for at, row in enumerate(study.customers)},
    }
    changed = _changed_verdicts(before, after)
    changes, left_out = _lane_changes(where, before, after, rows)
    touched: dict[str, set[int]] = {kind: set() for kind in rows}
    for kind, name in changed:
        if name in rows[kind]:
            touched[kind].add(rows[kind][name])
    for change in changes:
        start, end = ENDS[Leg(change["leg"])]
        touched[start].add(change["from"])
        touched[end].add(change["to"])
    place = {kind: {old: new for new, old in enumerate(sorted(kept))} for kind, kept in touched.items()}
    lanes = [_moved(change, place) for change in changes]
    notes = [f"Only what differs is drawn: dashed carries less in {names[1]} than in {names[0]}, solid more."]
    if left_out:
        notes.append(f"Not drawn: {counted(left_out, 'lane')} of places that the study of {names[1]} does not have.")
    moved = {kind: _throughput_change(before, after, kind) for kind in ("sites", "suppliers")}
    return {
        **whole,
        **frame_json(where, kind="differences", headline=headline, fingerprint=after.fingerprint, notes=notes),
        "warnings": [],
        "lane_heads": LANE_HEADS,
        "sites": _kept_things(where, whole["sites"], rows["sites"], place["sites"], changed, moved["sites"], "sites"),
        "suppliers": _kept_things(
            where, whole["suppliers"], rows["suppliers"], place["suppliers"], changed, moved["suppliers"], "suppliers"
        ),
        "customers": [whole["customers"][at] for at in sorted(touched["customers"])],
        "lanes": lanes,
        "legs": _pens(where, lanes, names),
        "dots": dots_json(where, (sum(whole["customers"][at]["load"]) for at in touched["customers"])),
        "bands": [{**band, "share": ""} for band in whole["bands"]],
    }


def _changed_verdicts(before: Plan, after: Plan) -> dict[tuple[str, str], str]:
    """Return what the sites and suppliers of another verdict or size were before, by kind and name."""
    was = {("sites", line.site): f"{line.verdict} {line.size}".strip() for line in before.sites}
    was |= {("suppliers", line.supplier): str(line.verdict) for line in before.suppliers}
    now = {("sites", line.site): f"{line.verdict} {line.size}".strip() for line in after.sites}
    now |= {("suppliers", line.supplier): str(line.verdict) for line in after.suppliers}
    return {key: was.get(key, "not there") for key, verdict in now.items() if was.get(key) != verdict}


def _throughput_change(before: Plan, after: Plan, kind: str) -> dict[str, float]:
    """Return by how much more load moves through each site or supplier afterwards."""
    if kind == "sites":
        was = {line.site: line.throughput for line in before.sites}
        return {line.site: line.throughput - was.get(line.site, 0.0) for line in after.sites}
    was = {line.supplier: line.volume for line in before.suppliers}
    return {line.supplier: line.volume - was.get(line.supplier, 0.0) for line in after.suppliers}


def _lane_changes(
    where: Located, before: Plan, after: Plan, rows: Mapping[str, Mapping[str, int]]
) -> tuple[list[Json], int]:
    """Return the lanes over which not the same moves, by position in the tables, and how many cannot be placed."""
    was, now = _by_lane(before), _by_lane(after)
    noise = LOAD_TOLERANCE * max(1.0, sum(line.load for line in after.customers))
    study, formats = where.study, where.formats
    changes: list[Json] = []
    left_out = 0
    for lane in dict.fromkeys((*was, *now)):
        had, has = loads_of(study, was.get(lane, {})), loads_of(study, now.get(lane, {}))
        leg, origin, destination = lane
        start, end = ENDS[leg]
        for pen, sign in ((LESS, -1.0), (MORE, 1.0)):
            load = [max(0.0, sign * (new - old)) for old, new in zip(had, has, strict=True)]
            if sum(load) <= noise:
                continue
            if origin not in rows[start] or destination not in rows[end]:
                left_out += 1
                continue
            change = map_facts.load_text(study, formats, sum(load))
            facts = [
                leg.value,
                f"{change} a year {pen}",
                f"{map_facts.load_text(study, formats, sum(had))} a year",
                f"{map_facts.load_text(study, formats, sum(has))} a year",
            ]
            at = {"from": rows[start][origin], "to": rows[end][destination]}
            changes.append({"leg": leg.value, "pen": pen, "load": load, "facts": facts, **at})
    changes.sort(key=lambda change: -sum(change["load"]))
    return changes, left_out


def _by_lane(plan: Plan) -> dict[Lane, Loads]:
    lanes: dict[Lane, Loads] = {}
    for flow in plan.flows:
        goods = lanes.setdefault((flow.leg, flow.origin, flow.destination), {})
        goods[flow.good] = goods.get(flow.good, 0.0) + flow.amount
    return lanes


def _moved(change: Json, place: Mapping[str, Mapping[int, int]]) -> Json:
    """Return the change with the positions of its ends among what is drawn."""
    start, end = ENDS[Leg(change["leg"])]
    return {**change, "from": place[start][change["from"]], "to": place[end][change["to"]]}


def _kept_things(  # noqa: PLR0913, PLR0917 - what is there, and what is said of it
    where: Located,
    things: Sequence[Json],
    rows: Mapping[str, int],
    place: Mapping[int, int],
    changed: Mapping[tuple[str, str], str],
    moved: Mapping[str, float],
    kind: str,
) -> list[Json]:
    """Return the sites or suppliers that are drawn, each with what it was and what it gains or loses."""
    names = {at: name for name, at in rows.items()}
    kept = []
    for at in sorted(place):
        change = moved.get(names[at], 0.0)
        amount = where.formats.amount(abs(change))
        brief = f"{amount} {MORE if change > 0 else LESS}" if abs(change) > LOAD_TOLERANCE else ""
        was = changed.get((kind, names[at]), "")
        kept.append({**things[at], "brief": brief, "note": f"was: {map_facts.name_shown(was)}" if was else ""})
    return kept


def _pens(where: Located, lanes: Sequence[Json], names: tuple[str, str]) -> list[Json]:
    """Return how lanes that carry less and more are drawn, on one scale."""
    most = max((sum(lane["load"]) for lane in lanes), default=0.0)
    hair = most * looks.HAIR_LINE_PX / looks.WIDEST_LINE_PX
    pens: list[Json] = []
    for pen, (colour, dashes) in PENS.items():
        own = max((sum(lane["load"]) for lane in lanes if lane["pen"] == pen), default=0.0)
        pens.append(
            {
                "pen": pen,
                "leg": "outbound",
                "colour": colour,
                "dashes": dashes,
                "widest": looks.WIDEST_LINE_PX,
                "hair": looks.HAIR_LINE_PX,
                "most": most if own else 0.0,
                "samples": [[own, where.formats.amount(own)]] if own else [],
                "hair_text": f"up to {where.formats.amount(hair)}" if hair else "",
                "words": [pen.capitalize(), f"in {looks.label(names[1])}"],
            }
        )
    return pens
