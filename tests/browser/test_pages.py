"""The pages in a real browser, the network cut: a whole sitting, a search in mid-solve, hostile names, the layout."""

from __future__ import annotations

import re
import time
from contextlib import ExitStack
from typing import TYPE_CHECKING

import pytest
from playwright.sync_api import Error as PlaywrightError

from tests.browse.running import Running, running
from tests.browse.studies import hostile_folder, long_folder, tiny_folder
from tests.browser.chromium import Watched, chromium, chromium_path

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator
    from pathlib import Path

    from playwright.sync_api import Browser, BrowserContext, Frame, Locator, Page

chromium_path()

PATIENCE_MS = 60_000
STOP_TARGET_S, BUSY_FACTOR = 1.0, 8.0
"""What Stop may take on an idle machine, and how much longer on one that runs other tests."""
LATITUDE_PX, SITE_PX = 170.0, 100.0
"""How far right of a table's left edge the middle of a column of the tiny and the long study is."""
SIZES = [(1366, 768), (2560, 1440)]


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """Run one browser for all tests of the module."""
    with chromium() as browser:
        yield browser


class Sitting:
    """One person's browser, opened on a server."""

    def __init__(self, context: BrowserContext, server: Running) -> None:
        self.context = context
        self.server = server
        self.watched = Watched(context, server=server.url)
        context.set_default_timeout(PATIENCE_MS)

    def tab(self, address: str = "") -> Page:
        """Open a tab, at the bare address where none is given."""
        page = self.context.new_page()
        page.goto(address or self.server.url)
        heading(page).wait_for()
        return page

    def is_unharmed(self) -> bool:
        """Return whether nothing was asked for outside, opened, thrown or run by a name, in any page or frame."""
        ran = [_ran(frame) for page in self.context.pages for frame in page.frames]
        bad = [
            said for said in self.watched.said if said.startswith(("dialog", "error: Ref", "error: Syn", "error: Type"))
        ]
        return not self.watched.outside and not bad and not any(ran)


def _ran(frame: Frame) -> object:
    """Return what a hostile name left behind in a frame; a frame that its page has just replaced has nothing to say."""
    try:
        return frame.evaluate("window.ran")
    except PlaywrightError:
        if frame.is_detached():
            return None
        raise


@pytest.fixture
def sitting(browser: Browser, tmp_path: Path) -> Iterator[Callable[..., Sitting]]:
    """Return a function that serves a study and opens a browser on it."""
    with ExitStack() as stack:

        def open_on(study: Path | None = None, size: tuple[int, int] = SIZES[0]) -> Sitting:
            server = stack.enter_context(running(study, folder=tmp_path))
            context = browser.new_context(viewport={"width": size[0], "height": size[1]})
            stack.callback(context.close)
            return Sitting(context, server)

        yield open_on


def heading(page: Page) -> Locator:
    """Return the sentence the page opens with."""
    return page.locator("h1.headline").first


def says(page: Page, text: str) -> None:
    """Wait until the page says something."""
    page.get_by_text(text).first.wait_for(timeout=PATIENCE_MS)


def goes_to(page: Page, name: str) -> None:
    """Go to a page by the navigation."""
    page.get_by_test_id("stTopNavLink").filter(has_text=name).click()
    page.locator(f'[data-testid="stTopNavLink"][aria-current="page"]:has-text("{name}")').wait_for()


def press(page: Page, name: str) -> None:
    """Press a button."""
    page.get_by_role("button", name=name, exact=True).click()


def type_into_cell(page: Page, right_px: float, text: str) -> None:
    """Replace the first row's cell at a distance from the left edge of the table, as a person does: with pauses."""
    canvas = page.locator('[data-testid="stDataFrame"] canvas').first
    canvas.wait_for()
    page.wait_for_timeout(800)
    box = canvas.bounding_box()
    assert box is not None
    page.mouse.dblclick(box["x"] + right_px, box["y"] + 52)
    page.wait_for_timeout(400)
    page.keyboard.press("Control+A")
    page.keyboard.type(text, delay=20)
    page.wait_for_timeout(300)
    page.keyboard.press("Enter")


def map_of(page: Page) -> Frame:
    """Return the map on the page once it is drawn."""
    page.locator("iframe").first.wait_for()
    frame = page.locator("iframe").first.element_handle().content_frame()
    assert frame is not None
    frame.wait_for_selector("#legend p.told", state="attached")
    return frame


def test_a_whole_sitting(sitting: Callable[..., Sitting], browser: Browser, tmp_path: Path) -> None:
    """Edit, fault, mend, run, edit, out of date, run again, take the map along; it opens alone, offline."""
    sat = sitting(tiny_folder(tmp_path / "study"))
    page = sat.tab()
    says(page, "Tiny: 2 sites (1 running)")
    type_into_cell(page, LATITUDE_PX, "abc")
    says(page, "row 2, latitude 'abc': not a number")
    goes_to(page, "Plan")
    says(page, "No plan while the tables have faults")
    goes_to(page, "Inputs")
    says(page, "row 2, latitude 'abc': not a number")
    type_into_cell(page, LATITUDE_PX, "48.30639")
    says(page, "No fault in sites.")
    goes_to(page, "Plan")
    says(page, "No plan yet: press Run")
    press(page, "Run")
    says(page, "How sure is this?")
    first = heading(page).inner_text()
    assert re.match(r"Run \d of 2 sites .* EUR a year", first)
    goes_to(page, "Inputs")
    type_into_cell(page, LATITUDE_PX, "48.5")
    says(page, "No fault in sites.")
    page.wait_for_timeout(500)
    goes_to(page, "Plan")
    says(page, "Out of date: this answers the tables")
    press(page, "Run")
    page.get_by_text("Out of date").first.wait_for(state="detached", timeout=PATIENCE_MS)
    says(page, "How sure is this?")
    assert heading(page).inner_text() != first
    goes_to(page, "Share")
    with page.expect_download() as download:
        press(page, "The map")
    file = tmp_path / "map.html"
    download.value.save_as(file)
    assert sat.is_unharmed()
    assert_opens_alone(browser, file, heading(page).inner_text())


def assert_opens_alone(browser: Browser, file: Path, headline: str) -> None:
    """Open a map from its file, offline: every site is drawn and listed, under the headline."""
    context = browser.new_context(offline=True)
    watched = Watched(context)
    page = context.new_page()
    page.goto(file.as_uri())
    page.wait_for_selector("#legend p.told")
    assert page.evaluate("siting.groups.sites.getLayers().length") == 2
    assert {"Linz", "Brno"} <= set(page.locator("#verdicts .who").all_inner_texts())
    assert page.locator("#headline").inner_text().replace("\xa0", " ") == headline.replace("\xa0", " ")
    assert not watched.outside
    assert not watched.said
    context.close()


def test_in_mid_solve(sitting: Callable[..., Sitting], tmp_path: Path) -> None:
    """A reload, a tab at the same address and one at the bare address find the search; Stop keeps its plan."""
    sat = sitting(long_folder(tmp_path / "study"))
    page = sat.tab(f"{sat.server.url}/plan")
    press(page, "Run")
    says(page, "Searching: best plan so far")
    page.reload()
    says(page, "Searching: best plan so far")
    second, bare = sat.tab(page.url), sat.tab(f"{sat.server.url}/plan")
    for tab in (second, bare):
        says(tab, "Searching: best plan so far")
    began = time.monotonic()
    press(second, "Stop and keep the best plan")
    says(second, "not proved")
    assert time.monotonic() - began < (STOP_TARGET_S + 1.0) * BUSY_FACTOR
    for tab in (page, bare):
        says(tab, "not proved")
    assert sat.is_unharmed()


def test_edits_in_mid_solve(sitting: Callable[..., Sitting], tmp_path: Path) -> None:
    """In a search the tables are edited as ever; it goes on, told apart as out of date, and can be stopped."""
    sat = sitting(long_folder(tmp_path / "study"))
    page = sat.tab(f"{sat.server.url}/plan")
    press(page, "Run")
    says(page, "Searching: ")
    began = time.monotonic()
    goes_to(page, "Inputs")
    says(page, "No fault in sites.")
    assert time.monotonic() - began < BUSY_FACTOR
    type_into_cell(page, LATITUDE_PX, "49")
    page.wait_for_timeout(1000)
    goes_to(page, "Plan")
    says(page, "A search on the tables as they were before your last edits is still running.")
    press(page, "Stop it")
    says(page, "Changed since the plan below: press Run")
    assert sat.is_unharmed()


def test_hostile_names_run_nowhere(sitting: Callable[..., Sitting], tmp_path: Path) -> None:
    """Names that are code, markup, templates or links are shown as typed on every page, and nothing of them happens."""
    sat = sitting(hostile_folder(tmp_path / "study"))
    page = sat.tab()
    says(page, "<script>window.ran=1</script>")
    map_of(page)
    for table in ("customers", "suppliers", "settings"):
        page.get_by_role("radio", name=table).or_(page.get_by_role("button", name=table, exact=True)).first.click()
        says(page, f" in {table}")
        page.wait_for_timeout(300)
    goes_to(page, "Plan")
    press(page, "Run")
    says(page, "How sure is this?")
    listed = map_of(page).locator("#verdicts .who").all_inner_texts()
    assert "<script>window.ran=1</script> 0" in listed
    assert "$" not in page.title()
    assert page.locator("table.report").first.locator("td.name").first.inner_text().startswith("<script>")
    assert page.locator("a[href^='javascript'], img[src='x'], .katex").count() == 0
    goes_to(page, "Share")
    says(page, "Every file opens without this program")
    assert sat.is_unharmed()


@pytest.mark.parametrize("size", SIZES, ids=str)
def test_the_layout(sitting: Callable[..., Sitting], size: tuple[int, int]) -> None:
    """On the demo, at both sizes: no sideways scrolling, the answer in the first screen, map, list and legend whole."""
    sat = sitting(None, size)
    page = sat.tab()
    for name in ("Inputs", "Share", "Plan"):
        goes_to(page, name)
        heading(page).wait_for()
        page.wait_for_timeout(300)
        assert page.evaluate("document.querySelector('[data-testid=stMain]').scrollWidth <= innerWidth"), name
        assert page.get_by_test_id("stMainMenuButton").count() == 0
    press(page, "Run")
    says(page, "How sure is this?")
    box = heading(page).bounding_box()
    assert box is not None
    assert box["y"] + box["height"] < 200
    frame = map_of(page)
    for part in ("#verdicts", "#legend"):
        assert frame.evaluate(
            "part => { const e = document.querySelector(part); return e.scrollHeight <= e.clientHeight }", part
        )
    assert frame.locator("header").is_hidden()
    overlaps = page.evaluate(
        """() => {
            const boxes = [...document.querySelectorAll('.stMainBlockContainer .stElementContainer')]
                .map(e => e.getBoundingClientRect()).filter(b => b.width > 1 && b.height > 1);
            return boxes.some((a, i) => boxes.slice(i + 1).some(b =>
                a.left < b.right - 2 && b.left < a.right - 2 && a.top < b.bottom - 2 && b.top < a.bottom - 2));
        }"""
    )
    assert not overlaps
    assert sat.is_unharmed()
