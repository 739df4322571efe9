"""The Gantt page in a real browser: what it shows, does, prints, and never does."""

from __future__ import annotations

import re
import shutil
import subprocess
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from zoneinfo import ZoneInfo

import pytest

from shopfloor.model.calendar import HOUR, Clock
from shopfloor.render.gantt import gantt_page, page_of
from shopfloor.render.gantt_facts import gantt_view
from shopfloor.render.gantt_view import ShutTime
from shopfloor.render.html import CARE_NOTICE
from tests.render.browser import answer, axis, find_bar, needs_browser, opened, pixels, pressed, table_rows
from tests.render.expected import small_plan
from tests.render.plans import HOSTILE, hall_plan
from tests.render.test_gantt import full_view
from tests.render.test_gantt_view import empty_plan

NIGHT = Clock(datetime(2026, 3, 28, 22, 0), ZoneInfo("Europe/Berlin"))  # the clocks go forward at 02:00
ELAPSED = {"clock": Clock(), "shift_end_s": None}


@needs_browser
class TestWhatItShows:
    def test_an_order_due_before_the_shift_is_late_by_the_whole_of_it(self, show):
        plan = small_plan()
        due = plan.shop.orders.due_s.copy()
        due[:2] = -1, -12 * HOUR
        page = show(replace(plan, shop=replace(plan.shop, orders=replace(plan.shop.orders, due_s=due))))
        for order, ends in (
            ("TQ-01", "05:59:59, late by 1 h 30 min 1 s"),
            ("TQ-02", "Sun 18:00, late by 13 h 35"),
        ):
            page.fill("#find", order)
            page.wait_for_function(
                "(id) => document.getElementById('answer').textContent.includes(id)", arg=order
            )
            assert f"due {ends}." in answer(page)

    @pytest.mark.parametrize(
        "plan",
        [
            hall_plan(60, clock=NIGHT),
            hall_plan(100, rounds=True, **ELAPSED),
            small_plan(),
            hall_plan(60, names=HOSTILE),
        ],
        ids=["clock change", "elapsed rounds", "parts", "hostile"],
    )
    def test_the_table_is_the_plan(self, show, plan):
        """Every value unpacked in the page and every time it says equals what the model says."""
        shop, say = plan.shop, plan.shop.clock.say
        late = {row.order for row in plan.late_orders()}
        expected = []
        for piece in plan.schedule:
            operation = shop.operation(piece.operation)
            due = shop.orders[operation.job].due_s
            standing = "no due time" if due is None else "late" if operation.order in late else "on time"
            expected.append(
                [
                    say(piece.start_s),
                    say(piece.end_s),
                    operation.machine_id,
                    str(piece.unit) if shop.machines[operation.machine].count > 1 else "",
                    operation.order,
                    str(piece.round or ""),
                    f"{piece.part} of {piece.parts}" if piece.parts > 1 else "",
                    "" if due is None else say(due),
                    standing,
                    operation.note,
                ]
            )
        page = show(plan, zone="America/New_York")
        rows, heads = table_rows(page), page.locator("#table th").all_text_contents()
        plain = [place for place, head in enumerate(heads) if head != "Closed"]  # that only a break brings
        assert [[row[place] for place in plain] for row in rows] == expected

    def test_the_table_comes_in_pages_of_500(self, show):
        page = show(hall_plan(1200))
        assert len(table_rows(page)) == 500
        assert page.text_content("#table caption") == "Operations 1 to 500 of 1200, by start"
        assert page.is_disabled("#table-before")
        page.click("#table-after")
        page.click("#table-after")
        assert page.text_content("#table caption") == "Operations 1001 to 1200 of 1200, by start"
        assert page.is_disabled("#table-after")

    def test_summary_and_care_are_in_sight(self, show):
        page = show(hall_plan(150))
        assert page.locator(".summary dt").all_text_contents() == [
            "Bound",
            "Binds",
            "Late",
            "Shift",
            "Would help",
        ]
        care = page.locator("footer .care")
        assert care.text_content() == CARE_NOTICE
        box = care.bounding_box()
        assert box["y"] + box["height"] <= 800
        assert page.evaluate("document.documentElement.scrollWidth") <= 1280

    def test_a_phone_needs_no_sideways_scrolling(self, show):
        page = show(hall_plan(150), width=390, height=844)
        assert page.evaluate("document.documentElement.scrollWidth") <= 390
        assert page.locator("#chart").bounding_box()["height"] >= 300

    @pytest.mark.parametrize("size", [200, 20_000])
    def test_few_elements_at_any_size(self, show, size):
        assert show(hall_plan(size)).evaluate("document.querySelectorAll('*').length") <= 800

    def test_it_opens_on_a_shift_and_shows_the_whole_on_demand(self, show):
        page = show(hall_plan(2000, **ELAPSED))
        begin, end = axis(page)[1]
        assert -600 < begin <= 0
        assert 8 * HOUR <= end < 8 * HOUR + 600
        page.click("#whole")
        assert axis(page)[1][1] >= hall_plan(2000).makespan_s
        page.click("#opening")
        assert axis(page)[1] == pytest.approx([begin, end])

    def test_closures_changeovers_and_now_are_drawn(self, show):
        page = show(page_of(full_view()))
        assert {"closed", "changeover"} < set(page.locator("#legend li:visible").all_text_contents())
        assert pressed(page, "#now") == "true"
        plain = show(page_of(gantt_view(hall_plan(60))))
        assert pixels(page) != pixels(plain)
        before = pixels(page, "marks")
        page.click("#now")
        assert pressed(page, "#now") == "false"
        assert pixels(page, "marks") != before

    def test_work_across_a_break_is_told_apart_from_it(self, show):
        page = show(small_plan())
        page.fill("#find", "TQ-01")
        page.focus("#chart")
        page.keyboard.press("ArrowDown")
        page.keyboard.press("ArrowDown")
        page.keyboard.press("ArrowDown")
        assert "06:30 – 07:30, 45 min of work, 15 min closed" in page.text_content("#said")

    def test_an_empty_plan_opens(self, show):
        page = show(empty_plan())
        assert page.text_content(".verdict") == "there is nothing to do"
        page.click("#as-orders")
        page.keyboard.press("ArrowRight")


@needs_browser
class TestWhatItDoes:
    @pytest.mark.parametrize(("options", "kind"), [({}, "date"), (ELAPSED, "linear")])
    def test_turning_rows_keeps_the_window_and_the_axis(self, show, options, kind):
        page = show(hall_plan(200, **options))
        page.click("#zoom-in")
        before = axis(page)
        assert before[0] == kind
        machines = pixels(page)
        page.click("#as-orders")
        assert pressed(page, "#as-orders") == "true"
        assert pixels(page) != machines
        assert axis(page) == before
        page.click("#as-orders")
        assert (pressed(page, "#as-orders"), axis(page)) == ("false", before)
        assert pixels(page) == machines
        page.click("#zoom-out")
        assert axis(page)[0] == kind

    def test_a_click_lights_one_order_and_lists_its_route(self, show):
        plan = hall_plan(200)
        page = show(plan)
        x, y = find_bar(page)
        order = page.text_content("#tip p:first-child")
        page.mouse.click(x, y)
        assert answer(page).startswith(f"{order} is lit: 5 operations, ends ")
        job, say = plan.shop.orders.ids.index(order), plan.shop.clock.say
        route = [
            f"{say(piece.start_s)} – {say(piece.end_s)}"
            for piece in plan.schedule
            if plan.shop.operation(piece.operation).job == job
        ]
        assert page.locator("#route time").all_text_contents() == route
        page.mouse.click(x, y)
        assert answer(page).startswith("Click a bar")
        assert page.locator("#route li").count() == 0

    def test_details_follow_the_pointer_and_stay_inside_the_window(self, show):
        page = show(hall_plan(200))
        find_bar(page)
        box = page.locator("#tip").bounding_box()
        assert box["x"] >= 0
        assert box["x"] + box["width"] <= 1280
        assert box["y"] + box["height"] <= 800
        page.mouse.move(5, 5)
        assert page.is_hidden("#tip")

    def test_search_finds_orders_and_notes(self, show):
        page = show(hall_plan(2000))
        page.get_by_label("Find order or note").fill("tq-1100")
        page.wait_for_selector("#route li")
        assert answer(page).startswith("TQ-1100 is lit: 5 operations")
        page.fill("#find", "gloves")
        page.wait_for_function("() => document.getElementById('answer').textContent.includes('found')")
        assert re.fullmatch(r"\d+ orders found\. Enter lights them one after the other\.", answer(page))
        page.press("#find", "Enter")
        first = answer(page)
        page.press("#find", "Enter")
        assert answer(page) != first
        assert "handle with gloves" in page.text_content("#route")
        page.fill("#find", "no such thing")
        page.wait_for_function("() => document.getElementById('answer').textContent.startsWith('No order')")
        page.press("#find", "Escape")
        assert page.input_value("#find") == ""

    def test_a_found_order_comes_into_sight(self, show):
        page = show(hall_plan(2000, **ELAPSED))
        width = axis(page)[1][1] - axis(page)[1][0]
        plan = hall_plan(2000, **ELAPSED)
        last = plan.shop.operation(plan.schedule[len(plan.schedule) - 1].operation)
        page.click("#as-orders")
        page.fill("#find", last.order)
        page.wait_for_selector("#route li")
        begin, end = axis(page)[1]
        assert end - begin == pytest.approx(width)
        pieces = [p for p in plan.schedule if plan.shop.operation(p.operation).job == last.job]
        assert any(piece.start_s < end and piece.end_s > begin for piece in pieces)

    def test_late_only_leaves_late_orders(self, show):
        plan = hall_plan(200)
        page = show(plan)
        page.click("#late-only")
        assert answer(page) == f"{len(plan.late_orders())} orders late."
        page.click("#as-orders")
        page.focus("#chart")
        seen = set()
        for _ in range(len(plan.late_orders()) + 2):
            page.keyboard.press("ArrowDown")
            seen.add(re.sub("[\u2068\u2069]", "", page.text_content("#said")).split(":")[0])
        assert seen == {row.order for row in plan.late_orders()}

    def test_keys_reach_every_bar_of_a_row_and_light_it(self, show):
        plan = hall_plan(200)
        page = show(plan)
        page.focus("#chart")
        page.keyboard.press("ArrowRight")
        page.keyboard.press("Home")
        said = [page.text_content("#said")]
        for _ in range(60):
            page.keyboard.press("ArrowRight")
            if page.text_content("#said") == said[-1]:
                break
            said.append(page.text_content("#said"))
        first_row = [
            p for p in plan.schedule if plan.shop.operation(p.operation).machine == 0 and p.unit == 1
        ]
        assert len(said) == len(first_row)
        page.keyboard.press("Enter")
        assert " is lit: " in answer(page)
        page.keyboard.press("Escape")
        assert answer(page).startswith("Click a bar")

    def test_keys_and_wheel_move_the_window(self, show):
        page = show(hall_plan(200, **ELAPSED))
        page.focus("#chart")
        start, end = axis(page)[1]
        page.keyboard.press("+")
        begin, finish = axis(page)[1]
        assert finish - begin == pytest.approx((end - start) / 2)
        page.keyboard.press("Shift+ArrowRight")
        assert axis(page)[1][0] > begin
        page.keyboard.press("0")
        assert axis(page)[1][1] >= hall_plan(200).makespan_s
        whole = axis(page)[1]
        box = page.locator("#chart").bounding_box()
        page.mouse.move(box["x"] + box["width"] / 2, box["y"] + box["height"] / 2)
        page.mouse.wheel(0, -200)  # ten rows fit, so the wheel zooms
        page.wait_for_timeout(100)
        assert axis(page)[1][1] - axis(page)[1][0] < whole[1] - whole[0]

    def test_a_drag_moves_the_window_and_lights_nothing(self, show):
        page = show(hall_plan(200, **ELAPSED))
        page.click("#zoom-in")
        before = axis(page)[1]
        x, y = find_bar(page)
        page.mouse.down()
        page.mouse.move(x - 200, y, steps=4)
        page.mouse.up()
        page.wait_for_timeout(100)
        assert axis(page)[1][0] > before[0]
        assert answer(page).startswith("Click a bar")

    def test_more_rows_than_fit_scroll(self, show):
        page = show(hall_plan(2000))
        assert page.is_visible("#scroller")
        box = page.locator("#chart").bounding_box()
        page.mouse.move(box["x"] + 400, box["y"] + 200)
        first = pixels(page)
        page.mouse.wheel(0, 200)
        page.wait_for_timeout(100)
        assert pixels(page) != first
        page.focus("#chart")
        page.keyboard.press("PageDown")
        page.keyboard.press("PageDown")
        assert page.evaluate("document.getElementById('scroller').scrollTop") > 0

    def test_the_now_line_takes_the_wall_clock_of_this_computer(self, show, browser):
        page = show(hall_plan(200), zone="Asia/Tokyo")
        page.clock.set_fixed_time(datetime(2026, 3, 1, 23, 0, tzinfo=ZoneInfo("UTC")))  # 08:00 in Tokyo
        before = pixels(page, "marks")
        page.click("#now")
        assert pressed(page, "#now") == "true"
        assert pixels(page, "marks") != before


@needs_browser
class TestWhatItNeverDoes:
    def test_hostile_names_stay_text(self, show):
        """No image, link, dialog or element of theirs, wherever a name is shown."""
        page = show(hall_plan(60, names=HOSTILE))
        for name in HOSTILE:
            page.fill("#find", name.replace("\n", " ")[:20] if "\n" not in name else "two")
            page.wait_for_timeout(60)
        find_bar(page)
        page.click("#as-orders")
        find_bar(page)
        table_rows(page)
        counts = page.evaluate(
            "['img', 'a', 'b i', 'iframe', 'object'].map((t) => document.querySelectorAll(t).length)"
        )
        assert counts == [0, 0, 0, 0, 0]
        assert page.evaluate("document.scripts.length") == 3
        assert "<img src=x onerror=alert(1)>" in page.text_content("#table")
        assert page.evaluate("getComputedStyle(document.querySelector('#route b') ?? document.body).color")

    def test_the_policy_stops_what_is_not_ours(self, browser, tmp_path):
        file = tmp_path / "gantt.html"
        body = gantt_page(hall_plan(60)).replace(
            "</main>", "</main><script>window.ran = 1</script><img src=x onerror='window.ran = 2'>"
        )
        file.write_text(body, encoding="utf-8")
        with opened(browser, file) as (page, seen):
            assert page.evaluate("window.ran") is None
            assert any("Content Security Policy" in text for text in seen.console)

    @pytest.mark.parametrize("state", ["machines", "orders and lit", "all open"])
    def test_no_serious_fault_of_access(self, show, state):
        """axe-core finds nothing serious; it is published by Deque and shipped by axe-playwright-python."""
        axe = pytest.importorskip(
            "axe_playwright_python.sync_playwright", reason="needs axe-playwright-python"
        )
        page = show(hall_plan(150 if state == "all open" else 2000))
        if state == "orders and lit":
            page.click("#as-orders")
            page.fill("#find", "TQ-1003")
            page.wait_for_selector("#route li")
        if state == "all open":
            for summary in page.locator("summary").all():
                summary.click()
        found = axe.Axe().run(page).response["violations"]
        serious = [fault for fault in found if fault["impact"] in ("serious", "critical")]
        assert [(fault["id"], [node["html"] for node in fault["nodes"]]) for fault in serious] == []

    def test_it_reads_well_without_sight(self, show):
        page = show(hall_plan(150))
        assert page.get_attribute("html", "lang") == "en"
        assert page.title() == "Shift plan, Monday 2 March 2026 from 06:00: Gantt chart"
        assert (
            page.get_attribute("#chart", "aria-label")
            == "Gantt chart. Ends 13:05, proved: nothing can end earlier."
        )
        assert page.get_attribute("#answer", "role") == "status"
        for canvas in page.locator("main > div canvas, #chart > *").all():
            assert canvas.evaluate(
                "(e) => e.closest('[aria-hidden=true]') !== null || e.closest('#legend') !== null"
            )


@needs_browser
class TestPaper:
    def printed(self, page, folder: Path, paper: str) -> list[str]:
        pdf = folder / "gantt.pdf"
        page.pdf(path=str(pdf), format=paper, prefer_css_page_size=True, landscape=True)
        done = subprocess.run(["pdftotext", "-layout", pdf, "-"], capture_output=True, text=True, check=True)
        return done.stdout.split("\f")[:-1]

    @pytest.fixture(autouse=True)
    def _needs_poppler(self):
        if shutil.which("pdftotext") is None:
            pytest.skip("pdftotext is not installed (apt-get install poppler-utils)")

    @pytest.mark.parametrize("paper", ["A4", "Letter"])
    def test_a_small_plan_is_one_sheet_with_the_notice(self, show, tmp_path, paper):
        sheets = self.printed(show(hall_plan(150)), tmp_path, paper)
        assert len(sheets) == 1
        assert "proved: nothing can end earlier" in sheets[0]
        assert "This is a plan, not a permit." in sheets[0]
        assert "Click a bar" not in sheets[0]

    def test_every_sheet_of_a_large_plan_has_the_notice(self, show, tmp_path):
        page = show(hall_plan(20_000))
        sheets = self.printed(page, tmp_path, "A4")
        assert len(sheets) == 3
        assert all("This is a plan, not a permit." in sheet for sheet in sheets)
        assert all("06:00 – 14:06 of a plan to Sat 22:10" in sheet for sheet in sheets)

    def test_a_lit_order_prints_its_route(self, show, tmp_path):
        page = show(hall_plan(150))
        page.fill("#find", "TQ-1003")
        page.wait_for_selector("#route li")
        (sheet,) = self.printed(page, tmp_path, "A4")
        assert re.search(r"TQ-1003\W+is lit: 5 operations", sheet)
        assert "08:00 – 08:35" in sheet

    def test_rows_beyond_the_last_sheet_are_counted(self, show, tmp_path):
        page = show(hall_plan(2000))
        page.click("#as-orders")
        sheets = self.printed(page, tmp_path, "A4")
        assert len(sheets) == 12
        assert re.search(r"; \d+ more rows not printed", sheets[-1])

    def test_the_screen_is_as_before_after_printing(self, show, tmp_path):
        page = show(hall_plan(150))
        before = pixels(page), pixels(page, "marks"), axis(page)
        self.printed(page, tmp_path, "A4")
        page.wait_for_timeout(100)
        assert (pixels(page), pixels(page, "marks"), axis(page)) == before
        assert page.locator("#sheets canvas").count() == 0

    def test_closures_of_one_machine_print_on_its_sheet_only(self, show, tmp_path):
        view = gantt_view(hall_plan(60))
        shut = replace(view, closures=(ShutTime(3, 0, 7200, "calibration"),))
        page, plain = show(page_of(shut)), show(page_of(view))
        assert pixels(page) != pixels(plain)
        page.click("#as-orders")
        plain.click("#as-orders")
        assert pixels(page) == pixels(plain)
