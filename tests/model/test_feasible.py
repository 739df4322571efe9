"""What no plan can do, judged against trying every start."""

from __future__ import annotations

from datetime import datetime

import hypothesis
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.calendar import DAY, HOUR, Clock
from shopfloor.model.feasible import FOR_GOOD_S, beyond_shift, impossible, waits_for_good
from shopfloor.model.shop import Closure, Crew, Machine, Operations, Orders, Shop

HORIZON = 60  # beyond it nothing changes any more
patient = hypothesis.settings(deadline=None)


def hall(
    seconds: list[int],
    *,
    machine: Machine | None = None,
    crews: tuple[Crew, ...] = (),
    breaks: tuple[Closure, ...] = (),
    release: int = 0,
    shift_end_s: int | None = None,
    **columns: list[int],
) -> Shop:
    """One machine and an order for each operation, all released at one time."""
    size = len(seconds)
    return Shop(
        machines=(machine or Machine("M"),),
        orders=Orders(tuple(f"J{k}" for k in range(size)), release_s=np.full(size, release)),
        operations=Operations(list(range(size)), [0] * size, seconds, **columns),  # type: ignore[arg-type]
        crews=crews,
        breaks=breaks,
        shift_end_s=shift_end_s,
    )


def said(shop: Shop) -> list[tuple[int, str, str]]:
    return [(one.operation, one.rule, f"{one.problem}; {one.advice}") for one in impossible(shop)]


# ---- words ------------------------------------------------------------------------------------------


def open_until(end_s: int, *closed: tuple[int, int]) -> tuple[Closure, ...]:
    return (*(Closure(*span) for span in closed), Closure(end_s, end_s + FOR_GOOD_S, "not open"))


def test_a_machine_that_is_not_shut_for_good_holds_any_operation() -> None:
    closed = (Closure(HOUR, 2 * HOUR), Closure(3 * HOUR, 3 * HOUR + FOR_GOOD_S - 1))
    assert said(hall([5 * HOUR], machine=Machine("M", closed=closed))) == []
    assert said(hall([400 * DAY])) == []


def test_an_operation_longer_than_the_longest_opening() -> None:
    machine = Machine("CMM", closed=open_until(4 * HOUR, (HOUR, 2 * HOUR)))
    assert said(hall([2 * HOUR, 2 * HOUR + 60], machine=machine)) == [
        (
            1,
            "longer-than-any-opening",
            "takes 2 h 01 on CMM, longer than its longest opening, 2 h; "
            "open CMM for longer, let it pause, or split the operation",
        )
    ]


def test_only_openings_after_the_release_count() -> None:
    machine = Machine("CMM", closed=open_until(4 * HOUR, (2 * HOUR, 3 * HOUR)))
    assert said(hall([2 * HOUR], machine=machine)) == []
    assert said(hall([2 * HOUR], machine=machine, release=60)) == [
        (
            0,
            "longer-than-any-opening",
            "takes 2 h on CMM, longer than its longest opening from 0:01 on, 1 h 59; "
            "open CMM for longer, let it pause, or split the operation",
        )
    ]


def test_work_that_pauses_needs_the_time_but_not_in_one_piece() -> None:
    machine = Machine("CMM", pauses=True, closed=open_until(4 * HOUR, (HOUR, 2 * HOUR)))
    assert said(hall([3 * HOUR, 3 * HOUR + 60], machine=machine)) == [
        (
            1,
            "longer-than-any-opening",
            "takes 3 h 01 on CMM, longer than all the time it is open, 3 h; "
            "open CMM for longer, or divide the order",
        )
    ]


def test_an_operation_that_may_be_cut_needs_no_opening_for_itself() -> None:
    machine = Machine("CMM", closed=open_until(4 * HOUR, (HOUR, 2 * HOUR)))
    shop = hall([3 * HOUR, 3 * HOUR, 3 * HOUR + 1], machine=machine, splittable=[0, 1, 1])
    assert [(operation, rule) for operation, rule, _ in said(shop)] == [
        (0, "longer-than-any-opening"),
        (2, "longer-than-any-opening"),
    ]


def test_a_machine_that_is_never_open_again_after_the_release() -> None:
    machine = Machine("CMM", closed=open_until(4 * HOUR))
    assert said(hall([60], machine=machine, release=4 * HOUR)) == [
        (
            0,
            "never-open-again",
            "is not open again from 4:00 on, the earliest that this operation can start; "
            "open CMM for longer, or send the order elsewhere",
        )
    ]


def test_lower_steps_of_the_order_push_the_earliest_start() -> None:
    shop = Shop(
        machines=(Machine("A"), Machine("B", closed=open_until(HOUR))),
        orders=Orders(("J",)),
        operations=Operations([0, 0], [0, 1], [HOUR, 60], step=[1, 2]),
    )
    assert [(one.operation, one.rule) for one in impossible(shop)] == [(1, "never-open-again")]


def test_more_heads_than_the_crew_ever_has() -> None:
    machine, crew = Machine("RIG", crew="fitters"), Crew("fitters", 2, ((60, 120, 3),))
    assert said(hall([50, 50], machine=machine, crews=(crew,), heads=[3, 4])) == [
        (
            1,
            "too-few-heads",
            "needs 4 heads of crew fitters, which never has more than 3; write fewer, or give the crew more",
        )
    ]
    nobody = Crew("fitters", 0)
    assert said(hall([50, 50], machine=machine, crews=(nobody,), heads=[0, 1])) == [
        (
            1,
            "too-few-heads",
            "needs 1 head of crew fitters, which never has more than 0; write fewer, or give the crew more",
        )
    ]


def test_as_many_heads_but_not_for_long_enough() -> None:
    machine, crew = Machine("RIG", crew="fitters"), Crew("fitters", 2, ((HOUR, 2 * HOUR, 3),))
    assert said(hall([HOUR, HOUR + 60], machine=machine, crews=(crew,), heads=[3, 3])) == [
        (
            1,
            "longer-than-heads-stay",
            "needs 3 heads of crew fitters for 1 h 01, but while RIG is open so many are there for at most "
            "1 h; write fewer, or give the crew more",
        )
    ]


def test_a_machine_attended_at_set_up_needs_its_heads_only_then() -> None:
    machine = Machine("RIG", crew="fitters", set_up_only=True)
    crew = Crew("fitters", 0, ((HOUR, 2 * HOUR, 1),))
    shop = hall([5 * HOUR] * 3, machine=machine, crews=(crew,), setup_s=[0, HOUR, HOUR + 1])
    assert [(one.operation, one.rule) for one in impossible(shop)] == [(2, "longer-than-heads-stay")]


def test_the_same_operation_is_told_once() -> None:
    machine = Machine("RIG", crew="fitters", closed=open_until(HOUR))
    shop = hall([2 * HOUR], machine=machine, crews=(Crew("fitters", 0),))
    assert [one.rule for one in impossible(shop)] == ["longer-than-any-opening"]


def test_moments_are_written_as_the_hall_says_them() -> None:
    machine = Machine("CMM", closed=open_until(4 * HOUR))
    shop = hall([60], machine=machine, release=5 * HOUR)
    wall = Shop(shop.machines, shop.orders, shop.operations, clock=Clock(datetime(2026, 3, 2, 6)))
    assert next(impossible(wall)).problem.startswith("is not open again from 11:00 on")


# ---- against trying everything ------------------------------------------------------------------------


@st.composite
def halls(draw: st.DrawFn) -> Shop:
    """Small halls with breaks, closures and crews; some machines are shut for good."""

    def spans(most: int) -> list[tuple[int, int]]:
        edges = sorted(draw(st.sets(st.integers(0, 24), max_size=2 * most)))
        return list(zip(edges[::2], edges[1::2], strict=False))

    machines = []
    for name in ("M", "N"):
        closed = [Closure(*span) for span in spans(3)]
        if draw(st.booleans()):
            begin = max([closure.end_s for closure in closed], default=0) + draw(st.integers(0, 6))
            closed.append(Closure(begin, begin + FOR_GOOD_S))
        machines.append(
            Machine(
                name,
                pauses=draw(st.booleans()),
                closed=tuple(closed),
                crew=draw(st.sampled_from([None, "crew"])),
                set_up_only=draw(st.booleans()),
            )
        )
    levels = tuple((*span, draw(st.integers(0, 3))) for span in spans(3))
    size = draw(st.integers(1, 4))
    seconds = draw(st.lists(st.integers(1, 9), min_size=size, max_size=size))
    return Shop(
        machines=tuple(machines),
        orders=Orders(tuple(f"J{k}" for k in range(size)), release_s=draw(_column(size, 0, 26))),
        operations=Operations(
            list(range(size)),
            draw(_column(size, 0, 1)),
            seconds,
            splittable=draw(_column(size, 0, 1)),
            heads=draw(_column(size, 0, 3)),
            setup_s=[draw(st.integers(0, length)) for length in seconds],
        ),
        crews=(Crew("crew", draw(st.integers(0, 2)), levels),),
        breaks=tuple(Closure(*span) for span in spans(2)),
        shift_end_s=draw(st.one_of(st.none(), st.integers(1, 30))),
    )


def _column(size: int, least: int, most: int) -> st.SearchStrategy[list[int]]:
    return st.lists(st.integers(least, most), min_size=size, max_size=size)


def worked(shop: Shop, index: int, until: int) -> list[bool]:
    """Whether each second of the horizon can be worked on the operation's machine."""
    machine = shop.machines[shop.operations.machine[index]]
    shut = [(closure.start_s, closure.end_s) for closure in (*shop.breaks, *machine.closed)]
    return [t < until and not any(start <= t < end for start, end in shut) for t in range(HORIZON)]


def attended(shop: Shop, index: int) -> list[bool]:
    """Whether the crew has the operation's heads at each second."""
    machine, heads = shop.machines[shop.operations.machine[index]], int(shop.operations.heads[index])
    if machine.crew is None:
        return [True] * HORIZON
    crew = shop.crews[0]
    there = [
        next((level for start, end, level in crew.levels if start <= t < end), crew.heads)
        for t in range(HORIZON)
    ]
    return [heads <= number for number in there]


def possible(shop: Shop, index: int, until: int = HORIZON) -> bool:
    """Whether some start within the horizon will do, judged second by second."""
    operation = shop.operation(index)
    machine = shop.machines[operation.machine]
    open_, there = worked(shop, index, until), attended(shop, index)
    wanted = operation.setup_s if machine.set_up_only else operation.seconds
    release = int(shop.orders.release_s[operation.job])
    if operation.splittable:
        free = [t for t in range(release, HORIZON) if open_[t]]
        return len(free) >= operation.seconds and sum(there[t] for t in free) >= wanted
    for start in range(release, HORIZON):
        seconds: list[int] = []
        for t in range(start, HORIZON):
            if len(seconds) == operation.seconds:
                break
            if open_[t]:
                seconds.append(t)
            elif not seconds or not machine.pauses:
                break
        if len(seconds) == operation.seconds and all(there[t] for t in seconds[:wanted]):
            return True
    return False


@patient
@given(halls())
def test_nothing_that_can_run_is_called_impossible(shop: Shop) -> None:
    for one in impossible(shop):
        assert not possible(shop, one.operation), one


@patient
@given(halls())
def test_without_set_ups_and_cuts_everything_impossible_is_found(shop: Shop) -> None:
    """Where the crew's time and the machine's are one and the same, the conditions are exact."""
    found = {one.operation for one in impossible(shop)}
    for operation in shop:
        machine = shop.machines[operation.machine]
        if machine.crew is None or not (machine.set_up_only or operation.splittable):
            assert possible(shop, operation.index) or operation.index in found


@patient
@given(halls())
def test_what_outlasts_the_shift_by_itself_is_found(shop: Shop) -> None:
    late = set(beyond_shift(shop).tolist())
    if shop.shift_end_s is None:
        assert not late
        return
    for operation in shop:
        if shop.machines[operation.machine].crew is None:
            assert possible(shop, operation.index, shop.shift_end_s) == (operation.index not in late)


@pytest.mark.parametrize("size", [0, 1])
def test_a_shop_without_operations_holds_nothing_impossible(size: int) -> None:
    empty = hall([]) if size == 0 else hall([60])
    assert (said(empty), beyond_shift(empty).tolist()) == ([], [])


def test_a_plan_that_waits_for_what_is_shut_for_good_is_known() -> None:
    """On a machine anything after it is shut; with a crew anything after a year of other heads."""
    shop = hall([5, 4], machine=Machine("M", closed=(Closure(10, 10 + FOR_GOOD_S),)))
    rows = np.arange(2)
    assert not waits_for_good(shop, rows, np.array([5, 10]))
    assert waits_for_good(shop, rows, np.array([5, 11]))
    crew = (Crew("Blue", 2, ((10, 10 + FOR_GOOD_S, 0),)),)
    attended = hall([5, 4], machine=Machine("M", crew="Blue"), crews=crew)
    assert not waits_for_good(attended, rows, np.array([5, 10]))
    assert waits_for_good(attended, rows, np.array([5, 10 + FOR_GOOD_S]))
    assert not waits_for_good(hall([5, 4]), rows, np.array([5, 10 + FOR_GOOD_S]))
