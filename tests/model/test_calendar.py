"""Clock rules: both changes of the clocks, past midnight, elapsed time, and working time around closures."""

from __future__ import annotations

from datetime import datetime
from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.calendar import Clock, WorkClock, duration, elapsed, minutes_exact

LONDON = ZoneInfo("Europe/London")
NIGHT = Clock(datetime(2026, 3, 2, 22))


@pytest.mark.parametrize(
    ("text", "seconds"),
    [
        ("22:30", 1800),
        ("01:15", 11700),
        ("2026-03-02T23:00", 3600),
        ("2026-03-03 06:00:30", 28830),
        ("22:00", 0),
    ],
)
def test_times_of_day_run_past_midnight(text: str, seconds: int) -> None:
    assert NIGHT.read(text) == seconds


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("25:00", "is no time of day; write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"),
        ("2026-02-30T06:00", "is no date; write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"),
        ("03/02/2026", "is no time this tool reads; write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"),
    ],
)
def test_what_is_no_time_is_refused_with_advice(text: str, message: str) -> None:
    with pytest.raises(ValueError, match="^" + message.replace("/", "/") + "$"):
        NIGHT.read(text)


def test_without_a_start_time_is_elapsed() -> None:
    clock = Clock()
    assert (clock.read("1:30"), clock.say(5400), clock.write(5400)) == (5400, "1:30", "1:30:00")
    with pytest.raises(ValueError, match="is a date but the shift has no start"):
        clock.read("2026-03-02T06:00")


@pytest.mark.parametrize(
    ("start", "end", "hours"),
    [
        (datetime(2026, 3, 28, 22), datetime(2026, 3, 29, 6), 7),  # clocks go forward: an hour less
        (datetime(2026, 10, 24, 22), datetime(2026, 10, 25, 6), 9),  # clocks go back: an hour more
        (datetime(2026, 6, 1, 22), datetime(2026, 6, 2, 6), 8),
    ],
)
def test_a_night_shift_over_a_change_of_the_clocks_counts_real_hours(start, end, hours) -> None:
    clock = Clock(start, LONDON)
    assert clock.seconds(end) == hours * 3600
    assert clock.moment(hours * 3600) == end
    # pandas as the oracle
    span = pd.Timestamp(end, tz=LONDON) - pd.Timestamp(start, tz=LONDON)
    assert span.total_seconds() == hours * 3600


def test_a_time_the_clocks_skip_does_not_exist() -> None:
    clock = Clock(datetime(2026, 3, 28, 22), LONDON)
    with pytest.raises(ValueError, match="does not exist, the clocks go forward over it"):
        clock.read("01:30")


def test_the_hour_that_comes_twice_is_told_apart_by_fold() -> None:
    clock = Clock(datetime(2026, 10, 24, 22), LONDON)
    first, second = datetime(2026, 10, 25, 1, 30), datetime(2026, 10, 25, 1, 30, fold=1)
    assert clock.seconds(second) - clock.seconds(first) == 3600


@given(st.integers(0, 10**6))
def test_elapsed_and_minutes_read_back(seconds: int) -> None:
    assert Clock().read(elapsed(seconds)) == seconds
    text = minutes_exact(seconds)
    assert (Clock().read(text) if ":" in text else round(float(text) * 60)) == seconds


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (27000, "7 h 30"),
        (7200, "2 h"),
        (2700, "45 min"),
        (90, "1 min 30 s"),
        (45, "45 s"),
        (7201, "2 h 0 min 1 s"),
    ],
)
def test_durations_read_as_people_say_them(seconds: int, text: str) -> None:
    assert duration(seconds) == text


closures = st.lists(st.integers(1, 20), max_size=8).map(
    lambda cuts: [(int(a), int(b)) for a, b in np.cumsum(cuts[: len(cuts) // 2 * 2]).reshape(-1, 2).tolist()]
)


@given(closures, st.integers(0, 60))
def test_working_time_counts_open_seconds(pairs, moment) -> None:
    clock = WorkClock(pairs)
    shut = {s for a, b in pairs for s in range(a, b)}
    assert clock.worked(moment) == sum(s not in shut for s in range(moment))


@given(closures, st.integers(0, 60))
def test_working_time_goes_there_and_back(pairs, work) -> None:
    clock = WorkClock(pairs)
    shut = {s for a, b in pairs for s in range(a, b)}
    start, end = int(clock.start(work)), int(clock.end(work))
    assert start not in shut
    assert clock.worked(start) == clock.worked(end) == work
    assert end == 0 or end - 1 not in shut


@given(closures, st.integers(0, 30), st.integers(1, 6), st.integers(1, 5))
def test_whole_pieces_stand_in_openings_and_none_could_end_earlier(pairs, begin, length, count) -> None:
    starts = WorkClock(pairs).whole(begin, length, count).tolist()
    shut = {s for a, b in pairs for s in range(a, b)}
    free = lambda s: not shut & set(range(s, s + length))  # noqa: E731  # a definition in one line
    expected, moment = [], begin
    while len(expected) < count:
        if free(moment):
            expected.append(moment)
            moment += length
        else:
            moment += 1
    assert starts == expected
