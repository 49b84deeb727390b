"""The pages of the follow-up questions in a real browser, the network cut: asked, looked at, found again, stopped."""

from __future__ import annotations

import re
from contextlib import ExitStack
from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from siting.plan.audit import audit
from siting.plan.folder import write_plan_folder
from siting.solving.solve import solve
from siting.study.read import read_study
from siting.study.tables import SiteRuling
from tests.browse.running import running
from tests.browse.studies import hostile_folder, long_folder, towns_folder
from tests.browser.chromium import chromium, chromium_path
from tests.browser.test_pages import SIZES, Sitting, goes_to, heading, map_of, press, says

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path

    from playwright.sync_api import Browser, Page

chromium_path()


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """Run one browser for all tests of the module."""
    with chromium() as browser:
        yield browser


@pytest.fixture(scope="module")
def towns(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Write the study of a few towns."""
    return towns_folder(tmp_path_factory.mktemp("towns") / "towns")


@pytest.fixture(scope="module")
def sitting(browser: Browser, towns: Path) -> Iterator[Sitting]:
    """Open a browser on the study of a few towns, its plan made, for all tests that only look."""
    with ExitStack() as stack:
        made = opened_on(stack, browser, towns)
        page = made.tab()
        goes_to(page, "Plan")
        press(page, "Run")
        says(page, "Verdicts one by one")
        yield made


def opened_on(stack: ExitStack, browser: Browser, study: Path, size: tuple[int, int] = SIZES[0]) -> Sitting:
    """Serve a study and open a browser on it."""
    server = stack.enter_context(running(study))
    context = browser.new_context(viewport={"width": size[0], "height": size[1]})
    stack.callback(context.close)
    return Sitting(context, server)


def asked(page: Page, name: str, button: str, answer: str) -> None:
    """Go to a question's page, ask, and wait for what its answer says; nothing is asked twice."""
    goes_to(page, name)
    heading(page).wait_for()
    found = page.get_by_role("button", name=button, exact=True).or_(page.get_by_text(answer)).first
    found.wait_for()
    if page.get_by_role("button", name=button, exact=True).count():
        press(page, button)
    says(page, answer)


def test_closing_is_asked_looked_at_and_found_again(sitting: Sitting) -> None:
    """The answer comes first; before, after and only the changes are drawn; a reload finds the answer again."""
    page = sitting.context.pages[0]
    asked(page, "Close a site", "Test each", "One at a time")
    first = heading(page).inner_text()
    assert re.match(r"Cheapest to close: \w+, ", first)
    changed = map_of(page)
    drawn = changed.evaluate("siting.data.lanes.map(lane => lane.pen)")
    assert set(drawn) == {"less", "more"}
    shown = changed.evaluate("siting.data.lanes.filter(lane => lane.drawn).length")
    assert shown == len(drawn)
    page.get_by_role("radio", name="The plan", exact=True).or_(page.get_by_text("The plan", exact=True)).first.click()
    page.wait_for_function(
        "[...document.querySelectorAll('iframe')].some(frame => frame.srcdoc.includes('\"kind\":\"plan\"'))"
    )
    page.reload()
    goes_to(page, "Close a site")
    says(page, "One at a time")
    assert heading(page).inner_text() == first
    assert sitting.is_unharmed()


def test_a_supplier_is_looked_at_beside_the_sites(sitting: Sitting) -> None:
    """Another name chosen, its own facts, cost lines and customers stand there."""
    page = sitting.context.pages[0]
    asked(page, "Close a site", "Test each", "One at a time")
    page.get_by_role("combobox").first.click()
    page.get_by_role("option", name="Szombathely", exact=True).click()
    says(page, "Where the extra cost without Szombathely comes from")
    assert page.locator("table.report").count() >= 4
    assert sitting.is_unharmed()


def test_the_number_of_sites_is_drawn(sitting: Sitting) -> None:
    """The best number in the headline, the curve, distance and service beside it, the split below."""
    page = sitting.context.pages[0]
    asked(page, "How many sites?", "Try each number", "Where the money goes")
    assert re.match(r"\d+ sites? (is|are) best, at ", heading(page).inner_text())
    page.locator('[data-testid="stVegaLiteChart"] canvas, [data-testid="stVegaLiteChart"] svg').nth(3).wait_for()
    assert sitting.is_unharmed()


def test_the_shortlist_explains_its_words_and_leads_to_a_plan(sitting: Sitting) -> None:
    """Dots and rules are there; a moved slider asks anew; the button plans again and goes to the page Plan."""
    page = sitting.context.pages[0]
    asked(page, "Shortlist", "Make the shortlist", "What the words mean")
    for word in ("irreplaceable", "robust", "replaceable", "stand-in", "never"):
        page.locator("table.report td.verdict", has_text=re.compile(f"^{word}$")).wait_for()
    page.get_by_role("slider").first.focus()
    page.keyboard.press("ArrowRight")
    says(page, "Not asked yet: press Make the shortlist")
    page.get_by_role("slider").first.focus()
    page.keyboard.press("ArrowLeft")
    says(page, "What the words mean")
    press(page, "Pin these and plan again")
    says(page, "Verdicts one by one")
    assert sitting.is_unharmed()


def test_plans_are_compared_with_one_from_a_file(sitting: Sitting, towns: Path, tmp_path: Path) -> None:
    """A plan.zip joins the plan of the sitting; the map draws only the lanes that differ."""
    import shutil  # noqa: PLC0415 - one test needs it

    study = read_study(towns)
    shut = replace(
        study,
        sites=tuple(replace(row, ruling=SiteRuling.PINNED_SHUT) if row.site == "Graz" else row for row in study.sites),
    )
    answer = solve(shut)
    assert answer.plan
    write_plan_folder(tmp_path / "plan" / "plan", shut, answer, audit(shut, answer.plan))
    shutil.make_archive(str(tmp_path / "Graz shut"), "zip", tmp_path / "plan")
    page = sitting.context.pages[0]
    goes_to(page, "Compare")
    says(page, "Two plans are needed to compare: there is one plan so far")
    press(page, "Add a plan from a file")
    page.locator("input[type=file]").set_input_files(str(tmp_path / "Graz shut.zip"))
    page.get_by_role("button", name="Add it", exact=True).click()
    says(page, "Cost lines side by side")
    assert "Plan 1 is the cheapest" in heading(page).inner_text()
    data = map_of(page).evaluate(
        "({lanes: siting.data.lanes.length, sites: siting.data.sites.map(site => [site.name, site.note])})"
    )
    assert data["lanes"] > 0
    assert ["Graz", "was: open"] in data["sites"]
    assert sitting.is_unharmed()


def test_no_hostile_name_runs_on_a_question_page(browser: Browser, tmp_path: Path) -> None:
    """With every question asked and its maps drawn, nothing ran and nothing was asked for outside."""
    with ExitStack() as stack:
        sitting = opened_on(stack, browser, hostile_folder(tmp_path / "hostile"))
        page = sitting.tab()
        goes_to(page, "Plan")
        press(page, "Run")
        says(page, "Verdicts one by one")
        asked(page, "Close a site", "Test each", "One at a time")
        asked(page, "Shortlist", "Make the shortlist", "What the words mean")
        asked(page, "How many sites?", "Try each number", "Where the money goes")
        page.wait_for_timeout(500)
        assert sitting.is_unharmed()


def test_stop_keeps_what_is_done(browser: Browser, tmp_path: Path) -> None:
    """A question stopped in mid-search shows what it has and offers to go on."""
    with ExitStack() as stack:
        sitting = opened_on(stack, browser, long_folder(tmp_path / "long"))
        page = sitting.tab()
        goes_to(page, "Plan")
        press(page, "Run")
        says(page, "best plan so far")
        press(page, "Stop and keep the best plan")
        says(page, "Verdicts one by one")
        goes_to(page, "Close a site")
        press(page, "Test each")
        says(page, "Searching: ")
        press(page, "Stop and keep what is done")
        says(page, "Go on where it stopped")
        assert sitting.is_unharmed()
