"""Single cells: what each kind reads, and the rule that each bad text breaks."""

from __future__ import annotations

from datetime import datetime
from fractions import Fraction
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.calendar import Clock, elapsed
from shopfloor.read import cells
from shopfloor.read.cells import CellFault, Marks
from tests.read.reading import patient

POINT = Marks()  # columns separated by commas
BOTH = Marks(comma=True, sure=frozenset())  # semicolons, nothing learnt yet
COMMA = Marks(comma=True, sure=frozenset(","))


def rule(read: object, *arguments: object) -> str:
    with pytest.raises(CellFault) as caught:
        read(*arguments)  # type: ignore[operator]
    return caught.value.rule


@pytest.mark.parametrize(
    ("text", "seconds"),
    [
        ("30", 1800),
        ("12.5", 750),
        ("1.500", 90),
        (".5", 30),
        ("5.", 300),
        ("+5", 300),
        ("007", 420),
        ("1:30", 5400),
        ("0:00:45", 45),
        ("100:00", 360_000),
        ("0:00:01.5", Fraction(3, 2)),
        ("0.1", 6),
        ("0.33333", Fraction("19.9998")),
    ],
)
def test_times_are_read_exactly(text: str, seconds: int) -> None:
    assert cells.length(text, POINT) == seconds


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("half an hour", "minutes-unreadable"),
        ("NaN", "minutes-unreadable"),
        ("inf", "minutes-unreadable"),
        ("-inf", "minutes-unreadable"),
        ("1e3", "minutes-unreadable"),
        ("30 min", "minutes-unreadable"),
        ("1:75", "minutes-unreadable"),
        ("1:5", "minutes-unreadable"),
        ("0x10", "minutes-unreadable"),
        ("1_000", "thousands-separator"),
        ("٣٠", "minutes-unreadable"),
        ("=30", "minutes-unreadable"),
        ("2026-03-02T06:00", "minutes-unreadable"),
        ("9" * 400, "minutes-unreadable"),
        ("0", "minutes-not-positive"),
        ("0:00", "minutes-not-positive"),
        ("-0.0", "minutes-not-positive"),
        ("-15", "minutes-not-positive"),
        ("-0:15", "minutes-not-positive"),
        ("525601", "minutes-too-large"),
        ("8761:00", "minutes-too-large"),
        ("12,5", "decimal-comma"),
        ("1,200", "number-ambiguous"),
        ("1,234,567", "thousands-separator"),
        ("1,234.5", "thousands-separator"),
        ("1.234,5", "thousands-separator"),
        ("1 200", "thousands-separator"),
        ("1\u00a0200", "thousands-separator"),
        ("1'200", "thousands-separator"),
    ],
)
def test_times_that_break_a_rule(text: str, code: str) -> None:
    assert rule(cells.length, text, POINT) == code


@pytest.mark.parametrize(
    ("text", "marks", "seconds"),
    [
        ("12,5", BOTH, 750),
        ("12.5", BOTH, 750),
        ("0,250", BOTH, 15),  # no one writes thousands with a leading zero
        ("1,500", COMMA, 90),
        ("1.5", COMMA, 90),
        ("1.500", Marks(comma=True), 90),  # a workbook's own number
    ],
)
def test_decimal_commas_are_read_where_no_comma_separates_columns(
    text: str, marks: Marks, seconds: int
) -> None:
    assert cells.length(text, marks) == seconds


@pytest.mark.parametrize(("text", "marks"), [("1,500", BOTH), ("1.500", BOTH), ("1.500", COMMA)])
def test_a_lone_mark_before_three_digits_is_refused_unless_the_table_shows_what_it_means(
    text: str, marks: Marks
) -> None:
    with pytest.raises(CellFault) as caught:
        cells.length(text, marks)
    assert caught.value.rule == "number-ambiguous"
    assert caught.value.words == {"large": "1500", "small": "1.5", "sure": "1.5"}


def test_the_advice_on_an_ambiguous_number_has_no_second_reading() -> None:
    with pytest.raises(CellFault) as caught:
        cells.length("1.234", BOTH)
    assert caught.value.words["sure"] == "1.2340"
    assert cells.number(caught.value.words["sure"], BOTH) == Fraction("1.234")


@pytest.mark.parametrize(
    ("separator", "texts", "marks"),
    [
        (",", ["1.5", "1,5"], Marks()),
        (";", ["30", "1.500"], Marks(comma=True, sure=frozenset())),
        (";", ["1.500", "12,5"], Marks(comma=True, sure=frozenset(","))),
        (";", ["0.250"], Marks(comma=True, sure=frozenset("."))),
        (";", ["12,5", "12.5"], Marks(comma=True, sure=frozenset())),
        ("", ["words"], Marks(comma=True, sure=frozenset("."))),
        ("", ["12,5"], Marks(comma=True, sure=frozenset(".,"))),
    ],
)
def test_marks_are_learnt_from_numbers_that_can_be_read_in_one_way_only(
    separator: str, texts: list[str], marks: Marks
) -> None:
    assert cells.find_marks(separator, texts) == marks


@patient
@given(st.integers(1, 365 * 24 * 3600))
def test_elapsed_time_reads_back(seconds: int) -> None:
    """:func:`elapsed` writes what :func:`length` reads."""
    assert cells.length(elapsed(seconds), POINT) == seconds


@patient
@given(st.decimals("0.001", 525_600, places=3))
def test_decimal_minutes_read_back_exactly(minutes: object) -> None:
    assert cells.length(str(minutes), POINT) == Fraction(str(minutes)) * 60


@patient
@given(st.fractions(0, 10**6))
def test_rounding_goes_to_the_nearest_second_and_up_from_the_half(seconds: Fraction) -> None:
    rounded = cells.nearest_second(seconds)
    assert abs(rounded - seconds) <= Fraction(1, 2)
    assert rounded - seconds != Fraction(-1, 2)


def test_priorities_have_at_most_three_decimals() -> None:
    assert cells.priority("1", POINT) == 1.0
    assert cells.priority("0.125", POINT) == 0.125
    assert cells.priority("2.50000", POINT) == 2.5
    assert rule(cells.priority, "1.2345", POINT) == "priority-too-fine"
    assert rule(cells.priority, "0", POINT) == "number-not-positive"
    assert rule(cells.priority, "1001", POINT) == "priority-too-large"
    assert rule(cells.priority, "high", POINT) == "number-unreadable"


def test_whole_numbers_may_carry_an_empty_fraction() -> None:
    assert [cells.step(text) for text in ("0", "7", "10.0", "10.", "100000")] == [0, 7, 10, 10, 100_000]
    assert [rule(cells.step, text) for text in ("-1", "1.5", "first", "1.000")] == ["step-unreadable"] * 4
    assert rule(cells.step, "100001") == "step-too-large"
    assert cells.heads("0") == 0
    assert rule(cells.heads, "two") == "heads-unreadable"
    assert rule(cells.heads, "10001") == "heads-too-large"


def test_yes_and_no_in_their_usual_spellings() -> None:
    assert all(cells.splittable(text) for text in ("yes", "Y", "TRUE", "1", "x", "X"))
    assert not any(cells.splittable(text) for text in ("no", "N", "false", "0", "-"))
    assert rule(cells.splittable, "maybe") == "splittable-unreadable"


@pytest.mark.parametrize(
    "name",
    [
        "TQ-001",
        "00042",
        "WÄSCHE",
        "מכונה 3",
        "مغسلة",
        "清洗",
        "<b>&\"'",
        "=1+1",
        "@A1",
        "का\u200dर",
        "a b",
        "x" * 80,
    ],
)
def test_names_may_hold_anything_that_can_be_seen(name: str) -> None:
    assert cells.name_of(name) == name


@pytest.mark.parametrize(
    ("name", "code"),
    [
        ("DYE\nPEN", "U+000A"),
        ("DYE\rPEN", "U+000D"),
        ("DYE\tPEN", "U+0009"),
        ("\x1b[31mred", "U+001B"),
        ("a\x00b", "U+0000"),
        ("a\x85b", "U+0085"),
        ("abc\u202edef", "U+202E"),
        ("abc\u2066def", "U+2066"),
        ("abc\u200bdef", "U+200B"),
        ("a\ufeffb", "U+FEFF"),
        ("a\u2028b", "U+2028"),
        ("a\ud800b", "U+D800"),
    ],
)
def test_names_hold_nothing_that_cannot_be_seen(name: str, code: str) -> None:
    with pytest.raises(CellFault) as caught:
        cells.name_of(name)
    assert caught.value.rule == "control-character"
    assert caught.value.words == {"code": code}


def test_names_are_bounded() -> None:
    assert rule(cells.name_of, "x" * 81) == "name-too-long"


def test_notes_keep_their_line_breaks_and_nothing_else_invisible() -> None:
    assert cells.note("rinse\r\ntwice\rdry\tit") == "rinse\ntwice\ndry\tit"
    assert rule(cells.note, "bell\x07") == "control-character"


def test_moments_are_read_by_the_clock() -> None:
    clock = Clock(datetime(2026, 3, 2, 6))
    assert cells.moment("07:30", clock, "due") == 5400
    assert cells.moment("2026-03-02T05:00", clock, "due") == -3600
    assert cells.moment("1:30", Clock(), "due") == 5400
    with pytest.raises(CellFault) as caught:
        cells.moment("noon", clock, "due")
    assert caught.value.rule == "due-unreadable"
    assert caught.value.words == {
        "problem": "is no time this tool reads",
        "advice": "write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date",
    }


@pytest.mark.parametrize(
    "text", ["2062-03-02T06:00", "1926-03-02T06:00", "0001-01-01T00:00", "9999-12-31T23:59"]
)
def test_moments_far_from_the_shift_have_a_mistyped_year(text: str) -> None:
    for zone in (None, ZoneInfo("Asia/Tokyo"), ZoneInfo("America/Los_Angeles")):
        assert rule(cells.moment, text, Clock(datetime(2026, 3, 2, 6), zone), "due") == "time-far-away"


def test_a_time_that_the_clocks_skip_is_refused() -> None:
    clock = Clock(datetime(2026, 3, 28, 22), ZoneInfo("Europe/London"))
    assert rule(cells.moment, "01:30", clock, "release") == "release-unreadable"


def test_error_values_of_spreadsheets_are_no_names() -> None:
    for text in ("#N/A", "#REF!", "#DIV/0!"):
        assert rule(cells.refuse_error_value, text) == "formula-error"
    cells.refuse_error_value("# 7")
