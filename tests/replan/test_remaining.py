"""What is left of a shift: done and scrapped, running and stopped, cut, added, changed and cancelled work."""

from __future__ import annotations

from typing import Any

import pytest

from shopfloor.errors import ShopError
from shopfloor.journal.events import Journal
from shopfloor.model.actuals import Key
from shopfloor.model.shop import NO_DUE, NO_FAMILY
from shopfloor.replan.remaining import Left, remaining
from tests.journal.floor import LATE
from tests.replan.floor import CLOCK, MIN, VISITS, book, hall, issued, machine, put, stand, told_order, work


def left(opened: Journal, at: float, **more: Any) -> dict[tuple[str, str], Left]:
    """What is left, by order and machine; every pair at most once."""
    shop = hall(**more)
    here = stand(opened, at, shop)
    found = remaining(here.now, here.state, here.told)
    names = [each.id for each in here.now.shop.machines]
    pairs = [
        (
            here.now.shop.orders.ids[here.now.shop.operations.job[one.operation]],
            names[here.now.shop.operations.machine[one.operation]],
        )
        for one in found
    ]
    assert len(set(pairs)) == len(pairs)
    return dict(zip(pairs, found, strict=True))


def minutes(opened: Journal, at: float, **more: Any) -> dict[tuple[str, str], float]:
    return {pair: one.seconds / MIN for pair, one in left(opened, at, **more).items()}


ALL = {(order, name): time for order, name, time in VISITS}


def without(*pairs: tuple[str, str]) -> dict[tuple[str, str], int]:
    return {pair: time for pair, time in ALL.items() if pair not in pairs}


def test_before_anything_happens_all_of_it_is_left() -> None:
    assert minutes(book(), 0) == ALL


def test_what_was_finished_is_not_left() -> None:
    opened = book(work("started", "TQ-1", "RIG", 0), work("finished", "TQ-1", "RIG", 33, good=5))
    assert minutes(opened, 40) == without(("TQ-1", "RIG"))


def test_running_work_is_left_by_its_time_less_what_it_has_run() -> None:
    one = left(book(work("started", "TQ-2", "CMM", 2, unit=2)), 12)["TQ-2", "CMM"]
    assert (one.seconds, one.running, one.unit, one.since_s) == (30 * MIN, True, 2, 2 * MIN)


def test_work_beyond_its_time_is_taken_to_need_a_minute_more() -> None:
    assert left(book(work("started", "TQ-1", "RIG", 0)), 59)["TQ-1", "RIG"].seconds == MIN


def test_a_report_goes_before_the_plan_and_runs_down_from_when_it_was_made() -> None:
    opened = book(work("started", "TQ-1", "RIG", 0), work("left", "TQ-1", "RIG", 10, left_s=40 * MIN))
    assert left(opened, 25)["TQ-1", "RIG"].seconds == 25 * MIN


def test_a_break_over_which_the_machine_pauses_is_no_work() -> None:
    """Begun at 40 of 60 min; at 80 it has run 40–60 and 75–80."""
    assert left(book(work("started", "TQ-2", "BENCH", 40)), 80)["TQ-2", "BENCH"].seconds == 35 * MIN


def test_a_report_made_before_a_break_does_not_run_down_in_it() -> None:
    opened = book(work("started", "TQ-2", "BENCH", 40), work("left", "TQ-2", "BENCH", 50, left_s=30 * MIN))
    assert left(opened, 80)["TQ-2", "BENCH"].seconds == 15 * MIN


def test_an_outage_stops_the_clock_of_what_runs_there() -> None:
    opened = book(work("started", "TQ-1", "RIG", 0), machine("down", "RIG", 10, reason="seal"))
    one = left(opened, 30)["TQ-1", "RIG"]
    assert (one.seconds, one.running, one.why) == (20 * MIN, True, "machine down: seal")


def test_stopped_work_waits_with_what_is_left_of_it() -> None:
    opened = book(work("started", "TQ-1", "RIG", 0), work("stopped", "TQ-1", "RIG", 12, reason="no gasket"))
    one = left(opened, 30)["TQ-1", "RIG"]
    assert (one.seconds, one.running, one.why) == (18 * MIN, False, "stopped: no gasket")


def test_set_up_is_left_only_as_far_as_it_was_not_worked() -> None:
    opened = book(work("started", "TQ-1", "RIG", 0))
    assert left(opened, 4, setup={"RIG": 10})["TQ-1", "RIG"].setup_s == 6 * MIN
    assert left(opened, 15, setup={"RIG": 10})["TQ-1", "RIG"].setup_s == 0


# ---- scrap -------------------------------------------------------------------------------------------

SCRAPPED = (work("started", "TQ-1", "RIG", 0), work("finished", "TQ-1", "RIG", 30, good=0, scrap=4))


def test_what_was_scrapped_whole_is_run_again_under_a_new_number() -> None:
    one = left(book(*SCRAPPED), 35)["TQ-1", "RIG"]
    assert (one.seconds, one.key, one.repeats, one.why) == (
        30 * MIN,
        Key("TQ-1", "RIG", 2),
        True,
        "scrapped, 4 lost",
    )


def test_a_repeat_that_came_out_well_is_not_run_a_third_time() -> None:
    opened = book(*SCRAPPED)
    again = issued([("TQ-1", "RIG", 1, 0, 30), ("TQ-1", "RIG", 1, 40, 70)], "1" * 64)
    opened.issue(again, by=LATE, at_s=36 * MIN)
    assert left(opened, 37)["TQ-1", "RIG"].key == Key("TQ-1", "RIG", 2)
    put(
        opened,
        work("started", "TQ-1", "RIG", 40, piece=2),
        work("finished", "TQ-1", "RIG", 58, piece=2, good=4),
    )
    assert ("TQ-1", "RIG") not in left(opened, 59)


def test_some_scrap_among_good_pieces_repeats_nothing() -> None:
    opened = book(SCRAPPED[0], work("finished", "TQ-1", "RIG", 30, good=3, scrap=1))
    assert ("TQ-1", "RIG") not in left(opened, 35)


# ---- orders added, changed, cancelled ----------------------------------------------------------------


def test_an_order_added_is_work_that_goes_any_way() -> None:
    added = told_order("added", "HOT", 20, {"operations": [("CMM", 900), ("RIG", 600)], "due_s": 3600})
    opened = book(added)
    found = left(opened, 25, setup={"RIG": 5})
    assert found["HOT", "CMM"].seconds == 900
    assert (found["HOT", "RIG"].seconds, found["HOT", "RIG"].setup_s) == (600, 300)  # as all on that machine
    shop = stand(opened, 25).now.shop
    job = shop.orders.ids.index("HOT")
    assert (shop.orders.due_s[job], shop.orders.release_s[job]) == (3600, 0)
    assert set(shop.operations.family.tolist()) == {NO_FAMILY}


def test_an_order_added_later_than_the_moment_is_not_there_yet() -> None:
    opened = book(told_order("added", "HOT", 20, {"operations": [("CMM", 900)]}))
    assert ("HOT", "CMM") not in left(opened, 19)


def test_an_order_changed_takes_its_new_times_and_a_further_machine() -> None:
    change = told_order("changed", "TQ-1", 5, {"operations": [("CMM", 50 * MIN), ("BENCH", 7 * MIN)]})
    found = minutes(book(change), 10)
    assert found == {**ALL, ("TQ-1", "CMM"): 50, ("TQ-1", "BENCH"): 7}


def test_a_due_time_and_a_priority_can_change() -> None:
    opened = book(told_order("changed", "TQ-3", 5, {"due_s": 3000, "priority": 4.0}))
    orders = stand(opened, 10).now.shop.orders
    job = orders.ids.index("TQ-3")
    assert (orders.due_s[job], orders.priority[job]) == (3000, 4.0)
    assert stand(opened, 4).now.shop.orders.due_s[job] == NO_DUE


def test_of_a_cancelled_order_only_what_runs_is_left() -> None:
    opened = book(work("started", "TQ-1", "RIG", 0), told_order("cancelled", "TQ-1", 10))
    assert minutes(opened, 12) == {**without(("TQ-1", "CMM")), ("TQ-1", "RIG"): 18}


# ---- several visits and parts --------------------------------------------------------------------------

TWICE = (("TQ-9", "CMM", 20), ("TQ-9", "CMM", 30))


def test_of_two_visits_the_one_that_was_done_is_the_one_as_long() -> None:
    rows = [("TQ-9", "CMM", 1, 0, 30), ("TQ-9", "CMM", 1, 30, 50)]
    opened = book(work("started", "TQ-9", "CMM", 0), work("finished", "TQ-9", "CMM", 31, good=1), rows=rows)
    here = stand(opened, 35, hall(TWICE))
    found = remaining(here.now, here.state, here.told)
    assert [(one.operation, one.key.piece, one.seconds) for one in found] == [(0, 2, 20 * MIN)]


def test_of_a_cut_operation_the_parts_done_and_running_are_taken_off() -> None:
    rows = [("TQ-9", "BENCH", 1, 0, 20), ("TQ-9", "BENCH", 1, 30, 50), ("TQ-9", "BENCH", 1, 80, 100)]
    visits = (("TQ-9", "BENCH", 60),)
    opened = book(
        work("started", "TQ-9", "BENCH", 0, piece=1),
        work("finished", "TQ-9", "BENCH", 25, piece=1),
        work("started", "TQ-9", "BENCH", 30, piece=2),
        rows=rows,
    )
    here = stand(opened, 35, hall(visits, splittable=True))
    found = remaining(here.now, here.state, here.told)
    assert [(one.key.piece, one.running, one.seconds / MIN) for one in found] == [
        (2, True, 15),
        (3, False, 20),
    ]


def test_work_of_a_journal_that_the_orders_have_not_is_refused() -> None:
    with pytest.raises(ShopError, match="work that these orders have not: TQ-1 on CMM; give the orders"):
        stand(
            book(),
            0,
            hall([visit for visit in VISITS if visit[:2] != ("TQ-1", "CMM")] + [("TQ-1", "RIG", 1)]),
        )


def test_the_hall_of_these_tests_is_on_the_clock_of_its_journal() -> None:
    assert hall().clock == book().clock == CLOCK
