"""Improvement step by step: legal at each, never worse in the end, and the same again from the same seed."""

from __future__ import annotations

from itertools import pairwise
from random import Random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import Shop
from shopfloor.openshop.floor.goals import FLOOR_GOALS, MAKESPAN, TARDINESS, Kept, score, worth
from shopfloor.openshop.floor.improve import closed_up, improve
from shopfloor.openshop.floor.moves import Moves
from shopfloor.openshop.floor.rules import Rules
from shopfloor.openshop.floor.sequence import Pass, Sequencer
from tests.bench.shifts import shift
from tests.floor_shops import floors
from tests.openshop.floor_passes import legal, some_list

STEPS = 60


class Watched(Moves):
    """Moves that remember every schedule they were told of: the first, and each that was accepted."""

    def __init__(self, rules: Rules, rng: Random) -> None:
        super().__init__(rules, rng)
        self.accepted: list[Pass] = []

    def settle(self, made: Pass) -> None:
        self.accepted.append(made)
        super().settle(made)


def cycle(
    shop: Shop, begin: Pass, goal: str, kept: Kept, *, seed: int, heat: float = 0.0, target: int = 0
) -> tuple[Pass, list[Pass], int]:
    """The best, every schedule accepted, and how often it was asked whether time is up."""
    rules, rng, asked = Rules.of(shop), Random(seed), []
    moves = Watched(rules, rng)
    best, ended = improve(
        Sequencer(rules), moves, begin, (goal,), kept, target, steps=STEPS, heat=heat, rng=rng,
        over=lambda: bool(asked.append(1)),
    )  # fmt: skip
    assert ended
    return best, moves.accepted, len(asked)


@pytest.fixture(scope="module")
def small_shift() -> Shop:
    return shift("S", 1)


@pytest.mark.parametrize("goal", FLOOR_GOALS)
@pytest.mark.parametrize("heat", [0.0, 0.05])
def test_every_schedule_accepted_is_legal_and_keeps_what_is_kept(
    small_shift: Shop, goal: str, heat: float
) -> None:
    begin = some_list(small_shift, Random(1))
    other = MAKESPAN if goal == TARDINESS else TARDINESS
    kept = Kept().and_(other, worth(begin, other))
    best, accepted, asked = cycle(small_shift, begin, goal, kept, seed=2, heat=heat)
    assert asked == STEPS
    assert len(accepted) > 3
    assert all(legal(small_shift, made) and not any(kept.excess(made)) for made in accepted)
    assert worth(best, goal) == min(worth(made, goal) for made in accepted)


@given(floors(), st.sampled_from(FLOOR_GOALS), st.integers(0, 10**6))
@settings(max_examples=60, deadline=None)
def test_without_heat_no_step_is_worse_than_the_one_before(shop: Shop, goal: str, seed: int) -> None:
    begin = some_list(shop, Random(seed))
    best, accepted, _ = cycle(shop, begin, goal, Kept(), seed=seed)
    values = [worth(made, goal) for made in accepted]
    assert all(before >= after for before, after in pairwise(values))
    assert worth(best, goal) == values[-1]


@given(floors(), st.sampled_from(FLOOR_GOALS), st.integers(0, 10**6), st.sampled_from([0.0, 0.05]))
@settings(max_examples=60, deadline=None)
def test_the_same_seed_takes_the_same_steps(shop: Shop, goal: str, seed: int, heat: float) -> None:
    begin = some_list(shop, Random(seed))
    one, other = (cycle(shop, begin, goal, Kept(), seed=seed, heat=heat) for _ in range(2))
    assert [made.sequence for made in one[1]] == [made.sequence for made in other[1]]
    assert (one[0].start, one[2]) == (other[0].start, other[2])


def test_no_step_is_taken_once_the_target_is_met(small_shift: Shop) -> None:
    begin = some_list(small_shift, Random(1))
    best, accepted, asked = cycle(small_shift, begin, MAKESPAN, Kept(), seed=2, target=begin.makespan)
    assert (best, accepted, asked) == (begin, [begin], 0)


def test_when_time_is_up_the_best_so_far_is_handed_back(small_shift: Shop) -> None:
    begin, rules, asked = some_list(small_shift, Random(1)), Rules.of(small_shift), []
    best, ended = improve(
        Sequencer(rules), Moves(rules, Random(2)), begin, (MAKESPAN,), Kept(), 0, steps=STEPS, heat=0.0,
        rng=Random(2), over=lambda: bool(asked.append(1)) or len(asked) > 20,
    )  # fmt: skip
    assert (ended, len(asked)) == (False, 21)
    assert best.makespan <= begin.makespan


@given(floors(), st.permutations(FLOOR_GOALS), st.integers(1, 3), st.integers(0, 10**6))
@settings(max_examples=60, deadline=None)
def test_closing_up_is_legal_and_no_worse(shop: Shop, goals: list[str], count: int, seed: int) -> None:
    made = some_list(shop, Random(seed))
    kept = Kept().and_(goals[-1], worth(made, goals[-1]))
    closed = closed_up(Sequencer(Rules.of(shop)), made, goals[:count], kept)
    assert legal(shop, closed)
    assert not any(kept.excess(closed))
    assert score(closed, goals[:count]) <= score(made, goals[:count])
