"""Arithmetic on closures, against counting seconds."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.audit.shut import Shut
from shopfloor.model.shop import Closure

closures = st.lists(
    st.builds(lambda start, length: Closure(start, start + length), st.integers(-3, 25), st.integers(1, 6)),
    max_size=5,
)


def shut_seconds(each: list[Closure]) -> set[int]:
    return {second for closure in each for second in range(closure.start_s, closure.end_s)}


@given(closures, st.integers(-5, 35), st.integers(0, 20))
def test_within_counts_the_seconds_shut(each: list[Closure], start: int, length: int) -> None:
    counted = len(shut_seconds(each) & set(range(start, start + length)))
    assert Shut(each).within(np.array([start]), np.array([start + length])).tolist() == [counted]


@given(closures, st.integers(0, 30), st.integers(1, 20))
def test_work_is_done_in_the_first_open_seconds(each: list[Closure], begin: int, work: int) -> None:
    opened = [second for second in range(begin, 200) if second not in shut_seconds(each)][:work]
    shut = Shut(each)
    assert [s for start, end in shut.stretches(begin, work) for s in range(start, end)] == opened
    assert shut.finish(begin, work) == opened[-1] + 1


@given(closures, st.integers(0, 30), st.integers(1, 5), st.integers(1, 5))
def test_pieces_are_never_across_a_closure(each: list[Closure], begin: int, length: int, count: int) -> None:
    """One piece after the other, each at the first second from which it is open long enough."""
    closed, moment = shut_seconds(each), begin
    for _ in range(count):
        while closed & set(range(moment, moment + length)):
            moment += 1
        moment += length
    assert Shut(each).finish_pieces(begin, length, count) == moment


def test_no_work_is_done_at_once() -> None:
    assert Shut([Closure(0, 10)]).finish(5, 0) == 5


def test_closures_that_meet_are_one_with_both_reasons() -> None:
    shut = Shut([Closure(20, 30, "filter"), Closure(10, 20, "tea"), Closure(25, 28, "tea")])
    assert shut.each == (Closure(10, 30, "tea, filter"),)
