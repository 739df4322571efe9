"""Closures and opening hours laid over each other, second by second."""

from __future__ import annotations

from itertools import pairwise

from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.feasible import FOR_GOOD_S
from shopfloor.model.shop import Closure
from shopfloor.read.spans import NOT_OPEN, merged, outside
from tests.read.reading import patient

END = 30
_spans = st.lists(st.tuples(st.integers(0, 20), st.integers(1, 8)), max_size=5).map(
    lambda pairs: [(start, start + length) for start, length in pairs]
)


def covered(spans: list[tuple[int, int]] | tuple[tuple[int, int], ...]) -> list[bool]:
    return [any(start <= second < end for start, end in spans) for second in range(END)]


def closures(spans: list[tuple[int, int]]) -> list[Closure]:
    return [Closure(start, end, f"r{start % 2}") for start, end in spans]


def times(found: list[Closure] | tuple[Closure, ...]) -> list[tuple[int, int]]:
    return [(closure.start_s, closure.end_s) for closure in found]


@patient
@given(_spans)
def test_merged_closures_cover_the_same_and_stand_apart(spans: list[tuple[int, int]]) -> None:
    found = merged(closures(spans))
    assert covered(times(found)) == covered(spans)
    assert all(one.end_s <= two.start_s for one, two in pairwise(found))
    for closure in found:
        inside = [c for c in closures(spans) if closure.start_s <= c.start_s < closure.end_s]
        assert set(closure.reason.split(", ")) == {c.reason for c in inside}


@patient
@given(_spans.filter(bool), _spans)
def test_a_machine_is_not_open_where_no_opening_and_no_closure_is(
    openings: list[tuple[int, int]], spans: list[tuple[int, int]]
) -> None:
    closed = merged(closures(spans))
    shut = outside(openings, closed)
    assert {closure.reason for closure in shut} == {NOT_OPEN}
    together = sorted([*closed, *shut], key=lambda one: one.start_s)
    assert all(one.end_s <= two.start_s for one, two in pairwise(together))
    is_open, is_closed = covered(openings), covered(spans)
    assert covered(times(shut)) == [not a and not b for a, b in zip(is_open, is_closed, strict=True)]
    last = max(end for _, end in openings)
    assert max(closure.end_s for closure in shut) == last + FOR_GOOD_S
