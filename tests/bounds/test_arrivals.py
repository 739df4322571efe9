"""Run bounds: against every sequence of small cases, and derived again from the witness."""

from __future__ import annotations

from itertools import pairwise, permutations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.arrivals import earliest_done
from shopfloor.audit.witness import rederive
from shopfloor.bounds import arrivals
from shopfloor.bounds.arrivals import Work, _work, least_end, quick_end, run_bounds
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.bounds.load import machine_bounds
from shopfloor.model.shop import Changeovers, Closure, Machine, Operations, Orders, Shop
from tests.bounds.test_families import FAMILIES, rules

JOBS = st.lists(st.tuples(st.integers(0, 40), st.integers(1, 20), st.integers(0, 2)), min_size=2, max_size=6)
BEGINS = st.sampled_from([None, *FAMILIES])


def coater(jobs: list[tuple[int, int, int]], rule: Changeovers, begins: str | None, closed=()) -> Shop:
    """Each job (release, seconds, family) visits the one machine."""
    size = len(jobs)
    heads, seconds, families = zip(*jobs, strict=True)
    return Shop(
        (Machine("COAT", family=begins, pauses=True, closed=closed),),
        Orders(tuple(f"J{k}" for k in range(size)), release_s=heads),
        Operations(np.arange(size), np.zeros(size, int), seconds, family=families),
        families=FAMILIES, changeovers={"COAT": rule},
    )  # fmt: skip


def by_trying(jobs: list[tuple[int, int, int]], rule: Changeovers, begins: str | None) -> int:
    ends = []
    for sequence in permutations(jobs):
        first = FAMILIES[sequence[0][2]]
        moment = 0 if begins is None else rule.seconds(begins, first)
        change = [0, *(rule.seconds(FAMILIES[a[2]], FAMILIES[b[2]]) for a, b in pairwise(sequence))]
        for (release, seconds, _), needed in zip(sequence, change, strict=True):
            moment = max(moment + needed, release) + seconds
        ends.append(moment)
    return min(ends)


@given(JOBS, rules(), BEGINS)
@settings(max_examples=150, deadline=None)
def test_it_is_the_end_of_the_best_sequence(jobs, rule, begins) -> None:
    shop, least = coater(jobs, rule, begins), by_trying(jobs, rule, begins)
    work = _work(shop, 0, 1)
    assert least_end(work, 10**6) == least <= quick_end(work)
    found = run_bounds(shop)
    assert all(rederive(shop, bound) == bound.value_s == least for bound in found)
    if not rule.none and len({family for _, _, family in jobs}) > 1:
        assert bool(found) == (machine_bounds(shop)[0].value_s < least)


@given(JOBS, rules(), BEGINS, st.integers(0, 40), st.integers(1, 30), st.sampled_from([3, 6]))
@settings(max_examples=80, deadline=None)
def test_a_coarser_grid_bounds_from_below_and_is_derived_again(jobs, rule, begins, shut, lasts, most) -> None:
    """With a closure: work that is done in open time."""
    shop = coater(jobs, rule, begins, (Closure(shut, shut + lasts),))
    exact = run_bounds(shop)
    before = arrivals.STATES_MOST
    try:
        arrivals.STATES_MOST = most
        rough = run_bounds(shop)
    finally:
        arrivals.STATES_MOST = before
    for bound in (*exact, *rough):
        assert rederive(shop, bound) == bound.value_s
    assert all(one.value_s <= two.value_s for one, two in zip(rough, exact, strict=False))


def test_the_sentence_names_work_and_families() -> None:
    """Red is there at 0:00 and at 0:40; grey at 0:00. To come back to red costs less than to wait."""
    jobs = [(0, 600, 0), (2400, 600, 0), (0, 1800, 2)]
    bound = lower_bounds(coater(jobs, Changeovers(300), "red"))[0]
    assert (bound.kind, bound.value_s) == ("runs", 3600)
    assert bound.sentence == (
        "COAT has 50 min of work in 2 families; as it arrives and with the changeovers it then needs, "
        "nothing can end before 1:00."
    )


def test_too_many_states_are_not_counted() -> None:
    assert least_end(Work([[(0, 1), (5, 1)], [(0, 1), (5, 1)]], [[0, 9], [9, 0]], [0, 0]), 1) is None
    assert earliest_done({"red": [(0, 1), (5, 1)], "grey": [(0, 1)]}, Changeovers(9), None) == 12
