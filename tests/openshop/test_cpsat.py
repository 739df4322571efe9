"""The exact model: its rules against brute force, its goals, and what surrounds a part of a schedule."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from ortools.sat.python import cp_model

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Machine, Operations, Orders, Shop, shop_of
from shopfloor.model.stated import state
from shopfloor.openshop.cpsat.constraints import add_rules, one_at_a_time
from shopfloor.openshop.cpsat.extract import starts_of
from shopfloor.openshop.cpsat.objective import MOST_COST, makespan, tardiness
from shopfloor.openshop.cpsat.pairs import cut_starts, mirrored, order_pairs, pair_count, reversible
from shopfloor.openshop.cpsat.solve import ANSWERS, Answer
from shopfloor.openshop.cpsat.stage import whole_horizon_s
from shopfloor.openshop.cpsat.variables import Grid, Model, declare
from shopfloor.openshop.cpsat.windows import around_late_order, least_end_s
from shopfloor.openshop.dense import MostWork, ShopLists, starts
from shopfloor.openshop.incumbent import makespan_of, tardiness_of
from shopfloor.openshop.left_shift import left_shift
from shopfloor.openshop.units import assign_units
from tests.oracle import optimum
from tests.strategies import shops

SOME = settings(max_examples=60, deadline=None)


def violations(shop: Shop, start: np.ndarray) -> list[str]:
    end = start + shop.operations.seconds
    schedule = Schedule(np.arange(len(shop)), start, end, unit=assign_units(shop, start, end))
    plan = Plan(shop, schedule, lower_bounds(shop), Choice("", "", {}))
    return [violation.sentence for violation in audit(shop, state(plan))]


def run(model: Model) -> tuple[Answer, cp_model.CpSolver]:
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    return ANSWERS[solver.solve(model.cp)], solver


# ---- the whole shop ------------------------------------------------------------------------------------


@SOME
@given(shops(groups=True, max_operations=6))
def test_the_model_has_the_least_makespan_of_brute_force(shop):
    model = declare(shop, whole_horizon_s(shop))
    add_rules(model)
    aim = makespan(model, 0)
    model.cp.minimize(aim.expression)
    answer, solver = run(model)
    assert answer is Answer.PROVED
    assert aim.worth(round(solver.objective_value)) == optimum(shop).makespan_s
    assert violations(shop, left_shift(shop, starts_of(model, solver.value))) == []


@SOME
@given(shops(groups=True, max_operations=6))
def test_the_model_has_the_least_lateness_of_brute_force(shop):
    assume(shop.has_due)
    model = declare(shop, whole_horizon_s(shop))
    add_rules(model)
    aim = tardiness(model)
    model.cp.minimize(aim.expression)
    answer, solver = run(model)
    best = optimum(shop).tardiness
    assert answer is Answer.PROVED
    assert aim.worth(round(solver.objective_value)) == best
    assert tardiness_of(shop, left_shift(shop, starts_of(model, solver.value))) == best


@SOME
@given(shops(groups=True, max_operations=6), st.booleans())
def test_the_pairs_model_says_yes_from_the_least_makespan_on(shop, with_no_overlap):
    """Mirror and cut starts lose no answer: yes at the optimum, no one grid point below."""
    best = optimum(shop).makespan_s
    for latest_s, expected in ((best, Answer.PROVED), (best - Grid.of(shop).unit_s, Answer.NONE)):
        model = declare(shop, latest_s, rows=np.arange(len(shop))[::-1])
        add_rules(model, without=() if with_no_overlap else (one_at_a_time,))
        order_pairs(model, mirror=reversible(shop))
        cut_starts(model)
        answer, solver = run(model)
        assert answer is expected
        if expected is Answer.PROVED:
            assert violations(shop, left_shift(shop, starts_of(model, solver.value))) == []


@SOME
@given(shops(max_operations=8, releases=False, steps=False))
def test_a_schedule_run_backwards_is_a_schedule(shop):
    assert reversible(shop)
    start = starts(ShopLists.of(shop), MostWork())
    back = mirrored(shop, start)
    assert violations(shop, back) == []
    assert makespan_of(shop, back) == makespan_of(shop, start)


def test_releases_and_steps_tell_forwards_from_backwards():
    operations = Operations([0, 0], [0, 1], [5, 5], step=[0, 1])
    machines = (Machine("M1"), Machine("M2"))
    assert not reversible(Shop(machines, Orders(("A",)), operations))
    late = Orders(("A",), release_s=np.array([3]))
    assert not reversible(Shop(machines, late, Operations([0, 0], [0, 1], [5, 5])))


def test_pairs_are_counted_on_orders_and_machines_of_one_unit():
    """Two orders on three machines, one of them a group: 2 × 3 pairs of orders, 2 × 1 of machines."""
    shop = Shop(
        (Machine("A"), Machine("B"), Machine("C", count=2)),
        Orders(("X", "Y")),
        Operations([0, 0, 0, 1, 1, 1], [0, 1, 2, 0, 1, 2], [1, 2, 3, 4, 5, 6]),
    )
    assert pair_count(shop) == 8


# ---- grid and numbers --------------------------------------------------------------------------------


def test_the_grid_is_the_greatest_common_divisor_of_times_and_releases():
    shop = Shop(
        (Machine("M"),),
        Orders(("A", "B"), release_s=np.array([0, 90])),
        Operations([0, 1], [0, 0], [120, 300]),
    )
    grid = Grid.of(shop)
    assert (grid.unit_s, grid.down(100), grid.up(100)) == (30, 3, 4)


@SOME
@given(shops(max_operations=5, dues=True), st.integers(2, 5))
def test_due_times_between_grid_points_count_exactly(shop, scale):
    """Times and releases in multiples, due times not: lateness is still exact to the second."""
    assume(shop.has_due)
    columns, orders = shop.operations, shop.orders
    coarse = Shop(
        shop.machines,
        Orders(orders.ids, orders.release_s * scale, np.maximum(orders.due_s, orders.release_s * scale)),
        Operations(columns.job, columns.machine, columns.seconds * scale, step=columns.step),
    )
    model = declare(coarse, whole_horizon_s(coarse))
    add_rules(model)
    aim = tardiness(model)
    model.cp.minimize(aim.expression)
    answer, solver = run(model)
    assert answer is Answer.PROVED
    assert aim.worth(round(solver.objective_value)) == optimum(coarse).tardiness


def test_costs_too_large_for_the_solver_are_made_coarser_and_prove_nothing():
    huge = np.array([999_999.999, 0.001])
    shop = Shop(
        (Machine("M"),),
        Orders(("A", "B"), due_s=np.array([0, 0]), priority=huge),
        Operations([0, 1], [0, 0], [10_000_001, 20_000_003]),
    )
    model = declare(shop, whole_horizon_s(shop))
    aim = tardiness(model)
    assert aim.exact is False
    assert aim.unit > 1
    model.cp.minimize(aim.expression)
    assert run(model)[1].objective_value < MOST_COST


# ---- a part of a schedule ------------------------------------------------------------------------------


@SOME
@given(shops(groups=True, max_operations=10), st.integers(0, 9), st.integers(1, 6))
def test_a_part_placed_again_leaves_a_legal_schedule_no_longer(shop, first, size):
    start = starts(ShopLists.of(shop), MostWork())
    by_start = np.lexsort((np.arange(len(start)), start))
    rows = by_start[min(first, len(start) - 1) :][:size]
    model = declare(shop, makespan_of(shop, start), rows=rows, at_s=start)
    add_rules(model)
    model.cp.minimize(sum(model.end(row) for row in model.rows))
    answer, solver = run(model)
    assert answer is Answer.PROVED  # where they stand is one solution
    placed = left_shift(shop, starts_of(model, solver.value, start))
    assert violations(shop, placed) == []
    assert makespan_of(shop, placed) <= makespan_of(shop, start)


@SOME
@given(shops(groups=True, max_operations=6), st.integers(1, 6))
def test_no_tail_ends_before_what_its_lines_need(shop, size):
    start = starts(ShopLists.of(shop), MostWork())
    rows = np.lexsort((np.arange(len(start)), start))[-size:]
    model = declare(shop, makespan_of(shop, start), rows=rows, at_s=start)
    add_rules(model)
    aim = makespan(model, 0)
    model.cp.minimize(aim.expression)
    _, solver = run(model)
    rest = np.setdiff1d(np.arange(len(start)), rows)
    ended = int((start + shop.operations.seconds)[rest].max(initial=0))
    assert least_end_s(shop, start, rows) <= max(ended, aim.worth(round(solver.objective_value)))


def test_a_window_holds_an_operation_of_a_late_order():
    """Two orders on one machine; only the second is late, so each window has it."""
    shop = Shop(
        (Machine("M"),),
        Orders(("A", "B"), due_s=np.array([100, 5])),
        Operations([0, 1], [0, 0], [10, 10]),
    )
    for seed in range(5):
        rows = around_late_order(shop, np.array([0, 10]), np.random.default_rng(seed))
        assert 1 in rows.tolist()
    assert len(around_late_order(shop, np.array([10, 20]) - 10, np.random.default_rng(0))) > 0
    nothing_late = Shop(shop.machines, Orders(("A", "B")), shop.operations)
    assert len(around_late_order(nothing_late, np.array([0, 10]), np.random.default_rng(0))) == 0


# ---- statuses ----------------------------------------------------------------------------------------


def test_unknown_is_not_none():
    """A shop far too large for no time at all: nothing is found, and nothing is said to be impossible."""
    model = declare(shop_of(np.random.default_rng(0).integers(1, 100, (30, 30))), 2_000)
    add_rules(model)
    solver = cp_model.CpSolver()
    solver.parameters.max_time_in_seconds = 0.0
    assert ANSWERS[solver.solve(model.cp)] is Answer.UNKNOWN


def test_an_invalid_model_is_a_bug_and_no_answer():
    with pytest.raises(KeyError):
        ANSWERS[cp_model.MODEL_INVALID]
