"""What the terminal shows: golden texts, 80 columns, nothing that could steer a terminal."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from shopfloor.model.calendar import HOUR, Clock
from shopfloor.model.shop import NO_DUE, Closure, Crew, Machine, Operations, Orders, Shop
from shopfloor.render import text
from shopfloor.render.html import CARE_NOTICE
from tests.render.expected import assert_golden, round_plan, small_plan
from tests.render.floor import crew_bound, floor_plan
from tests.render.plans import HOSTILE, hall_plan, many_plan

PLANS = [small_plan(), floor_plan(), round_plan(), hall_plan(200), hall_plan(60, names=HOSTILE)]


def check(plan) -> list[str]:
    """The lines of `check`: loads and bounds; a line may hold several."""
    return "\n".join(text.load_lines(plan.shop, plan.bounds)).split("\n")


def test_loads_match_the_expected_file():
    assert_golden("text-loads.txt", "\n".join(check(floor_plan())) + "\n")


def test_a_plan_matches_the_expected_file():
    assert_golden("text-plan.txt", "\n".join(text.plan_lines(floor_plan())) + "\n")


@pytest.mark.parametrize("plan", PLANS)
def test_no_line_is_wider_than_a_terminal_or_steers_it(plan):
    lines = check(plan) + "\n".join(text.plan_lines(plan)).split("\n")
    assert max(map(len, lines)) <= 80
    assert all(line.isprintable() for line in lines)


def test_hostile_reasons_and_crews_neither_widen_nor_steer():
    plan = floor_plan()
    crew = "\x1b[31m" + "x" * 70
    machines = tuple(
        replace(m, crew=m.crew and crew, closed=tuple(replace(c, reason="\x07 very " * 20) for c in m.closed))
        for m in plan.shop.machines
    )
    breaks = tuple(replace(shut, reason="\x1b]0;title\x07" * 9) for shut in plan.shop.breaks)
    plan = replace(plan, shop=replace(plan.shop, machines=machines, crews=(Crew(crew, 5),), breaks=breaks))
    lines = check(plan) + "\n".join(text.plan_lines(plan)).split("\n")
    assert max(map(len, lines)) <= 80
    assert all(line.isprintable() for line in lines)


def test_the_care_notice_is_the_one_of_the_pages():
    assert " ".join(text.wrap(text.CARE).split()) == CARE_NOTICE
    assert max(map(len, text.wrap(text.CARE).split("\n"))) <= 80


def hall(**changes) -> Shop:
    """One machine with four hours of work in a shift of eight; one crew of two attends it."""
    shop = Shop(
        machines=(Machine("CMM", crew="day"),),
        orders=Orders(("TQ-1", "TQ-2"), due_s=np.array([HOUR, NO_DUE])),
        operations=Operations([0, 1], [0, 0], [2 * HOUR, 2 * HOUR], heads=[2, 1], setup_s=[600, 600]),
        crews=(Crew("day", 2),),
        shift_end_s=8 * HOUR,
    )
    return replace(shop, **changes)


def bars(shop: Shop) -> dict[str, str]:
    """Share of each bar, by name."""
    found = (
        re.fullmatch(r"(.+?)  +\S.*[█·]+[> ] *(\S+%|10×\+)( +binds)?", line)
        for line in text.load_lines(shop, ())
    )
    return {match[1]: match[2] for match in found if match}


def test_a_machine_is_held_against_the_time_it_is_open():
    assert bars(hall())["CMM"] == "50%"
    closed = (Machine("CMM", crew="day", closed=(Closure(0, HOUR, "repair"), Closure(7 * HOUR, 99 * HOUR))),)
    assert bars(hall(machines=closed))["CMM"] == "67%"
    lines = text.load_lines(hall(machines=closed), ())
    assert "               open 6 h of 8 h; repair 0:00 – 1:00, closed from 7:00" in lines
    never = (Machine("CMM", crew="day", closed=(Closure(0, 99 * HOUR),)),)
    assert bars(hall(machines=never))["CMM"] == "10×+"


def test_breaks_are_said_once_and_count_for_all():
    shop = hall(breaks=(Closure(2 * HOUR, 4 * HOUR, "tea"),))
    lines = text.load_lines(shop, ())
    assert lines[0] == "Breaks for the whole hall: tea 2:00 – 4:00."
    assert bars(shop) == {"CMM": "67%", "day ×2": "50%", "TQ-1": "25%", "TQ-2": "25%"}


def test_a_crew_is_held_against_the_time_that_its_heads_are_there():
    assert bars(hall())["day ×2"] == "38%"  # two heads for two hours, one for two, of sixteen
    fewer = (Crew("day", 2, ((4 * HOUR, 8 * HOUR, 1),)),)
    assert bars(hall(crews=fewer))["day ×1–2"] == "50%"
    set_up = (Machine("CMM", crew="day", set_up_only=True),)
    assert bars(hall(machines=set_up))["day ×2"] == "3%"


def test_a_crew_that_binds_is_marked():
    plan = floor_plan()
    lines = text.load_lines(plan.shop, (crew_bound(plan.shop, "painters", 9),))
    assert [line.split()[0] for line in lines if line.endswith("binds")] == ["painters"]


def test_orders_that_no_plan_brings_in_on_time_are_named():
    lines = text.load_lines(hall(), ())
    assert lines[-1] == "Late whatever the plan, at least: TQ-1 by 1 h."
    released = replace(hall().orders, release_s=np.array([0, 5 * HOUR]), due_s=np.array([NO_DUE, 6 * HOUR]))
    assert text.load_lines(hall(orders=released), ())[-1].endswith("TQ-2 by 1 h.")
    assert "whatever" not in "".join(text.load_lines(hall_plan(60, due=False).shop, ()))


def test_without_a_shift_end_loads_are_held_against_the_bound():
    plan = hall_plan(60, clock=Clock(), shift_end_s=None)
    assert check(plan)[0].endswith("share of the bound")


def test_a_plain_plan_says_nothing_of_the_floor():
    assert text.floor_lines(hall_plan(60)) == []


def test_long_lists_of_closed_machines_are_cut():
    plan = many_plan(480)
    shut = tuple(replace(machine, closed=(Closure(0, 60),)) for machine in plan.shop.machines)
    lines = text.floor_lines(replace(plan, shop=replace(plan.shop, machines=shut)))
    assert " ".join(" ".join(lines).split()).endswith("M05 (closed 06:00 – 06:01) and 55 more.")
