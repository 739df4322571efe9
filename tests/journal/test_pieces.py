"""Rows of a plan get numbers that stay with the work, and the plan's own clock is read."""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime
from typing import Any
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.journal.pieces import clock_of, issued_plan, made_at, numbered
from shopfloor.model.actuals import Key, PieceState, Status, Stretch
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
    found = numbered(stated(rows, [(1, 1), (1, 2), (1, 1), (1, 1), (2, 2)]))
    assert [(piece.key, piece.start_s, piece.part, piece.parts) for piece in found] == [
        (Key("A", "M", 1), 0, 1, 2),
        (Key("A", "N", 1), 0, 1, 1),
        (Key("B", "M", 1), 30, 1, 1),
        (Key("A", "M", 2), 60, 1, 1),
        (Key("A", "M", 3), 90, 2, 2),
    ]
    assert found[3].seconds == 30


# ---- a plan made during the shift ----------------------------------------------------------------------


def waiting(number: int, seconds: int = 30, key: tuple[str, str] = ("A", "M")) -> PieceState:
    return PieceState(Key(*key, number), Status.WAITING, total_s=seconds, left_s=seconds)


def running(number: int, start: int, seconds: int = 30) -> PieceState:
    return replace(waiting(number, seconds), status=Status.RUNNING, start_s=start, runs=(Stretch(1, start),))


def stopped(number: int, start: int, left: int) -> PieceState:
    runs = (Stretch(1, start, start + 1),)
    return replace(waiting(number, 30), status=Status.BLOCKED, start_s=start, left_s=left, runs=runs)


def done(number: int, start: int, scrap: int = 0) -> PieceState:
    runs, end = (Stretch(1, start, start + 5),), start + 5
    made = replace(waiting(number, 30), status=Status.DONE, start_s=start, end_s=end, left_s=0, runs=runs)
    return replace(made, good=0 if scrap else 1, scrap=scrap)


def numbers(
    rows: list[tuple[int, int]], known: list[PieceState], made_s: int | None, parts: bool = False
) -> list[int]:
    """Return the number of each row of A on M, given as start and end; `parts` if they are parts of one."""
    cut = [(k, len(rows)) if parts else (1, 1) for k in range(1, len(rows) + 1)]
    found = numbered(stated([("A", "M", *row) for row in rows], cut), known, made_s=made_s)
    return [next(one.key.piece for one in found if (one.start_s, one.end_s) == row) for row in rows]


def test_work_under_way_keeps_its_number_in_the_next_plan() -> None:
    rows = [(40, 70), (70, 99), (99, 120)]
    assert numbers(rows, [running(2, 40)], None) == [2, 1, 3]
    assert numbers(rows, [running(2, 40)], 50) == [2, 1, 3]


def test_the_rest_of_stopped_work_is_the_same_work() -> None:
    assert numbers([(60, 80)], [stopped(1, 0, 20)], 50) == [1]
    assert numbers([(60, 80)], [stopped(1, 0, 9), stopped(2, 20, 20)], 50) == [2]  # the last one stopped
    assert numbers([(60, 90), (90, 110)], [stopped(1, 0, 20), waiting(2)], 50) == [2, 1]  # by their lengths


def test_what_was_scrapped_whole_is_run_again_under_a_new_number() -> None:
    assert numbers([(60, 90)], [done(1, 0, scrap=3)], 50) == [2]
    assert numbers([(60, 90), (90, 99)], [done(1, 0, scrap=3), waiting(2, 9)], 50) == [3, 2]
    assert numbers([(60, 90)], [done(1, 0), waiting(2)], 50) == [2]


def test_what_began_between_the_plan_and_its_issue_is_still_the_row_it_was() -> None:
    """The journal is asked how things stood when the plan was made; what was corrected since counts."""
    assert numbers([(10, 40)], [running(1, 12)], 50) == [1]  # its start was put right
    assert numbers([(60, 90)], [running(1, 12)], 50) == [1]  # it was stopped, and then not
    assert numbers([(60, 90)], [done(1, 12)], 50) == [1]  # it was done already, and that was told late


def test_work_that_is_cut_anew_gets_new_numbers_for_its_further_parts() -> None:
    assert numbers([(60, 70), (80, 90)], [stopped(2, 0, 20), waiting(3, 10)], 50, parts=True) == [2, 1]


def test_a_plan_of_the_whole_shift_takes_the_work_as_it_is_known() -> None:
    assert numbers([(0, 30), (30, 40)], [done(1, 3), waiting(2, 10)], None) == [1, 2]
    assert numbers([(0, 30)], [running(1, 3)], None) == [1]


def test_a_plan_says_when_it_was_made_of_what_was_left() -> None:
    assert made_at({"options": {"now_s": 4200}}) == 4200
    assert [made_at(head) for head in ({}, {"options": None}, {"options": {"now_s": "4200"}})] == [None] * 3


def test_whoever_knows_better_says_the_numbers() -> None:
    rows = [("A", "M", 0, 30), ("A", "M", 30, 60)]
    assert [piece.key.piece for piece in numbered(stated(rows), (), [5, 3])] == [5, 3]


PIECES = st.dictionaries(
    st.integers(1, 5),
    st.one_of(
        st.builds(lambda length: (waiting, length), st.integers(1, 9)),
        st.builds(lambda start: (running, start), st.integers(0, 4)),
        st.builds(lambda start, left: (stopped, start, left), st.integers(0, 4), st.integers(1, 9)),
        st.builds(lambda start, scrap: (done, start, scrap), st.integers(0, 4), st.integers(0, 1)),
    ),
    max_size=5,
)


@given(
    st.lists(st.tuples(st.integers(0, 9), st.integers(1, 9)), max_size=6, unique=True),
    PIECES,
    st.sampled_from([None, 5]),
)
def test_no_two_rows_share_a_number_and_all_that_can_be_known_is(
    rows: list[tuple[int, int]], made: dict[int, tuple[Any, ...]], made_s: int | None
) -> None:
    known = [make(number, *values) for number, (make, *values) in sorted(made.items())]
    listed = sorted((start, start + length) for start, length in rows)
    found = numbers(listed, known, made_s)
    assert len(set(found)) == len(found)
    assert min(found, default=1) >= 1
    usable = {piece.key.piece for piece in known if not piece.failed}
    later = [row for row in listed if made_s is None or row[0] >= made_s]
    halted = {
        piece.key.piece for piece in known if piece.start_s is not None and piece.status is Status.BLOCKED
    }
    if len(later) >= len(known):  # there is a row for each, so that each has one
        assert usable <= set(found)
    if len(later) >= len(halted) and made_s is not None:
        assert halted <= set(found)


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
