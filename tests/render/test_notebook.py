"""A plan in a cell of a notebook: markup that is well formed, small, scriptless and true."""

from __future__ import annotations

import re
from dataclasses import replace
from xml.etree import ElementTree

import pytest

from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.notebook import MOST_BARS, MOST_ROWS, plan_html
from tests.render.expected import small_plan
from tests.render.floor import floor_plan
from tests.render.plans import HOSTILE, hall_plan, many_plan
from tests.render.test_gantt_view import empty_plan

SVG = "{http://www.w3.org/2000/svg}"


def parsed(plan) -> ElementTree.Element:
    return ElementTree.fromstring(plan_html(plan).replace("<br>", "<br/>"))


def titles(plan) -> list[str]:
    return [found.text for found in parsed(plan).iter(f"{SVG}title")]


@pytest.mark.parametrize("plan", [small_plan(), floor_plan(), hall_plan(200), empty_plan()])
def test_it_is_well_formed_and_says_the_plan_and_the_notice(plan):
    text = "".join(parsed(plan).itertext())
    assert CARE_NOTICE in text
    assert f"ends {plan.shop.clock.say(plan.makespan_s)}" in text
    assert plan_html(plan) == plan_html(replace(plan))


def test_every_run_changeover_and_closure_is_drawn_and_named():
    plan = floor_plan()
    said = titles(plan)
    assert "TQ-103 on COAT: 06:15 – 06:45, on time" in said
    assert "changeover 06:00 – 06:15" in said
    assert "calibration 07:10 – 08:00" in said
    assert len([title for title in said if " on " in title]) >= len(plan.schedule)


def test_boxes_lie_where_time_is():
    plan = hall_plan(60)
    rects = parsed(plan).findall(f".//{SVG}rect")
    assert len(rects) == len(plan.schedule)
    horizon = max(plan.makespan_s, plan.shop.shift_end_s)
    for rect, piece in zip(rects, plan.schedule, strict=True):
        assert float(rect.get("x")) == pytest.approx(130 + 820 * piece.start_s / horizon, abs=0.06)
        assert float(rect.get("width")) == pytest.approx(
            820 * (piece.end_s - piece.start_s) / horizon, abs=0.11
        )


def test_names_are_only_text():
    tame, wild = (parsed(hall_plan(60, names=names)) for names in ((), HOSTILE))
    assert {found.tag for found in wild.iter()} == {found.tag for found in tame.iter()}
    assert not re.search(r"<script|<img|onerror=[^&]*>", plan_html(hall_plan(60, names=HOSTILE)))


def test_very_many_operations_are_drawn_as_load():
    plan = many_plan(48_000)
    assert len(plan.schedule) > MOST_BARS
    page = plan_html(plan)
    assert len(page) < 300_000
    assert f"and {60 - MOST_ROWS} more machines and units" in page
    assert any(re.fullmatch(r".* – .*: busy about \d+% of the time", title) for title in titles(plan))
