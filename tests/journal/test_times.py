"""Learned times: what was planned against what was, and never more than is known."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.journal.entries import Entry
from shopfloor.journal.times import Timing, learned, timings
from tests.journal.floor import MIN, journal, machine, put, work


def found(*entries: Entry, accept: bool = False, **options: object) -> list[Timing]:
    book = journal()
    put(book, *entries, accept=accept)
    return timings(book.events(), **options)


START, FINISH = work("started", "TQ-1", "WASH", 5), work("finished", "TQ-1", "WASH", 45)


def test_a_finished_operation_tells_its_run_time() -> None:
    assert found(START, FINISH) == [Timing("TQ-1", "WASH", "", 30 * MIN, 40 * MIN)]
    assert found(START) == []


def test_stops_and_outages_do_not_count() -> None:
    stop, resume = work("stopped", "TQ-1", "WASH", 10, reason="x"), work("resumed", "TQ-1", "WASH", 20)
    down, up = machine("down", "WASH", 25, reason="x"), machine("up", "WASH", 32)
    assert found(START, stop, resume, down, up, FINISH)[0].actual_s == (40 - 10 - 7) * MIN


def test_breaks_are_left_out_of_both_where_they_are_known() -> None:
    def worked(name: str, start: int, end: int) -> int:
        """A break from minute 20 to 30."""
        return sum(1 for minute in range(start // MIN, end // MIN) if not 20 <= minute < 30) * MIN

    assert found(START, FINISH, worked=worked) == [Timing("TQ-1", "WASH", "", 20 * MIN, 30 * MIN)]


def test_what_was_accepted_against_a_rule_teaches_nothing() -> None:
    assert found(FINISH, accept=True) == []
    assert found(START, START_AGAIN, FINISH, accept=True) == []


START_AGAIN = work("started", "TQ-1", "WASH", 30)


def test_families_are_asked_for() -> None:
    family = {("TQ-1", "WASH"): "oily"}
    assert found(START, FINISH, family=lambda order, name: family[order, name])[0].family == "oily"


def test_groups_are_told_by_median_and_quartiles() -> None:
    rows = [Timing("A", "M", "f", 600, actual) for actual in (600, 660, 900, 300)]
    rows += [Timing("B", "L", "", 60, 90)]
    one, two = learned(rows)
    assert (one.machine, one.count, one.actual_s, one.low_s, one.high_s, one.ratio) == (
        "L",
        1,
        90,
        90,
        90,
        1.5,
    )
    assert (two.family, two.count, two.planned_s, two.actual_s) == ("f", 4, 600, 630)
    assert (two.low_s, two.high_s, two.ratio) == (525, 720, 1.05)


@given(st.lists(st.integers(1, 10_000), min_size=1, max_size=30))
def test_quartiles_are_those_of_definition_seven(actual: list[int]) -> None:
    """Hyndman and Fan (1996), Sample quantiles in statistical packages; NumPy's ``linear``."""
    row = learned([Timing("A", "M", "", 600, seconds) for seconds in actual])[0]
    assert [row.low_s, row.actual_s, row.high_s] == pytest.approx(np.quantile(actual, [0.25, 0.5, 0.75]))
