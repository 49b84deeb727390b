"""
Start the pages on this computer, with every setting that safety rests on pinned in code.

A `.streamlit` folder in the user's current folder is not read: the server runs from the package's own folder, and what
a user-wide file might change is given explicitly.
"""

from __future__ import annotations

import contextlib
import os
import socket
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

FIRST_PORT = 8501
"""The first port tried; the next hundred are tried after it."""

PORTS_TRIED = 100


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
        "server.allowedHosts": sorted({"127.0.0.1", "localhost", address}),
        "server.enableCORS": True,
        "server.corsAllowedOrigins": [],
        "server.enableXsrfProtection": True,
        "server.xsrfCookieSameSite": "strict",
        "server.maxUploadSize": LARGEST_UPLOAD_MB,
        "server.fileWatcherType": "none",
        "server.runOnSave": False,
        "server.headless": True,
        "server.showEmailPrompt": False,
        "server.enableStaticServing": False,
        "server.enableAgentApi": False,
        "server.baseUrlPath": "",
        "browser.gatherUsageStats": False,
        "browser.serverAddress": address,
        "browser.serverPort": port,
        "client.toolbarMode": "viewer",
        "client.showErrorDetails": "none",
        "client.showErrorLinks": False,
        "client.showSidebarNavigation": True,
        "logger.hideWelcomeMessage": True,
        "logger.level": "error",
        "runner.fastReruns": True,
        "runner.magicEnabled": False,
        **theme_settings(),
    }


def theme_settings() -> Mapping[str, object]:
    """Return the look of the pages: the colours of `siting.sharing.looks`, nothing of the default theme."""
    return {
        "theme.base": "light",
        "theme.primaryColor": looks.TEAL,
        "theme.backgroundColor": looks.PAPER,
        "theme.secondaryBackgroundColor": looks.PANEL,
        "theme.textColor": looks.INK,
        "theme.borderColor": looks.BORDER,
        "theme.linkColor": looks.TEAL,
        "theme.font": looks.FONT_STACK,
        "theme.headingFont": looks.FONT_STACK,
        "theme.baseRadius": "2px",
        "theme.showWidgetBorder": True,
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
    import streamlit as st  # noqa: PLC0415 - costs a second; only this command needs it

    if study is None:
        os.environ.pop(STUDY_VARIABLE, None)
    else:
        os.environ[STUDY_VARIABLE] = str(study.resolve())
    home = Path(__file__).resolve().parent
    os.chdir(home)
    with contextlib.suppress(KeyboardInterrupt):
        st.App(home / "app.py").run(config=dict(server_settings(address, port)))
