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


def moment(length):
    """A break of 40 seconds begins at second 100."""
    return np.asarray(length) + 40 * (np.asarray(length) > 100)


def bill(position, rounds, job, lengths, due, priority):
    """Weighted tardiness and completion, from the definition."""
    sequence = sorted(range(len(lengths)), key=lambda r: position[r])
    ends = {
        r: int(moment(sum(lengths[s] for s in sequence[: place + 1]))) for place, r in enumerate(sequence)
    }
    tardiness = completion = 0
    for j in range(len(due)):
        mine = [ends[r] for r, i in zip(rounds, job, strict=True) if i == j]
        if mine:
            weight = round(priority[j] * PRIORITY_UNIT)
            completion += weight * max(mine)
            tardiness += weight * max(0, max(mine) - due[j]) if due[j] != NO_DUE else 0
    return tardiness, completion


@given(colourings(max_rounds=5), st.booleans(), st.data())
@settings(max_examples=80, deadline=None)
def test_the_exact_order_beats_every_permutation(case, equal, data) -> None:
    rounds, job, count = case
    orders = int(job.max()) + 1
    due = np.array([data.draw(st.one_of(st.just(NO_DUE), st.integers(-50, 400))) for _ in range(orders)])
    priority = [data.draw(st.sampled_from([0.5, 1, 3])) for _ in range(orders)]
    lengths = [60] * count if equal else [data.draw(st.integers(1, 90)) for _ in range(count)]
    found = order_rounds(rounds, job, lengths, moment, due, priority)
    costs = [bill(p, rounds, job, lengths, due, priority) for p in permutations(range(count))]
    assert found.proved
    assert found.exact
    assert sorted(found.position.tolist()) == list(range(count))
    assert (found.tardiness, found.completion) == min(costs)
    assert bill(found.position, rounds, job, lengths, due, priority) == min(costs)


def test_many_rounds_get_a_sequence_no_worse_than_the_one_given() -> None:
    rng = np.random.default_rng(7)
    count, orders = 40, 60
    rounds = np.r_[rng.integers(0, count, 300), np.arange(count)]
    job = np.r_[rng.integers(0, orders, 300), np.zeros(count, np.int64)]
    due, one = rng.integers(300, 2400, orders), np.ones(orders)
    lengths = rng.integers(20, 90, count)
    found = order_rounds(rounds, job, lengths, moment, due, one)
    assert sorted(found.position.tolist()) == list(range(count))
    assert (found.tardiness, found.completion) <= bill(np.arange(count), rounds, job, lengths, due, one)
    assert not found.exact


@given(colourings(max_rounds=6), st.data())
@settings(max_examples=60, deadline=None)
def test_filling_from_the_back_is_legal_and_counts_right(case, data) -> None:
    """Past EXACT_ROUNDS this is used; on small cases it must be legal and never beat exact."""
    rounds, job, count = case
    orders = int(job.max()) + 1
    due = np.array([data.draw(st.one_of(st.just(NO_DUE), st.integers(0, 400))) for _ in range(orders)])
    lengths, one = [data.draw(st.integers(1, 90)) for _ in range(count)], np.ones(orders)
    exact = order_rounds(rounds, job, lengths, moment, due, one)
    before = round_order.EXACT_ROUNDS
    round_order.EXACT_ROUNDS = 0
    try:
        quick = order_rounds(rounds, job, lengths, moment, due, one)
    finally:
        round_order.EXACT_ROUNDS = before
    assert sorted(quick.position.tolist()) == list(range(count))
    assert (quick.tardiness, quick.completion) >= (exact.tardiness, exact.completion)
    assert (quick.tardiness, quick.completion) == bill(quick.position, rounds, job, lengths, due, one)


def test_what_remains_is_said_in_words() -> None:
    late = round_order.RoundOrder(np.zeros(1, int), 1_800_000, 0, proved=True, exact=True)
    assert late.about("rounds") == (
        "The rounds were put in order for the due times; lateness weighted by priority comes to 30 min, "
        "and no other order of them has less."
    )
