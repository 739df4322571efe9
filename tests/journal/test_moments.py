"""Times as typed and as written: past midnight, both changes of the clocks, and clocks without a zone."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime, timedelta, timezone
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.journal import moments
from shopfloor.journal.errors import EntryError
from shopfloor.journal.events import Recorder
from shopfloor.model.actuals import Key
from shopfloor.model.calendar import Clock
from tests.journal.floor import journal, work

LONDON = ZoneInfo("Europe/London")
BACK = Clock(datetime(2026, 10, 24, 22), LONDON)  # at 02:00 BST the clocks go back to 01:00 GMT
FORWARD = Clock(datetime(2026, 3, 28, 22), LONDON)  # at 01:00 GMT they go forward to 02:00 BST
NIGHT = Clock(datetime(2026, 3, 2, 22))
HOUR = 3600


def test_now_is_exact_in_a_zone_whatever_zone_the_computer_is_set_to() -> None:
    wall = datetime(2026, 10, 25, 1, 30, tzinfo=UTC)  # the second 01:30 of that night in London
    assert moments.now_s(BACK, wall) == 4 * HOUR + 1800
    assert moments.now_s(BACK, wall.astimezone(timezone(timedelta(hours=9)))) == 4 * HOUR + 1800
    assert moments.now_s(FORWARD, datetime(2026, 3, 29, 1, 30, tzinfo=UTC)) == 3 * HOUR + 1800


def test_now_without_a_zone_is_the_wall_time_of_the_computer() -> None:
    wall = datetime(2026, 3, 3, 1, 15, 30, 999, tzinfo=timezone(timedelta(hours=9)))
    assert moments.now_s(NIGHT, wall) == 3 * HOUR + 930
    assert moments.now_s(Clock(), wall) is None


def test_a_time_of_day_runs_past_midnight() -> None:
    assert moments.read(NIGHT, "01:15", None) == 3 * HOUR + 900
    assert moments.say(NIGHT, 3 * HOUR + 900) == "Tue 01:15"


def test_in_the_hour_that_comes_twice_the_latest_pass_that_was_is_meant() -> None:
    first, second = 3 * HOUR + 1800, 4 * HOUR + 1800  # 01:30 BST and 01:30 GMT
    assert moments.read(BACK, "01:30", first + 60) == first
    assert moments.read(BACK, "01:30", second - 60) == first
    assert moments.read(BACK, "01:30", second) == second
    assert moments.read(BACK, "01:30", 8 * HOUR) == second
    assert moments.read(BACK, "01:30", None) == first
    assert moments.read(BACK, "2026-10-25T01:30+01:00", 8 * HOUR) == first
    assert moments.read(BACK, "2026-10-25T01:30+00:00", None) == second
    assert [moments.say(BACK, one) for one in (first, second)] == ["Sun 01:30 BST", "Sun 01:30 GMT"]
    assert [moments.write(BACK, one) for one in (first, second)] == [
        "2026-10-25T01:30:00+01:00",
        "2026-10-25T01:30:00+00:00",
    ]


def test_the_hour_that_is_skipped_does_not_exist() -> None:
    with pytest.raises(EntryError) as caught:
        moments.read(FORWARD, "01:30", None)
    assert str(caught.value) == (
        "at '01:30' does not exist, the clocks go forward over it; write the time after the change"
    )
    assert moments.read(FORWARD, "02:00", None) == 3 * HOUR
    assert moments.say(FORWARD, 3 * HOUR) == "Sun 02:00"


@given(st.sampled_from([BACK, FORWARD, NIGHT]), st.integers(0, 600))
def test_what_is_written_reads_back(clock: Clock, minute: int) -> None:
    assert moments.read(clock, moments.write(clock, minute * 60), None) == minute * 60


@given(st.integers(0, 600), st.integers(0, 600))
def test_a_time_typed_from_the_wall_clock_is_understood_at_any_moment_of_the_night(
    now: int, ago: int
) -> None:
    """What a wall clock showed less than an hour ago is read as that moment, even while the clocks change."""
    then = max(0, now - ago % 60)
    text = BACK.moment(then * 60).strftime("%H:%M")
    assert moments.read(BACK, text, now * 60) in (then * 60, then * 60 + HOUR)
    if BACK.moment(then * 60).hour != 1:
        assert moments.read(BACK, text, now * 60) == then * 60


WRITE = "write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"


@pytest.mark.parametrize(
    ("clock", "text", "message"),
    [
        (NIGHT, "25:00", f"at '25:00' is no time of day; {WRITE}"),
        (NIGHT, "soon", f"at 'soon' is no time this tool reads; {WRITE}"),
        (NIGHT, "2026-03-02T23:00+00:00", f"at '2026-03-02T23:00+00:00' is no time this tool reads; {WRITE}"),
        (Clock(), "7.30", "at '7.30' is no time; give --start, or write elapsed time as h:mm, such as 1:30"),
    ],
)
def test_what_is_no_time_is_told(clock: Clock, text: str, message: str) -> None:
    with pytest.raises(EntryError) as caught:
        moments.read(clock, text, None)
    assert str(caught.value) == message


def test_elapsed_time_is_written_and_read() -> None:
    assert (moments.read(Clock(), "1:30", None), moments.write(Clock(), 5400)) == (5400, "1:30:00")
    assert moments.write(Clock(), -90) == "-0:01:30"


def test_work_through_the_change_of_the_clocks_lasts_as_long_as_a_stopwatch_says() -> None:
    book = journal(clock=BACK, rows=[("TQ-1", "WASH", 1, 150, 330)])
    for text, kind in (("2026-10-25T00:30+01:00", "started"), ("2026-10-25T02:30+00:00", "finished")):
        book.record([work(kind, "TQ-1", "WASH", moments.read(BACK, text, None) / 60)], Recorder())
    piece = book.state().pieces[Key("TQ-1", "WASH")]
    assert piece.run_s == 3 * HOUR  # though the wall clock went on by two only
    assert [event.at for event in book.events()[1:]] == [
        "2026-10-25T00:30:00+01:00",
        "2026-10-25T02:30:00+00:00",
    ]


def test_entries_made_in_both_passes_of_the_hour_keep_their_order() -> None:
    book = journal(clock=BACK, rows=[("TQ-1", "WASH", 1, 180, 300)])
    for utc, kind in (((0, 40), "started"), ((1, 20), "finished")):  # 01:40 BST, then 01:20 GMT
        now = moments.now_s(BACK, datetime(2026, 10, 25, *utc, tzinfo=UTC))
        entry = work(kind, "TQ-1", "WASH", 0)
        book.record([replace(entry, at_s=None)], Recorder(now_s=now))
    assert book.state().pieces[Key("TQ-1", "WASH")].run_s == 40 * 60
