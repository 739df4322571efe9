"""The exact model of floors: legal, never worse than its start, and as good as trying everything."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.feasible import FOR_GOOD_S
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Closure, Machine, Operations, Orders, Shop
from shopfloor.model.stated import state
from shopfloor.openshop.cpsat.floor import solve, windows
from shopfloor.openshop.cpsat.floor.best import MEASURES, Places
from shopfloor.openshop.cpsat.floor.solve import improve_floor, whole_horizon_s
from shopfloor.openshop.floor.rules import Rules
from shopfloor.openshop.floor.timetable import Timetable
from shopfloor.openshop.method import Effort
from shopfloor.openshop.units import assign_units
from shopfloor.read.orders import load
from tests.floor_oracle import least_makespan, least_tardiness, plays
from tests.floor_shops import floors


def one_after_the_other(shop: Shop, gap_s: int = 0) -> Schedule:
    """A legal plan that wastes time: each operation begins when the one before has ended, and a gap later."""
    rules, moment = Rules.of(shop), 0
    table = Timetable(rules)
    for operation in sorted(range(len(shop)), key=lambda k: (rules.step[k], k)):
        spot = table.earliest(operation, moment + gap_s)
        assert spot is not None
        table.place(operation, spot)
        moment = spot.end
    spots = [spot for spot in table.spots if spot is not None]
    start, end = np.array([s.start for s in spots]), np.array([s.end for s in spots])
    unit = np.array([spot.unit + 1 for spot in spots])
    return Schedule(
        np.arange(len(shop)), start, end, unit=np.where(unit, unit, assign_units(shop, start, end))
    )


def check(shop: Shop, schedule: Schedule | None) -> Places:
    """The audit is content, and so is the oracle, which shares nothing with it."""
    assert schedule is not None
    assert audit(shop, state(Plan(shop, schedule, lower_bounds(shop), Choice("", "", {})))) == []
    places = Places.of(schedule)
    assert plays(shop, places.start.tolist(), places.unit.tolist()) == places.end.tolist()
    return places


def measures(shop: Shop, schedule: Schedule, goals: tuple[str, ...]) -> list[int]:
    return [MEASURES[goal](shop, Places.of(schedule)) for goal in goals]


@given(floors(max_operations=5), st.integers(0, 2))
@settings(max_examples=150, deadline=None)
def test_the_least_makespan_is_reached_and_proved(shop: Shop, gap: int) -> None:
    outcome = improve_floor(shop, one_after_the_other(shop, gap), ("makespan",), 0, Effort(workers=1))
    places = check(shop, outcome.schedule)
    assert (outcome.stopped, outcome.repeatable) == ("done", True)
    assert outcome.proven_s == places.end.max() == least_makespan(shop)


@given(floors(max_operations=5), st.integers(0, 2))
@settings(max_examples=100, deadline=None)
def test_the_least_tardiness_is_reached(shop: Shop, gap: int) -> None:
    start = one_after_the_other(shop, gap)
    outcome = improve_floor(shop, start, ("tardiness",), 0, Effort(workers=1))
    check(shop, outcome.schedule)
    assert outcome.schedule is not None
    assert measures(shop, outcome.schedule, ("tardiness",)) == [least_tardiness(shop)]


GOALS = ("makespan", "tardiness", "changeovers")


@given(floors(max_operations=6), st.permutations(GOALS), st.integers(1, 3))
@settings(max_examples=100, deadline=None)
def test_no_goal_spoils_the_ones_before(shop: Shop, goals: list[str], count: int) -> None:
    chosen = tuple(goals[:count])
    start = one_after_the_other(shop)
    outcome = improve_floor(shop, start, chosen, 0, Effort(workers=1))
    check(shop, outcome.schedule)
    assert outcome.schedule is not None
    assert measures(shop, outcome.schedule, chosen) <= measures(shop, start, chosen)
    shorter = improve_floor(shop, start, chosen[:1], 0, Effort(workers=1)).schedule
    assert shorter is not None
    assert measures(shop, shorter, chosen[:1]) == measures(shop, outcome.schedule, chosen[:1])


@given(floors(max_operations=6), st.permutations(GOALS), st.integers(1, 3))
@settings(max_examples=60, deadline=None)
def test_parts_placed_again_fit_what_stays(shop: Shop, goals: list[str], count: int) -> None:
    chosen = tuple(goals[:count])
    start = one_after_the_other(shop)
    with pytest.MonkeyPatch.context() as patch:
        for name, value in (("MODEL_MOST", 0), ("BRIEF_MOST", 0)):
            patch.setattr(solve, name, value)
        for name, sizes in (("WINDOW_SIZES", (1, 2, 3)), ("TAIL_SIZES", (1, 2, 4, 8)), ("FRUITLESS", 6)):
            patch.setattr(windows, name, sizes)
        outcome = improve_floor(shop, start, chosen, 0, Effort(workers=1))
    check(shop, outcome.schedule)
    assert outcome.schedule is not None
    assert measures(shop, outcome.schedule, chosen) <= measures(shop, start, chosen)


@given(floors(max_operations=5))
@settings(max_examples=60, deadline=None)
def test_some_best_plan_has_ended_by_the_horizon(shop: Shop) -> None:
    """And no machine that shuts for good after that is waited for."""
    least = least_makespan(shop)
    assert least is not None
    horizon = whole_horizon_s(shop)
    assert least <= horizon
    shut = Closure(horizon, horizon + FOR_GOOD_S, "sold")
    closing = replace(shop, machines=tuple(replace(m, closed=(*m.closed, shut)) for m in shop.machines))
    assert whole_horizon_s(closing) <= 2 * horizon


def test_a_machine_that_shuts_for_good_makes_no_long_horizon() -> None:
    """Open until 0:01 only, its closure told in two pieces; the order on the other machine comes at 0:02."""
    shut = (Closure(60, 600, "stocktaking"), Closure(600, 60 + FOR_GOOD_S, "not open"))
    shop = Shop(
        (Machine("M", closed=shut), Machine("N")),
        Orders(("A", "B"), release_s=[0, 120], due_s=[30, 125]),
        Operations([0, 1], [0, 1], [50, 7]),
    )
    assert whole_horizon_s(shop) == 120 + 50 + 7
    outcome = improve_floor(shop, one_after_the_other(shop, 3), ("tardiness",), 0, Effort(workers=1))
    assert check(shop, outcome.schedule).end.tolist() == [50, 127]
    assert outcome.stopped == "done"


def test_a_stop_is_obeyed_and_the_best_plan_handed_back() -> None:
    shop = Shop((Machine("M"),), Orders(("A", "B")), Operations([0, 1], [0, 0], [5, 7]))
    effort = Effort(workers=1)
    effort.stop.set()
    outcome = improve_floor(shop, one_after_the_other(shop, 3), ("makespan",), 0, effort)
    assert outcome.stopped == "interrupted"
    check(shop, outcome.schedule)


def test_the_mixed_shift_ends_as_early_as_its_test_rig_allows() -> None:
    """Every rule at once, 139 operations: proved least in all three goals, by one thread, repeatably."""
    folder = Path(__file__).parents[2] / "data" / "mixed"
    shop = load(folder / "orders.csv", shop=folder / "shop.toml").shop
    start = one_after_the_other(shop)
    outcome = improve_floor(shop, start, GOALS, 0, Effort(workers=1, time_limit_s=120))
    assert outcome.schedule is not None
    assert audit(shop, state(Plan(shop, outcome.schedule, lower_bounds(shop), Choice("", "", {})))) == []
    assert (outcome.stopped, shop.clock.say(outcome.proven_s)) == ("done", "12:50")
    assert outcome.proven_s == outcome.schedule.makespan_s == lower_bounds(shop)[0].value_s
    assert outcome.remarks == (
        "Nothing is late.",
        "Changeovers take 25 min in all; no plan as good in what comes first has less.",
    )
