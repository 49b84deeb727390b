"""
Start the pages on this computer, with every setting that safety rests on pinned in code.

A `.streamlit` folder in the user's current folder is not read: the server runs from the package's own folder.
Environment variables meant for Streamlit are dropped, no secrets are read, and what a user-wide file might weaken is
given explicitly; a test holds every option Streamlit knows against this list.
"""

from __future__ import annotations

import contextlib
import os
import secrets
import socket
from itertools import product
from pathlib import Path
from typing import TYPE_CHECKING

from siting.errors import SettingsError
from siting.sharing import looks

if TYPE_CHECKING:
    from collections.abc import Mapping

STUDY_VARIABLE = "SITING_BROWSE_STUDY"
"""Environment variable through which the entry script learns which study to open; unset = the demo."""

LARGEST_UPLOAD_MB = 100
"""Largest file a page takes."""

LARGEST_MESSAGE_MB = 200
"""Largest message to a page, such as a table or a map."""

LARGEST_STATE_MB = 25
"""Largest message from a page, such as a column pasted into a table."""

FIRST_PORT = 8501
"""The first port tried; the next hundred are tried after it."""

PORTS_TRIED = 100

FOREIGN = "STREAMLIT_"
"""Beginning of the environment variables that Streamlit takes settings from."""

COOKIE_SECRET_VARIABLE = "STREAMLIT_SERVER_COOKIE_SECRET"  # noqa: S105 - the name of a variable, not a secret
"""The one option that Streamlit takes from the environment only."""


def server_settings(address: str, port: int) -> Mapping[str, object]:
    """
    Return every pinned setting of the server.

    Parameters
    ----------
    address
        IP address or host name to bind to. A foreign `Host` header is refused unless it names this address.
    port
        TCP port.
    """
    return {
        "server.address": address,
        "server.port": port,
        "server.baseUrlPath": "",
        "server.customComponentBaseUrlPath": "",
        # Who may talk to it.
        "server.allowedHosts": sorted({"127.0.0.1", "localhost", address}),
        "server.enableCORS": True,
        "server.corsAllowedOrigins": [],
        "client.allowedOrigins": [],
        "server.enableXsrfProtection": True,
        "server.xsrfCookieSameSite": "strict",
        "server.trustedUserHeaders": {},
        "server.sslCertFile": "",
        "server.sslKeyFile": "",
        # What it takes and what it gives away.
        "server.maxUploadSize": LARGEST_UPLOAD_MB,
        "server.maxMessageSize": LARGEST_MESSAGE_MB,
        "server.maxWidgetStateSize": LARGEST_STATE_MB,
        "server.enableStaticServing": False,
        "server.enableAgentApi": False,
        "server.enableExpensiveMemoryStats": False,
        "server.scriptHealthCheckEnabled": False,
        "server.unsafeMetricsUserAttributes": [],
        "secrets.files": [],
        "browser.gatherUsageStats": False,
        "client.showErrorDetails": "none",
        "client.showErrorLinks": False,
        "logger.level": "error",
        "logger.messageFormat": "%(asctime)s %(message)s",
        "logger.hideWelcomeMessage": True,
        # How it behaves.
        "global.developmentMode": False,
        "global.e2eTest": False,
        "global.unitTest": False,
        "global.appTest": False,
        "server.fileWatcherType": "none",
        "server.folderWatchList": [],
        "server.runOnSave": False,
        "server.allowRunOnSave": False,
        "server.headless": True,
        "server.showEmailPrompt": False,
        "server.disconnectedSessionTTL": 120,
        "browser.serverAddress": address,
        "browser.serverPort": port,
        "client.toolbarMode": "minimal",
        "client.showSidebarNavigation": True,
        "client.disableDataExport": False,
        "runner.fastReruns": True,
        "runner.magicEnabled": False,
        "runner.postScriptGC": True,
        "runner.enforceSerializableSessionState": False,
        "runner.enumCoercion": "nameOnly",
        "ui.hideTopBar": False,
        **theme_settings(),
    }


def theme_settings() -> Mapping[str, object]:
    """Return the look of the pages: the colours of `siting.sharing.looks`, fonts of the reader's own machine."""
    parts = [
        ".".join(part for part in ("theme", *words) if part)
        for words in product(("", "light", "dark"), ("", "sidebar"))
    ]
    fonts = {f"{part}.{font}": looks.FONT_STACK for part in parts for font in ("font", "headingFont")}
    code = {f"{part}.codeFont": "monospace" for part in parts}
    return {
        **fonts,
        **code,
        "theme.fontFaces": [],
        "theme.base": "light",
        "theme.primaryColor": looks.TEAL,
        "theme.backgroundColor": looks.PAPER,
        "theme.secondaryBackgroundColor": looks.PANEL,
        "theme.textColor": looks.INK,
        "theme.borderColor": looks.BORDER,
        "theme.linkColor": looks.TEAL,
        "theme.baseRadius": "2px",
        "theme.showWidgetBorder": True,
        "theme.dataframeHeaderBackgroundColor": looks.PANEL,
        "theme.chartCategoricalColors": [looks.TEAL, looks.OCHRE, looks.SLATE, looks.FAULT],
    }


def free_port(address: str, asked: int | None = None) -> int:
    """
    Return the port asked for, or the first free one.

    Raises
    ------
    SettingsError
        If the port asked for, or each of the hundred tried, is taken.
    """
    tried = [asked] if asked is not None else list(range(FIRST_PORT, FIRST_PORT + PORTS_TRIED))
    for port in tried:
        family = socket.AF_INET6 if ":" in address else socket.AF_INET
        with socket.socket(family) as probe, contextlib.suppress(OSError):
            probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
            probe.bind((address, port))
            return port
    listed = f"port {tried[0]}" if len(tried) == 1 else f"ports {tried[0]} to {tried[-1]}"
    msg = f"{listed} on {address}: taken, or not yours to use. Give another with --port."
    raise SettingsError(msg)


def serve(study: Path | None, *, address: str, port: int) -> None:
    """
    Serve the pages until interrupted.

    Parameters
    ----------
    study
        Folder or workbook to open; None opens the demo.
    address
        Where to listen.
    port
        TCP port, such as `free_port` found.
    """
    if study is None:
        os.environ.pop(STUDY_VARIABLE, None)
    else:
        os.environ[STUDY_VARIABLE] = str(study.resolve())
    for name in [name for name in os.environ if name.startswith(FOREIGN)]:
        del os.environ[name]
    os.environ[COOKIE_SECRET_VARIABLE] = secrets.token_hex(32)
    home = Path(__file__).resolve().parent
    os.chdir(home)

    import streamlit as st  # noqa: PLC0415 - costs a second, and reads the environment and the current folder

    with contextlib.suppress(KeyboardInterrupt):
        st.App(home / "app.py").run(config=dict(server_settings(address, port)))
