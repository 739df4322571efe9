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
from shopfloor.model.shop import NO_DUE, Closure, Crew, Operations, Orders, Shop
from shopfloor.render import gantt_facts
from shopfloor.render import gantt_view as views
from shopfloor.render.gantt_colours import BY_LATENESS, by_family
from shopfloor.render.gantt_facts import gantt_view
from shopfloor.render.gantt_view import MachineRow, MarkedTime
from shopfloor.render.gantt_words import what_binds
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.runs import Runs
from tests.render.expected import round_plan, small_plan
from tests.render.floor import crew_bound, floor_plan
from tests.render.plans import HOSTILE, SHIFT, hall_plan

SIZES = [hall_plan(200), hall_plan(200, rounds=True), hall_plan(2000, clock=Clock(), shift_end_s=None)]


def empty_plan() -> Plan:
    shop = Shop(machines=(), orders=Orders(()), operations=Operations([], [], []))
    return Plan(shop=shop, schedule=Schedule([], [], []), bounds=(), choice=Choice("none", "nothing", {}))


def lines_of(plan: Plan) -> dict[str, str]:
    return {line.label: line.text for line in gantt_view(plan).summary}


@pytest.mark.parametrize(
    "kind",
    [
        *(views.GanttView, views.OrderColumns, views.BarColumns, views.ChangeColumns, views.CrewRow),
        *(views.MachineRow, views.ColourGroup, views.Family, views.IdleGap, views.Load),
    ],
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
        if view.orders.due_s[order] == NO_DUE:
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


FIVE = ("brass", "steel", "bronze", "cast iron", "nickel")


@pytest.mark.parametrize(
    "groups", [BY_LATENESS, by_family((*FIVE, ""), np.arange(6), np.arange(6, 0, -1))[1]], ids=len
)
def test_groups_stay_apart_without_colour(groups):
    """Text on a fill reaches contrast 7, fills differ in brightness by a third, no pattern serves twice."""
    assert len({group.pattern for group in groups}) == len(groups)
    for group in groups:
        assert contrast(group.fill, group.ink) >= 7
    for first in groups:
        for second in groups:
            assert first is second or contrast(first.fill, second.fill) >= 1.33


def test_families_with_most_work_have_fills_of_their_own():
    names = (*(f"family {k}" for k in range(7)), "")
    families, groups = by_family(names, np.arange(7), np.array([1, 9, 2, 8, 3, 7, 6]))
    assert [group.name for group in groups] == [
        *("family 1", "family 3", "family 5", "family 6"),
        "3 other families",
    ]
    assert [groups[family.group].name for family in families[:7]] == [
        *("3 other families", "family 1", "3 other families", "family 3", "3 other families"),
        *("family 5", "family 6"),
    ]


def test_no_family_has_a_fill_of_its_own_only_where_it_occurs():
    named, groups = by_family(("red", "black", ""), np.array([0, 1, 0]), np.array([5, 9, 1]))
    assert [group.name for group in groups] == ["black", "red"]
    mixed, groups = by_family(("red", "black", ""), np.array([0, 2, 0]), np.array([5, 9, 1]))
    assert [group.name for group in groups] == ["red", "no family"]
    assert [groups[family.group].name for family in mixed] == ["red", "no family", "no family"]
    assert [family.name for family in named] == ["red", "black", ""]


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
        ({"crew": "day", "from_s": 0}, ("crew", "day")),
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
    changes = gantt_facts._clock_changes(clock, hours * HOUR)
    edges = [moment for at, _ in changes[1:] for moment in (at - 1, at)]
    for seconds in [*range(0, hours * HOUR, HOUR), *edges]:
        ahead = [offset for at, offset in changes if at <= seconds][-1]
        assert clock.start + timedelta(seconds=seconds + ahead) == clock.moment(seconds)


def test_the_clock_change_of_a_night_shift_is_found_to_the_second():
    """Europe/Berlin goes from 02:00 to 03:00 on 29 March 2026."""
    clock = Clock(datetime(2026, 3, 28, 22, 0), ZoneInfo("Europe/Berlin"))
    assert gantt_facts._clock_changes(clock, 8 * HOUR) == ((0, 0), (4 * HOUR, HOUR))
    assert gantt_facts._clock_changes(SHIFT, 8 * HOUR) == ((0, 0),)


def test_hostile_names_pass_through_unchanged():
    view = gantt_view(hall_plan(60, names=HOSTILE))
    assert view.orders.ids[: len(HOSTILE)] == HOSTILE


# ---- the floor -----------------------------------------------------------------------------------


def test_closures_stand_on_the_rows_of_their_machine():
    view = gantt_view(floor_plan())
    rows = [row.label for row in view.rows]
    assert rows == ["WASH", "BLAST", "CMM", "PRESS unit 1", "PRESS unit 2", "BALANCE", "COAT", "ENGRAVE"]
    found = [
        (None if shut.row is None else rows[shut.row], shut.start_s // 60, shut.end_s // 60, shut.reason)
        for shut in view.closures
    ]
    assert found == [
        (None, 180, 195, "tea"),
        (None, 345, 375, "lunch"),
        ("CMM", 70, 120, "calibration"),
        ("ENGRAVE", 300, 600, "not open"),
    ]


def test_a_group_that_is_shut_is_shut_on_every_row_and_no_longer_than_the_chart():
    plan = floor_plan()
    machines = [
        replace(machine, closed=(Closure(0, 10**8),))
        if machine.id == "PRESS"
        else replace(machine, closed=())
        for machine in plan.shop.machines
    ]
    view = gantt_view(replace(plan, shop=replace(plan.shop, machines=tuple(machines), breaks=())))
    edge = view.horizon_s * 11 // 10
    assert [(shut.row, shut.start_s, shut.end_s, shut.reason) for shut in view.closures] == [
        (3, 0, edge, "closed"),
        (4, 0, edge, "closed"),
    ]


def test_bars_tell_of_set_up_heads_ways_and_breaks():
    plan, view = floor_plan(), gantt_view(floor_plan())
    runs = Runs(plan)
    assert view.bars.set_up_end_s.tolist() == runs.set_up_end_s.tolist()
    assert view.bars.heads.tolist() == runs.heads.tolist()
    assert view.bars.way_s.tolist() == runs.way_s.tolist()
    lengths = view.bars.end_s - view.bars.start_s
    assert (lengths - view.bars.paused_s).tolist() == runs.worked_s.tolist()
    assert [(row.crew, row.set_up_only) for row in view.rows[3:7]] == [
        *[("fitters", True)] * 2, ("fitters", False), ("painters", False),
    ]  # fmt: skip


def test_families_play_a_part_only_where_changing_them_takes_time():
    view = gantt_view(floor_plan())
    assert [(family.name, view.family_groups[family.group].name) for family in view.families] == [
        ("grey primer", "grey primer"),
        ("signal red", "signal red"),
        ("black", "black"),
        ("", "no family"),
    ]
    assert not view.by_family
    assert gantt_view(floor_plan(due=False)).by_family
    plan = floor_plan()
    free = gantt_view(replace(plan, shop=replace(plan.shop, changeovers={})))
    assert (free.families, free.family_groups, free.by_family, len(free.changeovers)) == ((), (), False, 0)


def test_idle_time_is_shown_of_the_machine_that_binds():
    plan = floor_plan()
    view = gantt_view(plan)
    assert {view.rows[gap.row].label for gap in view.gaps} == {"COAT"}
    assert all(gap.start_s < gap.end_s and gap.seconds > 0 for gap in view.gaps)
    by_crew = replace(plan, bounds=(crew_bound(plan.shop, "fitters", 1),))
    assert gantt_view(by_crew).gaps == ()


def test_a_binding_crew_is_named_and_marked():
    plan = floor_plan()
    view = gantt_view(replace(plan, bounds=(crew_bound(plan.shop, "fitters", plan.makespan_s),)))
    assert [(crew.crew, crew.binds) for crew in view.crews] == [("fitters", True), ("painters", False)]
    assert not any(row.binds for row in view.rows)
    assert ("Binds", "crew fitters") in [(line.label, line.text) for line in view.summary]


def test_of_very_many_crews_those_with_least_to_spare_are_shown():
    plan = floor_plan()
    shop = plan.shop
    spare = tuple(Crew(f"crew {k}", 50) for k in range(9))
    more = replace(plan, shop=replace(shop, crews=(*spare[:5], *shop.crews, *spare[5:])))
    view = gantt_view(more)
    assert [crew.crew for crew in view.crews] == ["crew 0", "crew 1", "crew 2", "fitters", "painters"]
    assert view.left_out == "This page leaves out 6 of 11 crews; plan.csv has every operation and every note."
