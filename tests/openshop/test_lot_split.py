"""Work that may be cut: the largest load decides (Gonzalez and Sahni, J. ACM 23 (1976) 665-679)."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Plan
from shopfloor.model.shop import Shop, shop_of
from shopfloor.model.stated import state
from shopfloor.openshop.choose import choose
from shopfloor.openshop.lot_split import LotSplit
from shopfloor.openshop.method import Effort
from tests.openshop.judge import solved
from tests.strategies import shops

lots = shops(releases=False, steps=False, dues=False, groups=True, max_seconds=9, max_operations=9).map(
    lambda shop: shop.with_splits()
)


@given(lots)
@settings(max_examples=100, deadline=None)
def test_groups_end_at_the_largest_load(shop: Shop) -> None:
    """max(order, machine, ⌈group / units⌉): McNaughton (1959) inside Gonzalez and Sahni (1976)."""
    solved(LotSplit(), shop)


@given(lots, st.integers(1, 4))
@settings(max_examples=100, deadline=None)
def test_a_crew_ends_at_the_largest_load_or_all_work_over_its_heads(shop: Shop, heads: int) -> None:
    solved(LotSplit(), shop.with_crew(heads))


@pytest.mark.parametrize(
    "matrix",
    [
        [[3, 3, 3], [3, 3, 3], [3, 3, 3]],  # every line tight
        [[0, 0, 0], [0, 5, 0], [0, 0, 0]],  # rows without work
        [[90, 90], [1, 0], [0, 1]],  # one giant
        [[1, 0, 0, 7], [0, 2, 0, 0], [0, 0, 3, 0], [4, 0, 0, 1]],  # sparse
    ],
)
def test_hostile_matrices(matrix) -> None:
    times = np.array(matrix)
    schedule = solved(LotSplit(), shop_of(matrix).with_splits())
    assert schedule.makespan_s == max(times.sum(axis=0).max(), times.sum(axis=1).max())


def test_a_giant_order_is_cut_on_a_group_and_the_parts_are_numbered() -> None:
    """Three lots of two hours on two units: whole they need four hours, cut they need three."""
    shop = shop_of([[7200], [7200], [7200]])
    shop = replace(shop, machines=(replace(shop.machines[0], count=2),)).with_splits()
    schedule = solved(LotSplit(), shop)
    assert schedule.makespan_s == 10_800
    assert sorted(zip(schedule.part.tolist(), schedule.parts.tolist(), strict=True))[-1] == (2, 2)


@given(shops(releases=False, steps=False, groups=True, max_seconds=9, max_operations=8))
@settings(max_examples=60, deadline=None)
def test_due_times_reorder_blocks_and_keep_the_finish(shop: Shop) -> None:
    solved(LotSplit(), shop.with_splits())


@given(lots, st.integers(1, 6))
@settings(max_examples=40, deadline=None)
def test_no_piece_is_shorter_than_asked(shop: Shop, least: int) -> None:
    outcome = LotSplit().solve(shop, Effort(shortest_piece_s=least, time_limit_s=2))
    schedule = outcome.schedule
    assert schedule is not None
    cut = schedule.parts > 1
    assert ((schedule.end_s - schedule.start_s)[cut] >= least).all()
    assert audit(shop, state(Plan(shop, schedule, (), Choice("", "", {})))) == []
    assert schedule.makespan_s >= lower_bounds(shop)[0].value_s
    assert outcome.remarks[0].startswith("No operation is cut into pieces shorter than")


def test_refusals() -> None:
    shop = shop_of([[60, 120], [90, 30]])
    assert LotSplit().accepts(shop) == "no operation may be cut"
    some = replace(shop, operations=replace(shop.operations, splittable=[1, 0, 0, 0]))
    assert LotSplit().accepts(some) == "only some operations may be cut"
    assert choose(some)[0].name == "two machines"
    odd = replace(
        shop.with_splits(), operations=replace(shop.with_splits().operations, heads=[2] * 4)
    ).with_crew(3)
    assert LotSplit().accepts(odd) == "the crew's heads do not divide evenly among the operations"
