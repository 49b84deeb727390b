"""Asking a server: against a stand-in on this machine, which says what it was asked and by whom."""

from __future__ import annotations

import json
import threading
import time
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from typing import TYPE_CHECKING
from urllib.parse import parse_qs, urlsplit

import pytest

from siting.errors import DataFileError
from siting.study.ask_online import ask_online

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path


class StandIn(ThreadingHTTPServer):
    """A server of the kind of Nominatim that knows one place."""

    def __init__(self) -> None:
        super().__init__(("127.0.0.1", 0), Answering)
        self.asked: list[tuple[float, str, str, str]] = []
        """When, of what, in which country and by whom it was asked."""
        self.broken = False

    @property
    def url(self) -> str:
        """Where it is."""
        return f"http://127.0.0.1:{self.server_port}/geo"


class Answering(BaseHTTPRequestHandler):
    """Answers one question."""

    server: StandIn

    def do_GET(self) -> None:
        """Answer with the one place, with nothing, or with an error."""
        parts = urlsplit(self.path)
        query = parse_qs(parts.query)
        place, code = query.get("q", [""])[0], query.get("countrycodes", [""])[0]
        self.server.asked.append((time.monotonic(), place, code, self.headers["User-Agent"]))
        known = [{"display_name": "Old mill, Austria", "lat": "47.5", "lon": "13.5"}]
        body = json.dumps(known if place.startswith("Old mill") and parts.path == "/geo/search" else []).encode()
        self.send_response(500 if self.server.broken else 200)
        self.send_header("Content-Type", "application/json")
        self.send_header("Content-Length", str(len(body)))
        self.end_headers()
        self.wfile.write(body)

    def log_message(self, *_: object) -> None:
        """Write no log."""


@pytest.fixture
def server() -> Iterator[StandIn]:
    """Run a stand-in while a test lasts."""
    stand_in = StandIn()
    thread = threading.Thread(target=stand_in.serve_forever, daemon=True)
    thread.start()
    yield stand_in
    stand_in.shutdown()
    thread.join()
    stand_in.server_close()


def test_a_place_is_asked_for_once_by_a_client_with_a_name(server: StandIn, tmp_path: Path) -> None:
    """Program and contact are told, the country goes along, and answers are kept on disk, none found too."""
    cache = tmp_path / "kept" / "places.json"
    ask = ask_online(server.url, contact="me@example.org", cache=cache, seconds_apart=0.0)
    town = ask("Old mill", "Österreich")
    assert town is not None
    assert (town.name, town.latitude, town.longitude, town.country) == ("Old mill, Austria", 47.5, 13.5, "AT")
    assert ask("Elsewhere", "AT") is None
    assert ask("Old mill", "AT") == town
    again = ask_online(server.url, cache=cache, seconds_apart=0.0)
    assert (again("Old mill", "AT"), again("Elsewhere", "AT")) == (town, None)
    assert [(place, code) for _, place, code, _ in server.asked] == [
        ("Old mill, Austria", "at"),
        ("Elsewhere, Austria", "at"),
    ]
    agent = server.asked[0][3]
    assert agent.startswith("siting/")
    assert agent.endswith("(me@example.org)")


def test_questions_are_kept_apart(server: StandIn) -> None:
    """Two questions are as many seconds apart as was asked for."""
    ask = ask_online(server.url, seconds_apart=0.3)
    ask("One", "")
    ask("Two", "Atlantis")
    assert server.asked[1][0] - server.asked[0][0] >= 0.25
    assert [place for _, place, _, _ in server.asked] == ["One", "Two, Atlantis"]


def test_a_server_that_fails_is_named(server: StandIn) -> None:
    """In one sentence, with what to do; nothing is kept of it."""
    server.broken = True
    ask = ask_online(server.url, seconds_apart=0.0)
    with pytest.raises(DataFileError, match=r"the server does not answer \(.*\)\. Try later, or leave --online out"):
        ask("Old mill", "AT")


@pytest.mark.parametrize("url", ["example.org", "ftp://example.org", "http://", ""])
def test_what_is_no_address_is_refused(url: str) -> None:
    """With an example of one."""
    with pytest.raises(DataFileError, match=r"is not the address of a server; write one such as https://nominatim"):
        ask_online(url)


def test_a_spoilt_cache_is_refused(tmp_path: Path) -> None:
    """It names the file and what to do."""
    for text in ("{", "[]"):
        (tmp_path / "places.json").write_text(text, encoding="utf-8")
        with pytest.raises(DataFileError, match=r"places\.json: this is no file of answers\. Delete it"):
            ask_online("http://localhost", cache=tmp_path / "places.json")
