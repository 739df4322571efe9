"""Debian's Chromium, driven by Playwright: offline, nothing downloaded, every surprise recorded."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import pytest

CHROMIUM = shutil.which("chromium")
FLAGS = (
    *("--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-sync"),
    *("--disable-background-networking", "--disable-component-update"),
)


def why_not() -> str:
    """Say why no browser can be driven here, or nothing where one can."""
    if CHROMIUM is None:
        return "Chromium is not installed (apt-get install chromium)"
    if find_spec("playwright") is None:
        return "playwright is not installed (pip install -e .[dev])"
    return ""


def needs_browser(test: Any) -> Any:
    """Mark a test, or a class of them, as one that needs Chromium; without, it is skipped and says why."""
    return pytest.mark.browser(pytest.mark.skipif(bool(why_not()), reason=why_not())(test))


@dataclass
class Seen:
    """What a page did that it should not do: requests, console errors, faults, dialogs."""

    requests: list[str] = field(default_factory=list)
    console: list[str] = field(default_factory=list)
    faults: list[str] = field(default_factory=list)
    dialogs: list[str] = field(default_factory=list)

    @property
    def everything(self) -> list[str]:
        """All of it; empty for a page that behaves."""
        return [*self.requests, *self.console, *self.faults, *self.dialogs]


@contextmanager
def chromium() -> Iterator[Any]:
    """Start one headless browser; hand it to :func:`opened`."""
    from playwright.sync_api import sync_playwright

    with sync_playwright() as driver:
        browser = driver.chromium.launch(executable_path=CHROMIUM, args=list(FLAGS))
        try:
            yield browser
        finally:
            browser.close()


@contextmanager
def opened(
    browser: Any, file: Path, *, width: int = 1280, height: int = 800, zone: str = "UTC", **options: Any
) -> Iterator[tuple[Any, Seen]]:
    """Open `file` offline in a fresh context; yield the page, once it says it is ready, and what was seen.

    `options` go to the context: `device_scale_factor`, `has_touch`, ….
    """
    context = browser.new_context(
        viewport={"width": width, "height": height}, offline=True, timezone_id=zone, **options
    )
    try:
        page, seen = context.new_page(), Seen()
        own = file.resolve().as_uri()
        page.on("request", lambda request: request.url == own or seen.requests.append(request.url))
        page.on("console", lambda said: said.type in ("error", "warning") and seen.console.append(said.text))
        page.on("pageerror", lambda fault: seen.faults.append(str(fault)))
        page.on("dialog", lambda dialog: (seen.dialogs.append(dialog.message), dialog.dismiss()))
        page.goto(own)
        page.wait_for_selector("html[data-ready]", state="attached", timeout=30_000)
        yield page, seen
    finally:
        context.close()
