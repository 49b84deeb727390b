"""Check each rule by itself: its members, its number, and the pins that contradict it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from siting.study.gathering import did_you_mean
from siting.study.tables import RuleKind, SiteRuling, SupplierRuling

if TYPE_CHECKING:
    from siting.study.draft import Draft
    from siting.study.tables import RuleRow

Ruling = SiteRuling | SupplierRuling

_IN = frozenset({SiteRuling.PINNED_OPEN, SupplierRuling.PINNED_SIGNED})
_OUT = frozenset({SiteRuling.PINNED_SHUT, SupplierRuling.PINNED_UNSIGNED})

_COUNTED = frozenset({RuleKind.AT_MOST, RuleKind.AT_LEAST})


def check_rules(draft: Draft) -> None:
    """Note every fault in `rules`."""
    if not draft.rules.there:
        return
    _check_names(draft)
    pins = _pins(draft)
    for row in draft.rules.rows:
        if draft.gathering.hurt("rules", row.row, "rule") or draft.gathering.hurt("rules", None, "rule"):
            continue
        _check_number(draft, row)
        if not draft.gathering.hurt("rules", row.row, "members", "number") and _check_members(draft, row):
            _check_pins(draft, row, pins)


def _check_names(draft: Draft) -> None:
    """Note names that the list of members cannot hold."""
    for table, key in (("sites", "site"), ("suppliers", "supplier")):
        for row in draft.tables[table].rows:
            name = getattr(row, key)
            if ";" in name:
                wrong = "the name holds a semicolon, which separates the members of rules"
                draft.gathering.fault(table, row.row, key, name, wrong, "Write the name without it")


def _check_number(draft: Draft, row: RuleRow) -> None:
    gathering = draft.gathering
    if gathering.hurt("rules", row.row, "number"):
        return
    if row.rule in _COUNTED and row.number is None:
        gathering.fault("rules", row.row, "number", "", f"{row.rule} needs a number", "Write a whole number such as 1")
    elif row.rule not in _COUNTED and row.number is not None:
        gathering.fault("rules", row.row, "number", str(row.number), f"{row.rule} takes no number", "Clear the cell")
    elif row.rule is RuleKind.AT_LEAST and row.number is not None and row.number > len(row.members) > 0:
        wrong = f"at_least asks for more than the {len(row.members)} members"
        gathering.fault("rules", row.row, "number", str(row.number), wrong, f"Write at most {len(row.members)}")


def _check_members(draft: Draft, row: RuleRow) -> bool:
    """Return whether the members are sound, after noting what is wrong with them."""
    gathering = draft.gathering
    if not row.members or not draft.is_sound("sites", "suppliers"):
        return False
    wrongs: list[tuple[str, str]] = []
    sites, suppliers = draft.names["sites"], draft.names["suppliers"]
    for name in dict.fromkeys(row.members):
        if name in sites and name in suppliers:
            wrongs.append((f"{name!r} is both a site and a supplier", "Rename one of the two"))
        elif name not in sites and name not in suppliers:
            repair = did_you_mean(name, [*sites, *suppliers], "Write names of sites or suppliers")
            wrongs.append((f"{name!r} is neither a site nor a supplier", repair))
        if row.members.count(name) > 1:
            wrongs.append((f"{name!r} is there more than once", "Name each member once"))
    if len(row.members) == 1 and row.rule not in _COUNTED:
        wrongs.append((f"{row.rule} needs at least two members", "Write names as in Brno;Graz"))
    for wrong, repair in wrongs:
        gathering.fault("rules", row.row, "members", ";".join(row.members), wrong, repair)
    return not wrongs


def _pins(draft: Draft) -> dict[str, Ruling]:
    """Return the ruling of each site and supplier that is not free."""
    pins: dict[str, Ruling] = {row.site: row.ruling for row in draft.sites.rows if row.ruling is not SiteRuling.FREE}
    for row in draft.suppliers.rows:
        if row.ruling is not SupplierRuling.FREE:
            pins[row.supplier] = row.ruling
    return pins


def _check_pins(draft: Draft, row: RuleRow, pins: dict[str, Ruling]) -> None:
    wrong = _contradiction(row, pins)
    if wrong:
        members = ";".join(row.members)
        draft.gathering.fault("rules", row.row, "members", members, wrong, "Free one of them, or change the rule")


def _contradiction(row: RuleRow, pins: dict[str, Ruling]) -> str:
    """Return how rulings alone contradict a rule; empty where they do not."""
    within = {name: pins[name] for name in row.members if pins.get(name) in _IN}
    without = {name: pins[name] for name in row.members if pins.get(name) in _OUT}
    first, number = row.members[0], row.number or 0
    wrong = ""
    match row.rule:
        case RuleKind.ONE_OF | RuleKind.NOT_TOGETHER if len(within) > 1:
            wrong = f"{row.rule} allows one member, but {_listed(within)} are in"
        case RuleKind.ONE_OF if len(without) == len(row.members):
            wrong = f"one_of asks for one member, but {_listed(without)} are out"
        case RuleKind.TOGETHER if within and without:
            wrong = f"together asks for all or none, but {_listed(within)} is in and {_listed(without)} out"
        case RuleKind.NEEDS if first not in without and without:
            wrong = f"{first!r} needs {_listed(without)}"
        case RuleKind.AT_MOST if len(within) > number:
            wrong = f"at_most allows {number}, but {_listed(within)} are in"
        case RuleKind.AT_LEAST if without and len(row.members) - len(without) < number:
            wrong = f"at_least asks for {number}, but {_listed(without)} are out"
    return wrong


def _listed(pinned: dict[str, Ruling]) -> str:
    shown = [f"{name!r} ({ruling})" for name, ruling in pinned.items()]
    return " and ".join([", ".join(shown[:-1]), shown[-1]] if len(shown) > 1 else shown)
