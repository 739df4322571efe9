"""The pictures of the README, made from plans of the demo sets by the command line itself.

    python -m tests.pictures [--to reports/pictures]

The Gantt page of `rounds` as it opens; of `mixed` as it opens, with an order lit, in the colours of
families, on a phone, and printed in grey; a machine's list and travellers as printed; and the terminal.
Needs Chromium and pdftoppm (Debian: chromium, poppler-utils).
"""

from __future__ import annotations

import argparse
import shutil
import subprocess
import sys
import tempfile
from html import escape
from pathlib import Path
from typing import Any

from tests.render.browser import chromium, opened, why_not

ROOT = Path(__file__).parents[1]
PICTURES = ROOT / "reports" / "pictures"
GREY_DPI, SHEET_DPI = 110, 70
SHEET = 10  # the list of COAT, which has changeovers, a break and families
COLUMNS = 80


def planned(name: str, folder: Path) -> tuple[Path, str]:
    """Plan a demo set; return the folder of its files and what the terminal showed."""
    data = ROOT / "data" / name
    files = ["orders.csv", "--shop", "shop.toml", "--out", str(folder / name), "--no-xlsx"]
    command = [sys.executable, "-m", "shopfloor", "plan", *files]
    done = subprocess.run(command, cwd=data, capture_output=True, text=True, check=True)
    shown = done.stdout.replace(f"{folder}/", "")
    return folder / name, f"$ shopfloor plan orders.csv --shop shop.toml --out {name}\n\n{shown}"


def light_an_order(page: Any, target: Path) -> None:
    """Take the page with one order lit in every row."""
    page.focus("#chart")
    for key in ("ArrowRight", "ArrowDown", "Enter"):
        page.keyboard.press(key)
    page.evaluate("document.activeElement.blur()")
    page.screenshot(path=str(target))
    page.focus("#chart")
    page.keyboard.press("Escape")


def by_family(page: Any, target: Path) -> None:
    """Take the page in the colours of families."""
    page.click("#by-family")
    page.evaluate("document.activeElement.blur()")
    page.screenshot(path=str(target))
    page.click("#by-family")


def on_a_phone(page: Any, target: Path) -> None:
    """Take the page 390 pixels wide."""
    size = page.viewport_size
    page.set_viewport_size({"width": 390, "height": 844})
    page.wait_for_timeout(500)
    page.screenshot(path=str(target))
    page.set_viewport_size(size)


def printed(page: Any, target: Path, dpi: int, sheet: int = 1, *, landscape: bool = False) -> None:
    """Print on A4 without colour and take one sheet."""
    with tempfile.TemporaryDirectory() as name:
        pdf = Path(name) / "page.pdf"
        page.pdf(path=str(pdf), format="A4", landscape=landscape, prefer_css_page_size=True)
        command = ["pdftoppm", "-gray", "-png", "-r", str(dpi), "-f", str(sheet), "-l", str(sheet)]
        subprocess.run([*command, "-singlefile", str(pdf), str(target.with_suffix(""))], check=True)


def terminal(browser: Any, text: str, target: Path) -> None:
    """Draw what a terminal of eighty columns shows."""
    assert max(map(len, text.splitlines())) <= COLUMNS
    style = "margin:0;padding:16px;background:#fff;color:#111;display:table;"
    style += "font:14px/1.35 'DejaVu Sans Mono',monospace"
    page = browser.new_page()
    page.set_content(f'<pre style="{style}">{escape(text)}</pre>')
    page.locator("pre").screenshot(path=str(target))
    page.close()


def main(arguments: list[str]) -> None:
    """Make the pictures and name them."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--to", type=Path, default=PICTURES, help="folder for the pictures")
    to = parser.parse_args(arguments).to
    if why_not() or shutil.which("pdftoppm") is None:
        sys.exit(why_not() or "pdftoppm is not installed (apt-get install poppler-utils)")
    to.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory() as name, chromium() as browser:
        rounds, _ = planned("rounds", Path(name))
        mixed, said = planned("mixed", Path(name))
        with opened(browser, rounds / "gantt.html") as (page, _):
            page.screenshot(path=str(to / "gantt.png"))
        with opened(browser, mixed / "gantt.html") as (page, _):
            page.screenshot(path=str(to / "mixed.png"))
            light_an_order(page, to / "mixed-lit.png")
            by_family(page, to / "mixed-family.png")
            on_a_phone(page, to / "mixed-phone.png")
            printed(page, to / "mixed-print-grey.png", GREY_DPI, landscape=True)
        page = browser.new_page()  # the sheets have no scripts, so nothing says that they are ready
        page.goto((mixed / "dispatch.html").as_uri())
        printed(page, to / "sheet.png", SHEET_DPI, sheet=SHEET)
        page.close()
        terminal(browser, said, to / "terminal.png")
    print("\n".join(str(picture) for picture in sorted(to.glob("*.png"))))


if __name__ == "__main__":
    main(sys.argv[1:])
