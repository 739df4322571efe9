"""The shop: frozen, checked when built, and the same from and to frames and graphs."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

from shopfloor.errors import ShopError
from shopfloor.model.shop import Closure, Crew, Machine, Operations, Orders, Shop, shop_of
from tests.strategies import shops


@given(shops())
@settings(max_examples=40, deadline=None)
def test_a_shop_comes_back_from_its_frame(shop: Shop) -> None:
    again = Shop.from_frame(shop.to_frame())
    assert [(o.order, o.machine_id, o.seconds, o.step) for o in again] == [
        (o.order, o.machine_id, o.seconds, o.step) for o in shop
    ]
    for name, due in zip(again.orders.ids, again.orders.due_s.tolist(), strict=True):
        assert due == shop.orders.due_s[shop.orders.ids.index(name)]


@given(shops())
@settings(max_examples=40, deadline=None)
def test_heads_and_tails_follow_from_the_steps(shop: Shop) -> None:
    for o in shop:
        mine = [p for p in shop if p.job == o.job and p.step is not None]
        lower = sum(p.seconds for p in mine if o.step is not None and p.step < o.step)
        higher = sum(p.seconds for p in mine if o.step is not None and p.step > o.step)
        assert shop.head_s[o.index] == shop.orders.release_s[o.job] + lower
        assert shop.tail_s[o.index] == higher


def test_the_graph_has_an_edge_an_operation() -> None:
    graph = shop_of([[60, 120], [0, 30]]).to_networkx()
    assert graph.number_of_edges() == 3
    assert graph[("order", "J1")][("machine", "M2")][1]["seconds"] == 120


def test_columns_are_frozen() -> None:
    shop = shop_of([[60]])
    with pytest.raises(ValueError, match="read-only"):
        shop.operations.seconds[0] = 5


def shop_with(machine: Machine, orders: Orders, *columns: list[int], **more: list[int]) -> Shop:
    return Shop((machine,), orders, Operations(*(columns or ([], [], [])), **more))


A, J = Machine("A"), Orders(("J",))


@pytest.mark.parametrize(
    ("build", "message"),
    [
        (lambda: shop_of([[60]]).with_crew(-1), "crew crew: heads must not be negative"),
        (lambda: Shop((A, A), Orders(()), Operations([], [], [])), "two machines share one id"),
        (lambda: shop_with(A, J, [0], [1], [60]), "an operation names machine 1 of 1"),
        (lambda: shop_with(A, J, [0], [0], [0]), "time must be positive, not 0 s"),
        (lambda: shop_with(A, Orders(("J",), release_s=[9], due_s=[5])), "order J: due before its release"),
        (lambda: shop_with(Machine("A", crew="x"), Orders(())), "names crew x"),
        (lambda: Crew("c", 2, ((0, 9, 1), (5, 8, 1))), "levels must be in order of time"),
        (lambda: Closure(5, 5), "it must end after it starts"),
        (lambda: shop_with(A, J, [0], [0], [5], setup_s=[6]), "a set-up is part"),
    ],
)
def test_what_contradicts_itself_is_refused(build, message: str) -> None:
    with pytest.raises(ShopError, match=message):
        build()


def test_keeping_some_operations_drops_orders_without_any() -> None:
    shop = shop_of([[60, 0], [30, 40]])
    kept = shop.keep(np.array([False, True, False]))
    assert kept.orders.ids == ("J2",)
    assert kept.machine_load_s.tolist() == [30, 0]
