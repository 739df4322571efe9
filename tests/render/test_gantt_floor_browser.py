"""The floor's rules on the Gantt page in a real browser, and pages of very large plans."""

from __future__ import annotations

import re
import shutil
import subprocess
from dataclasses import replace

import pytest

from shopfloor.model.calendar import HOUR, Clock
from shopfloor.model.results import Plan
from shopfloor.model.shop import Closure
from shopfloor.render.gantt import page_of
from shopfloor.render.gantt_facts import gantt_view
from shopfloor.render.runs import Runs
from tests.render.browser import answer, axis, needs_browser, pixels, pressed, table_rows
from tests.render.floor import crew_bound, floor_plan
from tests.render.plans import HOSTILE, hall_plan, many_plan

MANY = many_plan(60_000)
CUT = many_plan(300_000, floor=True)


def legend(page) -> list[str]:
    return page.locator("#legend li:visible").all_text_contents()


def tip_at(page, plan: Plan, row: int, seconds: int, *, rows: int) -> list[str]:
    """Point at a time on a row of a chart that shows `rows` rows, -1 for its last crew; the box's lines."""
    chart, (begin, end) = page.locator("#chart").bounding_box(), axis(page)[1]
    if isinstance(begin, str):
        begin, end = (plan.shop.clock.seconds(moment(text)) for text in (begin, end))
    frame = page.evaluate(
        "(({_size}) => [_size.l, _size.w, _size.t, _size.h])(document.getElementById('frame')._fullLayout)"
    )
    left, width, top, height = frame
    head = len(gantt_view(plan).lines) * 20 + 4
    crews = 6 + 38 * len(plan.shop.crews)
    tall = (height - head - crews) / rows
    down = top + head + (row + 0.7) * tall if row >= 0 else top + height - 20
    page.mouse.move(5, 5)
    page.mouse.move(chart["x"] + left + width * (seconds - begin) / (end - begin), chart["y"] + down)
    page.wait_for_timeout(30)
    return page.locator("#tip p").all_text_contents() if page.is_visible("#tip") else []


def moment(text: str):
    from datetime import datetime

    return datetime.fromisoformat(re.sub(r"(\.\d{6})\d+$", r"\1", text))


def plain(lines: list[str]) -> list[str]:
    return [re.sub("[\u2068\u2069]", "", line) for line in lines]


@needs_browser
class TestTheFloor:
    def test_the_legend_names_what_the_chart_has_and_no_more(self, show):
        page = show(floor_plan())
        assert legend(page) == [
            *("on time", "late", "no due time", "set-up", "changeover", "closed"),
            *("idle where it binds", "heads at work; dark: all"),
        ]
        page.click("#by-family")
        assert legend(page)[:6] == ["grey primer", "signal red", "black", "no family", "late", "set-up"]
        page = show(hall_plan(200))
        assert legend(page) == ["on time", "late", "no due time"]
        assert page.is_hidden("#by-family")

    def test_the_colours_of_families_come_and_go(self, show):
        page = show(floor_plan())
        before = pixels(page)
        page.click("#by-family")
        assert pressed(page, "#by-family") == "true"
        assert pixels(page) != before
        page.click("#by-family")
        assert (pressed(page, "#by-family"), pixels(page)) == ("false", before)

    def test_without_due_times_the_page_opens_in_the_colours_of_families(self, show):
        page = show(floor_plan(due=False))
        assert pressed(page, "#by-family") == "true"
        assert legend(page)[:4] == ["grey primer", "signal red", "black", "no family"]

    def test_whatever_the_pointer_is_on_is_named(self, show):
        plan = floor_plan()
        page = show(plan)
        at = lambda row, minutes: plain(tip_at(page, plan, row, minutes * 60, rows=8))  # noqa: E731
        assert at(2, 125) == ["TQ-111", "CMM (Measuring machine)", "07:00 – 08:10, 20 min of work, "
                              "50 min closed, set-up to 07:05",
                              "order ends 09:55, due 11:15, 1 h 20 to spare", "then 5 min on the way",
                              "not before 07:00"]  # fmt: skip
        assert at(6, 8) == [
            "changeover",
            "COAT",
            "changeover from grey primer to black: 15 min, 06:00 – 06:15",
        ]
        assert at(6, 50) == ["10 min idle", "COAT could work 06:45 – 06:55"]
        assert at(0, 188) == ["tea", "the whole hall is shut 09:00 – 09:15"]
        assert at(7, 400)[0] == "not open"
        assert at(-1, 500) == ["crew painters", "14:20: 1 of 1 head at work"]
        assert at(0, 500) == []

    def test_details_tell_of_family_changeover_heads_and_set_up(self, show):
        plan = floor_plan()
        page = show(plan)
        assert plain(tip_at(page, plan, 6, 40 * 60, rows=8)) == [
            "TQ-103",
            "COAT (Coating booth)",
            "06:15 – 06:45, 30 min, set-up to 06:20",
            "family black",
            "changeover from grey primer to black: 15 min, 06:00 – 06:15",
            "1 head of crew painters",
            "order ends 09:45, due 11:15, 1 h 30 to spare",
            "then 5 min on the way",
        ]
        press = plain(tip_at(page, plan, 3, 40 * 60, rows=8))
        assert "1 head of crew fitters for the set-up only" in press
        parts = plain(tip_at(page, plan, 1, 8 * 60, rows=8))
        assert "part 1 of 2" in parts

    def test_the_route_of_a_lit_order_has_its_ways(self, show):
        plan = floor_plan()
        page = show(plan)
        page.fill("#find", "TQ-112")
        page.wait_for_selector("#route li")
        assert page.locator("#route li.way").all_text_contents() == [
            *("10 min on the way", "5 min on the way", "5 min on the way"),
        ]
        assert page.locator("#route li:not(.way)").count() == 4
        assert "set-up to 09:45" in page.text_content("#route")

    def test_ways_are_drawn_in_rows_of_orders(self, show):
        plan = floor_plan()
        page, still = (
            show(plan),
            show(replace(plan, shop=replace(plan.shop, transport=type(plan.shop.transport)()))),
        )
        page.click("#as-orders")
        still.click("#as-orders")
        assert pixels(page) != pixels(still)

    def test_the_table_has_the_floors_columns_where_they_are_used(self, show):
        plan = floor_plan()
        page, runs, say = show(plan), Runs(plan), plan.shop.clock.say
        rows = table_rows(page)
        heads = page.locator("#table th").all_text_contents()
        assert heads == [
            *("Start", "End", "Machine", "Unit", "Order", "Round", "Part", "Set-up to", "Closed", "Family"),
            *("Changeover before", "Heads", "On the way after", "Due", "Standing", "Note"),
        ]
        for place, row in enumerate(rows):
            cells = dict(zip(heads, row, strict=True))
            set_up = int(runs.set_up_s[place])
            assert cells["Set-up to"] == (say(int(runs.set_up_end_s[place])) if set_up else "")
            assert cells["Family"] == runs.families[runs.family[place]]
            assert cells["Heads"] == str(runs.heads[place] or "")
            assert bool(cells["Changeover before"]) == bool(runs.change_s[place])
            assert bool(cells["On the way after"]) == bool(runs.way_s[place])
            assert bool(cells["Closed"]) == bool(
                runs.worked_s[place] < plan.schedule[place].end_s - plan.schedule[place].start_s
            )
        page = show(hall_plan(60))
        table_rows(page)
        assert page.locator("#table th").count() == 10

    def test_a_binding_crew_is_marked(self, show):
        plan = floor_plan()
        bound = crew_bound(plan.shop, "fitters", plan.makespan_s)
        page, other = show(replace(plan, bounds=(bound,))), show(plan)
        assert "crew fitters" in page.text_content(".summary")
        assert pixels(page) != pixels(other)

    def test_closures_overlap_a_break_without_counting_twice(self, show):
        plan = floor_plan()
        machines = tuple(
            replace(machine, closed=(*machine.closed, Closure(185 * 60, 190 * 60, "filter")))
            if machine.id == "CMM" else machine
            for machine in plan.shop.machines
        )  # fmt: skip
        page = show(replace(plan, shop=replace(plan.shop, machines=machines)))
        rows = table_rows(page)
        closed = page.locator("#table th").all_text_contents().index("Closed")
        assert [row[closed] for row in rows if row[2] == "CMM" and row[closed]] == ["50 min", "15 min"]

    def test_hostile_reasons_families_and_crews_stay_text(self, show):
        view = gantt_view(floor_plan())
        wild = replace(
            view,
            closures=tuple(replace(shut, reason=HOSTILE[0]) for shut in view.closures),
            families=tuple(replace(family, name=HOSTILE[1]) for family in view.families),
            family_groups=tuple(replace(group, name=HOSTILE[2]) for group in view.family_groups),
            crews=tuple(replace(crew, crew=HOSTILE[5]) for crew in view.crews),
            rows=tuple(replace(row, crew=HOSTILE[1] if row.crew else "") for row in view.rows),
        )
        page = show(page_of(wild))
        page.click("#by-family")
        plan = floor_plan()
        assert tip_at(page, plan, 0, 188 * 60, rows=8)[0] == HOSTILE[0]
        assert HOSTILE[1] in "".join(plain(tip_at(page, plan, 6, 40 * 60, rows=8)))
        table_rows(page)
        counts = page.evaluate(
            "['img', 'a', 'b i', 'iframe'].map((t) => document.querySelectorAll(t).length)"
        )
        assert counts == [0, 0, 0, 0]
        assert page.evaluate("document.scripts.length") == 3
        assert HOSTILE[2] in "".join(legend(page))

    @pytest.mark.parametrize("size", [(1280, 800), (390, 844)])
    def test_it_fits_screens_and_has_no_serious_fault_of_access(self, show, size):
        axe = pytest.importorskip(
            "axe_playwright_python.sync_playwright", reason="needs axe-playwright-python"
        )
        page = show(floor_plan(), width=size[0], height=size[1])
        page.click("#by-family")
        page.fill("#find", "TQ-112")
        page.wait_for_selector("#route li.way")
        table_rows(page)
        assert page.evaluate("document.documentElement.scrollWidth") <= size[0]
        found = axe.Axe().run(page).response["violations"]
        assert [fault["id"] for fault in found if fault["impact"] in ("serious", "critical")] == []

    def test_crews_and_closures_print(self, show, tmp_path):
        if shutil.which("pdftotext") is None:
            pytest.skip("pdftotext is not installed (apt-get install poppler-utils)")
        page = show(floor_plan())
        pdf = tmp_path / "gantt.pdf"
        page.pdf(path=str(pdf), format="A4", prefer_css_page_size=True, landscape=True)
        done = subprocess.run(["pdftotext", "-layout", pdf, "-"], capture_output=True, text=True, check=True)
        sheets = done.stdout.split("\f")[:-1]
        assert len(sheets) == 1
        assert "idle where it binds" in sheets[0]
        assert "This is a plan, not a permit." in sheets[0]

    def test_a_row_looked_at_stays_when_fewer_fit(self, show):
        page = show(floor_plan())
        page.click("#as-orders")
        page.fill("#find", "TQ-105")
        page.wait_for_selector("#route li")
        page.wait_for_timeout(100)
        lit = page.evaluate(
            """() => {
              const canvas = document.getElementById("marks"), scale = canvas.width / canvas.clientWidth;
              const data = canvas.getContext("2d").getImageData(1, 0, 1, canvas.height).data;
              return [...data].filter((value, i) => i % 4 === 3 && value === 255).length / scale;
            }"""
        )
        assert lit > 10  # the mark beside the name of the lit row


@needs_browser
class TestVeryMany:
    def test_it_opens_in_detail_and_shows_the_whole_as_load(self, show):
        page = show(MANY)
        assert page.text_content("#drawn") == (
            "Drawn in detail: 06:00 – 14:06. More time at once is drawn as load by machine."
        )
        detail = pixels(page)
        page.click("#whole")
        assert page.text_content("#drawn") == (
            "Drawn as load: the height of a block is the share of that time a machine is busy. "
            "Show less time (+) for single operations."
        )
        assert pixels(page) != detail
        page.click("#as-orders")
        assert page.text_content("#drawn") == ""
        page.click("#as-orders")
        page.click("#opening")
        assert pixels(page) == detail

    def test_a_block_of_load_says_how_busy(self, show):
        page = show(many_plan(60_000), width=1280)
        page.click("#whole")
        box = page.locator("#chart").bounding_box()
        page.mouse.move(box["x"] + 600, box["y"] + 200)
        lines = page.locator("#tip p").all_text_contents()
        assert re.fullmatch(r"M\d\d", lines[0])
        assert re.fullmatch(r".+ – .+: busy about \d+% of the time", lines[1])
        assert re.fullmatch(r"about \d+ operations?; show less time to see them", lines[2])
        page.mouse.click(box["x"] + 600, box["y"] + 200)
        assert answer(page).startswith("Click a bar")

    def test_an_order_found_comes_into_detail_and_lights_in_load(self, show):
        page = show(MANY)
        page.fill("#find", "TQ-004000")
        page.wait_for_selector("#route li")
        assert page.locator("#route li").count() == 8
        page.click("#whole")
        before = pixels(page, "marks")
        page.focus("#chart")
        page.keyboard.press("Escape")
        assert pixels(page, "marks") != before

    def test_what_is_left_out_is_said_and_drawn_as_load(self, show):
        page = show(CUT)
        assert re.fullmatch(
            r"This page leaves out [\d,]+ of 300,000 operations \(those from .+ on\); "
            r"plan\.csv has every operation and every note\.",
            page.text_content(".left-out"),
        )
        page.click("#late-only")
        assert answer(page).endswith(" orders late on this page.")
        page.fill("#find", CUT.shop.orders.ids[-1])
        page.wait_for_function("() => document.getElementById('answer').textContent.startsWith('No order')")
        assert answer(page) == "No order or note on this page holds this text."
        assert page.evaluate("document.documentElement.scrollWidth") <= 1280

    def test_beyond_the_last_bar_there_is_load(self, show):
        view = gantt_view(many_plan(60_000, floor=True))
        early = replace(view, detail_s=4 * HOUR)
        page, whole = show(page_of(early)), show(page_of(view))
        assert pixels(page) != pixels(whole)

    def test_few_elements_and_no_sideways_scrolling_on_a_phone(self, show):
        page = show(CUT, width=390, height=844)
        assert page.evaluate("document.querySelectorAll('*').length") <= 800
        assert page.evaluate("document.documentElement.scrollWidth") <= 390
        page.click("#whole")
        assert page.text_content("#drawn").startswith("Drawn as load")

    def test_time_from_zero_works_as_well(self, show):
        plan = many_plan(60_000)
        page = show(replace(plan, shop=replace(plan.shop, clock=Clock(), shift_end_s=None)))
        assert page.text_content("#drawn").startswith("Drawn in detail: 0:00 – 8:06.")
