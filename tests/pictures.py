"""The pictures of the README: the Gantt page on a screen, in the colours of families, and printed in grey.

    python -m tests.pictures [gantt.html] [--to reports/pictures]

Takes a page that `shopfloor plan` wrote, or, with none named, one drawn for the tests. Needs Chromium and
pdftoppm (Debian: chromium, poppler-utils).
"""

from __future__ import annotations

import argparse
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Any

from shopfloor.render.gantt import gantt_page
from tests.render.browser import chromium, opened, why_not
from tests.render.floor import floor_plan

PICTURES = Path(__file__).parents[1] / "reports" / "pictures"
GREY_DPI = 110


def screen(page: Any, folder: Path) -> list[Path]:
    """Take the page as it opens, and with the first late order lit, or the first order if none is late."""
    page.screenshot(path=str(folder / "gantt.png"))
    late = page.locator("#late-only")
    if late.is_visible():
        late.click()
    page.focus("#chart")
    for key in ("ArrowRight", "ArrowDown", "Enter"):
        page.keyboard.press(key)
    if late.is_visible():
        late.click()
    page.evaluate("document.activeElement.blur()")
    page.screenshot(path=str(folder / "gantt-lit.png"))
    page.focus("#chart")
    page.keyboard.press("Escape")
    return [folder / "gantt.png", folder / "gantt-lit.png", *families(page, folder)]


def families(page: Any, folder: Path) -> list[Path]:
    """Take the page in the colours of families, where they play a part."""
    button = page.locator("#by-family")
    if not button.is_visible():
        return []
    button.click()
    page.evaluate("document.activeElement.blur()")
    page.screenshot(path=str(folder / "gantt-family.png"))
    button.click()
    return [folder / "gantt-family.png"]


def grey_print(page: Any, folder: Path) -> list[Path]:
    """Print on A4 without colour and take the first sheet."""
    with tempfile.TemporaryDirectory() as name:
        pdf = Path(name) / "gantt.pdf"
        page.pdf(path=str(pdf), format="A4", landscape=True, prefer_css_page_size=True)
        target = folder / "gantt-print-grey"
        command = ["pdftoppm", "-gray", "-png", "-r", str(GREY_DPI), "-singlefile", str(pdf), str(target)]
        subprocess.run(command, check=True)
    return [target.with_suffix(".png")]


def main(arguments: list[str]) -> None:
    """Make the pictures and name them."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("page", nargs="?", type=Path, help="a gantt.html; one drawn for the tests without")
    parser.add_argument("--to", type=Path, default=PICTURES, help="folder for the pictures")
    chosen = parser.parse_args(arguments)
    if why_not() or shutil.which("pdftoppm") is None:
        sys.exit(why_not() or "pdftoppm is not installed (apt-get install poppler-utils)")
    chosen.to.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory() as name, chromium() as browser:
        file = chosen.page
        if file is None:
            file = Path(name) / "gantt.html"
            file.write_text(gantt_page(floor_plan()), encoding="utf-8")
        with opened(browser, file) as (page, _):
            for picture in [*screen(page, chosen.to), *grey_print(page, chosen.to)]:
                print(picture)


if __name__ == "__main__":
    main(sys.argv[1:])
