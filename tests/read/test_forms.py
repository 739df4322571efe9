"""What a workbook or a DataFrame holds, as text."""

from __future__ import annotations

from datetime import date, datetime, time, timedelta
from fractions import Fraction

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.read.cells import Marks, length, nearest_second
from shopfloor.read.forms import text_of
from tests.read.reading import patient


@pytest.mark.parametrize(
    ("value", "text"),
    [
        ("0042 ", "0042 "),
        (None, ""),
        (float("nan"), ""),
        (pd.NaT, ""),
        (pd.NA, ""),
        (np.float64("nan"), ""),
        (42, "42"),
        (42.0, "42"),
        (-0.5, "-0.5"),
        (0.1 + 0.2, "0.3"),
        (1e15, "1000000000000000"),
        (1e20, "100000000000000000000"),
        (1e-7, "0.0000001"),
        (float("inf"), "inf"),
        (float("-inf"), "-inf"),
        (True, "yes"),
        (np.False_, "no"),
        (np.int64(7), "7"),
        (np.float64(7.25), "7.25"),
        (datetime(2026, 3, 2, 6, 0), "2026-03-02T06:00"),
        (datetime(2026, 3, 2, 6, 0, 5), "2026-03-02T06:00:05"),
        (datetime(2026, 3, 2, 5, 59, 59, 999_600), "2026-03-02T06:00"),
        (pd.Timestamp("2026-03-02T06:00"), "2026-03-02T06:00"),
        (date(2026, 3, 2), "2026-03-02"),
        (time(7, 30), "7:30"),
        (time(0, 0, 45), "0:00:45"),
        (timedelta(hours=30), "30:00"),
        (timedelta(minutes=12, seconds=20), "0:12:20"),
        (timedelta(seconds=1.5), "0:00:01.5"),
        (timedelta(seconds=59.99999), "0:01"),
        (timedelta(minutes=-15), "-0:15"),
        (pd.Timedelta(minutes=90), "1:30"),
    ],
)
def test_text_of(value: object, text: str) -> None:
    assert text_of(value) == text


def test_the_way_a_cell_is_shown_counts_where_it_says_more_than_the_value() -> None:
    midnight = datetime(2026, 3, 2)
    assert text_of(midnight, "yyyy-mm-dd h:mm") == "2026-03-02T00:00"
    assert text_of(midnight, "dd.mm.yyyy") == "2026-03-02"
    assert text_of(datetime(2026, 3, 2, 6), "dd.mm.yyyy") == "2026-03-02T06:00"
    assert text_of(42, "00000") == "00042"
    assert text_of(42.0, "000000") == "000042"
    assert text_of(42, "0") == "42"
    assert text_of(42, "0.00") == "42"


@patient
@given(st.timedeltas(timedelta(seconds=1), timedelta(days=300)))
def test_lengths_of_time_read_back_to_the_millisecond(value: timedelta) -> None:
    exact = Fraction(value // timedelta(microseconds=1), 10**6)
    assert abs(length(text_of(value), Marks()) - exact) <= Fraction(1, 2000)


@patient
@given(st.integers(1, 10**6))
def test_minutes_kept_as_a_float_come_back_to_the_second(seconds: int) -> None:
    assert nearest_second(length(text_of(seconds / 60), Marks())) == seconds
