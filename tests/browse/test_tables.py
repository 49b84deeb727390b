"""Report tables: no text acts, numbers align, long tables scroll."""

from __future__ import annotations

from html.parser import HTMLParser

import pytest

from siting.browse.tables import MOST_WHOLE, Heading, Line, report_table
from siting.sharing.looks import SITE_SYMBOLS
from siting.sharing.symbols import symbol_svg
from tests.browse.studies import HOSTILE

HEADINGS = (
    Heading(text="Verdict", verdict=True),
    Heading(text="Site", name=True),
    Heading(text="Load, t", number=True),
)


class Seen(HTMLParser):
    """The elements and the text of a fragment."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.texts: list[str] = []
        self.feed(html)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note the element."""
        self.tags.append(tag)
        assert not any(name.startswith("on") for name, _ in attrs)

    def handle_data(self, data: str) -> None:
        """Note the text."""
        self.texts.append(data)


@pytest.mark.parametrize("text", HOSTILE)
def test_text_is_text(text: str) -> None:
    """In a heading, a caption or a cell, a hostile name is shown as typed and makes no element."""
    headings = (*HEADINGS[:2], Heading(text=text))
    seen = Seen(report_table(headings, [Line(cells=("keep", text, text))], caption=text))
    assert seen.texts.count(text) == 4
    assert set(seen.tags) == {"table", "caption", "thead", "tbody", "tr", "th", "td"}


def test_marks_are_images_before_the_first_cell() -> None:
    """A symbol comes as an image without a name of its own, once a row."""
    mark = symbol_svg(next(iter(SITE_SYMBOLS.values())), fill=0.5)
    html = report_table(HEADINGS, [Line(cells=("keep", "Linz", "1"), mark=mark)])
    assert html.count('<img alt="" src="data:image/svg+xml;base64,') == 1
    assert '<td class="verdict"><img' in html


def test_a_wide_cell_takes_the_rest_of_its_row() -> None:
    """The second cell spans what follows it, which is not shown."""
    html = report_table(HEADINGS, [Line(cells=("leave 2", "Graz, Wels", ""), wide=True, kind="faint")])
    assert '<tr class="faint"><td class="verdict">leave 2</td><td colspan="2">Graz, Wels</td></tr>' in html


@pytest.mark.parametrize(("rows", "framed"), [(MOST_WHOLE - 1, False), (MOST_WHOLE, False), (MOST_WHOLE + 1, True)])
def test_long_tables_scroll(rows: int, framed: bool) -> None:  # noqa: FBT001 - a case
    """Up to the limit a table is shown whole; beyond it scrolls in a frame that the keyboard reaches."""
    html = report_table(HEADINGS, [Line(cells=("keep", "Linz", "1"))] * rows)
    assert html.startswith('<div class="frame tall" tabindex="0">') == framed


def test_a_row_of_another_length_is_refused() -> None:
    """A row must have a cell for each heading."""
    with pytest.raises(ValueError, match="shorter"):
        report_table(HEADINGS, [Line(cells=("keep", "Linz"))])
