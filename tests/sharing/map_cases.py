"""Studies and plans for the tests of the map: the hand-worked one, and the same with hostile names in every field."""

from __future__ import annotations

from dataclasses import fields, is_dataclass, replace
from typing import TYPE_CHECKING, Any

from tests.plan import hand

if TYPE_CHECKING:
    from siting.plan.plan import Plan
    from siting.study.tables import Study

HOSTILE = (
    "<script>alert(1)</script>",
    '"><img src=x onerror="window.ran=1">',
    "</script><script>window.ran=2</script>",
    "${window.ran=3}",
    "`${window.ran=4}`",
    "{{ 7*7 }}",
    "{% x %}",
    "{# gone #}",
    "{{ cycler.__init__.__globals__.os.system('exit') }}",
    "<!--<script>",
    "\N{RIGHT-TO-LEFT OVERRIDE}gnirts",
    "\N{LINE SEPARATOR}line&amp;\\u003cb>",
    "javascript:window.ran=5",
    "'+window.ran+'",
)
"""Names that run, vanish or break a page which takes them for anything but text."""

NAMES = ("Graz", "Linz", "Brno", "Wels", "Vienna", "Salzburg", "Zlin", "Ostrava", "Farm", "Orchard", "Nursery")
GOODS = ("pots", "trees")
SIZES = ("small", "large")
LONG = "long " * 2000
"""A name of 10,000 characters."""


def renamed(thing: Any, names: dict[str, str]) -> Any:  # noqa: ANN401 - any part of a study or plan
    """Return a study, plan or part of one with every string that is a key replaced by its value."""
    if is_dataclass(thing) and not isinstance(thing, type):
        return replace(thing, **{part.name: renamed(getattr(thing, part.name), names) for part in fields(thing)})
    if type(thing) is str:
        return names.get(thing, thing)
    if isinstance(thing, tuple):
        return tuple(renamed(part, names) for part in thing)
    if isinstance(thing, dict):
        return {renamed(key, names): renamed(value, names) for key, value in thing.items()}
    return thing


def hand_case() -> tuple[Study, Plan]:
    """Return the hand-worked study and its plan."""
    return hand.STUDY, hand.plan_of()


def hostile_case() -> tuple[Study, Plan, dict[str, str]]:
    """Return the hand-worked study and plan with a hostile text wherever a user can type one, and the names."""
    every = (*NAMES, *GOODS, *SIZES)
    names = {name: f"{HOSTILE[i % len(HOSTILE)]} {i}" for i, name in enumerate(every)}
    names["Wels"] = LONG
    study, plan = (renamed(thing, names) for thing in hand_case())
    text = " ".join(HOSTILE)
    rows: dict[str, Any] = {
        table: tuple(replace(row, place=text, country=HOSTILE[1]) for row in getattr(study, table))
        for table in ("sites", "suppliers", "customers")
    }
    settings = replace(study.settings, title=text, unit=HOSTILE[0])
    lines = tuple(replace(line, note=text) for line in plan.sites)
    return replace(study, settings=settings, **rows), replace(plan, title=text, sites=lines, warnings=(text,)), names
