"""dispatch.html as text: what every sheet says, and that text from files stays text."""

from __future__ import annotations

import re
from dataclasses import fields, is_dataclass, replace

import numpy as np
import pytest

from shopfloor.model.calendar import Clock
from shopfloor.model.results import Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Changeovers, Crew, Machine, Operations, Orders, Shop
from shopfloor.render import dispatch_view as views
from shopfloor.render.dispatch import css_string, dispatch_page, lay_out
from shopfloor.render.dispatch_sheets import STOPS_A_STRIP, dispatch_view
from shopfloor.render.html import CARE_NOTICE, page_file
from shopfloor.render.tables import plan_id, plan_json
from tests.render.expected import assert_golden, page_text, round_plan, small_plan
from tests.render.floor import floor_plan
from tests.render.plans import HOSTILE, hall_plan


def shown_by(plan: Plan, stamp: str | None = None) -> str:
    """The page as lines, without what every sheet repeats or every release changes."""
    shown = page_text(dispatch_page(plan, stamp=stamp))
    return shown.replace(plan_id(plan_json(plan)), "PLAN-ID").replace(CARE_NOTICE, "(care notice)")


def test_text_matches_the_expected_file():
    assert_golden("dispatch.txt", shown_by(small_plan(), stamp="Mon 05:41"))


def test_text_of_a_floor_with_every_rule_matches_the_expected_file():
    assert_golden("dispatch-floor.txt", shown_by(floor_plan(8)))


def test_text_of_unit_rounds_matches_the_expected_file():
    assert_golden("dispatch-rounds.txt", shown_by(round_plan(orders=2)))


# ---- what the sheets hold ------------------------------------------------------------------------


@pytest.mark.parametrize(
    "plan", [small_plan(), round_plan(), hall_plan(200), hall_plan(200, rounds=True), floor_plan()]
)
class TestEveryPlan:
    def test_every_assignment_is_once_on_a_list_and_once_on_a_strip(self, plan):
        view, say = dispatch_view(plan), plan.shop.clock.say
        expected = sorted(
            (row.order, row.machine_id, say(piece.start_s), say(piece.end_s))
            for piece in plan.schedule
            for row in [plan.shop.operation(piece.operation)]
        )
        on_lists = [
            (run.order, sheet.machine, run.start, run.end) for sheet in view.machines for run in sheet.runs
        ]
        on_strips = [
            (strip.order, stop.machine, stop.start, stop.end) for strip in view.strips for stop in strip.stops
        ]
        assert sorted(on_lists) == expected
        assert sorted(on_strips) == expected

    def test_lists_run_in_sequence_and_are_numbered(self, plan):
        for sheet in dispatch_view(plan).machines:
            assert [run.number for run in sheet.runs] == list(range(1, len(sheet.runs) + 1))
            assert [run.start for run in sheet.runs] == sorted(run.start for run in sheet.runs)
            assert all((run.unit == 0) == (sheet.units == 1) for run in sheet.runs)

    def test_where_an_order_goes_next_agrees_with_its_strip(self, plan):
        view = dispatch_view(plan)
        routes: dict[str, list] = {}
        for strip in view.strips:
            routes.setdefault(strip.order, []).extend(strip.stops)
        for sheet in view.machines:
            for run in sheet.runs:
                route = routes[run.order]
                here = next(
                    place
                    for place, stop in enumerate(route)
                    if (stop.machine, stop.start) == (sheet.machine, run.start)
                )
                before = route[here - 1] if here else None
                after = route[here + 1] if here + 1 < len(route) else None
                assert run.before == (before and views.Move(before.machine, before.end, ""))
                assert run.after == (after and views.Move(after.machine, after.start, route[here].way))

    def test_same_plan_same_bytes(self, plan):
        assert dispatch_page(plan) == dispatch_page(replace(plan))

    def test_every_sheet_and_every_strip_has_the_care_notice(self, plan):
        page, view = dispatch_page(plan), dispatch_view(plan)
        sheets = len(view.machines) + len(view.strips) + len(view.round_sheets)
        assert page.count(CARE_NOTICE) == sheets + 1  # and the screen's index


def test_round_sheets_say_who_is_where():
    (sheet,) = dispatch_view(round_plan()).round_sheets
    assert sheet.machines == ("Bench 1", "Bench 2", "Bench 3", "Bench 4")
    assert [row.orders for row in sheet.rows] == [
        ("TQ-1", "", "", ""),
        ("TQ-2", "TQ-1", "", ""),
        ("TQ-3", "TQ-2", "TQ-1", ""),
        ("", "TQ-3", "TQ-2", "TQ-1"),
        ("", "", "TQ-3", "TQ-2"),
        ("", "", "", "TQ-3"),
    ]
    assert [(row.number, row.start, row.end) for row in sheet.rows][1] == (2, "0:30", "1:00")


def test_round_sheets_share_many_machines_evenly():
    sheets = dispatch_view(round_plan(machines=30)).round_sheets
    assert [len(sheet.machines) for sheet in sheets] == [8, 8, 7, 7]
    assert [machine for sheet in sheets for machine in sheet.machines] == [f"Bench {k}" for k in range(1, 31)]
    assert {(sheet.sheet, sheet.sheets) for sheet in sheets} == {(1, 4), (2, 4), (3, 4), (4, 4)}


def test_no_round_sheets_outside_unit_rounds():
    assert dispatch_view(small_plan()).round_sheets == ()
    assert "round sheets" not in page_text(dispatch_page(small_plan()))


def test_minutes_count_work_and_not_the_break_inside():
    """On CMM 45 minutes of work run from 06:30 to 07:30 around a break of 15."""
    cmm = dispatch_view(small_plan()).machines[1]
    assert (cmm.runs[0].minutes, cmm.runs[0].remarks) == ("45", ("pauses 07:00 – 07:15: tea",))


def test_a_long_route_is_cut_into_strips_that_fit_a_page():
    strips = dispatch_view(round_plan(orders=1, machines=2 * STOPS_A_STRIP + 1)).strips
    assert [len(strip.stops) for strip in strips] == [STOPS_A_STRIP, STOPS_A_STRIP, 1]
    assert [(strip.strip, strip.strips) for strip in strips] == [(1, 3), (2, 3), (3, 3)]
    assert strips[2].stops[0].number == 2 * STOPS_A_STRIP + 1
    assert "TQ-1 (3 of 3)" in page_text(dispatch_page(round_plan(orders=1, machines=2 * STOPS_A_STRIP + 1)))


def test_a_long_note_is_whole_on_the_list_and_cut_on_the_strip():
    note = "mind the seal face " * 20
    shop = small_plan().shop
    shop = replace(shop, operations=replace(shop.operations, notes={0: note}))
    view = dispatch_view(replace(small_plan(), shop=shop))
    assert view.machines[0].runs[0].note == note.strip()
    assert view.strips[0].stops[0].note.endswith("…")
    assert len(view.strips[0].stops[0].note) <= 120


def test_nothing_to_do():
    shop = Shop((Machine("Wash"),), Orders(("TQ-1",)), Operations([], [], []))
    plan = replace(small_plan(), shop=shop, schedule=Schedule([], [], []), bounds=())
    shown = page_text(dispatch_page(plan))
    assert "There is nothing to do." in shown
    assert "Nothing to run: Wash." in shown


def test_days_are_named_once_the_shift_passes_midnight():
    shop = Shop(
        (Machine("Wash"),), Orders(("TQ-1",)), Operations([0], [0], [1800]), clock=small_plan().shop.clock
    )
    late = Schedule([0], np.array([19 * 3600]), np.array([19 * 3600 + 1800]))
    run = dispatch_view(replace(small_plan(), shop=shop, schedule=late)).machines[0].runs[0]
    assert (run.start, run.end) == ("Tue 01:00", "Tue 01:30")


# ---- the floor -----------------------------------------------------------------------------------


def list_of(plan: Plan, machine: str) -> views.MachineList:
    return next(sheet for sheet in dispatch_view(plan).machines if sheet.machine == machine)


def titles(plan: Plan, machine: str) -> list[str]:
    """The columns of one machine's list, as printed."""
    page = lay_out(replace(dispatch_view(plan), machines=(list_of(plan, machine),), strips=()))
    return re.findall(r'<th scope="col">([A-Za-z]+)</th>', page)


def test_lists_have_columns_only_for_what_their_machine_has():
    plain = ["No", "Order", "Start", "End", "Began", "Ended", "Done"]
    assert titles(floor_plan(), "WASH") == plain
    assert titles(floor_plan(), "PRESS") == ["No", "Unit", *plain[1:]]
    assert titles(floor_plan(), "COAT") == ["No", "Order", "Family", *plain[2:]]
    plan = floor_plan()
    heads = plan.shop.operations.heads.copy()
    heads[np.flatnonzero(plan.shop.operations.machine == 4)[0]] = 1  # BALANCE takes two elsewhere
    mixed = replace(plan, shop=replace(plan.shop, operations=replace(plan.shop.operations, heads=heads)))
    assert titles(mixed, "BALANCE") == ["No", "Order", "Heads", *plain[2:]]
    assert sorted({run.heads for run in list_of(mixed, "BALANCE").runs}) == ["1", "2"]


def test_changeovers_and_closures_stand_in_sequence():
    coat = list_of(floor_plan(), "COAT")
    assert [run.family for run in coat.runs[:4]] == ["black", "grey primer", "grey primer", "black"]
    assert [run.asides for run in coat.runs[:3]] == [
        (views.Aside("changeover from grey primer to black", 0, "06:00", "06:15", "15", True),),
        (views.Aside("changeover from black to grey primer", 0, "06:55", "07:20", "25", True),),
        (),
    ]
    assert coat.runs[3].asides == (
        views.Aside("changeover from grey primer to black", 0, "08:45", "09:00", "15", True),
        views.Aside("tea", 0, "09:00", "09:15", "15", False),
    )
    over_lunch = views.Aside("changeover from signal red to grey primer", 0, "11:35", "12:20", "15", True)
    assert coat.runs[6].asides == (over_lunch, views.Aside("lunch", 0, "11:45", "12:15", "30", False))
    assert coat.changes == "2 h 10"


def test_a_closure_inside_a_run_is_told_by_the_run():
    cmm = list_of(floor_plan(), "CMM")
    assert cmm.runs[1].remarks == ("pauses 07:10 – 08:00: calibration",)
    assert not any(run.asides for run in cmm.runs)


@pytest.mark.parametrize("plan", [floor_plan(), *(floor_plan(8, seed=seed) for seed in range(3))])
def test_closures_before_the_last_run_and_every_changeover_are_told_once(plan):
    say = plan.shop.clock.say
    for sheet in dispatch_view(plan).machines:
        machine = next(m for m in plan.shop.machines if m.id == sheet.machine)
        asides = [aside for run in sheet.runs for aside in run.asides]
        told = {aside.start for aside in asides if not aside.changeover}
        told |= {mark.split()[1] for run in sheet.runs for mark in run.remarks if mark.startswith("pauses")}
        read = plan.shop.clock.read
        for last, holds in (
            (max(read(run.start) for run in sheet.runs), told.issuperset),
            (max(read(run.end) for run in sheet.runs), told.issubset),
        ):
            shuts = [shut for shut in (*plan.shop.breaks, *machine.closed) if shut.start_s < last]
            assert holds({say(shut.start_s) for shut in shuts})
        starts = [aside.start for aside in asides if not aside.changeover]
        assert len(starts) == len(set(starts))
        changes = [aside for aside in asides if aside.changeover]
        assert (sheet.changes == "") == (changes == [])


def test_who_attends_a_machine_is_said_once_for_all_runs():
    assert list_of(floor_plan(), "PRESS").crew == "crew fitters, 1 head for the set-up only"
    assert list_of(floor_plan(), "BALANCE").crew == "crew fitters, 2 heads"
    assert list_of(floor_plan(), "WASH").crew == ""


def test_ways_are_told_where_an_order_goes_next():
    plan = floor_plan()
    wash = list_of(plan, "WASH")
    assert wash.runs[3].after == views.Move("CMM", "09:40", "10 min")
    shown = page_text(dispatch_page(plan))
    assert "first stop → CMM 09:40 (10 min on the way)" in shown
    strip = next(strip for strip in dispatch_view(plan).strips if strip.order == "TQ-112")
    assert [stop.way for stop in strip.stops] == ["10 min", "5 min", "5 min", ""]
    assert "then 10 min on the way" in shown


def test_a_traveller_tells_what_its_stops_need():
    strip = dispatch_view(floor_plan()).strips[0]
    assert [stop.remarks for stop in strip.stops] == [
        ("part 1 of 2",),
        ("part 2 of 2",),
        ("2 heads",),
        ("set-up 5 min", "grey primer", "changeover before 25 min"),
        (),
    ]


def test_hostile_reasons_families_and_crews_stay_text():
    plan = floor_plan()
    names = {name: f"{HOSTILE[place % 3]}{name}" for place, name in enumerate(plan.shop.families)}
    machines = tuple(
        replace(
            machine,
            closed=tuple(replace(shut, reason=HOSTILE[0]) for shut in machine.closed),
            crew=machine.crew and HOSTILE[1],
            family=names.get(machine.family or ""),
        )
        for machine in plan.shop.machines
    )
    shop = replace(
        plan.shop,
        machines=machines,
        families=tuple(names.values()),
        crews=(Crew(HOSTILE[1], 9),),
        breaks=tuple(replace(shut, reason=HOSTILE[2]) for shut in plan.shop.breaks),
        changeovers={"COAT": Changeovers(600)},
    )
    page = dispatch_page(replace(plan, shop=shop))
    assert "<script" not in page
    assert "<img" not in page
    shown = page_text(page)
    for text in (f"closed: {HOSTILE[2]}", f"pauses 07:10 – 08:00: {HOSTILE[0]}", f"crew {HOSTILE[1]}",
                 f"to {HOSTILE[0]}grey primer"):  # fmt: skip
        assert text in shown


# ---- hostile input -------------------------------------------------------------------------------


def test_hostile_names_and_stamps_stay_text():
    plan = hall_plan(60, names=HOSTILE)
    page = dispatch_page(plan, stamp='</style><script>alert(4)</script>"; } \\ ☃')
    tags = set(re.findall(r"<(/?[a-z0-9]+)", re.sub(r"<style>.*?</style>", "", page, count=1, flags=re.S)))
    allowed = (
        "a article b bdi body br col colgroup div h2 h3 head header html i li main meta nav ol p section"
    )
    allowed += " small span style table tbody td tfoot th thead title tr"
    assert {tag.removeprefix("/") for tag in tags} <= set(allowed.split())
    assert "<script" not in page
    assert "javascript:" not in re.sub(r">[^<]*<", "><", page)  # in no attribute
    assert page.count("</style>") == 1
    assert "script-src 'none'" in page
    shown = page_text(page)
    assert all(" ".join(name.split()) in shown for name in HOSTILE)


def test_css_string_leaves_nothing_bare_that_could_end_it():
    assert css_string('a "b" \\ }\n</style>') == '"a \\22 b\\22  \\5c  \\7d \\a \\3c \\2f style\\3e "'


def test_nothing_is_fetched_and_no_style_stands_outside_the_sheet():
    page = dispatch_page(hall_plan(60, rounds=True))
    assert not re.search(r"""\s(src|style|on\w+)=|url\(|@import|https?:""", page)
    assert set(re.findall(r'href="([^"]*)"', page)) == {
        *(f"#m{number}" for number in range(1, 10)),
        *(f"#o{number}" for number in range(1, 13)),
        *("#machines", "#orders", "#rounds", "#sheets", "#only-machines", "#only-strips", "#only-rounds"),
    }


# ---- the page and its description ------------------------------------------------------------------


def test_every_link_leads_somewhere_and_every_class_is_styled():
    pages = (small_plan(), hall_plan(60, rounds=True), floor_plan())
    page = "".join(dispatch_page(plan, stamp="now") for plan in pages)
    ids = set(re.findall(r'id="([^"]*)"', page))
    assert {target.removeprefix("#") for target in re.findall(r'href="([^"]*)"', page)} <= ids
    used = {name for names in re.findall(r'class="([^"]*)"', page) for name in names.split()}
    styled = set(re.findall(r"\.([a-z][a-z-]*)", page_file("dispatch.css")))
    assert used - styled == set()


def test_every_field_of_the_view_reaches_the_page():
    """Change one field at a time; the page must change, or the field is dead."""
    base = dispatch_view(floor_plan(), stamp="now")
    lists = sorted(base.machines, key=lambda sheet: sheet.machine != "COAT")  # the fields of the first count
    first = replace(lists[0].runs[0], unit=1, heads="1")
    lists[0] = replace(lists[0], units=2, runs=(first, *lists[0].runs[1:]))
    base = replace(base, machines=tuple(lists))
    strips = [replace(base.strips[0], strips=2), *base.strips[1:]]
    sheets = [replace(sheet, sheets=2) for sheet in dispatch_view(round_plan()).round_sheets]
    base = replace(base, strips=tuple(strips), round_sheets=tuple(sheets))
    before = lay_out(base)

    def variants(value):
        if isinstance(value, str):
            yield value + "§"
        elif isinstance(value, bool):
            yield not value
        elif isinstance(value, int):
            yield value + 7
        elif value is None:
            yield views.Move("§", "§", "")
        elif is_dataclass(value):
            for field in fields(value):
                for changed in variants(getattr(value, field.name)):
                    yield replace(value, **{field.name: changed})
        elif value:
            for changed in variants(value[0]):
                yield (changed, *value[1:])
        else:
            yield ("§",)

    changed = list(variants(base))
    assert len(changed) == 58
    for view in changed:
        assert lay_out(view) != before


def test_clock_at_zero_shows_elapsed_time_and_no_date():
    shown = page_text(dispatch_page(hall_plan(60, clock=Clock(), shift_end_s=None)))
    assert "time counts from 0:00" in shown
    assert not re.search(r"\d{4}-\d{2}-\d{2}", shown)
