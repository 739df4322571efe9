"""Timetables of floors: clocks, levels and places against counting, and lists against every schedule."""

from __future__ import annotations

from itertools import permutations, product

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import NO_STEP, Closure, Shop
from shopfloor.openshop.floor.openings import Openings
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.timeline import Level, Line
from shopfloor.openshop.floor.timetable import Timetable, serial
from shopfloor.openshop.units import assign_units
from tests.floor_oracle import least_makespan, least_tardiness, plays
from tests.floor_shops import floors, spans


def columns(shop: Shop, timetable: Timetable) -> tuple[list[int], list[int], list[int]]:
    """Start, end and unit, from 1, of a full timetable."""
    spots = [spot for spot in timetable.spots if spot is not None]
    start, end = [spot.start for spot in spots], [spot.end for spot in spots]
    dealt = assign_units(shop, np.array(start), np.array(end)).tolist()
    return start, end, [
        dealt[k] if spot.unit == NONE else spot.unit + 1 for k, spot in enumerate(spots)
    ]  # fmt: skip


def upwards(shop: Shop, sequence: tuple[int, ...]) -> bool:
    """Whether lower steps of each order come before higher ones."""
    job, step = shop.operations.job, shop.operations.step
    return not any(
        job[a] == job[b] and NO_STEP not in (step[a], step[b]) and step[a] > step[b]
        for place, a in enumerate(sequence)
        for b in sequence[place:]
    )


@given(spans(3, 20), st.integers(0, 25), st.integers(0, 9), st.booleans())
def test_openings_count_like_a_clock(
    closed: tuple[Closure, ...], moment: int, work: int, pauses: bool
) -> None:
    shut = {second for each in closed for second in range(each.start_s, each.end_s)}
    openings = Openings([(each.start_s, each.end_s) for each in closed], pauses=pauses)
    opened = [second for second in range(moment, 60) if second not in shut]
    assert openings.at(moment) == opened[0]
    assert openings.after(moment, work) == (opened[work - 1] + 1 if work else moment)
    assert openings.worked(moment) == moment - len(shut & set(range(moment)))
    if work:
        start, end = openings.fit(moment, work)
        if pauses:
            assert (start, end) == (opened[0], opened[work - 1] + 1)
        else:
            first = next(s for s in range(moment, 60) if not shut & set(range(s, s + work)))
            assert (start, end) == (first, first + work)
        spells = openings.stretches(opened[0], work)
        assert [second for a, b in spells for second in range(a, b)] == opened[:work]


@given(
    st.lists(st.tuples(st.integers(0, 9), st.integers(1, 5), st.integers(1, 2)), max_size=4),
    st.integers(0, 12), st.integers(1, 4), st.integers(1, 3),
)  # fmt: skip
def test_a_level_says_when_too_little_is_free(
    taken: list[tuple[int, int, int]], start: int, length: int, need: int
) -> None:
    level = Level([0], [3])
    for begin, lasts, amount in taken:
        level.take(begin, begin + lasts, amount)
    free = [3 - sum(a for b, n, a in taken if b <= second < b + n) for second in range(40)]
    fits = [all(free[second] >= need for second in range(s, s + length)) for s in range(30)]
    moment = level.clash(start, start + length, need)
    assert (moment == NONE) == fits[start]
    if moment != NONE:
        assert not any(fits[start:moment])
    for begin, lasts, amount in taken:
        level.take(begin, begin + lasts, -amount)
    assert set(level.free) == {3}


def test_a_visit_that_takes_no_time_is_told_from_one_that_starts_with_it() -> None:
    line = Line(None)
    line.take(3, 3, NONE, 0)
    line.take(3, 5, NONE, 1)
    line.give_back(3, 1)
    assert (line.start, line.end, line.operation) == ([3], [3], [0])


@given(st.data())
@settings(max_examples=150, deadline=None)
def test_an_operation_stands_at_the_first_legal_second(data: st.DataObject) -> None:
    """Whatever stands already, and whatever has been taken out again."""
    shop = data.draw(floors(max_operations=4))
    rules = Rules.of(shop)
    sequence = tuple(data.draw(st.permutations(range(len(shop)))))
    sequence = tuple(sorted(sequence, key=lambda k: (rules.job[k], rules.step[k])))
    timetable = serial(rules, sequence)
    assert timetable is not None
    start, end, unit = columns(shop, timetable)
    assert plays(shop, start, unit) == end
    moved = data.draw(st.sampled_from(range(len(shop))))
    timetable.remove(moved)
    spot = timetable.earliest(moved)
    assert spot is not None
    counts = range(1, shop.machines[rules.machine[moved]].count + 1)
    for second in range(spot.start):
        for of in counts if spot.unit != NONE else ():
            assert plays(shop, _with(start, moved, second), _with(unit, moved, of)) is None


def _with(values: list[int], place: int, value: int) -> list[int]:
    return [*values[:place], value, *values[place + 1 :]]


@given(floors(max_operations=4))
@settings(max_examples=100, deadline=None)
def test_some_list_on_some_units_is_as_good_as_any_schedule(shop: Shop) -> None:
    rules = Rules.of(shop)
    count = [shop.machines[machine].count for machine in rules.machine]
    makespans, late = [], []
    for sequence in permutations(range(len(shop))):
        if not upwards(shop, sequence):
            continue
        for units in product(*(range(k) for k in count)):
            timetable = serial(rules, sequence, units)
            assert timetable is not None
            ends = [spot.end for spot in timetable.spots if spot is not None]
            makespans.append(max(ends))
            done = [
                max(e for e, j in zip(ends, rules.job, strict=True) if j == job) for job in set(rules.job)
            ]
            due = [(rules.weight[job], rules.due[job]) for job in set(rules.job)]
            late.append(sum(w * max(0, e - d) for e, (w, d) in zip(done, due, strict=True)))
    assert min(makespans) == least_makespan(shop)
    assert min(late) == least_tardiness(shop)
