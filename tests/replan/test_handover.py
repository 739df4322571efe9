"""Planned against actual: a morning told entry by entry, and what the report makes of it."""

from __future__ import annotations

import pytest

from shopfloor.replan.handover import Handover, handover
from shopfloor.replan.known import known_shop
from shopfloor.replan.reasons import Reason
from tests.replan.floor import CLOCK, MIN, book, hall, machine, stand, told_order, work

# The plan is in tests/replan/floor.py. TQ-1 is due at 45 min, planned for 50, and done at 85.
MORNING = (
    work("started", "TQ-1", "RIG", 0),
    work("started", "TQ-3", "BENCH", 0),
    work("stopped", "TQ-1", "RIG", 10, reason="no gasket"),
    work("resumed", "TQ-1", "RIG", 15),
    work("finished", "TQ-3", "BENCH", 38, good=2),
    work("finished", "TQ-1", "RIG", 35, good=9, scrap=1),
    machine("down", "CMM", 36, reason="probe"),
    machine("up", "CMM", 56),
    work("started", "TQ-1", "CMM", 56),
    work("started", "TQ-2", "BENCH", 58),
    work("finished", "TQ-1", "CMM", 85),
    work("started", "TQ-2", "CMM", 86, unit=2),
)


@pytest.fixture
def found() -> Handover:
    opened = book(*MORNING[:9], MORNING[10], work("started", "TQ-2", "CMM", 86, unit=2))
    here = stand(opened, 100, hall(setup={"RIG": 5}))
    return handover(here.now, here.state, here.told)


def test_a_machine_is_told_planned_and_actual(found: Handover) -> None:
    rig, cmm, bench = found.machines
    assert (rig.planned_s, rig.planned, rig.done) == (50 * MIN, 2, 1)
    assert (rig.times.work_s, rig.setup_s, rig.times.stopped_s) == (30 * MIN, 5 * MIN, 5 * MIN)
    assert rig.stops == (Reason("down", "", 5 * MIN, "no gasket"),)
    assert cmm.outages == (Reason("down", "", 20 * MIN, "probe"),)
    assert (cmm.planned, cmm.done) == (2, 1)
    assert (bench.planned_s, bench.planned, bench.done) == (75 * MIN, 1, 1)
    assert (rig.elements.GQ, rig.elements.SQ, found.elements.PQ) == (9, 1, 12)


def test_an_order_is_told_planned_and_actual_and_why(found: Handover) -> None:
    first = found.orders[0]
    assert (first.order, first.promised_s, first.actual_s, first.due_s) == (
        "TQ-1",
        50 * MIN,
        85 * MIN,
        45 * MIN,
    )
    assert (first.late_s, first.behind_s, first.left) == (40 * MIN, 35 * MIN, 0)
    assert first.why == (
        Reason("down", "CMM", 20 * MIN, "probe"),
        Reason("stopped", "RIG", 5 * MIN, "no gasket"),
    )


def test_an_order_not_done_is_late_as_far_as_its_due_time_has_passed(found: Handover) -> None:
    second = found.orders[1]
    assert (second.order, second.actual_s, second.left, second.late_s) == ("TQ-2", None, 2, 0)
    third = found.orders[2]
    assert (third.due_s, third.late_s, third.behind_s) == (None, 0, 50 * MIN)
    assert [(one.kind, one.machine) for one in third.why] == [("longer", "BENCH"), ("not-started", "RIG")]


def test_the_sequence_is_kept_by_as_many_as_can_be(found: Handover) -> None:
    """The CMM was to run TQ-2, then TQ-1; it ran them the other way round."""
    assert [(row.started, row.in_sequence) for row in found.machines] == [(1, 1), (2, 1), (1, 1)]
    assert (found.started, found.in_sequence) == (4, 3)


def test_what_is_left_carries_over_with_its_remaining_time(found: Handover) -> None:
    left = {(one.key.order, one.key.machine): one.seconds // MIN for one in found.left}
    assert left == {("TQ-2", "CMM"): 26, ("TQ-2", "BENCH"): 60, ("TQ-3", "RIG"): 20}


def test_done_and_left_are_all_there_is(found: Handover) -> None:
    assert found.done + len(found.left) == len(found.now.shop)


def test_a_cancelled_order_is_neither_late_nor_carried() -> None:
    here = stand(book(told_order("cancelled", "TQ-1", 5)), 100)
    row = handover(here.now, here.state, here.told).orders[0]
    assert (row.cancelled, row.late_s, row.left, row.actual_s) == (True, 0, 0, None)


def test_without_the_orders_file_the_journal_gives_what_it_knows() -> None:
    opened = book(*MORNING[:9])
    here = stand(opened, 60)
    shop = known_shop(here.state, here.told, CLOCK, None)
    again = stand(opened, 60, shop)
    found = handover(again.now, again.state, again.told)
    assert found.done == 2
    assert [row.machine for row in found.machines] == ["BENCH", "CMM", "RIG"]
    assert found.machines[1].units == 2
    assert all(row.due_s is None for row in found.orders)


def test_remarks_and_oddities_are_handed_on() -> None:
    from shopfloor.journal.entries import Entry
    from shopfloor.model.actuals import Kind

    opened = book(Entry(Kind.REMARK, 10 * MIN, order="TQ-1", data={"text": "rim is worn"}))
    here = stand(opened, 60)
    found = handover(here.now, here.state, here.told)
    assert [event.data["text"] for event in found.remarks] == ["rim is worn"]
    assert found.odd == 0
