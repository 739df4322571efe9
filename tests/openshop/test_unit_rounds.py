"""Unit rounds: the busiest order or machine decides, always (König, Math. Annalen 77 (1916) 453-465)."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import NO_DUE, Closure, Machine, Operations, Orders, Shop, shop_of
from shopfloor.openshop.choose import choose
from shopfloor.openshop.crew_rounds import CrewRounds
from shopfloor.openshop.method import Effort
from shopfloor.openshop.over_breaks import OverBreaks
from shopfloor.openshop.unit_rounds import UnitRounds
from tests.openshop.judge import least_rounds_by_model, solved
from tests.strategies import shops

unit_shops = shops(unit=True, releases=False, steps=False, groups=True, max_operations=9, max_orders=5)


@pytest.mark.parametrize(("r", "s"), [(1, 1), (3, 5), (5, 3), (7, 7)])
def test_complete_bipartite_needs_the_larger_side(r: int, s: int) -> None:
    assert solved(UnitRounds(), shop_of(np.ones((r, s), int))).makespan_s == max(r, s)


@given(unit_shops)
@settings(max_examples=80, deadline=None)
def test_rounds_with_groups_equal_a_model_of_the_same_shop(shop: Shop) -> None:
    schedule = solved(UnitRounds(), shop)
    assert schedule.makespan_s == least_rounds_by_model(shop) * int(shop.operations.seconds[0])


@given(unit_shops, st.integers(1, 4))
@settings(max_examples=60, deadline=None)
def test_rounds_under_a_crew_equal_a_model_of_the_same_shop(shop: Shop, heads: int) -> None:
    """De Werra (1971) and McDiarmid (1972): max(Δ, ⌈m/c⌉) even rounds always suffice."""
    schedule = solved(CrewRounds(), shop.with_crew(heads))
    assert schedule.makespan_s == least_rounds_by_model(shop, heads) * int(shop.operations.seconds[0])


@given(unit_shops, st.lists(st.integers(1, 8), min_size=2, max_size=6), st.booleans())
@settings(max_examples=80, deadline=None)
def test_breaks_are_kept_and_the_bound_is_still_reached(shop: Shop, cuts: list[int], pauses: bool) -> None:
    edges = np.cumsum(cuts[: len(cuts) // 2 * 2]).reshape(-1, 2).tolist()
    shop = replace(
        shop,
        breaks=tuple(Closure(a, b) for a, b in edges),
        machines=tuple(replace(machine, pauses=pauses) for machine in shop.machines),
    )
    method = choose(shop)[0]
    assert method.name == "unit rounds"
    assert isinstance(method, OverBreaks) == pauses
    solved(method, shop)


def test_due_times_choose_the_order_of_rounds() -> None:
    """Two orders on one machine: the urgent one goes first, whatever the colouring said."""
    shop = Shop(
        (Machine("A"),), Orders(("J", "K"), due_s=[NO_DUE, 600]), Operations([0, 1], [0, 0], [600, 600])
    )  # fmt: skip
    outcome = UnitRounds().solve(shop, Effort())
    assert outcome.remarks == ("The rounds were put in an order in which nothing is late.",)


@given(unit_shops)
@settings(max_examples=40, deadline=None)
def test_even_rounds_differ_by_at_most_one_operation(shop: Shop) -> None:
    schedule = solved(UnitRounds(), shop, Effort(even=True))
    sizes = np.bincount(schedule.round - 1)
    assert sizes.max() - sizes.min() <= 1


@pytest.mark.parametrize(
    ("shop", "reason"),
    [
        (shop_of([[60, 120]]), "times differ (1 min to 2 min)"),
        (Shop((Machine("A"),), Orders(("J",), release_s=[60]), Operations([0], [0], [60])),
         "some orders are released after the shift's start"),
        (shop_of([[60]]).with_crew(1), "a crew limits how much runs at once"),
        (replace(shop_of([[60]]), breaks=(Closure(1, 2),), machines=(Machine("A", pauses=True),)),
         "some machines pause over the breaks and others do not"),
    ],
)  # fmt: skip
def test_it_says_why_it_refuses(shop: Shop, reason: str) -> None:
    assert UnitRounds().accepts(shop) == reason


def test_mixed_heads_are_handed_on_with_the_reason() -> None:
    shop = Shop(
        (Machine("A"), Machine("B")), Orders(("J", "K")), Operations([0, 1], [0, 1], [60, 60], heads=[1, 2])
    ).with_crew(2)  # fmt: skip
    assert CrewRounds().accepts(shop) == "operations take different numbers of heads (1 to 2)"
