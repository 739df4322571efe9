"""No plan has less weighted lateness than the bound says, whatever rules its floor has."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from shopfloor.bounds import family_path
from shopfloor.bounds.lateness import Parts, earliest_ends, least_lateness
from shopfloor.model.shop import (
    NO_DUE,
    Changeovers,
    Closure,
    Crew,
    Machine,
    Operations,
    Orders,
    Shop,
    Transport,
    shop_of,
)
from tests.floor_oracle import least_tardiness
from tests.floor_shops import floors
from tests.oracle import optimum
from tests.strategies import shops

HOUR = 3600


@st.composite
def crowded(draw: st.DrawFn) -> Shop:
    """Floors of one or two machines on which every order is wanted about as soon as it can be done."""
    shop = draw(floors(parallel=True, max_machines=2))
    slack = draw(st.lists(st.integers(0, 2), min_size=len(shop.orders), max_size=len(shop.orders)))
    priority = draw(st.lists(st.sampled_from([0.5, 1, 3]), min_size=len(slack), max_size=len(slack)))
    due = earliest_ends(shop) + np.array(slack)
    return replace(shop, orders=replace(shop.orders, due_s=due, priority=np.array(priority)))


parts = st.builds(
    Parts,
    machines=st.sampled_from([True, True, False]),
    changeovers=st.booleans(),
    shared=st.booleans(),
    slots=st.sampled_from([1, 3, 48]),
)


@given(crowded(), parts)
@settings(max_examples=250, deadline=None)
def test_no_crowded_floor_has_a_plan_below_the_bound(shop: Shop, parts: Parts) -> None:
    least = least_tardiness(shop)
    assert least is not None
    assert least_lateness(shop, parts).value <= least


@given(floors(parallel=True), parts)
@settings(max_examples=100, deadline=None)
def test_no_floor_has_a_plan_below_the_bound(shop: Shop, parts: Parts) -> None:
    least = least_tardiness(shop)
    assert least is not None
    assert least_lateness(shop, parts).value <= least


@given(shops(groups=True, max_orders=5, max_machines=2, max_operations=6))
@settings(max_examples=100, deadline=None)
def test_no_plain_shop_has_a_plan_below_the_bound(shop: Shop) -> None:
    assert least_lateness(shop).value <= optimum(shop).tardiness


@given(crowded(), st.integers(1, 3), st.integers(0, 2))
@settings(max_examples=150, deadline=None)
def test_steps_that_do_not_divide_the_work_are_rounded_down(shop: Shop, times: int, more: int) -> None:
    """A machine with changeovers, its time in coarse steps."""
    seconds = shop.operations.seconds * times + more
    longer = replace(shop, operations=replace(shop.operations, seconds=seconds))
    assume(longer.changeovers and int(seconds.sum()) <= 24)
    least = least_tardiness(longer)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(family_path, "STEPS_MOST", 8)
        assert least is None or least_lateness(longer).value <= least


# ---- by hand ---------------------------------------------------------------------------------------


def test_an_order_alone_is_late_by_its_work_its_way_and_its_machines_closures() -> None:
    """Two hours of work and ten minutes between them; one machine opens only at two."""
    late = Closure(0, 2 * HOUR)
    shop = Shop(
        (Machine("A"), Machine("B", closed=(late,)), Machine("C")),
        Orders(("J", "K", "L"), due_s=[2 * HOUR, 2 * HOUR, NO_DUE], priority=[1.0, 2.0, 1.0]),
        Operations([0, 0, 1, 2], [0, 2, 1, 1], [HOUR] * 4), transport=Transport(600),
    )  # fmt: skip
    assert earliest_ends(shop).tolist() == [2 * HOUR + 600, 3 * HOUR, 3 * HOUR]
    found = least_lateness(shop)
    assert (found.alone, found.together) == (1_000 * 600 + 2_000 * HOUR, 0)
    assert found.names == ()


def test_one_machine_serves_the_dearest_first() -> None:
    """Three orders of an hour, all wanted at one: the two cheaper ones are an hour and two hours late."""
    shop = shop_of([[HOUR], [HOUR], [HOUR]])
    shop = replace(shop, orders=replace(shop.orders, due_s=np.full(3, HOUR), priority=np.array([1.0, 5, 2])))
    found = least_lateness(shop)
    best = 1_000 * HOUR * (2 * 1 + 1 * 2)
    assert (found.alone, found.value) == (0, best)
    assert found.names == ("M1",)


def test_lateness_of_one_order_counts_once_on_two_machines() -> None:
    """Each machine makes one of two orders an hour late, and it may be the same one."""
    shop = shop_of([[HOUR, HOUR], [HOUR, HOUR]])
    shop = replace(shop, orders=replace(shop.orders, due_s=np.full(2, 2 * HOUR)))
    assert least_lateness(shop).value == 0  # each by itself ends at two, and so do both together
    assert optimum(shop_of([[1, 1], [1, 1]])).makespan_s == 2


def test_a_crew_makes_orders_late_that_no_machine_does() -> None:
    """One head for three machines."""
    machines = tuple(Machine(name, crew="Blue") for name in "ABC")
    shop = Shop(
        machines, Orders(("J", "K", "L"), due_s=[HOUR] * 3), Operations([0, 1, 2], [0, 1, 2], [HOUR] * 3),
        crews=(Crew("Blue", 1),),
    )  # fmt: skip
    found = least_lateness(shop)
    assert found.value == 3_000 * HOUR
    assert found.names == ("crew Blue",)
    assert least_lateness(shop, Parts(crews=False)).value == 0


def test_changeovers_make_orders_late() -> None:
    """Two families an hour apart; without the change both orders would be in time."""
    shop = Shop(
        (Machine("A", family="red"),),
        Orders(("J", "K"), due_s=[HOUR, 2 * HOUR]), Operations([0, 1], [0, 0], [HOUR, HOUR], family=[0, 1]),
        families=("red", "black"), changeovers={"A": Changeovers(HOUR)},
    )  # fmt: skip
    found = least_lateness(shop)
    assert found.value == 1_000 * HOUR
    assert least_lateness(shop, Parts(changeovers=False)).value == 0


def test_a_bound_is_rounded_up_to_what_lateness_is_a_multiple_of() -> None:
    """Times in whole hours, priorities in halves: what is missing to the next such step is given."""
    shop = shop_of([[HOUR], [2 * HOUR], [3 * HOUR]])
    shop = replace(shop, orders=replace(shop.orders, due_s=np.array([HOUR, 2 * HOUR, 3 * HOUR])))
    shop = replace(shop, orders=replace(shop.orders, priority=np.array([1.0, 1.5, 0.5])))
    assert least_lateness(shop).value == optimum(shop_hours(shop)).tardiness * HOUR
    cut = replace(shop, operations=replace(shop.operations, splittable=np.array([0, 0, 1])))
    assert least_lateness(cut).value % 500 == 0


def shop_hours(shop: Shop) -> Shop:
    """The same with hours for seconds, which brute force likes better."""
    orders = replace(shop.orders, due_s=shop.orders.due_s // HOUR)
    operations = replace(shop.operations, seconds=shop.operations.seconds // HOUR)
    return replace(shop, orders=orders, operations=operations)


def test_the_same_shop_gives_the_same_bound() -> None:
    shop = shop_of([[700, 300], [500, 900], [800, 100], [400, 600]])
    shop = replace(shop, orders=replace(shop.orders, due_s=np.array([900, 1_000, 900, 1_100])))
    assert least_lateness(shop) == least_lateness(shop)
    assert least_lateness(shop).value > 0
