"""Two machines: the finish is the largest load (Gonzalez and Sahni, J. ACM 23 (1976) 665-679)."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.model.results import Choice, Plan
from shopfloor.model.shop import Machine, Operations, Orders, Shop, shop_of
from shopfloor.model.stated import state
from shopfloor.openshop.method import Effort
from shopfloor.openshop.two_machine import TwoMachine, open_shop_of_two
from tests.oracle import optimum
from tests.strategies import shops

times = st.lists(st.tuples(st.integers(0, 30), st.integers(0, 30)), min_size=1, max_size=12)


@given(times)
@settings(max_examples=400, deadline=None)
def test_it_ends_at_the_largest_load(pairs) -> None:
    a, b = np.array(pairs, np.int64).T
    first, second = open_shop_of_two(a, b)
    ends = [*(first + a)[a > 0], *(second + b)[b > 0]]
    assert max(ends, default=0) == (max(a.sum(), b.sum(), (a + b).max()) if ends else 0)
    for start, length in ((first, a), (second, b)):
        busy = sorted((s, s + t) for s, t in zip(start, length, strict=True) if t)
        assert all(e <= s for (_, e), (s, _) in pairwise(busy))
        assert all(s >= 0 for s, _ in busy)
    for j in range(len(a)):
        if a[j] and b[j]:
            assert first[j] + a[j] <= second[j] or second[j] + b[j] <= first[j]


@given(shops(max_machines=2, max_operations=6, releases=False, steps=False, dues=False))
@settings(max_examples=60, deadline=None)
def test_it_equals_brute_force_and_passes_the_audit(shop: Shop) -> None:
    method = TwoMachine()
    assert method.accepts(shop) is None
    schedule = method.solve(shop, Effort()).schedule
    assert schedule is not None
    assert schedule.makespan_s == optimum(shop).makespan_s
    assert audit(shop, state(Plan(shop, schedule, (), Choice("", "", {})))) == []


def test_two_orders_on_many_machines_is_the_mirror() -> None:
    shop = shop_of([[3, 9, 4, 1], [5, 2, 6, 7]])
    schedule = TwoMachine().solve(shop, Effort()).schedule
    assert schedule is not None
    assert schedule.makespan_s == 20
    assert audit(shop, state(Plan(shop, schedule, (), Choice("", "", {})))) == []


@pytest.mark.parametrize(
    ("shop", "reason"),
    [
        (shop_of(np.ones((3, 3), int)), "3 machines and 3 orders have work, not two of either"),
        (Shop((Machine("A", count=2), Machine("B")), Orders(("J",)), Operations([0, 0], [0, 1], [1, 2])),
         "a machine has several units"),
        (Shop((Machine("A"), Machine("B")), Orders(("J",), due_s=[9]), Operations([0, 0], [0, 1], [1, 2])),
         "the rule knows no due times"),
    ],
)  # fmt: skip
def test_it_says_why_it_refuses(shop: Shop, reason: str) -> None:
    assert TwoMachine().accepts(shop) == reason
