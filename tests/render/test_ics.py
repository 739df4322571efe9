"""plan.ics, read back by the library that reads anybody's calendar."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import pytest

pytest.importorskip("icalendar")
from icalendar import Calendar, vText

from shopfloor.errors import SaveError
from shopfloor.model.calendar import Clock
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.ics import machine_calendars, plan_ics
from shopfloor.render.save import save
from tests.render.expected import START, round_plan, small_plan
from tests.render.plans import HOSTILE, hall_plan


def events(content: bytes) -> list:
    return Calendar.from_ical(content).walk("VEVENT")


def test_calendar_says_what_it_is():
    calendar = Calendar.from_ical(plan_ics(small_plan()))
    assert (calendar["version"], calendar["method"]) == ("2.0", "PUBLISH")
    assert calendar["name"] == "Plan of 2026-03-02"
    assert calendar["description"] == CARE_NOTICE


def test_an_event_an_assignment():
    first = events(plan_ics(small_plan()))[0]
    assert first["summary"] == "TQ-01 on Wash unit 1"
    assert first["location"] == "Wash unit 1"
    assert (first["dtstart"].dt, first["dtend"].dt) == (START, START + timedelta(minutes=30))
    assert first["description"] == f"30 min of work\nseal kit on cart 4\n{CARE_NOTICE}"
    parts = [event["description"].splitlines()[:2] for event in events(plan_ics(small_plan()))[2:6:3]]
    assert parts == [["40 min of work", "part 1 of 2 of it"], ["40 min of work", "part 2 of 2 of it"]]


@pytest.mark.parametrize("plan", [small_plan(), round_plan(clock=Clock(START)), hall_plan(200)])
def test_every_assignment_comes_back(plan):
    found = events(plan_ics(plan))
    assert [(event["dtstart"].dt, event["dtend"].dt) for event in found] == [
        (plan.shop.clock.moment(row.start_s), plan.shop.clock.moment(row.end_s)) for row in plan.schedule
    ]
    assert len({event["uid"] for event in found}) == len(plan.schedule)
    assert plan_ics(plan) == plan_ics(replace(plan))


def test_lines_are_folded_and_end_as_the_standard_says():
    """RFC 5545, 3.1: lines end in CR LF and are at most 75 octets long."""
    content = plan_ics(hall_plan(60, names=HOSTILE))
    assert content.endswith(b"END:VCALENDAR\r\n")
    assert all(len(line) <= 75 and b"\n" not in line for line in content.split(b"\r\n"))


def test_hostile_names_come_back_as_they_were_and_add_nothing():
    names = (*HOSTILE, "a\r\nBEGIN:VEVENT", "x\nEND:VCALENDAR", "semi;colon,comma\\n")
    plan = hall_plan(100, names=names)
    found = events(plan_ics(plan))
    assert len(found) == len(plan.schedule)
    orders = {event["summary"].partition(" on ")[0] for event in found}
    assert {name.replace("\r\n", "\n") for name in names} <= orders


def test_with_a_time_zone_moments_are_exact_across_a_change_of_clocks():
    """On 25 October 2026 the clocks of Oslo go back from 03:00 to 02:00 summer time."""
    clock = Clock(datetime(2026, 10, 25, 1, 0), ZoneInfo("Europe/Oslo"))
    starts = [event["dtstart"].dt for event in events(plan_ics(round_plan(1, 6, clock=clock)))]
    assert starts == [datetime(2026, 10, 24, 23, 0, tzinfo=UTC) + timedelta(minutes=30 * k) for k in range(6)]


def test_identifiers_stay_when_times_move_and_tell_twins_apart():
    shop = Shop(
        (Machine("Wash"),), Orders(("TQ-1",)), Operations([0, 0], [0, 0], [1800, 1800]), clock=Clock(START)
    )
    plan = replace(small_plan(), shop=shop, schedule=Schedule([0, 1], [0, 1800], [1800, 3600]))
    moved = replace(plan, schedule=Schedule([1, 0], np.array([0, 3600]), np.array([1800, 5400])))
    before, after = events(plan_ics(plan)), events(plan_ics(moved))
    assert before[0]["uid"] != before[1]["uid"]
    assert {event["uid"] for event in before} == {event["uid"] for event in after}
    assert before[0]["uid"] == after[1]["uid"]


def test_a_calendar_a_machine_shares_identifiers_with_the_whole(tmp_path):
    plan = small_plan()
    files = machine_calendars(plan)
    assert list(files) == ["machine-001-Wash.ics", "machine-002-CMM.ics", "machine-003-Coat.ics"]
    apart = sorted(event["uid"] for content in files.values() for event in events(content))
    assert apart == sorted(event["uid"] for event in events(plan_ics(plan)))
    assert Calendar.from_ical(files["machine-002-CMM.ics"])["name"] == "CMM"
    assert len(save(tmp_path, files)) == 3


def test_file_names_are_plain_whatever_the_machines_are_called(tmp_path):
    files = machine_calendars(hall_plan(60, names=HOSTILE))
    assert len(save(tmp_path, files)) == 9
    assert all(name.replace("-", "").replace(".", "").isalnum() and name.isascii() for name in files)
    # the library hands NAME back as it stands in the file
    names = [Calendar.from_ical(content)["name"] for content in files.values()]
    assert names == [vText(f"{name} ").to_ical().decode() for name in reversed(HOSTILE)]


def test_a_clock_that_starts_at_zero_has_no_calendar():
    for make in (plan_ics, machine_calendars):
        with pytest.raises(SaveError) as caught:
            make(round_plan())
        assert str(caught.value) == "a calendar needs to know when the shift starts; give --start"
