"""dispatch.html on paper: printed through Chromium on A4 and Letter, read back with pdftotext."""

from __future__ import annotations

import re
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from shopfloor.model.calendar import HOUR
from shopfloor.model.shop import Machine
from shopfloor.render.dispatch import dispatch_page, lay_out
from shopfloor.render.dispatch_sheets import STOPS_A_STRIP, dispatch_view
from shopfloor.render.html import CARE_NOTICE
from tests.render.browser import Seen, chromium, needs_browser
from tests.render.expected import round_plan
from tests.render.plans import HOSTILE, hall_plan, many_plan

PAPERS = ("A4", "Letter")
MIXED = hall_plan(200)
ROUNDS = hall_plan(200, rounds=True)
SPAN = re.compile(r"\d\d:\d\d – \d\d:\d\d")

pytestmark = pytest.mark.skipif(
    shutil.which("pdftotext") is None, reason="pdftotext is not installed (apt-get install poppler-utils)"
)


@pytest.fixture(scope="module")
def browser():
    with chromium() as running:
        yield running


class Paper:
    """Prints a page and returns the text of each sheet of paper."""

    def __init__(self, browser: Any, folder: Path) -> None:
        self.browser, self.folder, self.seen = browser, folder, Seen()

    def sheets(self, page: str, paper: str, only: str = "") -> list[str]:
        file, pdf = self.folder / "dispatch.html", self.folder / "dispatch.pdf"
        file.write_text(page, encoding="utf-8")
        context = self.browser.new_context(offline=True)
        tab = context.new_page()
        own = file.resolve().as_uri()
        tab.on(
            "request", lambda request: request.url.startswith(own) or self.seen.requests.append(request.url)
        )
        tab.on("console", lambda said: self.seen.console.append(said.text))
        tab.on("dialog", lambda dialog: (self.seen.dialogs.append(dialog.message), dialog.dismiss()))
        tab.goto(own + only)
        tab.pdf(path=str(pdf), format=paper)
        context.close()
        text = subprocess.run(
            ["pdftotext", "-layout", pdf, "-"], capture_output=True, check=True
        ).stdout.decode()
        return text.split("\f")[:-1]


@pytest.fixture
def paper(browser, tmp_path):
    printer = Paper(browser, tmp_path)
    yield printer
    assert printer.seen.everything == []


def unnumbered(text: str) -> str:
    return squeezed(re.sub(r"page \d+ of \d+", "", text))


def squeezed(text: str) -> str:
    return "".join(text.split())


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_every_machine_starts_a_page_and_no_row_is_cut(paper, size):
    view = dispatch_view(MIXED)
    sheets = paper.sheets(dispatch_page(MIXED), size, "#only-machines")
    # in the sequence of the lists, each page begins with its machine and goes on where the last one ended
    expected = [(sheet.machine, run.number) for sheet in view.machines for run in sheet.runs]
    found, firsts = [], []
    for text in sheets:
        machine = re.match(r"\s*(.+?)(  |\n)", text)[1]
        numbers = [int(number) for number in re.findall(r"^ {1,6}(\d{1,3}) ", text, re.M)]
        orders, ways, ends = (len(re.findall(mark, text)) for mark in (r"TQ-\d+", "→", r"\d min\b"))
        assert len(numbers) == orders == ways == ends > 0
        found += [(machine, number) for number in numbers]
        firsts.append((machine, numbers[0]))
    assert found == expected
    assert [machine for machine, number in firsts if number == 1] == [
        sheet.machine for sheet in view.machines
    ]
    assert len(sheets) > len(view.machines)  # so that lists do run over


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_titles_repeat_and_every_page_is_numbered_and_carries_the_notice(paper, size):
    page = dispatch_page(ROUNDS, stamp="2026-03-02 05:41")
    sheets = paper.sheets(page, size)
    plan = dispatch_view(ROUNDS).plan
    for number, text in enumerate(sheets, 1):
        assert f"page {number} of {len(sheets)}" in text
        assert f"plan {plan}, printed 2026-03-02 05:41" in text
        assert "This is a plan, not a permit." in text
        if "Began" not in text and "Who is where" not in text:
            assert SPAN.search(text)  # travellers
    assert sum("No" in text and "Began" in text for text in sheets) >= len(ROUNDS.shop.machines)


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_no_strip_is_cut(paper, size):
    view = dispatch_view(MIXED)
    stops = {strip.order: len(strip.stops) for strip in view.strips}
    sheets = paper.sheets(dispatch_page(MIXED), size, "#only-strips")
    seen = []
    for text in sheets:
        orders = re.findall(r"TQ-\d+", text)
        seen += orders
        assert len(SPAN.findall(text)) == sum(stops[order] for order in orders)
        assert len(re.findall(r"This is a plan", text)) == len(orders)
    assert seen == [strip.order for strip in view.strips]
    assert len(sheets) <= len(seen) / 4  # several a page


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_the_longest_strip_stands_whole_on_a_page(paper, size):
    plan = round_plan(orders=2, machines=STOPS_A_STRIP)
    machines = tuple(Machine(f"{machine.id} in the far corner of the hall") for machine in plan.shop.machines)
    plan = replace(plan, shop=replace(plan.shop, machines=machines))
    sheets = paper.sheets(dispatch_page(plan), size, "#only-strips")
    assert len(sheets) == 2
    assert [text.count("min") for text in sheets] == [STOPS_A_STRIP, STOPS_A_STRIP]


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_round_sheets_hold_the_whole_grid(paper, size):
    view = dispatch_view(ROUNDS)
    sheets = paper.sheets(dispatch_page(ROUNDS), size, "#only-rounds")
    text = "\n".join(sheets)
    assert all("Who is where" in sheet for sheet in sheets)
    rows = [row for sheet in view.round_sheets for row in sheet.rows]
    printed = re.findall(r"^ *(\d+) (\d\d:\d\d – \d\d:\d\d) +(.+)$", text, re.M)
    assert [(int(number), span, cells.split()) for number, span, cells in printed] == [
        (row.number, f"{row.start} – {row.end}", [order or "·" for order in row.orders]) for row in rows
    ]


@needs_browser
def test_a_shift_of_rounds_on_eight_machines_is_one_page(paper):
    plan = round_plan(orders=9, machines=8)
    assert len(plan.schedule) == 72
    for size in PAPERS:
        assert len(paper.sheets(dispatch_page(plan), size, "#only-rounds")) == 1


@needs_browser
def test_only_what_is_chosen_is_printed(paper):
    page = dispatch_page(ROUNDS)
    kinds = {kind: paper.sheets(page, "A4", f"#only-{kind}") for kind in ("machines", "strips", "rounds")}
    whole = paper.sheets(page, "A4")
    parts = [text for kind in ("machines", "strips", "rounds") for text in kinds[kind]]
    assert list(map(unnumbered, parts)) == list(map(unnumbered, whole))
    assert all("Show and print" not in text for text in whole)


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_hostile_names_are_printed_as_text_and_run_nothing(paper, size):
    names = tuple(name for name in HOSTILE if name.isascii())
    plan = hall_plan(60, names=names)
    text = squeezed("\n".join(paper.sheets(dispatch_page(plan, stamp="</style><b>x"), size)))
    assert squeezed("printed </style><b>x") in text
    assert all(squeezed(name) in text for name in names)


@needs_browser
def test_names_as_long_as_allowed_stay_on_the_paper(browser, tmp_path):
    """Nothing may stick out to the right: no element is wider than the sheet it stands on."""
    long = ("W" * 80, "long words " * 7)
    plan = hall_plan(60, names=long, shift_end_s=2 * HOUR)
    notes = dict.fromkeys(range(0, 60, 7), "x" * 300)
    plan = replace(plan, shop=replace(plan.shop, operations=replace(plan.shop.operations, notes=notes)))
    file = tmp_path / "dispatch.html"
    file.write_text(dispatch_page(plan), encoding="utf-8")
    tab = browser.new_page(viewport={"width": 1000, "height": 800})
    tab.goto(file.resolve().as_uri())
    tab.emulate_media(media="print")
    sticking_out = tab.evaluate(
        """() => [...document.querySelectorAll('main *')].filter(
            (e) => e.clientWidth > 0 && e.scrollWidth > e.clientWidth + 1
        ).map((e) => e.outerHTML.slice(0, 80))"""
    )
    tab.close()
    assert sticking_out == []


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_titles_repeat_under_the_longest_names_too(paper, size):
    """Browsers stop repeating a table's head that takes a quarter of the page."""
    plan = hall_plan(200)
    machines = tuple(Machine(f"{n} " + "W" * 78, "M" * 80) for n, _ in enumerate(plan.shop.machines))
    plan = replace(plan, shop=replace(plan.shop, machines=machines))
    sheets = paper.sheets(dispatch_page(plan), size, "#only-machines")
    assert len(sheets) > len(machines)
    assert all("Began" in text for text in sheets)


@needs_browser
@pytest.mark.parametrize("kind", ["qr", "code128"])
def test_printed_codes_can_be_scanned(paper, kind):
    decoder = pytest.importorskip("zxingcpp", reason="zxing-cpp is not installed (pip install -e .[dev])")
    view = dispatch_view(hall_plan(60))
    sheets = paper.sheets(dispatch_page(hall_plan(60), codes=kind), "Letter")
    command = ["pdftoppm", "-gray", "-r", "300", paper.folder / "dispatch.pdf", paper.folder / "sheet"]
    subprocess.run(command, check=True)
    pictures = [_picture(file) for file in sorted(paper.folder.glob("sheet-*.pgm"))]
    read = [found.text for picture in pictures for found in decoder.read_barcodes(picture)]
    assert len(pictures) == len(sheets)
    assert sorted(read) == sorted(
        [*(sheet.machine for sheet in view.machines), *(strip.order for strip in view.strips)]
    )


def _picture(file: Path) -> np.ndarray:
    """A grey picture as pdftoppm writes it: P5, width and height, 255, then the bytes."""
    _, size, _, data = file.read_bytes().split(b"\n", 3)
    width, height = map(int, size.split())
    return np.frombuffer(data, np.uint8).reshape(height, width)


@needs_browser
def test_the_notice_is_printed_in_full(paper):
    text = paper.sheets(dispatch_page(hall_plan(60)), "Letter", "#only-machines")[0]
    assert squeezed(CARE_NOTICE) in squeezed(text)


@needs_browser
@pytest.mark.parametrize("size", PAPERS)
def test_what_comes_before_a_run_stays_with_it(paper, size):
    """Five machines with a changeover before most runs: no sheet ends with one, and every run is printed."""
    plan = many_plan(4_800, floor=True)
    families = np.arange(len(plan.shop)) % 8 % 7  # another one in every round
    shop = replace(plan.shop, operations=replace(plan.shop.operations, family=families))
    view = dispatch_view(replace(plan, shop=shop))
    lists = view.machines[:5]
    sheets = paper.sheets(lay_out(replace(view, machines=lists, strips=())), size)
    changes = sum(len(run.asides) for sheet in lists for run in sheet.runs)
    assert sum(text.count("changeover from") for text in sheets) == changes > 100
    for text in sheets:
        above = text.split("This is a plan, not a permit.")[0].rstrip().splitlines()
        assert "changeover" not in above[-1]
    assert len(sheets) > 2 * len(lists)
