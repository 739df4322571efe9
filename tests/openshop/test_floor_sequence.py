"""Lists as schedules: legal, as good as any schedule for some list, and quick to take up again."""

from __future__ import annotations

from itertools import permutations
from random import Random

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import Shop
from shopfloor.openshop.floor.goals import CHANGEOVERS, MAKESPAN, TARDINESS, Kept, worth
from shopfloor.openshop.floor.improve import closed_up, improve
from shopfloor.openshop.floor.list_rule import in_order
from shopfloor.openshop.floor.moves import Moves
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.sequence import Limits, Pass, Sequencer
from shopfloor.openshop.units import assign_units
from tests.bench.shifts import shift
from tests.floor_oracle import least_makespan, least_tardiness, plays
from tests.floor_shops import floors

GOALS = st.sampled_from([MAKESPAN, TARDINESS, CHANGEOVERS])
RANDOM = st.integers(0, 10**6).map(Random)


def upwards(shop: Shop, random: Random) -> list[int]:
    """Some list with the steps of each order in order."""
    columns = shop.operations
    return sorted(range(len(shop)), key=lambda k: (int(columns.step[k]), random.random()))


def units(shop: Shop, made: Pass) -> list[int]:
    dealt = assign_units(shop, np.array(made.start), np.array(made.end)).tolist()
    return [dealt[k] if unit == NONE else unit + 1 for k, unit in enumerate(made.unit)]


@given(floors(), RANDOM)
@settings(max_examples=150, deadline=None)
def test_a_list_is_a_legal_schedule_with_true_figures(shop: Shop, random: Random) -> None:
    rules = Rules.of(shop)
    made = Sequencer(rules).whole(upwards(shop, random))
    assert made is not None
    assert plays(shop, made.start, units(shop, made)) == made.end
    done = {job: max(e for e, j in zip(made.end, rules.job, strict=True) if j == job) for job in rules.job}
    assert made.makespan == max(done.values())
    assert made.late == sum(rules.weight[job] * max(0, end - rules.due[job]) for job, end in done.items())
    assert all((made.done[job], made.end[made.last[job]]) == (end, end) for job, end in done.items())


@given(floors(max_operations=4))
@settings(max_examples=60, deadline=None)
def test_some_list_is_as_good_as_any_schedule(shop: Shop) -> None:
    """Where a machine with changeovers has one unit; of several the list takes the first that is ready."""
    rules = Rules.of(shop)
    sequencer = Sequencer(rules)
    stepped = [k for k in range(len(rules)) if rules.step[k] != NONE]
    pairs = [(a, b) for a in stepped for b in stepped if rules.job[a] == rules.job[b]]
    ahead = [(a, b) for a, b in pairs if rules.step[a] < rules.step[b]]
    made = [
        sequencer.whole(list(sequence))
        for sequence in permutations(range(len(shop)))
        if all(sequence.index(a) < sequence.index(b) for a, b in ahead)
    ]
    best = tuple(min(worth(each, goal) for each in made if each) for goal in (MAKESPAN, TARDINESS))
    least = (least_makespan(shop), least_tardiness(shop))
    if any(change is not None and count > 1 for change, count in zip(rules.change, rules.count, strict=True)):
        assert best >= least
    else:
        assert best == least


@pytest.fixture(scope="module")
def small_shift() -> Shop:
    """Some 250 operations with every rule: several stretches of a pass."""
    return shift("S", 1)


@given(st.data())
@settings(max_examples=40, deadline=None)
def test_a_pass_taken_up_again_is_the_whole_pass(small_shift: Shop, data: st.DataObject) -> None:
    """And it is broken off exactly when the whole would pass a limit."""
    rules, random = Rules.of(small_shift), data.draw(RANDOM)
    sequencer, moves = Sequencer(rules), Moves(rules, random)
    old = sequencer.whole(upwards(small_shift, random))
    assert old is not None
    assert len(old.states) == -(-len(rules) // sequencer.apart)
    assert len(old.states) > 1
    moves.settle(old)
    change = moves.propose(data.draw(GOALS))
    if change is None:
        return
    sequence, begin = change
    assert sequence[:begin] == old.sequence[:begin]
    assert sorted(sequence) == list(range(len(rules)))
    made, whole = sequencer.again(old, sequence, begin, Limits()), sequencer.whole(sequence)
    assert made is not None
    assert whole is not None
    assert (made.start, made.end, made.unit, made.cause) == (whole.start, whole.end, whole.unit, whole.cause)
    assert (made.makespan, made.late, made.changed) == (whole.makespan, whole.late, whole.changed)
    exact = Limits(made.makespan, made.late, made.changed)
    assert sequencer.again(old, sequence, begin, exact) is not None
    for limits in (
        Limits(latest=made.makespan - 1), Limits(late=made.late - 1), Limits(changed=made.changed - 1)
    ):  # fmt: skip
        assert sequencer.again(old, sequence, begin, limits) is None


@given(floors(), GOALS, RANDOM)
@settings(max_examples=100, deadline=None)
def test_a_move_keeps_every_operation_and_the_steps(shop: Shop, goal: str, random: Random) -> None:
    rules = Rules.of(shop)
    made = Sequencer(rules).whole(upwards(shop, random))
    assert made is not None
    moves = Moves(rules, random)
    moves.settle(made)
    for _ in range(5):
        change = moves.propose(goal)
        if change is not None:
            sequence, begin = change
            assert sorted(sequence) == list(range(len(rules)))
            assert sequence[:begin] == made.sequence[:begin]
            again = Sequencer(rules).whole(sequence)
            assert again is not None
            assert plays(shop, again.start, units(shop, again)) == again.end


@given(floors(), GOALS, GOALS, RANDOM)
@settings(max_examples=100, deadline=None)
def test_improvement_only_improves_and_gives_up_nothing_kept(
    shop: Shop, goal: str, other: str, random: Random
) -> None:
    rules = Rules.of(shop)
    sequencer = Sequencer(rules)
    made = sequencer.whole(upwards(shop, random))
    assert made is not None
    kept = Kept().and_(other, worth(made, other)) if other != goal else Kept()
    better, ended = improve(
        sequencer, Moves(rules, random), made, (goal,), kept, 0, steps=40, heat=0.05, rng=random
    )
    assert ended
    closed = closed_up(sequencer, better, (goal,), kept)
    for each in (better, closed):
        assert worth(each, goal) <= worth(made, goal)
        assert not any(kept.excess(each))
        assert plays(shop, each.start, units(shop, each)) == each.end
    assert worth(closed, goal) <= worth(better, goal)


def test_a_list_in_the_order_of_its_starts_is_no_later(small_shift: Shop) -> None:
    sequencer = Sequencer(Rules.of(small_shift))
    made = sequencer.whole(upwards(small_shift, Random(5)))
    assert made is not None
    again = sequencer.whole(in_order(made.start))
    assert again is not None
    assert max(again.end) <= max(made.end)
