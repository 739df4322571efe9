"""What the Gantt page shows, said exactly: summary, rows, lines, window, clock changes."""

from __future__ import annotations

import re
from dataclasses import fields, replace
from datetime import datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.calendar import HOUR, Clock
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Operations, Orders, Shop
from shopfloor.render import gantt_view as views
from shopfloor.render.gantt_view import BY_LATENESS, MachineRow, MarkedTime, gantt_view, what_binds
from shopfloor.render.html import CARE_NOTICE
from tests.render.expected import round_plan, small_plan
from tests.render.plans import HOSTILE, SHIFT, hall_plan

SIZES = [hall_plan(200), hall_plan(200, rounds=True), hall_plan(2000, clock=Clock(), shift_end_s=None)]


def empty_plan() -> Plan:
    shop = Shop(machines=(), orders=Orders(()), operations=Operations([], [], []))
    return Plan(shop=shop, schedule=Schedule([], [], []), bounds=(), choice=Choice("none", "nothing", {}))


def lines_of(plan: Plan) -> dict[str, str]:
    return {line.label: line.text for line in gantt_view(plan).summary}


@pytest.mark.parametrize(
    "kind", [views.GanttView, views.OrderColumns, views.BarColumns, views.MachineRow, views.ColourGroup]
)
def test_every_field_is_explained(kind):
    for field in fields(kind):
        assert re.search(rf"\b{field.name}\b", kind.__doc__), f"{kind.__name__}.{field.name}"


@pytest.mark.parametrize("plan", SIZES)
def test_the_drawn_schedules_are_legal(plan):
    """The factory of these tests: no unit runs two operations at once, no order is in two places."""
    view = gantt_view(plan)
    for key in (view.bars.row, view.bars.order):
        order = np.lexsort((view.bars.start_s, key))
        same = key[order][1:] == key[order][:-1]
        assert (view.bars.end_s[order][:-1] <= view.bars.start_s[order][1:])[same].all()


@pytest.mark.parametrize("plan", SIZES)
def test_bars_say_what_the_plan_says(plan):
    view = gantt_view(plan)
    for bar, piece in enumerate(plan.schedule):
        operation, row = plan.shop.operation(piece.operation), view.rows[view.bars.row[bar]]
        assert (row.machine, row.unit or 1) == (operation.machine_id, piece.unit)
        assert view.orders.ids[view.bars.order[bar]] == operation.order
        assert (view.bars.start_s[bar], view.bars.end_s[bar]) == (piece.start_s, piece.end_s)
        assert view.bars.notes.get(bar, "") == operation.note
        assert view.bars.round[bar] == (piece.round or 0)


@pytest.mark.parametrize("plan", SIZES)
def test_colour_tells_lateness(plan):
    view, late = gantt_view(plan), {row.order for row in plan.late_orders()}
    for bar in range(len(view.bars)):
        order = int(view.bars.order[bar])
        name = view.groups[view.bars.group[bar]].name
        if view.orders.due_s[order] < 0:
            assert name == "no due time"
        else:
            assert name == ("late" if view.orders.ids[order] in late else "on time")


def test_without_due_times_all_bars_look_alike_and_plain():
    view = gantt_view(hall_plan(60, due=False))
    assert [(group.name, group.pattern) for group in view.groups] == [("no due time", "plain")]
    assert not view.bars.group.any()


def luminance(colour: str) -> float:
    """Relative luminance, WCAG 2.2."""
    parts = [int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)]
    linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(first: str, second: str) -> float:
    low, high = sorted((luminance(first), luminance(second)))
    return (high + 0.05) / (low + 0.05)


def test_groups_stay_apart_without_colour():
    """Text on a fill reaches contrast 7, fills differ in brightness by a third, no pattern serves twice."""
    assert len({group.pattern for group in BY_LATENESS}) == len(BY_LATENESS)
    for group in BY_LATENESS:
        assert contrast(group.fill, group.ink) >= 7
    for first in BY_LATENESS:
        for second in BY_LATENESS:
            assert first is second or contrast(first.fill, second.fill) >= 1.33


# ---- words ---------------------------------------------------------------------------------------


def test_words_of_a_plan_that_meets_its_bound():
    view = gantt_view(hall_plan(150), stamp="05:40")
    assert view.title == "Shift plan, Monday 2 March 2026 from 06:00"
    assert view.subtitle == "orders.csv: 150 operations, 30 orders, 9 machines"
    assert (view.finish, view.verdict, view.stamp) == ("13:05", "proved: nothing can end earlier", "05:40")
    assert [(line.label, line.text) for line in view.summary] == [
        ("Bound", "Coating has 7 h 05 of work for this shift, so nothing can end before 13:05."),
        ("Binds", "machine Coating"),
        ("Late", "5 of 22 orders: TQ-1003 by 20 min, TQ-1010 by 20 min, TQ-1020 by 15 min, "
                 "TQ-1027 by 5 min, TQ-1028 by 5 min"),
        ("Shift", "all fits; the shift ends 14:00, 55 min to spare"),
        ("Would help", "One more unit of CMM would let everything end by 12:40, 25 min earlier."),
    ]  # fmt: skip
    assert view.lines == (
        MarkedTime("proved", 25500, "ends 13:05: bound = finish, proved", "ends 13:05, proved"),
        MarkedTime("shift", 28800, "shift ends 14:00", "shift ends 14:00"),
    )
    assert view.care == CARE_NOTICE


def test_words_of_a_plan_above_its_bound():
    view = gantt_view(hall_plan(150, idle_s=900))
    assert (view.finish, view.verdict) == ("13:20", "15 min (3.5%) above the bound")
    bound = "Coating has 7 h 05 of work for this shift, so nothing can end before 13:05."
    assert view.lines[:2] == (
        MarkedTime("bound", 25500, bound, "bound 13:05"),
        MarkedTime("finish", 26400, "ends 13:20, 15 min (3.5%) above the bound", "ends 13:20"),
    )


def test_the_shift_line_names_what_is_not_done():
    assert lines_of(small_plan())["Shift"] == "overruns 08:20 by 5 min; 1 order is not done by then: =3"
    assert lines_of(hall_plan(2000))["Shift"] == (
        "overruns 14:00 by 29 h 55; 400 orders are not done by then: "
        "TQ-1001, TQ-1002, TQ-1003, TQ-1004, TQ-1005 and 395 more"
    )


def test_a_line_is_left_out_where_nothing_is_known():
    plan = replace(hall_plan(150, due=False, shift_end_s=None), would_help=())
    assert list(lines_of(plan)) == ["Bound", "Binds"]
    assert list(lines_of(round_plan())) == ["Bound"]


def test_help_is_offered_only_where_a_plan_is_late_or_overruns():
    fits = hall_plan(100, due=False)
    assert fits.would_help
    assert "Would help" not in lines_of(fits)
    late = replace(fits, shop=replace(fits.shop, shift_end_s=HOUR))
    assert "Would help" in lines_of(late)


def test_what_binds_names_ties():
    plan = hall_plan(150)
    best = plan.bounds[0]
    tied = [replace(best, kind="order", witness={"order": f"TQ-{1001 + k}"}) for k in range(5)]
    assert lines_of(replace(plan, bounds=(best, *tied)))["Binds"] == (
        "machine Coating; just as long: order TQ-1001, order TQ-1002, order TQ-1003 and 2 more"
    )


@pytest.mark.parametrize(
    ("witness", "expected"),
    [
        ({"order": "TQ-1"}, ("order", "TQ-1")),
        ({"machine": "CMM", "from_s": 0}, ("machine", "CMM")),
        ({"node": "order", "id": "TQ-1", "operations": 3}, ("order", "TQ-1")),
        ({"node": "machine", "id": "CMM"}, ("machine", "CMM")),
        ({"crew": "day", "from_s": 0}, ("", "")),
        ({"solver": "CP-SAT"}, ("", "")),
    ],
)
def test_a_witness_names_a_machine_or_an_order(witness, expected):
    assert what_binds(Bound("any", 1, witness, "")) == expected


def test_rows_number_only_units_of_groups_and_mark_what_binds():
    view = gantt_view(small_plan())
    assert view.rows == (
        MachineRow("Wash", 1, "Washing bay", False),
        MachineRow("Wash", 2, "Washing bay", False),
        MachineRow("CMM", 0, "Measuring machine", True),
        MachineRow("Coat", 0, "", False),
        MachineRow("Engrave", 0, "", False),
    )
    assert [row.label for row in view.rows] == ["Wash unit 1", "Wash unit 2", "CMM", "Coat", "Engrave"]
    assert view.orders.binds == -1


def test_a_binding_order_is_marked():
    plan = hall_plan(150)
    bound = Bound("order", plan.makespan_s, {"order": "TQ-1007"}, "")
    assert gantt_view(replace(plan, bounds=(bound,))).orders.binds == 6


def test_an_empty_plan_has_a_view():
    view = gantt_view(empty_plan())
    assert (view.verdict, view.summary, view.lines, view.rows) == ("there is nothing to do", (), (), ())
    assert view.horizon_s > 0


# ---- times ---------------------------------------------------------------------------------------


def test_a_short_plan_opens_whole_and_a_long_one_on_a_shift():
    assert gantt_view(hall_plan(200)).window_s == (0, 34200)
    assert gantt_view(hall_plan(2000)).window_s == (0, 8 * HOUR)
    assert gantt_view(hall_plan(2000, shift_end_s=10 * HOUR)).window_s == (0, 10 * HOUR)
    assert gantt_view(hall_plan(2000, clock=Clock(), shift_end_s=None)).window_s == (0, 8 * HOUR)


def test_a_plan_that_begins_late_opens_where_work_begins():
    plan = hall_plan(2000)
    schedule = plan.schedule
    later = Schedule(
        schedule.operation, schedule.start_s + 30 * HOUR, schedule.end_s + 30 * HOUR, schedule.unit
    )
    assert gantt_view(replace(plan, schedule=later)).window_s == (30 * HOUR, 38 * HOUR)


def test_rounds_are_marked_only_where_all_start_together():
    assert gantt_view(round_plan()).rounds_s == tuple(range(0, 6 * 1800, 1800))
    assert gantt_view(small_plan()).rounds_s == ()
    plan = round_plan()
    start = plan.schedule.start_s.copy()
    start[1] += 60
    uneven = Schedule(plan.schedule.operation, start, start + 1800, round=plan.schedule.round)
    assert gantt_view(replace(plan, schedule=uneven)).rounds_s == ()


def test_breaks_are_closures_of_the_whole_hall():
    closures = gantt_view(small_plan()).closures
    assert [(shut.row, shut.start_s, shut.end_s, shut.reason) for shut in closures] == [
        (None, 3600, 4500, "tea")
    ]


@given(
    st.sampled_from(["Europe/Berlin", "America/New_York", "Australia/Lord_Howe", "Asia/Kolkata"]),
    st.datetimes(datetime(2026, 1, 1), datetime(2026, 12, 1)),
    st.integers(1, 21 * 24),
)
def test_clock_changes_give_back_the_wall_clock(zone, start, hours):
    """At every hour, and on both sides of every change, elapsed time plus offset is what the clock says."""
    clock = Clock(start.replace(second=0, microsecond=0), ZoneInfo(zone))
    changes = views._clock_changes(clock, hours * HOUR)
    edges = [moment for at, _ in changes[1:] for moment in (at - 1, at)]
    for seconds in [*range(0, hours * HOUR, HOUR), *edges]:
        ahead = [offset for at, offset in changes if at <= seconds][-1]
        assert clock.start + timedelta(seconds=seconds + ahead) == clock.moment(seconds)


def test_the_clock_change_of_a_night_shift_is_found_to_the_second():
    """Europe/Berlin goes from 02:00 to 03:00 on 29 March 2026."""
    clock = Clock(datetime(2026, 3, 28, 22, 0), ZoneInfo("Europe/Berlin"))
    assert views._clock_changes(clock, 8 * HOUR) == ((0, 0), (4 * HOUR, HOUR))
    assert views._clock_changes(SHIFT, 8 * HOUR) == ((0, 0),)


def test_hostile_names_pass_through_unchanged():
    view = gantt_view(hall_plan(60, names=HOSTILE))
    assert view.orders.ids[: len(HOSTILE)] == HOSTILE
