"""Pages of very large plans: load held against counting, what is left out, how large pages get."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.calendar import HOUR
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.render import gantt_limits as limits
from shopfloor.render.gantt import gantt_page
from shopfloor.render.gantt_data import pack, page_data
from shopfloor.render.gantt_facts import gantt_view
from shopfloor.render.runs import Runs
from tests.render.floor import floor_plan
from tests.render.plans import hall_plan, many_plan


@given(
    st.lists(st.tuples(st.integers(0, 30), st.integers(1, 40), st.integers(0, 2)), max_size=12),
    st.integers(1, 500),
)
@settings(deadline=None)
def test_load_is_the_share_of_each_step_that_a_row_is_busy(pieces, horizon):
    """Against counting second by second; pieces are a pause, a length and a row."""
    free, rows = [0, 0, 0], []
    for pause, length, row in pieces:
        rows.append((row, free[row] + pause, free[row] + pause + length))
        free[row] = rows[-1][2]
    row, start, end = (
        np.array(column, np.int64) for column in (zip(*rows, strict=True) if rows else ([],) * 3)
    )
    shop = Shop(
        tuple(Machine(f"M{k}") for k in range(3)), Orders(("TQ-1",)), Operations(0 * row, row, end - start)
    )
    runs = Runs(Plan(shop, Schedule(np.arange(len(row)), start, end), (), Choice("by hand", "a test", {})))
    load = limits.load(runs, 3, horizon)
    assert load.steps == -(-horizon // load.step_s)
    for place in range(3):
        busy = np.zeros(load.steps * load.step_s + 5000, bool)
        for _, begin, done in (piece for piece in rows if piece[0] == place):
            busy[begin:done] = True
        for step in range(load.steps):
            counted = busy[step * load.step_s : (step + 1) * load.step_s].mean()
            shown = load.share[place * load.steps + step]
            assert (shown == 0) == (counted == 0)
            assert (shown == 31) == (counted == 1)
            assert abs(shown / 31 - counted) <= 1 / 15


def test_steps_of_load_are_bounded_and_of_whole_minutes():
    load = gantt_view(many_plan(60_000)).load
    assert load.step_s % 60 == 0
    assert load.steps <= 2000
    assert len(load.share) == 60 * load.steps <= 200_000


@pytest.mark.parametrize("plan", [hall_plan(200), floor_plan(), many_plan(50_000, floor=True)])
def test_a_plan_of_fair_size_is_whole_and_without_load(plan):
    view = gantt_view(plan)
    assert (view.load, view.left_out, view.detail_s) == (None, "", view.horizon_s)
    assert len(view.bars) == len(plan.schedule)


def test_two_hundred_thousand_plain_operations_are_all_on_the_page():
    plan = many_plan(200_000)
    view = gantt_view(plan)
    assert len(view.bars) == 200_000
    assert view.load is not None
    assert view.left_out == ""
    assert len(gantt_page(plan).encode()) <= 8_000_000


@pytest.mark.parametrize(
    ("plan", "missing"),
    [
        (many_plan(200_000, floor=True), r"[\d,]+ of 200,000 operations \(those from 2026-[-\d: ]+ on\)"),
        (
            many_plan(200_000, names=80, notes=True),
            r"[\d,]+ of 200,000 operations .* and [\d,]+ of 25,000 notes",
        ),
        (many_plan(600_000, floor=True, names=30, notes=True), r"[\d,]+ of 600,000 operations .* notes"),
    ],
    ids=["every rule", "long names and notes", "everything"],
)
def test_what_does_not_fit_is_left_out_and_said(plan, missing):
    page = gantt_page(plan)
    assert len(page.encode()) <= 8_000_000
    said = re.search(r'<p class="left-out"><bdi>(.*?)</bdi></p>', page)[1]
    assert re.fullmatch(
        rf"This page leaves out {missing}; plan\.csv has every operation and every note\.", said
    )


def test_the_page_has_every_bar_up_to_the_time_it_says():
    plan = many_plan(200_000, floor=True)
    view = gantt_view(plan)
    kept = len(view.bars)
    assert plan.schedule.start_s[kept] == view.detail_s
    assert (view.bars.start_s == plan.schedule.start_s[:kept]).all()
    ids = plan.shop.orders.ids
    names = [view.orders.ids[order] for order in view.bars.order[-100:].tolist()]
    assert names == [ids[job] for job in plan.shop.operations.job[plan.schedule.operation[kept - 100 : kept]]]
    assert (view.changeovers.bar < kept).all()


def test_an_order_that_is_cut_off_keeps_its_true_finish():
    plan = many_plan(200_000, floor=True)
    view = gantt_view(plan)
    finish = dict(zip(plan.shop.orders.ids, plan.schedule.completion_s(
        plan.shop.operations.job, len(plan.shop.orders)).tolist(), strict=True))  # fmt: skip
    assert view.orders.finish_s.tolist() == [finish[order] for order in view.orders.ids]
    assert (view.orders.finish_s > view.detail_s).any()


def test_rows_beyond_the_most_are_left_out(monkeypatch):
    monkeypatch.setattr(limits, "ROWS", 5)
    view = gantt_view(floor_plan())
    assert [row.label for row in view.rows] == ["WASH", "BLAST", "CMM", "PRESS unit 1", "PRESS unit 2"]
    assert int(view.bars.row.max()) == 4
    assert view.left_out.startswith(
        "This page leaves out 26 of 50 operations and parts and 3 of 8 machines and units;"
    )
    assert page_data(view)["load"]["size"] == 5 * view.load.steps


def test_a_note_said_twice_takes_room_once(monkeypatch):
    monkeypatch.setattr(limits, "NOTE_BYTES", 100)
    assert limits.some_notes({0: "x" * 60, 4: "x" * 60, 9: "x" * 60, 11: "y" * 60}) == dict.fromkeys(
        (0, 4, 9), "x" * 60
    )


@given(st.integers(1, 10**6))
def test_letters_are_what_packing_takes(most):
    zero_and_most = pack(np.array([0, most]))
    assert limits._letters(most + 1) == len(zero_and_most) - 1


def test_a_day_of_crew_steps_is_whole():
    view = gantt_view(floor_plan())
    assert all(crew.at_s[-1] == view.horizon_s for crew in view.crews)
    assert view.horizon_s > 9 * HOUR
