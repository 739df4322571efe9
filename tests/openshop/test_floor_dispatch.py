"""The dispatching loop: nothing idles that might work, waits are paid for, and all is the same again."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import NO_STEP, Changeovers, Machine, Operations, Orders, Shop
from shopfloor.openshop.floor import dispatch
from shopfloor.openshop.floor.dispatch import Charges, Dispatch, Times
from shopfloor.openshop.floor.goals import MAKESPAN
from shopfloor.openshop.floor.indices import most_work
from shopfloor.openshop.floor.list_rule import grid
from shopfloor.openshop.floor.rules import Rules
from tests.floor_shops import floors


def first_rule(shop: Shop) -> Times:
    rules = Rules.of(shop)
    times = next(grid(rules, MAKESPAN)).times(rules, 0)
    assert times is not None
    return times


@given(floors(max_operations=8, most=0))
@settings(max_examples=100, deadline=None)
def test_without_waits_no_order_waits_for_a_unit_that_is_idle(shop: Shop) -> None:
    """Where no closure, crew, changeover or way holds anything up: at every moment before it starts, its
    machine is full, its order is busy or not yet there, or a lower step is not done."""
    times, columns = first_rule(shop), shop.operations
    job, machine, step = columns.job.tolist(), columns.machine.tolist(), columns.step.tolist()
    size = range(len(shop))
    for k in size:
        for moment in range(int(shop.orders.release_s[job[k]]), times.start[k]):
            runs = [i for i in size if times.start[i] <= moment < times.end[i]]
            full = sum(machine[i] == machine[k] for i in runs) == shop.machines[machine[k]].count
            busy = any(job[i] == job[k] for i in runs)
            below = step[k] != NO_STEP and any(
                job[i] == job[k] and NO_STEP != step[i] < step[k] and times.end[i] > moment for i in size
            )
            assert full or busy or below


@given(floors(), st.sampled_from([1, 2]))
@settings(max_examples=60, deadline=None)
def test_the_same_again_and_complete_however_few_are_looked_at(shop: Shop, looked_at: int) -> None:
    once, again = first_rule(shop), first_rule(shop)
    assert (once.start, once.end, once.unit) == (again.start, again.end, again.unit)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(dispatch, "LOOKED_AT", looked_at)
        few = first_rule(shop)
    length = shop.operations.seconds.tolist()
    assert all(end - start >= least for start, end, least in zip(few.start, few.end, length, strict=True))


def coater() -> Shop:
    """A coater set up for red, with one long red order and four short black ones."""
    return Shop(
        (Machine("COAT", family="red"),), Orders(("R", *(f"B{k}" for k in range(4)))),
        Operations(range(5), [0] * 5, [900, *[600] * 4], family=[0, 1, 1, 1, 1]),
        families=("red", "black"), changeovers={"COAT": Changeovers(300)},
    )  # fmt: skip


def starts(patience: float, batch: float, bias: tuple[float, ...] = (0.0,) * 5) -> list[int]:
    times = Dispatch(Rules.of(coater()), most_work(0.0), Charges((patience,), batch, bias)).run()
    assert times is not None
    return times.start


def test_a_change_waits_its_turn_unless_it_serves_many() -> None:
    assert starts(0.1, 0.0) == [0, 1200, 1800, 2400, 3000]
    # one change then serves four times the work: log 4 of the index, against a wait of 300 s and log 1.5
    assert starts(1.0, 1.0) == [3000, 300, 900, 1500, 2100]
    assert starts(0.1, 1.0)[0] == 0  # … but not if waits are dear


@pytest.mark.parametrize(("bias", "first"), [(0.85, 0), (0.87, 1)])
def test_a_bias_is_paid_in_the_currency_of_the_index(bias: float, first: int) -> None:
    """Black is behind by log(900 / 600) = 0.405, and by 300 s of waiting at 660 s a unit = 0.455."""
    begun = starts(1.0, 0.0, (0.0, bias, 0.0, 0.0, 0.0))
    assert begun.index(min(begun)) == first
