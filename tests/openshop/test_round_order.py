"""The order of rounds: least tardiness, then least completion, against every permutation of small cases."""

from __future__ import annotations

from itertools import permutations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import NO_DUE
from shopfloor.openshop import round_order
from shopfloor.openshop.round_order import PRIORITY_UNIT, order_rounds
from tests.strategies import colourings


def bill(position, colour, job, ends, due, priority):
    """Weighted tardiness and completion, from the definition."""
    tardiness = completion = 0
    for j in range(len(due)):
        mine = [position[c] for c, i in zip(colour, job, strict=True) if i == j]
        if mine:
            done = int(ends[max(mine)])
            weight = round(priority[j] * PRIORITY_UNIT)
            completion += weight * done
            tardiness += weight * max(0, done - due[j]) if due[j] != NO_DUE else 0
    return tardiness, completion


@given(colourings(max_rounds=5), st.data())
@settings(max_examples=80, deadline=None)
def test_the_exact_order_beats_every_permutation(case, data) -> None:
    colour, job, rounds = case
    orders = int(job.max()) + 1
    due = np.array([data.draw(st.one_of(st.just(NO_DUE), st.integers(-50, 400))) for _ in range(orders)])
    priority = [data.draw(st.sampled_from([0.5, 1, 3])) for _ in range(orders)]
    ends = np.cumsum(
        [data.draw(st.sampled_from([60, 60, 95])) for _ in range(rounds)]
    )  # a break makes one longer
    found = order_rounds(colour, job, ends, due, priority)
    costs = [bill(p, colour, job, ends, due, priority) for p in permutations(range(rounds))]
    assert found.proved
    assert found.exact
    assert sorted(found.position.tolist()) == list(range(rounds))
    assert (found.tardiness, found.completion) == min(costs)
    assert bill(found.position, colour, job, ends, due, priority) == min(costs)


def test_many_rounds_get_a_permutation_no_worse_than_the_one_given() -> None:
    rng = np.random.default_rng(7)
    rounds, orders = 40, 60
    colour, job = rng.integers(0, rounds, 300), rng.integers(0, orders, 300)
    colour = np.r_[colour, np.arange(rounds)]
    job = np.r_[job, np.zeros(rounds, np.int64)]
    due = rng.integers(300, 2400, orders)
    ends = 60 * np.arange(1, rounds + 1)
    found = order_rounds(colour, job, ends, due, np.ones(orders))
    given = bill(np.arange(rounds), colour, job, ends, due, np.ones(orders))
    assert sorted(found.position.tolist()) == list(range(rounds))
    assert (found.tardiness, found.completion) <= given
    assert not found.exact


@given(colourings(max_rounds=6), st.data())
@settings(max_examples=60, deadline=None)
def test_filling_from_the_back_is_near_the_exact_answer(case, data) -> None:
    """Past EXACT_ROUNDS this is used; on small cases it must be legal and never beat exact."""
    colour, job, rounds = case
    orders = int(job.max()) + 1
    due = np.array([data.draw(st.one_of(st.just(NO_DUE), st.integers(0, 400))) for _ in range(orders)])
    ends = 60 * np.arange(1, rounds + 1)
    exact = order_rounds(colour, job, ends, due, np.ones(orders))
    before = round_order.EXACT_ROUNDS
    round_order.EXACT_ROUNDS = 0
    try:
        quick = order_rounds(colour, job, ends, due, np.ones(orders))
    finally:
        round_order.EXACT_ROUNDS = before
    assert sorted(quick.position.tolist()) == list(range(rounds))
    assert (quick.tardiness, quick.completion) >= (exact.tardiness, exact.completion)
    assert (quick.tardiness, quick.completion) == bill(
        quick.position, colour, job, ends, due, np.ones(orders)
    )
