"""What is left to plan: running work holds unit, order and people; machines, crews, orders as they are."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from shopfloor.journal.entries import Entry
from shopfloor.journal.events import Journal
from shopfloor.model.actuals import Kind
from shopfloor.model.shop import NO_STEP, Changeovers, Closure, Crew, Shop, Transport
from shopfloor.replan.begin import begin
from shopfloor.replan.outlook import Outlook, outlook
from shopfloor.replan.remaining import remaining
from shopfloor.replan.residual import Residual, residual
from tests.replan.floor import MIN, ROWS, book, hall, machine, put, stand, told_order, work

RIG, CMM, BENCH = range(3)


def ahead(opened: Journal, at: float, shop: Shop | None = None, **more: object) -> Outlook:
    """What is known of the time after a moment, in minutes."""
    here = stand(opened, at, shop)
    left = remaining(here.now, here.state, here.told)
    return outlook(here.now, left, here.state, here.told, **more)  # type: ignore[arg-type]


def rest(opened: Journal, at: float, shop: Shop | None = None, **more: object) -> Residual:
    """What is left to plan at a moment, in minutes."""
    here = stand(opened, at, shop)
    left = remaining(here.now, here.state, here.told)
    look = outlook(here.now, left, here.state, here.told, **more)  # type: ignore[arg-type]
    return residual(here.now, left, look, begin(here.now, left, look, here.told))


def operations(shop: Shop) -> dict[tuple[str, str], int]:
    """The minutes of each operation."""
    return {(row.order, row.machine_id): row.seconds // MIN for row in shop}


STARTED = (work("started", "TQ-1", "RIG", 0), work("started", "TQ-2", "CMM", 0, unit=2))


def test_what_runs_is_an_operation_from_its_true_start_in_the_shop_that_is_written() -> None:
    found = rest(book(*STARTED), 10)
    runs = {found.left[k].key[:2]: (one.since_s, one.ends_s) for k, one in found.pinned.items()}
    assert runs == {("TQ-1", "RIG"): (0, 30 * MIN), ("TQ-2", "CMM"): (0, 40 * MIN)}
    assert operations(found.shop)["TQ-1", "RIG"] == 30
    assert operations(found.solve)["TQ-1", "RIG"] == 20
    assert found.shop.clock.say(0) == "06:00"
    assert found.solve.clock.say(0) == "06:10"


def test_for_methods_what_runs_on_one_unit_is_a_closure_and_holds_its_order() -> None:
    found = rest(book(*STARTED), 10)
    assert found.fresh.machines[RIG].closed[0] == Closure(0, 20 * MIN, "running TQ-1")
    assert ("TQ-1", "RIG") not in operations(found.fresh)
    assert ("TQ-2", "CMM") in operations(found.fresh)  # in a group it is left free: never harder
    job = found.fresh.orders.ids.index("TQ-1")
    assert int(found.fresh.orders.release_s[job]) == 20 * MIN


def test_for_methods_people_at_running_work_are_away_until_it_ends() -> None:
    """TQ-1 on the RIG takes one of two fitters for twenty minutes more."""
    assert rest(book(*STARTED), 10).fresh.crews == (Crew("fitters", 2, ((0, 20 * MIN, 1),)),)
    assert rest(book(*STARTED), 10).solve.crews == (Crew("fitters", 2),)


def test_breaks_and_closures_move_with_the_clock_and_the_past_is_gone() -> None:
    found = rest(book(), 62)
    assert found.solve.breaks == (Closure(0, 13 * MIN, "tea"),)
    assert found.shop.breaks == (Closure(62 * MIN, 75 * MIN, "tea"),)
    assert found.solve.machines[RIG].closed == (Closure(28 * MIN, 38 * MIN, "gauge"),)
    assert rest(book(), 80).solve.breaks == ()


def test_a_machine_that_is_down_is_closed_until_it_is_expected_back() -> None:
    opened = book(machine("down", "BENCH", 5, reason="vice"))
    found = rest(opened, 10, back={("BENCH", 0): 50 * MIN})
    assert found.shop.machines[BENCH].closed == (Closure(10 * MIN, 50 * MIN, "down: vice"),)
    assert found.remarks == ()
    assumed = rest(opened, 10)
    assert assumed.shop.machines[BENCH].closed == (Closure(10 * MIN, 40 * MIN, "down: vice"),)
    assert assumed.remarks == (
        "BENCH is down since 06:05; nobody said until when, so it is taken to be back at 06:40.",
    )


def test_one_unit_down_closes_no_machine() -> None:
    found = rest(book(machine("down", "CMM", 5, 1, reason="probe")), 10)
    assert found.shop.machines[CMM].closed == ()
    assert [(out.machine, out.unit) for out in found.look.outs] == [(CMM, 1)]


def test_running_work_on_a_machine_that_is_down_goes_on_when_it_is_back() -> None:
    opened = book(*STARTED, machine("down", "RIG", 8, reason="seal"))
    one = ahead(opened, 10, back={("RIG", 0): 30 * MIN}).running[0]
    assert (one.resumes_s, one.ends_s) == (30 * MIN, 52 * MIN)


def test_work_that_runs_on_into_a_break_is_no_row_and_holds_its_machine_all_the_same() -> None:
    """The RIG does not pause; begun at 50, its thirty minutes end at 80, past the break at 60."""
    found = rest(book(work("started", "TQ-1", "RIG", 50)), 55)
    assert [one.ends_s for one in found.held] == [80 * MIN]
    assert ("TQ-1", "RIG") not in operations(found.shop)
    assert Closure(55 * MIN, 80 * MIN, "running TQ-1") in found.shop.machines[RIG].closed
    assert int(found.solve.orders.release_s[found.solve.orders.ids.index("TQ-1")]) == 25 * MIN


def test_what_pauses_over_a_break_stays_a_row() -> None:
    found = rest(book(work("started", "TQ-2", "BENCH", 40)), 55)
    (one,) = found.pinned.values()
    assert one.ends_s == 115 * MIN
    assert operations(found.shop)["TQ-2", "BENCH"] == 60


def test_fewer_people_count_until_the_shift_ends() -> None:
    opened = book(Entry(Kind.CREW, 5 * MIN, data={"heads": 1}))
    found = rest(opened, 10)
    assert found.shop.crews == (Crew("fitters", 2, ((0, 480 * MIN, 1),)),)
    assert found.remarks == (
        "Crew fitters has 1 there since 06:05 and not 2; it is taken to stay so until the shift ends, and "
        "never to have more than were planned.",
    )


def test_people_that_running_work_holds_are_there_whatever_was_said() -> None:
    opened = book(*STARTED, Entry(Kind.CREW, 5 * MIN, data={"heads": 0}))
    found = rest(opened, 10)
    assert found.solve.crews[0].levels[0] == (0, 20 * MIN, 1)
    assert (
        "Work that runs holds more of crew fitters than are said to be there; it is taken to run on."
        in found.remarks
    )


def test_an_order_on_its_way_is_released_when_it_has_arrived() -> None:
    shop = replace(hall(), transport=Transport(10 * MIN))
    opened = book(*STARTED, work("finished", "TQ-1", "RIG", 28))
    found = rest(opened, 30, shop)
    job = found.solve.orders.ids.index("TQ-1")
    assert int(found.solve.orders.release_s[job]) == 8 * MIN


def test_a_due_time_that_has_passed_stays_as_it_was_in_what_is_written() -> None:
    found = rest(book(), 50)
    job = found.shop.orders.ids.index("TQ-1")
    assert int(found.shop.orders.due_s[job]) == 45 * MIN
    assert found.shop.orders.due_s[job] >= found.shop.orders.release_s[job]


def test_orders_added_and_cancelled_are_in_and_out() -> None:
    hot = {"operations": [("CMM", 15 * MIN)], "due_s": 60 * MIN, "priority": 3.0}
    opened = book(told_order("added", "HOT", 5, hot), told_order("cancelled", "TQ-3", 6))
    shop = rest(opened, 10).shop
    assert ("HOT", "CMM") in operations(shop)
    assert "TQ-3" not in shop.orders.ids
    assert shop.orders[shop.orders.ids.index("HOT")].priority == 3.0


def test_steps_stay_and_what_runs_has_none_where_plans_are_looked_for() -> None:
    shop = hall(steps=[1, 2, NO_STEP, NO_STEP, 5, 6])
    found = rest(book(*STARTED), 10, shop)
    steps = {(row.order, row.machine_id): row.step for row in found.solve}
    assert (steps["TQ-1", "RIG"], steps["TQ-1", "CMM"], steps["TQ-3", "RIG"]) == (None, 2, 6)


def test_two_places_at_once_are_held_without_a_row() -> None:
    """A journal may say so, if somebody insisted: both machines and the order stay kept until the end."""
    opened = book(STARTED[0])
    put(opened, work("started", "TQ-1", "CMM", 5), accept=True)
    found = rest(opened, 10)
    assert len(found.held) == 2
    assert "TQ-1" not in found.shop.orders.ids


# ---- changeovers -------------------------------------------------------------------------------------


def with_families() -> Shop:
    """The hall with a changeover of ten minutes on the BENCH: TQ-2 is red, TQ-3 grey."""
    shop = hall()
    family = [0 if row.order == "TQ-2" else 1 if row.order == "TQ-3" else -1 for row in shop]
    return replace(
        shop,
        families=("red", "grey"),
        operations=replace(shop.operations, family=np.array(family)),
        changeovers={"BENCH": Changeovers(10 * MIN)},
        machines=tuple(replace(m, family="red") if m.id == "BENCH" else m for m in shop.machines),
    )


def test_a_machine_is_of_the_family_it_ran_last_and_changes_to_the_next_as_planned() -> None:
    opened = book(work("started", "TQ-3", "BENCH", 0), work("finished", "TQ-3", "BENCH", 30))
    found = rest(opened, 34, with_families())
    assert found.shop.machines[BENCH].family == "red"  # on its way to TQ-2 since 30
    assert found.shop.machines[BENCH].closed == (Closure(34 * MIN, 40 * MIN, "changing over to red"),)
    assert found.remarks == ("BENCH is taken to be changing over to red until 06:40, as planned.",)
    assert rest(opened, 45, with_families()).shop.machines[BENCH].closed == ()


def test_no_changeover_is_taken_for_granted_while_the_machine_is_down() -> None:
    opened = book(
        work("started", "TQ-3", "BENCH", 0),
        work("finished", "TQ-3", "BENCH", 30),
        machine("down", "BENCH", 31, reason="vice"),
    )
    assert rest(opened, 34, with_families()).shop.machines[BENCH].family == "grey"


# ---- rounds ------------------------------------------------------------------------------------------


def test_a_plan_without_rounds_begins_now() -> None:
    found = rest(book(), 12)
    assert (found.begin_s, found.begin.rounds) == (12 * MIN, None)


@pytest.mark.parametrize("at", [0, 12, 55, 95])
def test_operation_k_is_the_same_in_both_shops(at: int) -> None:
    opened = book(*(entry for entry in STARTED if (entry.at_s or 0) <= at * MIN))
    found = rest(opened, at)
    names = [[(row.order, row.machine_id) for row in shop] for shop in (found.shop, found.solve)]
    assert names[0] == names[1] == [one.key[:2] for one in found.left]
    assert [names[1][k] for k in found.from_fresh.tolist()] == [
        (row.order, row.machine_id) for row in found.fresh
    ]
    assert len(found.left) + len(found.held) == len(ROWS)
