"""Debian's Chromium, driven by Playwright: offline, nothing downloaded, every surprise recorded."""

from __future__ import annotations

import re
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


# ---- the Gantt page ---------------------------------------------------------------------------------


def axis(page: Any) -> tuple[str, list]:
    """Kind and range of the time axis."""
    return tuple(
        page.evaluate(
            "(({xaxis}) => [xaxis.type, xaxis.range])(document.getElementById('frame')._fullLayout)"
        )
    )


def answer(page: Any) -> str:
    """What the page says under the chart."""
    return re.sub("[\u2068\u2069]", "", page.text_content("#answer"))


def pressed(page: Any, selector: str) -> str:
    """Whether a button is pressed, as the page says it."""
    return page.get_attribute(selector, "aria-pressed")


def pixels(page: Any, canvas: str = "bars") -> int:
    """A number for what the canvas shows, to tell whether it changed."""
    return hash(page.evaluate("(id) => document.getElementById(id).toDataURL()", canvas))


def find_bar(page: Any) -> tuple[float, float]:
    """Move the pointer until the details of a bar show, and return where."""
    box = page.locator("#chart").bounding_box()
    for down in (0.35, 0.45, 0.55, 0.65, 0.75):
        for across in (0.3, 0.4, 0.5, 0.6):
            x, y = box["x"] + box["width"] * across, box["y"] + box["height"] * down
            page.mouse.move(x, y)
            if page.is_visible("#tip"):
                return x, y
    raise AssertionError("no bar under the pointer anywhere")


def table_rows(page: Any) -> list[list[str]]:
    """Open the table and return its cells."""
    page.click("#table > summary")
    page.wait_for_selector("#table tbody tr")
    return page.evaluate(
        "[...document.querySelectorAll('#table tbody tr')].map((r) => [...r.cells].map((c) => c.textContent))"
    )
