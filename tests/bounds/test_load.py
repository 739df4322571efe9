"""Load bounds: right value, a witness that carries it, a sentence, and never above the optimum."""

from __future__ import annotations

from datetime import datetime

from hypothesis import given, settings

from shopfloor.audit.witness import rederive
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.bounds.load import machine_bounds, order_bounds, round_bounds
from shopfloor.model.calendar import Clock
from shopfloor.model.shop import Machine, Operations, Orders, Shop, shop_of
from tests.oracle import optimum
from tests.strategies import shops


def test_the_sentence_names_the_machine_its_work_and_the_clock_time() -> None:
    shop = Shop(
        (Machine("WASH"),), Orders(tuple(f"TQ-{k}" for k in range(15))),
        Operations(list(range(15)), [0] * 15, [1800] * 15), clock=Clock(datetime(2026, 3, 2, 6)),
    )  # fmt: skip
    bound = machine_bounds(shop)[0]
    assert bound.value_s == 27_000
    assert bound.sentence == "WASH has 7 h 30 of work for this shift, so nothing can end before 13:30."


def test_a_late_release_moves_the_threshold() -> None:
    shop = Shop(
        (Machine("CMM"),), Orders(("A", "B"), release_s=[0, 3600]), Operations([0, 1], [0, 0], [600, 1800])
    )  # fmt: skip
    bound = machine_bounds(shop)[0]
    assert (bound.value_s, bound.witness) == (
        5400, {"machine": "CMM", "from_s": 3600, "tail_s": 0, "load_s": 1800},
    )  # fmt: skip
    assert bound.sentence == (
        "CMM has 30 min of work that cannot start before 1:00, so nothing can end before 1:30."
    )


def test_steps_give_a_machine_a_head_and_a_tail() -> None:
    shop = Shop(
        (Machine("A"), Machine("B"), Machine("C")), Orders(("J",)),
        Operations([0, 0, 0], [0, 1, 2], [60, 120, 180], step=[1, 2, 3]),
    )  # fmt: skip
    assert [bound.value_s for bound in machine_bounds(shop)] == [360, 360, 360]
    assert machine_bounds(shop)[1].witness == {"machine": "B", "from_s": 60, "tail_s": 180, "load_s": 120}


def test_an_order_is_in_one_place_at_a_time() -> None:
    bound = order_bounds(shop_of([[60, 120], [0, 30]]))[0]
    assert bound.value_s == 180
    assert bound.sentence == (
        "Order J1 needs 3 min of machine time, one machine at a time, so nothing can end before 0:03."
    )


def test_a_group_in_unit_rounds_is_bounded_in_whole_rounds() -> None:
    shop = Shop(
        (Machine("CMM", count=2),), Orders(("A", "B", "C")), Operations([0, 1, 2], [0, 0, 0], [600] * 3)
    )  # fmt: skip
    assert round_bounds(shop)[0].value_s == 1200
    assert lower_bounds(shop)[0].kind == "rounds"
    assert machine_bounds(shop)[0].value_s == 900


@given(shops(groups=True))
@settings(max_examples=60, deadline=None)
def test_no_bound_is_above_the_optimum_and_each_follows_from_its_witness(shop: Shop) -> None:
    least = optimum(shop).makespan_s
    for bound in lower_bounds(shop):
        assert bound.value_s <= least
        assert rederive(shop, bound) == bound.value_s


def test_an_empty_shop_has_no_bounds() -> None:
    assert lower_bounds(Shop((), Orders(()), Operations([], [], []))) == ()
