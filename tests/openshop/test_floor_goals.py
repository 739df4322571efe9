"""Goals in whole numbers: what is kept, by how much it is passed, and what no schedule can go below."""

from __future__ import annotations

from random import Random

from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.model.shop import Shop
from shopfloor.openshop.floor.goals import (
    CHANGEOVERS,
    FLOOR_GOALS,
    MAKESPAN,
    TARDINESS,
    Kept,
    has,
    least,
    score,
    worth,
)
from shopfloor.openshop.floor.rules import FAR, Rules
from shopfloor.openshop.floor.sequence import Limits, Pass
from tests.floor_oracle import least_makespan, least_tardiness
from tests.floor_shops import floors
from tests.openshop.floor_passes import some_list

VALUES = st.integers(0, 100)


def came_to(makespan: int, late: int, changed: int) -> Pass:
    return Pass([], [], [], [], [], [], makespan=makespan, late=late, changed=changed)


def test_a_schedule_is_scored_goal_after_goal() -> None:
    made = came_to(7, 5, 3)
    assert score(made, (TARDINESS, MAKESPAN, CHANGEOVERS)) == (5, 7, 3)
    assert score(made, (CHANGEOVERS,)) == (3,)


def test_what_is_passed_most_counts_as_a_share() -> None:
    kept = Kept().and_(MAKESPAN, 100).and_(TARDINESS, 10)
    assert kept.excess(came_to(110, 9, 99)) == (10, 0)
    assert kept.passed_by(came_to(110, 12, 99)) == 0.2
    assert kept.passed_by(came_to(100, 10, 0)) == 0.0
    assert Kept().passed_by(came_to(1, 1, 1)) == 0.0


@given(VALUES, VALUES, VALUES, st.sampled_from(FLOOR_GOALS), st.sampled_from(FLOOR_GOALS), VALUES, VALUES)
def test_limits_let_pass_exactly_what_is_kept(a, b, c, one, goal, most, limit) -> None:
    kept, made = Kept().and_(one, most), came_to(a, b, c)
    limits = kept.limits(goal, limit)
    within = a <= limits.latest and b <= limits.late and c <= limits.changed
    assert within == (not any(kept.excess(made)) and worth(made, goal) <= limit)
    assert Kept().limits(MAKESPAN, 5) == Limits(5, FAR, FAR)


@given(floors(), st.integers(0, 10**6))
@settings(max_examples=100, deadline=None)
def test_no_schedule_has_less_than_the_least(shop: Shop, seed: int) -> None:
    rules, made = Rules.of(shop), some_list(shop, Random(seed))
    makespan, tardiness = least_makespan(shop), least_tardiness(shop)
    assert makespan is not None
    assert tardiness is not None
    assert least(rules, MAKESPAN, makespan) == makespan
    assert least(rules, TARDINESS, makespan) <= tardiness <= worth(made, TARDINESS)
    assert least(rules, CHANGEOVERS, makespan) == 0
    for goal in FLOOR_GOALS:
        assert has(rules, goal) or worth(made, goal) == 0
