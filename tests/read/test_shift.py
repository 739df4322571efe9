"""The start and the end of the shift, from the command line or from shop.toml."""

from __future__ import annotations

from datetime import datetime, time

import pytest

from shopfloor.model.calendar import Clock
from shopfloor.model.shop import Shop
from tests.read.reading import faults_of, shop_of

ORDERS = "order,machine,minutes\nA,M,5\n"


def shift(text: str = "", **options: object) -> Shop:
    return shop_of(ORDERS, shop=f"[shift]\n{text}\n", **options)


def test_without_a_start_time_counts_from_zero() -> None:
    assert shop_of(ORDERS).clock == Clock()
    assert shop_of(ORDERS).shift_end_s is None
    assert shop_of(ORDERS, end="7:30").shift_end_s == 27_000


@pytest.mark.parametrize(
    "start", ["2026-03-02T06:00", "2026-03-02 06:00", " 2026-03-02T06:00:00 ", datetime(2026, 3, 2, 6)]
)
def test_a_start_is_a_date_and_a_time(start: str | datetime) -> None:
    assert shop_of(ORDERS, start=start).clock.start == datetime(2026, 3, 2, 6)


@pytest.mark.parametrize("start", ["2026-03-02T06:00:00", '"2026-03-02T06:00"', "2026-03-02 06:00:00"])
@pytest.mark.parametrize("end", ["2026-03-02T14:00:00", '"2026-03-02T14:00"', "14:00:00", '"14:00"'])
def test_toml_times_and_texts_say_the_same(start: str, end: str) -> None:
    shop = shift(f"start = {start}\nend = {end}")
    assert (shop.clock.start, shop.shift_end_s) == (datetime(2026, 3, 2, 6), 8 * 3600)


def test_an_end_without_a_date_is_the_next_such_time() -> None:
    assert shop_of(ORDERS, start="2026-03-02T22:00", end="06:00").shift_end_s == 8 * 3600
    assert shop_of(ORDERS, start="2026-03-02T06:00", end=time(6)).shift_end_s == 24 * 3600


def test_a_night_on_which_the_clocks_change_is_as_long_as_it_is() -> None:
    """The clocks of London went forward on 29 March 2026 at 01:00 and back on 25 October at 02:00."""
    zone = 'zone = "Europe/London"'
    assert shift(zone, start="2026-03-28T22:00", end="06:00").shift_end_s == 7 * 3600
    assert shift(zone, start="2026-10-24T22:00", end="06:00").shift_end_s == 9 * 3600
    assert shift(zone, start="2026-03-28T22:00", end="22:00").shift_end_s == 23 * 3600


def test_the_command_line_goes_before_the_file() -> None:
    file = 'start = "2026-03-02T06:00"\nend = "14:00"'
    assert shift(file, start="2026-03-03T10:00").shift_end_s == 4 * 3600
    assert shift(file, end="12:00").shift_end_s == 6 * 3600
    assert shift('start = "nonsense"', start="2026-03-03T10:00").clock.start == datetime(2026, 3, 3, 10)


@pytest.mark.parametrize(
    ("start", "code", "text"),
    [
        (
            "06:00",
            "start-unreadable",
            "--start: '06:00' has no date; write the start as YYYY-MM-DDTHH:MM, such as 2026-03-02T06:00",
        ),
        (
            "tomorrow",
            "start-unreadable",
            "--start: 'tomorrow' has no date; write the start as YYYY-MM-DDTHH:MM, such as 2026-03-02T06:00",
        ),
        (
            "2026-02-30T06:00",
            "start-unreadable",
            "--start: '2026-02-30T06:00' is no date; "
            "write the start as YYYY-MM-DDTHH:MM, such as 2026-03-02T06:00",
        ),
        (
            "0206-03-02T06:00",
            "start-implausible",
            "--start: '0206-03-02T06:00' is not between 1970 and 2200; check the year",
        ),
        (
            "2026-03-02T06:00Z",
            "offset-not-allowed",
            "--start: '2026-03-02T06:00Z' has an offset from UTC; "
            'leave it out, and name the zone: zone = "Europe/London"',
        ),
        (
            "2026-03-29T01:30",
            "start-unreadable",
            "--start: '2026-03-29T01:30' does not exist, the clocks go forward over it; "
            "write the start as YYYY-MM-DDTHH:MM, such as 2026-03-02T06:00",
        ),
    ],
)
def test_starts_that_cannot_be_used(start: str, code: str, text: str) -> None:
    (fault,) = faults_of(ORDERS, shop='[shift]\nzone = "Europe/London"\n', start=start)
    assert (fault.rule, fault.text()) == (code, text)


@pytest.mark.parametrize(
    ("end", "code", "text"),
    [
        (
            "2026-03-02T06:00",
            "end-not-after-start",
            "'2026-03-02T06:00' is not after the start of the shift; write a later end",
        ),
        ("2026-03-01", "end-unreadable", None),
        ("14:60", "end-unreadable", None),
        (
            "2062-03-02T06:00",
            "end-too-late",
            "'2062-03-02T06:00' is more than 366 days after the start of the shift; check the date",
        ),
        ("2026-03-02T14:00+01:00", "offset-not-allowed", None),
    ],
)
def test_ends_that_cannot_be_used(end: str, code: str, text: str | None) -> None:
    (fault,) = faults_of(ORDERS, start="2026-03-02T06:00", end=end)
    assert fault.rule == code
    assert text is None or fault.text() == f"--end: {text}"


def test_a_faulty_start_hides_no_other_fault_and_makes_none_up() -> None:
    """Due times need the clock: they are not judged by one that is in doubt."""
    text = "order,machine,minutes,due\nA,M,x,2026-03-02T08:00\n"
    rules = [fault.rule for fault in faults_of(text, start="06:00")]
    assert rules == ["start-unreadable", "minutes-unreadable"]
    rules = [fault.rule for fault in faults_of(text, shop='[shift]\nstart = 6\nzone = "Nowhere"\n')]
    assert rules == ["wrong-kind", "zone-unknown", "minutes-unreadable"]
