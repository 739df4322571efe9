"""The Gantt page as text, its data, its size, what it imports, and the figure for notebooks."""

from __future__ import annotations

import hashlib
import json
import re
import subprocess
import sys
from dataclasses import fields, replace
from html.parser import HTMLParser

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.calendar import Clock
from shopfloor.render import gantt_view as views
from shopfloor.render.gantt import SCRIPTS, gantt_figure, gantt_page, page_of
from shopfloor.render.gantt_colours import BY_LATENESS
from shopfloor.render.gantt_data import AS_TEXT, pack, page_data
from shopfloor.render.gantt_facts import gantt_view
from shopfloor.render.gantt_view import GanttView
from shopfloor.render.html import CARE_NOTICE, page_file
from tests.render.expected import assert_golden, page_text, small_plan
from tests.render.floor import floor_plan
from tests.render.plans import HOSTILE, hall_plan, many_plan
from tests.render.test_gantt_view import empty_plan

DIGITS = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz-_"
CODE = "\n".join(page_file(name) for name in SCRIPTS)


def unpack(text: str) -> list[int]:
    """Read a packed column letter by letter, as the page's script does."""
    values, value, place = [], 0, 1
    for digit in map(DIGITS.index, text):
        value += digit % 32 * place
        place *= 32
        if digit < 32:
            values.append(value)
            value, place = 0, 1
    return values


@given(st.lists(st.integers(0, 2**40) | st.integers(0, 40), min_size=1))
def test_a_packed_column_reads_back(values):
    packed = pack(np.array(values, dtype=np.int64))
    if len(set(values)) == 1:
        assert packed == values[0]
    else:
        assert unpack(packed) == values


def test_small_numbers_take_one_letter_and_none_may_be_negative():
    assert pack(np.arange(32)) == DIGITS[:32]
    assert pack(np.array([], dtype=np.int64)) == 0
    with pytest.raises(ValueError, match="only numbers from 0 can be packed, not -1"):
        pack(np.array([3, -1]))


# ---- page data and the documented view hold together ------------------------------------------------


def full_view() -> GanttView:
    """A view in which every list has an entry."""
    return replace(gantt_view(floor_plan(), stamp="05:40"), now_s=4000)


def test_every_field_of_the_view_is_on_the_page_once():
    names = [field.name for field in fields(GanttView)]
    assert set(names) >= AS_TEXT
    assert list(page_data(full_view())) == [name for name in names if name not in AS_TEXT]


@pytest.mark.parametrize(
    ("key", "kind"),
    [
        ("rows", views.MachineRow),
        ("groups", views.ColourGroup),
        ("families", views.Family),
        ("family_groups", views.ColourGroup),
        ("gaps", views.IdleGap),
        ("lines", views.MarkedTime),
        ("closures", views.ShutTime),
    ],
)
def test_every_entry_of_a_list_has_the_fields_of_its_kind(key, kind):
    names = [field.name for field in fields(kind)]
    entries = page_data(full_view())[key]
    assert entries
    assert all(list(entry) == names for entry in entries)


def test_columns_have_the_fields_of_their_kind():
    data = page_data(full_view())
    names = [field.name for field in fields(views.OrderColumns)]
    assert [name for name in data["orders"] if name != "due_from_s"] == names
    renamed = {"start_s": "start_steps", "end_s": "lengths", "set_up_end_s": "set_ups"}  # times are steps
    names = [renamed.get(field.name, field.name) for field in fields(views.BarColumns)]
    assert list(data["bars"]) == ["size", "tick_s", *names]
    renamed = {"bar": "bar_steps", "start_s": "ahead_s", "end_s": "done_ahead_s"}
    names = [renamed.get(field.name, field.name) for field in fields(views.ChangeColumns)]
    assert list(data["changeovers"]) == ["size", *names]
    names = [field.name.replace("at_s", "at_steps") for field in fields(views.CrewRow)]
    assert [name for name in data["crews"][0] if name != "size"] == names
    load = page_data(gantt_view(many_plan(60_000)))["load"]
    assert [name for name in load if name != "size"] == [field.name for field in fields(views.Load)]


def test_the_script_reads_exactly_the_fields_that_are_sent():
    assert set(re.findall(r"\bgiven\.(\w+)", CODE)) == set(page_data(full_view()))


def test_columns_in_the_page_give_back_the_plan():
    plan = small_plan()
    packed = page_data(gantt_view(plan))["bars"]
    tick, size = packed["tick_s"], packed["size"]
    steps, lengths = (np.array(unpack(packed[name])) * tick for name in ("start_steps", "lengths"))
    assert size == len(plan.schedule)
    assert np.cumsum(steps).tolist() == plan.schedule.start_s.tolist()
    assert (np.cumsum(steps) + lengths).tolist() == plan.schedule.end_s.tolist()
    assert tick == 300


# ---- the page as text --------------------------------------------------------------------------------


def test_text_matches_the_expected_file():
    page = gantt_page(small_plan(), stamp="Mon 05:41").replace(CARE_NOTICE, "(care notice)")
    assert_golden("gantt.txt", page_text(page.replace("<dt>", "<p>").replace("</dt><dd>", ": ")))


def digest(page: str) -> str:
    return hashlib.sha256(page.encode()).hexdigest()


def test_equal_plans_are_equal_bytes_and_the_stamp_is_the_only_clock():
    first, second = gantt_page(hall_plan(60)), gantt_page(hall_plan(60))
    stamped = gantt_page(hall_plan(60), stamp="Mon 05:41")
    assert digest(first) == digest(second)  # a difference of whole pages would fill the screen
    assert digest(stamped.replace("; printed Mon 05:41", "")) == digest(first)


@pytest.mark.parametrize("size", [200, 2_000, 20_000])
def test_a_page_stays_small(size):
    for rounds in (False, True):
        assert len(gantt_page(hall_plan(size, rounds=rounds)).encode()) <= 5_200_000


class Tags(HTMLParser):
    """Counts tags and collects attribute names and the JSON."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.counts: dict[str, int] = {}
        self.attributes: set[str] = set()
        self.feed(page)

    def handle_starttag(self, tag, attrs):
        self.counts[tag] = self.counts.get(tag, 0) + 1
        self.attributes |= {name for name, _ in attrs}


def test_names_add_no_tag_and_no_attribute():
    tame = Tags(gantt_page(hall_plan(60)))
    wild = Tags(gantt_page(hall_plan(60, names=HOSTILE), stamp=HOSTILE[0]))
    assert wild.counts == tame.counts
    assert wild.attributes == tame.attributes
    assert "onerror" not in wild.attributes
    assert "img" not in wild.counts


def test_hostile_names_stand_in_the_data_as_they_were():
    page = gantt_page(hall_plan(60, names=HOSTILE))
    found = re.search(r'<script type="application/json" id="plan-data">(.*?)</script>', page, re.DOTALL)
    assert json.loads(found[1])["orders"]["ids"][: len(HOSTILE)] == list(HOSTILE)


def test_scripts_write_names_only_as_text():
    """Nothing in our scripts reads markup, runs text or reaches out."""
    assert not re.findall(r"innerHTML|outerHTML|insertAdjacent|document\.write|eval\(|Function\(", CODE)
    assert not re.findall(r"fetch\(|XMLHttpRequest|import\(|sendBeacon|WebSocket|https?:", CODE)


@pytest.mark.parametrize("name", SCRIPTS)
def test_scripts_stay_short_and_end_no_element(name):
    text = page_file(name)
    assert len(text.splitlines()) <= 420
    assert max(map(len, text.splitlines())) <= 120


def test_views_with_every_list_and_with_none_make_pages():
    assert "calibration" in page_of(full_view())
    assert "there is nothing to do" in gantt_page(empty_plan())


def test_the_page_needs_neither_plotly_nor_pandas_to_be_imported():
    code = (
        "import sys; from tests.render.plans import hall_plan; "
        "from shopfloor.render.gantt import gantt_page; "
        "gantt_page(hall_plan(20)); print(sorted({'plotly', 'pandas', 'networkx'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


# ---- the figure --------------------------------------------------------------------------------------


@pytest.mark.parametrize(("clock", "kind"), [(Clock(), "linear"), (hall_plan(20).shop.clock, "date")])
def test_a_figure_holds_every_bar_once(clock, kind):
    plan = hall_plan(150, clock=clock, idle_s=900)
    figure = gantt_figure(plan)
    assert figure.layout.xaxis.type == kind
    assert sum(len(trace.y) for trace in figure.data) == len(plan.schedule)
    assert [trace.name for trace in figure.data] == ["on time", "late", "no due time"]
    assert len({trace.marker.pattern.shape for trace in figure.data}) == 3
    assert len(figure.layout.shapes) == len(figure.layout.annotations) == 3


def test_a_figure_on_dates_puts_bars_where_they_start():
    plan = small_plan()
    figure = gantt_figure(plan)
    bars = [trace for trace in figure.data if trace.name in {group.name for group in BY_LATENESS}]
    starts = np.sort(np.concatenate([trace.base for trace in bars]))
    expected = np.datetime64("2026-03-02T06:00:00") + plan.schedule.start_s.astype("timedelta64[s]")
    assert (starts == np.sort(expected)).all()
    lengths = sum(int(trace.x.sum()) for trace in bars)
    assert lengths == 1000 * int((plan.schedule.end_s - plan.schedule.start_s).sum())


def test_a_figure_escapes_what_plotly_would_read_as_markup():
    figure = gantt_figure(hall_plan(60, names=HOSTILE))
    texts = [*figure.layout.yaxis.categoryarray, figure.layout.title.text]
    texts += [text for trace in figure.data for text in (*trace.text, *trace.y)]
    assert any("&lt;img" in text for text in texts)
    assert not [text for text in texts if "<" in text]


def test_a_figure_shows_changeovers_and_closures_apart_from_bars():
    plan = floor_plan()
    figure = gantt_figure(plan)
    traces = {trace.name: trace for trace in figure.data}
    assert list(traces)[-2:] == ["changeover", "closed"]
    assert set(traces["changeover"].y) == {"COAT"}
    assert traces["changeover"].width == 0.4
    assert list(traces["changeover"].customdata[0]) == [
        *("2026-03-02 06:00", "2026-03-02 06:15", "grey primer", "black"),
    ]
    shut = sorted(zip(traces["closed"].y, traces["closed"].text, strict=True))
    assert [row for row in shut if row[1] not in ("tea", "lunch")] == [
        ("CMM", "calibration"),
        ("ENGRAVE", "not open"),
    ]
    assert len(shut) == 2 + 2 * 8
