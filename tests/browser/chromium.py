"""The real browser for tests: Debian's Chromium, driven by playwright, with the world outside cut off."""

from __future__ import annotations

import os
import shutil
from contextlib import contextmanager
from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from collections.abc import Iterator

    from playwright.sync_api import Browser, BrowserContext, Dialog, Route

ARGUMENTS = (
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--no-first-run",
)


def chromium_path() -> str:
    """Return the path of Chromium, or skip the tests of the module where there is none."""
    pytest.importorskip("playwright.sync_api", reason="playwright is not installed")
    path = os.environ.get("CHROMIUM") or shutil.which("chromium") or shutil.which("chromium-browser")
    if path is None:
        pytest.skip("Chromium is not installed (Debian: apt-get install chromium)", allow_module_level=True)
    return path


@contextmanager
def chromium() -> Iterator[Browser]:
    """Run Chromium for a while."""
    from playwright.sync_api import sync_playwright  # noqa: PLC0415 - absent where the tests are skipped

    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=chromium_path(), args=list(ARGUMENTS))
        try:
            yield browser
        finally:
            browser.close()


class Watched:
    """Whatever a page said that it should not have: outside requests, console messages, errors, dialogs."""

    def __init__(self, context: BrowserContext, *, server: str = "") -> None:
        """Watch all pages of a context; only files, and the server where there is one, can be reached."""
        self._inside = ("file:", "data:", "blob:", *([server] if server else []))
        self.outside: list[str] = []
        self.said: list[str] = []
        context.route("**/*", self._route)
        context.on("console", lambda message: self.said.append(f"{message.type}: {message.text}"))
        context.on("weberror", lambda error: self.said.append(f"error: {error.error}"))
        context.on("dialog", self._dismiss)

    def _dismiss(self, dialog: Dialog) -> None:
        self.said.append(f"dialog: {dialog.message}")
        dialog.dismiss()

    def _route(self, route: Route) -> None:
        if route.request.url.startswith(self._inside):
            route.continue_()
        else:
            self.outside.append(route.request.url)
            route.abort()
