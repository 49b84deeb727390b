"""The map in a real browser, opened from a file with the network cut."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import pytest

from siting.sharing.map import draw_given, draw_map
from tests.browser.chromium import Watched, chromium, chromium_path
from tests.sharing.map_cases import HOSTILE, hand_case, hostile_case

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path

    from playwright.sync_api import Browser, Page

chromium_path()

SIZES = [(1366, 768), (2560, 1440)]


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """Run one browser for all tests of the module."""
    with chromium() as running:
        yield running


@pytest.fixture(scope="module")
def files(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Write the maps that the tests open."""
    folder = tmp_path_factory.mktemp("maps")
    study, plan = hand_case()
    hostile_study, hostile_plan, _ = hostile_case()
    pages = {
        "plan": draw_map(study, plan, headline="Run 2 of 4 sites."),
        "hostile": draw_map(hostile_study, hostile_plan, headline=" ".join(HOSTILE)),
        "given": draw_given(hostile_study),
    }
    for name, page in pages.items():
        page.write(folder / f"{name}.html")
    return {name: folder / f"{name}.html" for name in pages}


class Opened:
    """A page that a test looks at, and what it said."""

    def __init__(self, page: Page, watched: Watched) -> None:
        self.page = page
        self.watched = watched

    def drawn(self, key: str) -> int:
        """Return how many items of a layer are on the map."""
        count: int = self.page.evaluate(
            "key => siting.map.hasLayer(siting.groups[key]) ? siting.groups[key].getLayers().length : 0", key
        )
        return count

    def is_quiet(self) -> bool:
        """Return whether nothing was asked for outside, said, thrown or run by a name."""
        ran = self.page.evaluate("window.ran")
        return not self.watched.outside and not self.watched.said and ran is None


@pytest.fixture
def opened(browser: Browser, files: dict[str, Path], request: pytest.FixtureRequest) -> Iterator[Opened]:
    """Open the map that the test's `map_of` mark names, at its size."""
    name, (width, height) = request.param
    context = browser.new_context(viewport={"width": width, "height": height}, offline=True)
    watched = Watched(context)
    page = context.new_page()
    page.goto(files[name].as_uri())
    page.wait_for_selector("#legend p.told")
    yield Opened(page, watched)
    context.close()


def at(name: str, *sizes: tuple[int, int]) -> pytest.MarkDecorator:
    """Open a map at the sizes, or at the smaller one."""
    chosen = sizes or SIZES[:1]
    return pytest.mark.parametrize("opened", [(name, size) for size in chosen], indirect=True, ids=str)


@at("plan", *SIZES)
def test_everything_is_drawn_without_a_network(opened: Opened) -> None:
    """All four sites, three suppliers, four customers and eight lanes are on the map, and nothing went wrong."""
    keys = ("sites", "suppliers", "customers", "inbound", "outbound", "direct")
    assert [opened.drawn(key) for key in keys] == [4, 3, 4, 3, 4, 1]
    assert opened.page.locator(".symbol.sites").count() == 4
    assert opened.page.locator("path.land").count() == 1
    assert opened.page.title() == "Hand-worked: plan"
    assert opened.is_quiet()


@at("plan", *SIZES)
def test_every_symbol_is_in_view(opened: Opened) -> None:
    """At first the whole study is in the window, with the symbols inside the map's frame."""
    frame = opened.page.locator(".map").bounding_box()
    assert frame
    for marker in opened.page.locator(".symbol").all():
        box = marker.bounding_box()
        assert box
        assert frame["x"] <= box["x"]
        assert box["x"] + box["width"] <= frame["x"] + frame["width"]
        assert frame["y"] <= box["y"]
        assert box["y"] + box["height"] <= frame["y"] + frame["height"]


@at("plan", *SIZES)
def test_labels_do_not_overlap(opened: Opened) -> None:
    """No two labels share a spot, and every open site has one."""
    boxes = opened.page.evaluate(
        "[...document.querySelectorAll('.labels text')].map(t => { const b = t.getBBox(); "
        "return [b.x, b.y, b.width, b.height, t.textContent]; })"
    )
    assert {"Linz", "Brno"} <= {box[4] for box in boxes}
    assert len(boxes) > 10
    for i, (x, y, width, height, _) in enumerate(boxes):
        for other_x, other_y, other_width, other_height, _ in boxes[:i]:
            apart = x + width <= other_x + 2 or other_x + other_width <= x + 2
            assert apart or y + height * 0.85 <= other_y + 2 or other_y + other_height * 0.85 <= y + 2


@at("plan")
def test_a_site_tells_its_numbers(opened: Opened) -> None:
    """Hovering over Linz shows verdict, throughput with unit and utilisation."""
    opened.page.locator(".symbol.sites[aria-label^='site Linz']").hover()
    card = opened.page.locator(".tip .card").inner_text().replace("\u00a0", " ")
    assert "Linz" in card
    assert "80 t of load a year" in card
    assert "66.7 %" in card
    assert opened.is_quiet()


@at("plan")
def test_a_customer_and_a_lane_tell_theirs(opened: Opened) -> None:
    """Dots and lines are on a canvas; hovering over their places shows their cards."""
    for place, words in (("siting.data.customers[3].spot", "pots 40 t a year"), (None, "420 km, given")):
        spot = place or "[0, 1].map(i => (siting.data.suppliers[1].spot[i] + siting.data.customers[3].spot[i]) / 2)"
        point = opened.page.evaluate(f"siting.map.latLngToContainerPoint({spot})")
        frame = opened.page.locator(".map").bounding_box()
        assert frame
        opened.page.mouse.move(frame["x"] + point["x"] + 3, frame["y"] + point["y"] + 3)
        opened.page.mouse.move(frame["x"] + point["x"], frame["y"] + point["y"])
        opened.page.wait_for_function("document.querySelector('.tip .card')")
        assert words in opened.page.locator(".tip .card").last.inner_text().replace("\u00a0", " ")


@at("plan")
@pytest.mark.parametrize(
    ("key", "count"),
    [("sites", 4), ("suppliers", 3), ("customers", 4), ("outbound", 4), ("inbound", 3), ("direct", 1)],
)
def test_every_layer_switches_off_and_on(opened: Opened, key: str, count: int) -> None:
    """A switch is reached and pressed by keyboard; off nothing of the layer is drawn, on all of it again."""
    switch = opened.page.locator(f"#switch-{key}")
    switch.focus()
    opened.page.keyboard.press("Space")
    assert opened.drawn(key) == 0
    opened.page.keyboard.press("Space")
    assert opened.drawn(key) == count
    assert opened.is_quiet()


@at("plan")
def test_goods_are_shown_one_at_a_time(opened: Opened) -> None:
    """Trees move on one inbound and two outbound lanes and go to two customers."""
    opened.page.locator("#good-2").check()
    assert [opened.drawn(key) for key in ("inbound", "outbound", "direct", "customers")] == [1, 2, 0, 2]
    opened.page.locator("#good-0").check()
    assert [opened.drawn(key) for key in ("inbound", "outbound", "direct", "customers")] == [3, 4, 1, 4]


@at("plan")
def test_a_site_is_singled_out_by_keyboard(opened: Opened) -> None:
    """Enter on a row of the verdict list fades what does not belong to the site; Escape shows all again."""
    row = opened.page.locator("#verdicts button", has_text="Brno")
    row.focus()
    opened.page.keyboard.press("Enter")
    assert row.get_attribute("aria-pressed") == "true"
    assert "Brno" in opened.page.locator("#said").inner_text()
    faded = "siting.data.lanes.filter(lane => lane.drawn.options.opacity < 0.1).length"
    assert opened.page.evaluate(faded) == 4
    opened.page.keyboard.press("Escape")
    assert opened.page.evaluate(faded) == 0
    assert row.get_attribute("aria-pressed") == "false"


@at("plan")
def test_markers_are_reached_by_keyboard(opened: Opened) -> None:
    """Every symbol takes the focus, has a spoken name and answers Enter."""
    for marker in opened.page.locator(".symbol").all():
        assert marker.get_attribute("tabindex") == "0"
        assert marker.get_attribute("aria-label")
    opened.page.locator(".symbol.sites[aria-label^='site Brno']").focus()
    opened.page.keyboard.press("Enter")
    assert "Brno" in opened.page.locator("#said").inner_text()


@at("plan")
def test_tables_hold_the_same_numbers(opened: Opened) -> None:
    """Behind the map stand tables with every site, supplier and customer, for those who cannot see it."""
    for summary in opened.page.locator("#tables summary").all():
        summary.click()
    assert opened.page.locator("#tables tbody tr").count() == 4 + 3 + 4
    row = opened.page.locator("#tables tr", has=opened.page.locator("th", has_text=re.compile("^Linz$")))
    assert "80\u00a0t\u00a0of\u00a0load a year" in row.inner_text()


@at("plan")
def test_the_map_prints_on_one_page_with_its_outlines(opened: Opened, tmp_path: Path) -> None:
    """A4 landscape, one page; while printing, lanes are drawn as lines and no canvas hides the outlines."""
    pdf = opened.page.pdf(prefer_css_page_size=True, print_background=True)
    (tmp_path / "map.pdf").write_bytes(pdf)
    assert len(re.findall(rb"/Type\s*/Page\b", pdf)) == 1
    box = re.search(rb"/MediaBox\s*\[\s*0 0 ([\d.]+) ([\d.]+)", pdf)
    assert box
    assert float(box[1]) == pytest.approx(842, abs=1)
    opened.page.evaluate("siting.forPrint(true)")
    assert opened.page.locator("canvas").count() == 0
    assert opened.drawn("outbound") == 4
    opened.page.evaluate("siting.forPrint(false)")
    assert opened.page.locator("canvas").count() == 1
    assert opened.is_quiet()


@at("hostile", *SIZES)
def test_no_hostile_name_runs(opened: Opened) -> None:
    """With every card opened, every row pressed and every table shown, nothing ran and nothing was asked for."""
    for marker in opened.page.locator(".symbol").all():
        marker.dispatch_event("mouseover")
        marker.focus()
    opened.page.evaluate(
        "for (const item of [...siting.data.lanes, ...siting.data.customers]) if (item.drawn) item.drawn.openTooltip()"
    )
    assert opened.page.locator(".tip .card").count() >= 12
    for row in opened.page.locator("#verdicts button").all():
        row.click()
    for summary in opened.page.locator("#tables summary").all():
        summary.click()
    opened.page.wait_for_timeout(200)
    assert opened.page.locator("body img, body iframe, body object, body a:not(.skip):not([role=button])").count() == 0
    assert opened.is_quiet()


@at("hostile")
def test_hostile_names_show_as_typed(opened: Opened) -> None:
    """The verdict list shows every name letter by letter, the long one shortened and its length named."""
    shown = opened.page.locator("#verdicts .who").all_text_contents()
    _, _, names = hostile_case()
    assert names["Linz"] in shown
    assert names["Orchard"] in shown
    assert any(name.endswith("(10,000 characters)") for name in shown)
    assert "49" not in opened.page.locator("#title").inner_text()
    assert opened.page.locator("#title").inner_text().count("{{ 7*7 }}") == 1
    assert opened.page.locator("#verdicts").evaluate("list => list.scrollWidth <= list.clientWidth")


@at("given", *SIZES)
def test_the_given_map_draws_everything(opened: Opened) -> None:
    """Sites, suppliers and customers by standing; no lanes, no verdicts, nothing run by a name."""
    assert [opened.drawn(key) for key in ("sites", "suppliers", "customers", "outbound")] == [4, 3, 4, 0]
    assert opened.page.locator("#legend .switch input[type=checkbox]").count() == 3
    assert opened.is_quiet()


@at("plan", (390, 844))
def test_a_phone_can_read_it(opened: Opened) -> None:
    """On a narrow screen the parts stand below each other and nothing is wider than the screen."""
    assert opened.page.evaluate("document.documentElement.scrollWidth") <= 390
    assert opened.drawn("sites") == 4
    assert opened.is_quiet()
