"""Compare: plans side by side, what differs first, names, and what cannot be compared."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from siting.errors import PlanFileError, SettingsError
from siting.plan.audit import audit
from siting.plan.folder import VARIANTS_FILE, write_plan_folder
from siting.questions.compare import Named, compare, read_named
from siting.questions.compare_result import comparison_to_json
from siting.solving.solve import solve
from siting.study.tables import Leg, SiteRuling
from siting.study.variant import CellChange, RowAdded, RowRemoved, Variant, variants_text
from siting.study.varying import vary
from tests.answers import EXACT, proved
from tests.builders import TINY, tiny_study, with_cells
from tests.published import instances as given

if TYPE_CHECKING:
    from pathlib import Path

    from siting.study.tables import Study

RENT = Variant(
    name="Dear Linz", changes=(CellChange(table="sites", key={"site": "Linz"}, column="yearly_charge", value="9000"),)
)


def named(name: str, study: Study) -> Named:
    """Return the proved plan of a study under a name."""
    return Named(name=name, study=study, plan=proved(study))


def pair() -> tuple[Named, Named]:
    """Return a tiny study, which keeps Linz, and its variant with a dear Linz, which opens Brno instead."""
    study = tiny_study(with_cells(TINY, "customers", {3: {"reach_km": ""}}))
    return named("as it is", study), named("Dear Linz", vary(study, [RENT]).study)


def test_what_differs_comes_first() -> None:
    """Sites that swap are ahead of suppliers that stay; cost lines add up to the costs."""
    one, other = pair()
    found = compare([one, other])
    verdicts = {row.name: row.verdicts for row in found.verdicts}
    assert verdicts["Linz"] == ("keep", "close")
    assert verdicts["Brno"] == ("leave", "open")
    assert [row.differs for row in found.verdicts] == sorted((row.differs for row in found.verdicts), reverse=True)
    assert {row.name for row in found.differing} >= {"Linz", "Brno"}
    for at, each in enumerate((one, other)):
        assert sum(row.amounts[at] for row in found.cost_lines) == pytest.approx(each.plan.cost)
        assert found.plans[at].cost == pytest.approx(each.plan.cost)
    assert (found.names, found.one_study) == (("as it is", "Dear Linz"), False)


def test_customers_that_change_site_and_the_map_of_differences() -> None:
    """Every customer moves from Linz to Brno; the lanes that differ carry loads in one plan only, and their places."""
    found = compare(pair())
    moves = {move.customer: move.origins for move in found.customers}
    assert moves == dict.fromkeys(("Vienna", "Munich", "Prague", "Graz"), (("Linz",), ("Brno",)))
    assert [move.customer for move in found.customers] == ["Vienna", "Prague", "Munich", "Graz"]
    assert found.customers[0].place == (48.20849, 16.37208)
    outbound = {(lane.origin, lane.destination): lane for lane in found.lanes if lane.leg is Leg.OUTBOUND}
    assert outbound["Linz", "Vienna"].loads == pytest.approx((40, 0))
    assert outbound["Brno", "Vienna"].loads == pytest.approx((0, 40))
    assert outbound["Brno", "Vienna"].from_place == (49.19522, 16.60796)
    assert outbound["Brno", "Vienna"].to_place == (48.20849, 16.37208)


def test_a_plan_against_itself_shows_no_difference() -> None:
    """Nothing differs, no customer moves, no lane changes."""
    one, _ = pair()
    found = compare([one, replace(one, name="again")])
    assert (found.differing, found.customers, found.lanes) == ((), (), ())
    assert found.one_study


def test_sites_and_customers_that_one_study_lacks() -> None:
    """A site removed has no verdict there; a customer removed is served from nowhere."""
    study = tiny_study()
    without = Variant(
        name="V",
        added=(
            RowAdded(table="customers", row={"customer": "Ulm", "latitude": "48.4", "longitude": "10", "demand": "3"}),
        ),
        removed=(
            RowRemoved(table="sites", key={"site": "Brno"}),
            RowRemoved(table="customers", key={"customer": "Graz"}),
        ),
    )
    found = compare([named("all", study), named("less", vary(study, [without]).study)])
    rows = {row.name: row for row in found.verdicts}
    assert rows["Brno"].verdicts == ("leave", "")
    moves = {move.customer: move for move in found.customers}
    assert moves["Graz"].origins == (("Linz",), ())
    assert moves["Ulm"].origins == ((), ("Linz",))
    assert moves["Ulm"].place == (48.4, 10.0)


def test_sizes_that_differ_are_differences() -> None:
    """A site open at another size differs though its verdict is the same; six plans at once are allowed."""
    study = given.regional_plants()
    pinned = given.with_sites(study, SiteRuling.PINNED_OPEN, "Europe plant", "Asia plant", "Africa plant")
    small = replace(pinned, sizes=tuple(row for row in study.sizes if row.size == "small" or row.site != "Asia plant"))
    found = compare([named("any", pinned), named("small", small), *(named(str(n), pinned) for n in range(4))])
    asia = next(row for row in found.verdicts if row.name == "Asia plant")
    assert set(asia.verdicts) == {"open"}
    assert asia.sizes == ("large", "small", "large", "large", "large", "large")
    assert asia.differs


def test_what_cannot_be_compared_is_refused() -> None:
    """One plan, seven plans, one name twice, two currencies and two units are refused with the repair."""
    one, other = pair()
    with pytest.raises(SettingsError, match=r"2 to 6 plans can be compared, got 1\. Leave some out, or add one\."):
        compare([one])
    with pytest.raises(SettingsError, match="2 to 6 plans can be compared, got 7"):
        compare([replace(one, name=str(n)) for n in range(7)])
    with pytest.raises(SettingsError, match=r"two plans go by the name 'as it is'\. Give each plan once"):
        compare([one, one])
    for column, plan in (
        ("currency", replace(other.plan, currency="CZK")),
        ("unit", replace(other.plan, unit="pallets")),
    ):
        changed = replace(other, plan=plan)
        with pytest.raises(PlanFileError, match=f"differ in their {column} cannot be compared: as it is in "):
            compare([one, changed])


def test_folders_are_named_by_variant_or_by_themselves(tmp_path: Path) -> None:
    """A plan of variants goes by their names, another by its folder; two of one name by their paths."""
    study = tiny_study()
    for path, variants in (("base", []), ("dear", [RENT]), ("other/base", [])):
        made = vary(study, variants)
        answer = solve(made.study, EXACT)
        assert answer.plan is not None
        more = {VARIANTS_FILE: variants_text(variants)} if variants else {}
        write_plan_folder(tmp_path / path, made.study, answer, audit(made.study, answer.plan), more=more)
    assert [each.name for each in read_named([tmp_path / "base", tmp_path / "dear"])] == ["base", "Dear Linz"]
    both = [tmp_path / "base", tmp_path / "other" / "base"]
    assert [each.name for each in read_named(both)] == [str(path) for path in both]
    with pytest.raises(PlanFileError, match="is not a PLAN folder"):
        read_named([tmp_path])


def test_a_folder_without_a_plan_is_refused(tmp_path: Path) -> None:
    """An impossible answer cannot be compared."""
    study = tiny_study()
    shut = replace(study, sites=tuple(replace(row, ruling=SiteRuling.PINNED_SHUT) for row in study.sites))
    write_plan_folder(tmp_path / "none", shut, solve(shut, EXACT), None)
    with pytest.raises(PlanFileError, match="holds no plan \\(outcome: impossible\\)"):
        read_named([tmp_path / "none"])


def test_json_keeps_the_order_of_the_plans() -> None:
    """Every list of the JSON form has one entry a plan, in order."""
    one, other = pair()
    held = comparison_to_json(compare([one, other]))
    assert [plan["name"] for plan in held["plans"]] == ["as it is", "Dear Linz"]
    assert held["plans"][1]["cost"] == pytest.approx(other.plan.cost)
    assert held["verdicts"][0]["differs"] is True
    assert held["customers"][0]["place"] == {"latitude": 48.20849, "longitude": 16.37208}
    assert all(len(loads) == 2 for loads in (lane["loads"] for lane in held["lanes"]))
