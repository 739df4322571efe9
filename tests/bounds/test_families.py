"""The least changeover that families force: against every sequence of small cases."""

from __future__ import annotations

from itertools import pairwise, permutations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.bounds.families import least_changeover
from shopfloor.errors import ShopError
from shopfloor.model.shop import Changeovers, Closure, Machine, Operations, Orders, Shop

FAMILIES = ("red", "black", "grey")


def shop_with(families: list[int], rule: Changeovers, *, count: int = 1, start: str | None = None) -> Shop:
    size = len(families)
    return Shop(
        (Machine("COAT", count=count, family=start),), Orders(tuple(f"J{k}" for k in range(size))),
        Operations(np.arange(size), np.zeros(size, int), [600] * size, family=families),
        families=FAMILIES, changeovers={"COAT": rule},
    )  # fmt: skip


@st.composite
def rules(draw: st.DrawFn) -> Changeovers:
    """Tables in which no way round is shorter: closed up by Floyd and Warshall's recursion."""
    names = [*FAMILIES, ""]
    time = {(a, b): 0 if a == b else draw(st.integers(0, 30)) for a in names for b in names}
    for c in names:
        for a in names:
            for b in names:
                time[a, b] = min(time[a, b], time[a, c] + time[c, b])
    between = max(time.values())
    pairs = {pair: value for pair, value in time.items() if pair[0] != pair[1]}
    try:
        return Changeovers(between, pairs)
    except ShopError:  # an unlisted family may be nearer than the table says; take an even table instead
        return Changeovers(between)


@given(st.lists(st.integers(0, 2), min_size=1, max_size=5), rules(), st.sampled_from([None, *FAMILIES]))
@settings(max_examples=100, deadline=None)
def test_one_unit_pays_exactly_the_cheapest_sequence(families, rule, start) -> None:
    shop = shop_with(families, rule, start=start)
    cheapest = min(
        sum(rule.seconds(a, b) for a, b in pairwise(route))
        for order in permutations(families)
        for route in [([start] if start else []) + [FAMILIES[f] for f in order]]
    )
    assert least_changeover(shop, 0, np.arange(len(families)), from_start=True) == cheapest


def test_the_sentence_names_work_changeovers_and_closures() -> None:
    shop = shop_with([0, 1, 2], Changeovers(300))
    assert lower_bounds(shop)[0].value_s == 2400
    assert lower_bounds(shop)[0].sentence == (
        "COAT has 30 min of work for this shift, and its families force at least 10 min of changeovers, "
        "so nothing can end before 0:40."
    )
    cmm = Machine("CMM", closed=(Closure(600, 1200, "calibration"),))
    closed = Shop((cmm,), Orders(("A",)), Operations([0], [0], [900]))
    assert lower_bounds(closed)[0].value_s == 1500


def test_each_unit_of_a_group_stands_in_its_first_family_for_nothing() -> None:
    assert (
        least_changeover(shop_with([0, 1, 2], Changeovers(300), count=2), 0, np.arange(3), from_start=True)
        == 300
    )


def test_a_shorter_way_round_is_refused() -> None:
    with pytest.raises(ShopError, match="changeover from red to black takes longer than by way of grey"):
        Changeovers(60, {("red", "black"): 90, ("red", "grey"): 10, ("grey", "black"): 10})


def test_a_change_made_while_the_machine_waits_costs_nothing() -> None:
    """One grey order released at 1:00 on a machine set up for red: it is changed before the order comes."""
    coat = Machine("COAT", family="red")
    shop = Shop(
        (coat,), Orders(("J",), release_s=[3600]), Operations([0], [0], [600], family=[2]),
        families=FAMILIES, changeovers={"COAT": Changeovers(1200)},
    )  # fmt: skip
    assert lower_bounds(shop)[0].value_s == 4200
