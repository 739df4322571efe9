"""Moves begin at what the schedule waited for, and a run of a family stays one."""

from __future__ import annotations

from random import Random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import Changeovers, Machine, Operations, Orders, Shop
from shopfloor.openshop.floor.goals import CHANGEOVERS, FLOOR_GOALS, MAKESPAN, TARDINESS
from shopfloor.openshop.floor.moves import Moves
from shopfloor.openshop.floor.rules import Rules
from shopfloor.openshop.floor.sequence import Pass, Sequencer
from tests.bench.shifts import shift
from tests.floor_shops import floors
from tests.openshop.floor_passes import some_list


def proposals(shop: Shop, made: Pass, goal: str, seed: int, tries: int) -> list[tuple[list[int], int]]:
    moves = Moves(Rules.of(shop), Random(seed))
    moves.settle(made)
    found = [moves.propose(goal) for _ in range(tries)]
    return [each for each in found if each is not None]


@given(floors(), st.integers(0, 10**6))
@settings(max_examples=100, deadline=None)
def test_nothing_behind_what_ends_last_is_touched_alone(shop: Shop, seed: int) -> None:
    """A change that begins after the last end cannot bring it forward."""
    made = some_list(shop, Random(seed))
    ends_last = max(place for place, k in enumerate(made.sequence) if made.end[k] == made.makespan)
    assert all(begin <= ends_last for _, begin in proposals(shop, made, MAKESPAN, seed, 10))


@given(floors(), st.sampled_from(FLOOR_GOALS), st.integers(0, 10**6))
@settings(max_examples=100, deadline=None)
def test_the_same_seed_proposes_the_same(shop: Shop, goal: str, seed: int) -> None:
    made = some_list(shop, Random(seed))
    assert proposals(shop, made, goal, seed, 10) == proposals(shop, made, goal, seed, 10)


@pytest.mark.parametrize("goal", FLOOR_GOALS)
def test_most_tries_on_a_whole_shift_come_to_a_list(goal: str) -> None:
    shop = shift("S", 2)
    made = some_list(shop, Random(3))
    found = proposals(shop, made, goal, 4, 100)
    assert len(found) > 50
    assert len({tuple(sequence) for sequence, _ in found}) > 25


def test_nothing_is_proposed_where_nothing_waited() -> None:
    shop = Shop((Machine("M"), Machine("N")), Orders(("A", "B")), Operations([0, 1], [0, 1], [5, 7]))
    made = some_list(shop, Random(0))
    assert all(not proposals(shop, made, goal, 1, 20) for goal in FLOOR_GOALS)


def test_two_runs_of_a_family_are_joined_by_one_move() -> None:
    """Red, black, red, black, due early: some single move saves two of the three changes."""
    size = 4
    shop = Shop(
        (Machine("COAT", family="red"),), Orders(tuple("ABCD"), due_s=[0] * size),
        Operations(range(size), [0] * size, [600] * size, family=[0, 1, 0, 1]),
        families=("red", "black"), changeovers={"COAT": Changeovers(300)},
    )  # fmt: skip
    sequencer = Sequencer(Rules.of(shop))
    made = sequencer.whole([0, 1, 2, 3])
    assert made is not None
    assert made.changed == 900
    for goal in (MAKESPAN, TARDINESS, CHANGEOVERS):
        tried = [sequencer.whole(sequence) for sequence, _ in proposals(shop, made, goal, 1, 60)]
        assert min(each.changed for each in tried if each) == 300
