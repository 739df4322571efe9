"""List schedules: always legal, never below what brute force finds, and at the bound where that is known."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_STEP, Machine, Operations, Orders, Shop, shop_of
from shopfloor.model.stated import state
from shopfloor.openshop.dense import Dispatch, MostWork, ShopLists, starts
from shopfloor.openshop.due_search import due_runs
from shopfloor.openshop.holds import Holds
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, Incumbent
from shopfloor.openshop.left_shift import left_shift, steps_in_sequence
from shopfloor.openshop.list_rule import BUDGETS, list_schedules, makespan_runs
from shopfloor.openshop.reserve import Filling, may_reserve, near_bound_orders, reserved_starts
from shopfloor.openshop.units import assign_units
from tests.oracle import optimum
from tests.strategies import shops


def schedule_of(shop: Shop, start: np.ndarray) -> Schedule:
    end = start + shop.operations.seconds
    return Schedule(np.arange(len(shop)), start, end, unit=assign_units(shop, start, end))


def violations(shop: Shop, start: np.ndarray) -> list[str]:
    plan = Plan(shop, schedule_of(shop, start), lower_bounds(shop), Choice("", "", {}))
    return [violation.sentence for violation in audit(shop, state(plan))]


def bound(shop: Shop) -> int:
    return lower_bounds(shop)[0].value_s


def uniform(orders: int, machines: int, seed: int) -> Shop:
    return shop_of(np.random.default_rng(seed).integers(1, 100, (orders, machines)))


SOME = settings(max_examples=60, deadline=None)


# ---- legal, and never too good ---------------------------------------------------------------------


@SOME
@given(shops(groups=True, max_operations=12), st.integers(0, 3))
def test_every_run_for_the_makespan_is_legal(shop, seed):
    for _, run in zip(range(14), makespan_runs(shop, bound(shop), seed), strict=False):
        assert violations(shop, run()) == []


@SOME
@given(shops(groups=True, max_operations=12), st.integers(0, 3))
def test_every_run_for_due_times_is_legal(shop, seed):
    incumbent = Incumbent(shop)
    for _, run in zip(range(40), due_runs(shop, incumbent, bound(shop), seed), strict=False):
        start = run()
        incumbent.offer(start)
        assert violations(shop, start) == []


@SOME
@given(shops(groups=True, max_operations=6))
def test_lists_are_never_below_brute_force(shop):
    best = optimum(shop)
    shortest, least_late = Incumbent(shop), Incumbent(shop, (TARDINESS, MAKESPAN))
    list_schedules(shop, shortest, MAKESPAN, bound(shop))
    list_schedules(shop, least_late, TARDINESS, bound(shop))
    assert shortest.value(MAKESPAN) >= best.makespan_s
    assert least_late.value(TARDINESS) >= best.tardiness


@SOME
@given(shops(groups=True, steps=False, releases=False, max_operations=10))
def test_without_holds_no_machine_waits_for_an_order_that_is_free(shop):
    """A dense schedule: at no start could that operation have run just before on a free unit."""
    start = starts(ShopLists.of(shop), MostWork())
    end = start + shop.operations.seconds
    job, machine = shop.operations.job, shop.operations.machine
    for row in range(len(shop)):
        moment = start[row] - 1
        running = (start <= moment) & (end > moment)
        order_busy = bool((running & (job == job[row])).any())
        busy_units = int((running & (machine == machine[row])).sum())
        assert moment < 0 or order_busy or busy_units == shop.machines[machine[row]].count


# ---- good ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("orders", "machines"), [(50, 10), (100, 20), (500, 20), (20, 20), (30, 30), (50, 50)]
)
def test_uniform_shops_meet_the_load_bound(orders, machines):
    """Durations U[1, 99] as in E. Taillard, European Journal of Operational Research 64 (1993) 278-285."""
    for seed in range(2):
        shop = uniform(orders, machines, seed)
        incumbent = Incumbent(shop)
        list_schedules(shop, incumbent, MAKESPAN, bound(shop))
        assert incumbent.makespan_s == bound(shop)


def test_holding_a_machine_helps_the_tight_order():
    """By hand: J1 and J2 have 10 s of work and 10 s of time. J2 leaves M2 at 1; the plain rule gives it to
    J3 for 5 s, so J1, free at 3, finds no machine. A rule that holds M2 for J1 from 1 to 3 loses nothing.
    """
    lists = ShopLists.of(shop_of([[3, 2, 5], [6, 1, 3], [0, 5, 0]]))
    seconds = np.array(lists.seconds)
    assert int((starts(lists, MostWork()) + seconds).max()) == 11
    held = starts(lists, MostWork(), Holds(10, 1))
    assert int((held + seconds).max()) == 10
    assert held.tolist() == [0, 3, 5, 4, 0, 1, 5]


def test_an_order_as_long_as_the_plan_is_placed_first():
    shop = near_bound_shop(100, 10, seed=0)
    near = near_bound_orders(shop, bound(shop))
    assert near == [0]
    assert may_reserve(shop, near)
    start = reserved_starts(shop, ShopLists.of(shop), near, bound(shop), None)
    assert violations(shop, start) == []
    assert int((start + shop.operations.seconds).max()) == bound(shop)


def near_bound_shop(orders: int, machines: int, seed: int) -> Shop:
    """One order takes the whole bound, and no machine has more than half a per cent of slack."""
    rng = np.random.default_rng(seed)
    times = rng.integers(1, 100, (orders, machines))
    target = int(times[1:].sum() / (machines - 1))
    share = rng.uniform(0.5, 1.5, machines)
    times[0] = share / share.sum() * target
    times[0, 0] += target - times[0].sum()
    load = (target * (1 - 0.005 * rng.random(machines))).astype(int)
    for machine in range(machines):
        while short := int(load[machine] - times[:, machine].sum()):
            order, by = int(rng.integers(1, orders)), int(np.sign(short))
            if 1 <= times[order, machine] + by <= 99:
                times[order, machine] += by
    return shop_of(times)


@SOME
@given(st.lists(st.integers(1, 9), min_size=1, max_size=8), st.integers(1, 30))
def test_a_filling_fills_what_can_be_filled(values, gap):
    """One machine, a block at `gap`: the largest subset sum up to the gap, as found by trying all subsets."""
    shop = shop_of([[100], *([value] for value in values)])
    loop = Dispatch(ShopLists.of(shop), Filling())
    loop.reserve([(gap, 0)])
    start = np.array(loop.run())
    before = [value for value, begin in zip(values, start[1:], strict=True) if begin < gap]
    sums = {0}
    for value in values:
        sums |= {value + each for each in sums}
    assert start[0] == gap
    assert sum(before) == max(each for each in sums if each <= gap)


# ---- small parts -------------------------------------------------------------------------------


@SOME
@given(shops(groups=True, max_operations=12), st.integers(1, 5))
def test_pushing_left_starts_nothing_later_and_stays_legal(shop, stretch):
    start = stretch * starts(ShopLists.of(shop), MostWork())  # legal: every distance between starts has grown
    assert violations(shop, start) == []
    pushed = left_shift(shop, start)
    assert (pushed <= start).all()
    assert violations(shop, pushed) == []
    assert left_shift(shop, pushed).tolist() == pushed.tolist()


@SOME
@given(shops(groups=True, max_operations=12), st.integers(0, 2**32 - 1))
def test_any_sequence_with_lower_steps_first_becomes_a_legal_schedule(shop, seed):
    order = np.random.default_rng(seed).permutation(len(shop))
    if not steps_in_sequence(shop, order):
        step = np.where(shop.operations.step == NO_STEP, 0, shop.operations.step)
        order = order + step * len(shop)
    assert steps_in_sequence(shop, order)
    assert violations(shop, left_shift(shop, order)) == []


def test_too_many_at_once_have_no_units():
    shop = Shop(
        (Machine("M", count=2),), Orders(("A", "B", "C")), Operations([0, 1, 2], [0, 0, 0], [5, 5, 5])
    )
    assert assign_units(shop, np.array([0, 0, 5]), np.array([5, 5, 10])).tolist() == [1, 2, 1]
    with pytest.raises(ValueError, match=r"^machine M: more than 2 operations at once$"):
        assign_units(shop, np.array([0, 0, 4]), np.array([5, 5, 9]))


@SOME
@given(shops(groups=True))
def test_same_seed_same_schedule(shop):
    made = []
    for _ in range(2):
        incumbent = Incumbent(shop)
        list_schedules(shop, incumbent, MAKESPAN, bound(shop), seed=3)
        list_schedules(shop, incumbent, TARDINESS, incumbent.value(MAKESPAN), seed=3)
        made.append(incumbent.start.tolist())
    assert made[0] == made[1]


def test_a_stop_still_leaves_one_schedule():
    shop = uniform(8, 8, 0)
    incumbent = Incumbent(shop)
    assert list_schedules(shop, incumbent, MAKESPAN, 1, over=lambda: True) is False
    assert violations(shop, incumbent.start) == []


def test_large_shops_get_few_runs():
    made = []
    shop = uniform(500, 20, 0)

    class Counted(Incumbent):
        def offer(self, start):
            made.append(start)
            return super().offer(start)

    list_schedules(shop, Counted(shop), MAKESPAN, 1)
    assert len(made) == BUDGETS[MAKESPAN][0] // len(shop)
