"""The audit of a replan against the journal: one plan that breaks just one rule, each time."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from shopfloor.model.stated import StatedPlan
from shopfloor.replan.frozen import audit_frozen
from tests.replan.floor import CLOCK, MIN, VISITS, book, machine, stand, told_order, work

Rows = Sequence[tuple[str, str, int, float, float]]
WANTED = {(order, name): 1 for order, name, _ in VISITS}
ENTRIES = (
    work("started", "TQ-1", "RIG", 0),
    work("started", "TQ-2", "CMM", 2, unit=2),
    work("started", "TQ-3", "BENCH", 0),
    work("finished", "TQ-3", "BENCH", 18, good=1),
)
# What is left at 20 minutes: TQ-1 runs on the RIG until 30, TQ-2 on the CMM until 42.
CLEAN: Rows = (
    ("TQ-1", "RIG", 1, 0, 30),
    ("TQ-2", "CMM", 2, 2, 42),
    ("TQ-1", "CMM", 1, 30, 50),
    ("TQ-3", "RIG", 1, 30, 50),
    ("TQ-2", "BENCH", 1, 42, 117),
)


def stated(rows: Rows) -> StatedPlan:
    order, name, unit, start, end = (list(column) for column in zip(*rows, strict=True))
    size = len(order)
    return StatedPlan(
        row=np.arange(1, size + 1),
        order=order,
        machine=name,
        unit=np.array(unit),
        start_s=np.array([round(moment * MIN) for moment in start]),
        end_s=np.array([round(moment * MIN) for moment in end]),
        round=np.full(size, -1),
        part=np.ones(size),
        parts=np.ones(size),
    )


def found(
    rows: Rows, *more: object, back: dict[tuple[str, int], int] | None = None
) -> list[tuple[str, str, tuple[int, ...]]]:
    opened = book(*ENTRIES, *more)  # type: ignore[arg-type]
    listed = audit_frozen(stated(rows), stand(opened, 20).state, WANTED, CLOCK, back)
    return [(one.rule, one.sentence, one.rows) for one in listed]


def changed(place: int, row: tuple[str, str, int, float, float]) -> Rows:
    return [*CLEAN[:place], row, *CLEAN[place + 1 :]]


def test_a_faithful_plan_is_clean() -> None:
    assert found(CLEAN) == []


def test_nothing_new_starts_before_now() -> None:
    assert found(changed(4, ("TQ-2", "BENCH", 1, 19, 94)))[0] == (
        "before-now",
        "TQ-2 on BENCH starts at 06:19, but it is 06:20.",
        (5,),
    )


def test_running_work_stays_on_its_unit() -> None:
    assert found(changed(1, ("TQ-2", "CMM", 1, 2, 42)))[-1] == (
        "frozen-moved",
        "TQ-2 on CMM runs on unit 2, but is planned on unit 1.",
        (2,),
    )


def test_no_other_work_takes_the_unit_of_what_runs() -> None:
    assert found(changed(3, ("TQ-3", "RIG", 1, 28, 48))) == [
        ("frozen-crossed", "TQ-1 on RIG runs until 06:30, but TQ-3 on RIG takes its unit at 06:28.", (4,))
    ]


def test_no_other_work_takes_the_order_of_what_runs() -> None:
    assert found(changed(2, ("TQ-1", "CMM", 1, 25, 45))) == [
        ("frozen-crossed", "TQ-1 on RIG runs until 06:30, but TQ-1 on CMM takes its order at 06:25.", (3,))
    ]


def test_running_work_that_was_moved_counts_as_planned_twice() -> None:
    rules = [rule for rule, _, _ in found(changed(0, ("TQ-1", "RIG", 1, 60, 90)))]
    assert rules == ["visit-again"]


def test_what_is_done_is_not_planned_again() -> None:
    assert found([*CLEAN, ("TQ-3", "BENCH", 1, 120, 150)]) == [
        ("visit-again", "TQ-3 needs BENCH 1 times: 1 done, 0 running, 1 planned.", (6,))
    ]


def test_nothing_is_forgotten() -> None:
    assert found(CLEAN[:-1]) == [
        ("visit-lost", "TQ-2 needs BENCH 1 times: 0 done, 0 running, 0 planned.", ())
    ]


def test_scrapped_work_is_not_done() -> None:
    scrapped = (work("finished", "TQ-1", "RIG", 20, good=0, scrap=2),)
    again = ("TQ-1", "RIG", 1, 60, 90)
    assert found(changed(0, again), *scrapped) == []
    assert [rule for rule, _, _ in found(CLEAN[1:], *scrapped)] == ["visit-lost"]


def test_a_cancelled_order_is_not_planned_but_for_what_runs_of_it() -> None:
    rows = found(CLEAN, told_order("cancelled", "TQ-2", 19))
    assert rows == [("cancelled", "TQ-2 on BENCH is planned at 06:42, but cancelled.", (5,))]
    assert found(CLEAN[:-1], told_order("cancelled", "TQ-2", 19)) == []


def test_a_machine_that_is_down_begins_nothing_before_it_is_back() -> None:
    down = machine("down", "BENCH", 19, reason="vice")
    assert found(CLEAN, down, back={("BENCH", 0): 45 * MIN}) == [
        ("machine-down", "TQ-2 on BENCH starts at 06:42, but BENCH is down until 06:45.", (5,))
    ]
    assert found(CLEAN, down, back={("BENCH", 0): 42 * MIN}) == []
