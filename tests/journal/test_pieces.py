"""Rows of a plan get numbers that stay with the work, and the plan's own clock is read."""

from __future__ import annotations

from datetime import datetime
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.journal.pieces import clock_of, issued_plan, numbered
from shopfloor.model.actuals import Key
from shopfloor.model.calendar import Clock
from shopfloor.model.stated import StatedPlan

START = "2026-03-02T06:00"
Row = tuple[str, str, int, int]


def stated(rows: list[Row], parts: list[tuple[int, int]] | None = None) -> StatedPlan:
    """Return rows of order, machine, start and end as a stated plan on unit 1."""
    cut = parts or [(1, 1)] * len(rows)
    return StatedPlan(
        row=range(1, len(rows) + 1),
        order=[row[0] for row in rows],
        machine=[row[1] for row in rows],
        unit=[1] * len(rows),
        start_s=[row[2] for row in rows],
        end_s=[row[3] for row in rows],
        round=[-1] * len(rows),
        part=[part for part, _ in cut],
        parts=[parts for _, parts in cut],
    )


def test_visits_and_parts_of_one_order_on_one_machine_count_in_order_of_start() -> None:
    rows = [("A", "M", 60, 90), ("A", "M", 0, 30), ("B", "M", 30, 60), ("A", "N", 0, 9), ("A", "M", 90, 95)]
    found = numbered(stated(rows, [(1, 1), (1, 2), (1, 1), (1, 1), (2, 2)]), {})
    assert [(piece.key, piece.start_s, piece.part, piece.parts) for piece in found] == [
        (Key("A", "M", 1), 0, 1, 2),
        (Key("A", "N", 1), 0, 1, 1),
        (Key("B", "M", 1), 30, 1, 1),
        (Key("A", "M", 2), 60, 1, 1),
        (Key("A", "M", 3), 90, 2, 2),
    ]
    assert found[3].seconds == 30


def test_work_begun_keeps_its_number_in_the_next_plan() -> None:
    begun = {Key("A", "M", 2): 40}  # the second visit was taken first
    rows = [("A", "M", 40, 70), ("A", "M", 70, 99), ("A", "M", 99, 120)]
    assert [piece.key.piece for piece in numbered(stated(rows), begun)] == [2, 1, 3]


def test_whoever_knows_better_says_the_numbers() -> None:
    rows = [("A", "M", 0, 30), ("A", "M", 30, 60)]
    assert [piece.key.piece for piece in numbered(stated(rows), {}, [5, 3])] == [5, 3]


@given(
    st.lists(st.tuples(st.sampled_from("AB"), st.sampled_from("MN"), st.integers(0, 9)), max_size=12),
    st.dictionaries(
        st.builds(Key, st.sampled_from("AB"), st.just("M"), st.integers(1, 4)), st.integers(0, 9)
    ),
)
def test_no_two_rows_share_a_number_and_rows_begun_keep_theirs(
    rows: list[tuple[str, str, int]], begun: dict[Key, int]
) -> None:
    found = numbered(stated([(a, b, start, start + 1) for a, b, start in rows]), begun)
    keys = [piece.key for piece in found]
    assert len(set(keys)) == len(rows)
    assert all(begun[piece.key] == piece.start_s for piece in found if piece.key in begun)


def test_a_plan_is_issued_with_all_it_says_but_its_rows() -> None:
    head = {"shift_start": "2026-03-02T06:00:00", "shift_end_s": 28800, "bounds": [1], "assignments": [2]}
    plan = issued_plan(stated([("A", "M", 0, 30)]), head, sha256="ab")
    assert plan.clock == Clock(datetime(2026, 3, 2, 6))
    assert (plan.shift_end_s, plan.last_s, "assignments" in plan.head, plan.head["bounds"]) == (
        28800,
        28800,
        False,
        [1],
    )


def test_the_clock_of_a_plan_has_its_zone_or_none_at_all() -> None:
    assert clock_of({"shift_start": None}) == Clock()
    zoned = clock_of({"shift_start": "2026-03-02T06:00:00", "time_zone": "Europe/London"})
    assert zoned == Clock(datetime(2026, 3, 2, 6), ZoneInfo("Europe/London"))


@pytest.mark.parametrize(
    ("head", "message"),
    [
        ({"shift_start": "soon"}, "shift_start 'soon' is no date and time"),
        ({"shift_start": 5}, "shift_start '5' is no date and time"),
        ({"shift_start": START + "+01:00"}, f"shift_start '{START}+01:00' has an offset from UTC"),
        ({"shift_start": START, "time_zone": "Mars"}, "time_zone 'Mars' is no time zone known here"),
        ({"shift_start": START, "time_zone": "../x"}, "time_zone '../x' is no time zone known here"),
    ],
)
def test_a_clock_that_cannot_be_read_is_told(head: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError) as caught:  # noqa: PT011 - the whole text is compared
        clock_of(head)
    assert str(caught.value) == message
