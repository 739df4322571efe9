"""List rules and plans of floors: legal, never below the optimum, repeatable, and no family starves."""

from __future__ import annotations

import threading
from random import Random

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_DUE, Changeovers, Crew, Machine, Operations, Orders, Shop
from shopfloor.model.stated import state
from shopfloor.openshop.floor.goals import FLOOR_GOALS, MAKESPAN, TARDINESS, Kept
from shopfloor.openshop.floor.list_rule import Rule, floor_schedules, grid
from shopfloor.openshop.floor.plan import first_schedule, floor_plan, schedule_of
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.sequence import Pass
from shopfloor.openshop.method import Effort
from shopfloor.openshop.units import assign_units
from tests.bench.shifts import shift
from tests.floor_oracle import Hall, Visit, least_makespan, least_tardiness, plays
from tests.floor_shops import floors


def clean(shop: Shop, schedule: Schedule | None) -> bool:
    """Whether there is a schedule and the audit finds nothing wrong with it and the bounds."""
    assert schedule is not None
    return audit(shop, state(Plan(shop, schedule, lower_bounds(shop), Choice("", "", {})))) == []


@given(floors())
@settings(max_examples=100, deadline=None)
def test_every_rule_makes_a_legal_schedule_never_below_the_optimum(shop: Shop) -> None:
    rules = Rules.of(shop)
    makespan, tardiness = least_makespan(shop), least_tardiness(shop)
    assert makespan is not None
    assert tardiness is not None
    tried = [*grid(rules, MAKESPAN), *grid(rules, TARDINESS), *grid(rules, TARDINESS, in_time=True)]
    seen = set()
    for rule in tried:
        times = rule.times(rules, makespan)
        assert times is not None
        if tuple(times.start) not in seen:
            seen.add(tuple(times.start))
            dealt = assign_units(shop, np.array(times.start), np.array(times.end)).tolist()
            unit = [dealt[k] if each == NONE else each + 1 for k, each in enumerate(times.unit)]
            assert plays(shop, times.start, unit) == times.end
            assert max(times.end) >= makespan
            visits = [Visit(k, 1, 0, end, ()) for k, end in enumerate(times.end)]
            assert Hall(shop).tardiness(visits) >= tardiness


@given(floors(parallel=False), st.permutations(FLOOR_GOALS), st.integers(1, 3))
@settings(max_examples=60, deadline=None)
def test_a_plan_is_legal_repeats_and_gives_up_nothing(shop: Shop, goals: list[str], count: int) -> None:
    first, then = (
        floor_plan(shop, tuple(goals[:count]), Effort(seed=3), rounds=1) for _ in range(2)
    )  # fmt: skip
    assert first.schedule is not None
    assert then.schedule is not None
    assert (first.stopped, first.repeatable) == ("done", True)
    for column in ("operation", "start_s", "end_s", "unit"):
        assert np.array_equal(getattr(first.schedule, column), getattr(then.schedule, column))
    assert clean(shop, first.schedule)
    least = least_makespan(shop)
    assert least is not None
    assert first.schedule.makespan_s >= least
    if goals[0] == MAKESPAN:
        alone = floor_plan(shop, (MAKESPAN,), Effort(seed=3), rounds=1)
        assert alone.schedule is not None
        assert first.schedule.makespan_s <= alone.schedule.makespan_s


@given(floors(parallel=False, scarce=True))
@settings(max_examples=60, deadline=None)
def test_a_crew_that_is_too_small_leaves_no_plan(shop: Shop) -> None:
    outcome = floor_plan(shop, (MAKESPAN,), Effort(), rounds=0)
    if least_makespan(shop) is None:
        assert outcome.schedule is None
        assert outcome.remarks == (
            "No plan was found: some operation needs more heads than its crew has left for long enough.",
        )
    elif outcome.schedule is not None:
        assert clean(shop, outcome.schedule)


def test_heads_that_come_once_are_kept_for_the_operation_that_needs_them() -> None:
    """Three heads are there in the first minute only; the longest order would take one of them."""
    shop = Shop(
        (Machine("A", crew="Blue"), Machine("B", crew="Blue")),
        Orders(("long", "scarce")),
        Operations([0, 1], [0, 1], [600, 60], heads=[1, 3]),
        crews=(Crew("Blue", 1, ((0, 60, 3),)),),
    )
    outcome = floor_plan(shop, (MAKESPAN,))
    assert outcome.schedule is not None
    assert outcome.schedule.makespan_s == 660


def starving() -> Shop:
    """Twelve red orders without a due time, two black ones due soon, and one machine set up for red."""
    return Shop(
        (Machine("COAT", family="red"),),
        Orders(
            tuple(f"TQ-{k}" for k in range(14)),
            due_s=[NO_DUE] * 12 + [3600] * 2,
            priority=[1.0] * 12 + [5.0] * 2,
        ),
        Operations(range(14), [0] * 14, [600] * 14, family=[0] * 12 + [1] * 2),
        families=("red", "black"),
        changeovers={"COAT": Changeovers(900)},
    )  # fmt: skip


def test_a_family_that_needs_a_change_does_not_starve() -> None:
    shop = starving()
    rules = Rules.of(shop)
    late = {
        patience: sorted(Rule(1, (patience,), (0.0,) * 14, pull=0.001).times(rules, 0).start[12:])
        for patience in (1e-9, 3.0)
    }
    assert late[1e-9] == [12 * 600 + 900, 13 * 600 + 900]  # who never waits changes when nothing red is left
    assert late[3.0] == [900, 1500]
    plan = floor_plan(shop, (TARDINESS,))
    assert plan.schedule is not None
    assert not (plan.schedule.completion_s(shop.operations.job, 14) > shop.orders.due_s).any()


def test_a_group_serves_two_families_at_once() -> None:
    shop = Shop(
        (Machine("COAT", count=2, family="red"),),
        Orders(tuple(f"TQ-{k}" for k in range(8))),
        Operations(range(8), [0] * 8, [600] * 8, family=[0, 1] * 4),
        families=("red", "black"),
        changeovers={"COAT": Changeovers(300)},
    )
    plan = floor_plan(shop, (MAKESPAN, "changeovers"))
    assert clean(shop, plan.schedule)
    assert plan.schedule is not None
    assert plan.schedule.makespan_s == 2700


def test_the_first_schedule_is_made_even_when_time_is_up() -> None:
    stop = threading.Event()
    stop.set()
    shop = shift("S", 2)
    outcome = floor_plan(shop, (MAKESPAN, TARDINESS), Effort(stop=stop))
    assert (outcome.stopped, outcome.repeatable) == ("interrupted", False)
    assert clean(shop, outcome.schedule)
    assert clean(shop, first_schedule(shop))
    assert floor_plan(shop, (MAKESPAN,), Effort(time_limit_s=0.0)).stopped == "time limit"


def test_nothing_to_do_is_a_plan() -> None:
    outcome = floor_plan(Shop((), Orders(()), Operations([], [], [])))
    assert outcome.schedule is not None
    assert len(outcome.schedule) == 0
    assert floor_schedules(Shop((), Orders(()), Operations([], [], [])), lambda made: None)


def test_schedules_are_offered_until_the_goal_is_met_or_time_is_up() -> None:
    shop = shift("S", 3)
    bound = lower_bounds(shop)[0].value_s
    offered: list[Pass] = []
    assert floor_schedules(shop, offered.append, MAKESPAN, bound, deadline=bound)
    assert offered[-1].makespan == bound
    assert clean(shop, schedule_of(shop, offered[-1]))
    offered.clear()
    assert not floor_schedules(
        shop, offered.append, TARDINESS, deadline=bound, over=lambda: len(offered) == 2
    )
    assert len(offered) == 2
    kept = Kept().and_(MAKESPAN, bound)
    assert floor_schedules(shop, offered.append, TARDINESS, kept=kept, deadline=bound, variants=5, seed=1)


@pytest.mark.parametrize("size", ["S", "M"])
def test_whole_shifts_are_planned_legally_and_repeat(size: str) -> None:
    shop = shift(size, 4)
    plans = [floor_plan(shop, (TARDINESS, MAKESPAN), Effort(seed=7), rounds=0) for _ in range(2)]
    assert clean(shop, plans[0].schedule)
    assert np.array_equal(plans[0].schedule.start_s, plans[1].schedule.start_s)


def test_a_lifted_rule_presses_only_what_was_late() -> None:
    rules = Rules.of(starving())
    rule = next(grid(rules, TARDINESS))
    for seed in range(20):
        lifted = rule.lift(rules, Random(seed), [False] * 12 + [True] * 2)
        assert lifted.bias[:12] == rule.bias[:12]
        assert min(lifted.bias[12:]) >= 0.0
