"""Codes that a scanner reads: drawn here on a grid, read back by an independent decoder."""

from __future__ import annotations

import re

import numpy as np
import pytest

from shopfloor.render.codes import MAX_BAR_CHARACTERS, code
from shopfloor.render.dispatch import dispatch_page
from tests.render.expected import small_plan

zxingcpp = pytest.importorskip("zxingcpp", reason="zxing-cpp is not installed (pip install -e .[dev])")

NAMES = ("TQ-1001", "0007", "A", "Wash 2", "=1+1", "<b>&\"'", "x" * MAX_BAR_CHARACTERS)


def pixels(markup: str) -> np.ndarray:
    """Draw the path of a code, one pixel a module, then enlarge; 0 is black."""
    width, height = map(int, re.search(r'viewBox="0 0 (\d+) (\d+)"', markup).groups())
    grid = np.full((height, width), 255, np.uint8)
    x = y = 0.0
    for command, numbers in re.findall(r"([Mmhvz])([\d. -]*)", re.search(r' d="([^"]*)"', markup)[1]):
        values = [float(number) for number in re.findall(r"-?[\d.]+", numbers)]
        if command == "M":
            x, y = values
        elif command == "m":
            x, y = x + values[0], y + values[1]
        elif command == "h" and values[0] > 0:
            # a stroke one module wide about its line in QR, the upper side of a bar in Code 128
            rows = slice(int(y), int(y) + 1) if "stroke" in markup else slice(0, height)
            grid[rows, int(x) : int(x + values[0])] = 0
            x += values[0]
    return np.kron(np.pad(grid, 4, constant_values=255), np.full((4, 4), 1, np.uint8))


def scanned(markup: str) -> list[tuple[str, str]]:
    return [(found.text, found.format.name) for found in zxingcpp.read_barcodes(pixels(markup))]


@pytest.mark.parametrize("name", NAMES)
def test_bar_codes_read_back(name):
    assert scanned(code(name, "code128")) == [(name, "Code128")]


@pytest.mark.parametrize("name", [*NAMES, "TQ-04 Ø12", "طلب 9", "W" * 80])
def test_qr_codes_read_back(name):
    assert scanned(code(name, "qr")) == [(name, "QRCode")]


@pytest.mark.parametrize("name", ["TQ-04 Ø12", "x" * (MAX_BAR_CHARACTERS + 1), "two\nlines", ""])
def test_names_that_bars_cannot_hold_say_so(name):
    assert code(name, "code128") == '<small class="code">no bar code</small>'


def test_only_known_kinds():
    for make in (lambda: code("x", "aztec"), lambda: dispatch_page(small_plan(), codes="aztec")):
        with pytest.raises(ValueError, match="codes must be one of qr, code128, not 'aztec'"):
            make()


def test_markup_stands_under_the_page_policy():
    """No style attribute, script or reference; hostile names are escaped in the label."""
    for kind in ("qr", "code128"):
        markup = code('"><script>', kind)
        assert 'aria-label="' in markup
        assert "&quot;&gt;&lt;script&gt;" in markup
        assert not re.search(r"<script|style=|href|class=\"(?!code\")|xmlns:", markup)


def test_pages_carry_codes_only_when_asked():
    assert "<svg" not in dispatch_page(small_plan())
    page = dispatch_page(small_plan(), codes="qr")
    assert page.count("<svg") == 3 + 4  # machines with work, and orders
    assert page == dispatch_page(small_plan(), codes="qr")
