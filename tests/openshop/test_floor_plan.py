"""Plans of floors: more effort is never worse, goals in their turn, and no clock where the target is met."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.openshop.cpsat.floor.best import MEASURES, Places
from shopfloor.openshop.floor import plan
from shopfloor.openshop.floor.goals import FLOOR_GOALS, MAKESPAN
from shopfloor.openshop.floor.plan import first_schedule, floor_plan
from shopfloor.openshop.method import Effort, Progress
from tests.bench.shifts import shift
from tests.floor_shops import floors


def has_of(shop: Shop, schedule: Schedule | None, goal: str) -> int:
    assert schedule is not None
    return MEASURES[goal](shop, Places.of(schedule))


@given(floors(), st.sampled_from(FLOOR_GOALS), st.integers(0, 10**6))
@settings(max_examples=40, deadline=None)
def test_more_rounds_are_never_worse(shop: Shop, goal: str, seed: int) -> None:
    plans = [floor_plan(shop, (goal,), Effort(seed=seed), rounds=rounds) for rounds in (0, 1, 2)]
    values = [
        has_of(shop, schedule, goal)
        for schedule in (first_schedule(shop, goal), *(p.schedule for p in plans))
    ]
    assert values == sorted(values, reverse=True)
    assert all(each.repeatable for each in plans)


@given(floors(), st.permutations(FLOOR_GOALS))
@settings(max_examples=40, deadline=None)
def test_a_goal_served_is_as_good_as_if_it_were_the_only_one(shop: Shop, goals: list[str]) -> None:
    """Or better: goals that follow only choose among equals while it is served."""
    alone = floor_plan(shop, goals[:1], rounds=0)
    both = floor_plan(shop, tuple(goals), rounds=0)
    assert has_of(shop, both.schedule, goals[0]) <= has_of(shop, alone.schedule, goals[0])


@pytest.mark.parametrize("long_from", [0, 10**6])
def test_rounds_end_at_the_bound_whatever_time_is_left(
    monkeypatch: pytest.MonkeyPatch, long_from: int
) -> None:
    """By size rounds would go on without end; this shift meets its bound in one, so no clock decides."""
    monkeypatch.setattr(plan, "LONG_FROM", long_from)
    shop = shift("S", 3)
    bound = lower_bounds(shop)[0].value_s
    told: list[Progress] = []
    outcomes = [
        floor_plan(shop, (MAKESPAN,), Effort(bound_s=bound, time_limit_s=1e9, report=told.append))
        for _ in range(2)
    ]
    assert [(each.stopped, each.repeatable) for each in outcomes] == [("done", True)] * 2
    one, other = (each.schedule for each in outcomes)
    assert one is not None
    assert other is not None
    assert one.makespan_s == bound
    assert np.array_equal(one.start_s, other.start_s)
    assert all(each.bound_s == bound for each in told)
