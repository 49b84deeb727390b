"""The page is one file, asks nothing of a network, and never takes a name for markup, code or a template."""

from __future__ import annotations

import json
import re
from html.parser import HTMLParser
from typing import TYPE_CHECKING

import pytest

from siting.sharing.looks import shortened
from siting.sharing.map import draw_given, draw_map, write_map
from siting.sharing.map_facts import NAME_LENGTH
from siting.sharing.map_page import payload_text
from tests.sharing.map_cases import HOSTILE, LONG, hand_case, hostile_case

if TYPE_CHECKING:
    from pathlib import Path


class Outline(HTMLParser):
    """The elements of a page with their attributes, and the text of its scripts."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.texts: dict[str, list[str]] = {}
        self.feed(html)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note the element."""
        self.elements.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        """Note the text under the element opened last."""
        self.texts.setdefault(self.elements[-1][0] if self.elements else "", []).append(data)


def payload_of(html: str) -> dict[str, object]:
    """Return the payload that the page carries."""
    found = re.search(r'<script type="application/json" id="payload">(.*?)</script>', html, re.DOTALL)
    assert found
    payload: dict[str, object] = json.loads(found[1])
    return payload


@pytest.fixture(scope="module")
def hostile_html() -> str:
    """Return the map of the study with hostile names."""
    study, plan, _ = hostile_case()
    return draw_map(study, plan, headline=" ".join(HOSTILE)).html


def test_hostile_names_leave_the_page_as_it_is(hostile_html: str) -> None:
    """The elements are those of the same map with plain names: no name became an element or an attribute."""
    study, plan = hand_case()
    plain = Outline(draw_map(study, plan, headline="Here.").html)
    hostile = Outline(hostile_html)
    assert [tag for tag, _ in hostile.elements] == [tag for tag, _ in plain.elements]
    assert [tag for tag, _ in plain.elements].count("script") == 2


def test_hostile_names_travel_as_typed(hostile_html: str) -> None:
    """Every name is in the payload exactly as typed, none was evaluated; the long one says how long it is."""
    _, _, names = hostile_case()
    payload = payload_of(hostile_html)
    shown = {row["name"] for table in ("sites", "suppliers", "customers") for row in payload[table]}  # type: ignore[attr-defined]
    places = ("Graz", "Linz", "Brno", "Vienna", "Salzburg", "Zlin", "Ostrava", "Farm", "Orchard", "Nursery")
    assert {names[place] for place in places} | {shortened(LONG, NAME_LENGTH)} == shown
    assert payload["goods"] == [names["pots"], names["trees"]]


def test_no_less_than_sign_is_left_in_the_payload(hostile_html: str) -> None:
    """Without `<`, nothing in the payload can close its element or open a comment."""
    found = re.search(r'id="payload">(.*?)</script>', hostile_html, re.DOTALL)
    assert found
    assert "<" not in found[1]
    assert "\u2028" not in found[1]


def test_payload_text_is_the_payload() -> None:
    """The escapes are those of JSON: what is read back is what was given."""
    given = {"name": "</script>\u2028\u2029<!-- é", "numbers": [0.1, 1e-300]}
    assert json.loads(payload_text(given)) == given


def test_payload_text_refuses_what_json_cannot_say() -> None:
    """Infinity is not JSON; a browser would stop at it."""
    with pytest.raises(ValueError, match="not JSON compliant"):
        payload_text({"capacity": float("inf")})


def test_the_page_refers_to_nothing_outside(hostile_html: str) -> None:
    """No element names an address but the pictures and links inside the file."""
    for tag, attributes in Outline(hostile_html).elements:
        assert not {"src", "srcset", "action", "data"} & set(attributes), tag
        assert attributes.get("href", "#").startswith("#"), tag  # type: ignore[union-attr]
    style = re.search(r"<style>(.*?)</style>", hostile_html, re.DOTALL)
    assert style
    assert "@import" not in style[1]
    assert all(address.startswith(("data:", "#default")) for address in re.findall(r"url\(([^)]*)\)", style[1]))
    assert "sourceMappingURL" not in hostile_html


def test_only_the_pages_own_script_may_run(hostile_html: str) -> None:
    """The policy names one nonce, the script carries it, and nothing else is allowed to load."""
    policy = re.search(r'http-equiv="Content-Security-Policy" content="([^"]*)"', hostile_html)
    assert policy
    nonce = re.search(r"script-src 'nonce-([\w-]{20,})'", policy[1])
    assert nonce
    assert "default-src 'none'" in policy[1]
    assert "unsafe-inline" not in policy[1].split("script-src")[1].split(";")[0]
    assert "http" not in policy[1]
    scripts = [attributes for tag, attributes in Outline(hostile_html).elements if tag == "script"]
    assert scripts == [{"type": "application/json", "id": "payload"}, {"nonce": nonce[1]}]


def test_the_nonce_is_new_each_time() -> None:
    """A name typed after seeing one map cannot carry the nonce of the next."""
    study, plan = hand_case()
    first, second = (draw_map(study, plan, headline="Here.").html for _ in range(2))
    assert re.findall(r"nonce-[\w-]+", first) != re.findall(r"nonce-[\w-]+", second)


def test_leaflets_licence_goes_with_it(hostile_html: str) -> None:
    """Each file hands Leaflet on, so its notice is inside."""
    assert "BSD 2-Clause License" in hostile_html
    assert "Redistributions in binary form must reproduce the above copyright notice" in hostile_html


def test_write_map_writes_what_is_drawn(tmp_path: Path) -> None:
    """The file is UTF-8 and holds the same payload as the page."""
    study, plan = hand_case()
    write_map(tmp_path / "map.html", study, plan, headline="Here.")
    written = (tmp_path / "map.html").read_text("utf-8")
    assert payload_of(written) == payload_of(draw_map(study, plan, headline="Here.").html)


def test_the_given_map_is_a_page_of_the_same_form() -> None:
    """Before any plan there is a map too, of kind `given`."""
    study, _ = hand_case()
    html = draw_given(study).html
    assert payload_of(html)["kind"] == "given"
    assert [tag for tag, _ in Outline(html).elements].count("script") == 2
