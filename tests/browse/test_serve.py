"""Safe by default: what is pinned holds against any `.streamlit` folder, and what is not cannot weaken it."""

from __future__ import annotations

import json
import os
import socket
import subprocess
import sys
import urllib.error
import urllib.request
from typing import TYPE_CHECKING

import pytest

from siting.browse.serve import COOKIE_SECRET_VARIABLE, FIRST_PORT, free_port, server_settings
from siting.errors import SettingsError
from tests.browse.running import Running, running

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path

HOSTILE_CONFIG = """\
[global]
developmentMode = true
[server]
address = "0.0.0.0"
port = 1
baseUrlPath = "elsewhere"
allowedHosts = ["evil.example", "*"]
enableCORS = false
corsAllowedOrigins = ["https://evil.example"]
enableXsrfProtection = false
xsrfCookieSameSite = "none"
maxUploadSize = 100000
fileWatcherType = "auto"
runOnSave = true
headless = false
showEmailPrompt = true
enableStaticServing = true
enableAgentApi = true
scriptHealthCheckEnabled = true
trustedUserHeaders = {X-User = "user"}
sslCertFile = "/nowhere"
cookieSecret = "known"
[browser]
gatherUsageStats = true
serverAddress = "evil.example"
[client]
showErrorDetails = "full"
toolbarMode = "developer"
allowedOrigins = ["https://evil.example"]
[logger]
level = "debug"
[secrets]
files = ["secrets.toml"]
[theme]
base = "dark"
font = "Evil:https://evil.example/font.css"
fontFaces = [{family = "Evil", url = "https://evil.example/font.woff2"}]
[theme.dark]
font = "Evil:https://evil.example/font.css"
[theme.light.sidebar]
codeFont = "Evil:https://evil.example/font.css"
"""
HOSTILE_ENVIRONMENT = {
    "STREAMLIT_SERVER_ADDRESS": "0.0.0.0",  # noqa: S104 - what must not come to be
    "STREAMLIT_SERVER_ALLOWED_HOSTS": "evil.example",
    "STREAMLIT_SERVER_ENABLE_CORS": "false",
    "STREAMLIT_SERVER_ENABLE_XSRF_PROTECTION": "false",
    "STREAMLIT_SERVER_ENABLE_STATIC_SERVING": "true",
    "STREAMLIT_SERVER_COOKIE_SECRET": "known",
    "STREAMLIT_BROWSER_GATHER_USAGE_STATS": "true",
    "STREAMLIT_CLIENT_SHOW_ERROR_DETAILS": "full",
    "STREAMLIT_GLOBAL_DEVELOPMENT_MODE": "true",
    "STREAMLIT_THEME_FONT": "Evil:https://evil.example/font.css",
}

HARMLESS = {
    # How fast and how much is kept in memory; no one gets to see more.
    "global.minCachedMessageSize",
    "global.maxCachedMessageAge",
    "runner.parallelMaxWorkers",
    "runner.cacheBackgroundRefreshMaxWorkers",
    "runner.cacheBackgroundRefreshTTLMultiplier",
    "runner.cacheHashSeed",
    "runner.connectionDefaultTTL",
    "server.maxCacheDataSize",
    "server.enableWebsocketCompression",
    "server.websocketPingInterval",
    "server.folderWatchBlacklist",
    # Only with the interface for programs, which is off.
    "server.agentWaitTimeout",
    "server.agentSessionTTL",
    "server.agentMaxSessions",
    "server.agentPreviewRows",
    # What is said on the terminal, and of scripts that are written for Streamlit.
    "global.disableWidgetStateDuplicationWarning",
    "global.showWarningOnDirectExecution",
    "global.suppressDeprecationWarnings",
    "logger.enableRich",
    "magic.displayRootDocString",
    "magic.displayLastExprIfNoSemicolon",
    # Taken from the environment only, where `serve` puts a random one.
    "server.cookieSecret",
}
"""Options that are not pinned, with why each group cannot weaken anything."""

EFFECTIVE = """
import json, sys
from pathlib import Path
from siting.browse.serve import serve
from streamlit import config
from streamlit.web.server.starlette import starlette_server
keys = json.loads(sys.argv[1])
def tell(runner):
    sys.stdout.write(json.dumps({key: config.get_option(key) for key in keys}))
starlette_server.UvicornRunner.run = tell
serve(None, address="127.0.0.1", port=8599)
"""


@pytest.fixture
def hostile(tmp_path: Path) -> Path:
    """Return a current folder, which is the home folder too, whose `.streamlit` wants all that is unsafe."""
    (tmp_path / ".streamlit").mkdir()
    (tmp_path / ".streamlit" / "config.toml").write_text(HOSTILE_CONFIG)
    (tmp_path / ".streamlit" / "secrets.toml").write_text('SITING_LEAK = "1"\n')
    return tmp_path


def test_pins_hold_against_files_and_environment(hostile: Path) -> None:
    """Every pinned option has its value although the current and home folders and the environment say otherwise."""
    pinned = dict(server_settings("127.0.0.1", 8599))
    done = subprocess.run(  # noqa: S603 - our own script
        [sys.executable, "-c", EFFECTIVE, json.dumps([*pinned, "server.cookieSecret"])],
        cwd=hostile,
        env={**os.environ, **HOSTILE_ENVIRONMENT, "HOME": str(hostile)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    effective = json.loads(done.stdout)
    cookie_key = effective.pop("server.cookieSecret")
    assert effective == json.loads(json.dumps(pinned))
    assert cookie_key != "known"
    assert len(cookie_key) == 64


def test_what_is_not_pinned_is_known_and_harmless() -> None:
    """Each option of the Streamlit installed is pinned, a colour or size of the theme, or listed with a reason."""
    from streamlit import config  # noqa: PLC0415 - costs a second

    options = set(config._config_options_template)  # noqa: SLF001 - the list is offered in no other way
    pinned = set(server_settings("127.0.0.1", 8599))
    rest = options - pinned - HARMLESS
    unknown = {key for key in rest if not key.startswith("theme.")}
    fetched = {key for key in rest if key.endswith((".font", "headingFont", "codeFont", "fontFaces"))}
    assert unknown == set()
    assert fetched == set()
    assert pinned <= options
    assert options >= HARMLESS


@pytest.fixture(scope="module")
def server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Running]:
    """Serve the demo from a hostile folder."""
    home = tmp_path_factory.mktemp("hostile")
    (home / ".streamlit").mkdir()
    (home / ".streamlit" / "config.toml").write_text(HOSTILE_CONFIG)
    (home / "static").mkdir()
    (home / "static" / "secret.txt").write_text("a secret of the user")
    with running(folder=home, more={**HOSTILE_ENVIRONMENT, "HOME": str(home)}) as server:
        yield server


def status(request: urllib.request.Request) -> int:
    """Return the status of a request to our own server."""
    try:
        with urllib.request.urlopen(request) as answer:  # noqa: S310 - our own server
            code: int = answer.status
    except urllib.error.HTTPError as error:
        code = error.code
    return code


def handshake(server: Running, **headers: str) -> int:
    """Return the status of a request to open the page's websocket; 101 opens it."""
    lines = {
        "Host": f"127.0.0.1:{server.port}",
        "Connection": "Upgrade",
        "Upgrade": "websocket",
        "Sec-WebSocket-Version": "13",
        "Sec-WebSocket-Key": "AAAAAAAAAAAAAAAAAAAAAA==",
        **headers,
    }
    with socket.create_connection(("127.0.0.1", server.port), timeout=10) as line:
        head = "".join(f"{name}: {value}\r\n" for name, value in lines.items())
        line.sendall(f"GET /_stcore/stream HTTP/1.1\r\n{head}\r\n".encode())
        return int(line.recv(64).split()[1])


def test_listens_on_this_computer_alone(server: Running) -> None:
    """Another address of this computer finds no one, so no other computer does."""
    assert status(urllib.request.Request(f"{server.url}/_stcore/health")) == 200  # noqa: S310 - our own server
    with pytest.raises(ConnectionRefusedError), socket.create_connection(("127.0.0.2", server.port), timeout=5):
        pass


def test_a_page_of_our_own_may_open_the_line(server: Running) -> None:
    """The pages themselves are let in, by name or by number."""
    assert handshake(server, Origin=f"http://127.0.0.1:{server.port}") == 101
    assert handshake(server, Host=f"localhost:{server.port}", Origin=f"http://localhost:{server.port}") == 101


@pytest.mark.parametrize(
    "headers",
    [
        {"Host": "evil.example", "Origin": "http://evil.example"},
        {"Host": "evil.example:80", "Origin": "http://evil.example:80"},
        {"Origin": "http://evil.example"},
        {"Host": "127.0.0.1.evil.example", "Origin": "http://127.0.0.1.evil.example"},
    ],
)
def test_a_foreign_host_or_origin_is_refused(server: Running, headers: dict[str, str]) -> None:
    """A page elsewhere cannot talk to the server, also where its name leads to this computer (DNS rebinding)."""
    assert handshake(server, **headers) == 403


def test_no_file_of_a_folder_is_served(server: Running) -> None:
    """Static serving is off: a file beside the user's study is not given away."""
    with urllib.request.urlopen(f"{server.url}/app/static/secret.txt") as answer:  # noqa: S310 - our own server
        said = answer.read()
    assert b"<html" in said
    assert b"a secret of the user" not in said


def test_an_upload_from_elsewhere_is_refused(server: Running) -> None:
    """A file sent without the page's own token is not taken."""
    request = urllib.request.Request(  # noqa: S310 - our own server
        f"{server.url}/_stcore/upload_file/session/file", data=b"x", method="PUT"
    )
    assert status(request) in {400, 403}


def test_says_where_it_is_and_nothing_else(server: Running) -> None:
    """The terminal shows one line."""
    assert server.log.read_text() == f"siting is at {server.url} - stop it with Ctrl-C\n"


def test_an_asked_for_port_that_is_taken() -> None:
    """A taken port is refused by number; unasked, another is found."""
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = taken.getsockname()[1]
        with pytest.raises(SettingsError, match=rf"port {port} on 127\.0\.0\.1: taken, .* Give another with --port"):
            free_port("127.0.0.1", port)
    assert free_port("127.0.0.1") >= FIRST_PORT


def test_a_name_for_other_computers_is_allowed_too() -> None:
    """Who serves to others on purpose is found by the name given, and by no other."""
    assert server_settings("192.0.2.7", 1)["server.allowedHosts"] == ["127.0.0.1", "192.0.2.7", "localhost"]
    assert COOKIE_SECRET_VARIABLE.startswith("STREAMLIT_")
