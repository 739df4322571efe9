"""Searches with the exact model: provers and finders, stages, windows; stopped, reported, failing."""

from __future__ import annotations

import threading
import time

import numpy as np
import pytest
from hypothesis import given, settings
from ortools.sat.python import cp_model

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.shop import Shop, shop_of
from shopfloor.openshop.cpsat.bracket import Bracket
from shopfloor.openshop.cpsat.solve import Answer, Switchboard, threads, watch
from shopfloor.openshop.cpsat.stage import improve
from shopfloor.openshop.cpsat.windows import serve_due_times, shorten_by_tails
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, Incumbent
from shopfloor.openshop.list_rule import makespan_runs
from shopfloor.openshop.method import Effort, Progress
from tests.bench.instances import instances
from tests.oracle import optimum
from tests.strategies import shops

PUBLISHED = {instance.name: instance for instance in instances()}


def begun(shop: Shop, *goals: str) -> Incumbent:
    """One plain list schedule, as poor as it may be."""
    incumbent = Incumbent(shop, goals or (MAKESPAN,))
    incumbent.offer(next(makespan_runs(shop, 1, 0))())
    return incumbent


def bound(shop: Shop) -> int:
    return lower_bounds(shop)[0].value_s


# ---- provers and finders ---------------------------------------------------------------------------------


@settings(max_examples=30, deadline=None)
@given(shops(releases=False, steps=False, dues=False, max_operations=7))
def test_a_bracket_closes_at_the_optimum(shop):
    incumbent = begun(shop)
    bracket = Bracket(shop, incumbent, bound(shop), Effort(time_limit_s=60))
    bracket.run()
    assert bracket.closed
    assert bracket.bound_s == incumbent.makespan_s == optimum(shop).makespan_s


@pytest.mark.parametrize("workers", [1, 2, 3, 5])
def test_any_number_of_workers_closes_j5(workers):
    """j5-per10-0: load bound 1000, optimum 1004, from Brucker et al. (1997) and proved again."""
    shop = PUBLISHED["j5-per10-0"].shop()
    incumbent = begun(shop)
    bracket = Bracket(shop, incumbent, bound(shop), Effort(time_limit_s=120, workers=workers))
    bracket.run()
    assert bracket.bound_s == incumbent.makespan_s == 1004 * 60


def test_a_bracket_begun_above_the_grid_rounds_its_bound_up():
    shop = shop_of([[60, 120], [120, 60]])
    bracket = Bracket(shop, begun(shop), 121, Effort(time_limit_s=10))
    assert bracket.bound_s == 180


# ---- stages and windows ----------------------------------------------------------------------------------


@settings(max_examples=30, deadline=None)
@given(shops(groups=True, max_operations=6))
def test_stages_end_at_brute_force(shop):
    best = optimum(shop)
    incumbent = begun(shop, MAKESPAN, TARDINESS)
    effort = Effort(time_limit_s=60)
    first = improve(shop, incumbent, MAKESPAN, (), bound(shop), effort, str, bound_s=0)
    assert (incumbent.value(MAKESPAN), first.bound) == (best.makespan_s, best.makespan_s)
    if shop.has_due:
        then = improve(shop, incumbent, TARDINESS, (MAKESPAN,), 0, effort, str, bound_s=0)
        assert incumbent.value(MAKESPAN) == best.makespan_s
        assert incumbent.value(TARDINESS) == then.bound == best.tardiness_at_makespan


def test_a_brief_search_of_a_hard_shop_ends_by_itself_and_repeats():
    made = []
    for _ in range(2):
        shop = PUBLISHED["j6-per0-0"].shop()
        incumbent = begun(shop)
        result = improve(
            shop, incumbent, MAKESPAN, (), bound(shop), Effort(time_limit_s=300), str, bound_s=0, brief=True
        )
        assert (result.ended, result.repeatable) == (True, True)
        made.append((incumbent.start.tolist(), result.bound))
    assert made[0] == made[1]


def late_shop() -> Shop:
    """Twenty orders on five machines, each due by about its own length: most must be late."""
    rng = np.random.default_rng(1)
    shop = shop_of(rng.integers(60, 600, (20, 5)))
    orders = type(shop.orders)(shop.orders.ids, due_s=rng.integers(1500, 4500, 20))
    return Shop(shop.machines, orders, shop.operations)


def test_windows_lower_lateness_and_keep_the_makespan():
    shop = late_shop()
    incumbent = begun(shop, MAKESPAN, TARDINESS)
    before = (incumbent.value(MAKESPAN), incumbent.value(TARDINESS))
    stop = threading.Event()

    def report(progress: Progress) -> None:
        if incumbent.value(TARDINESS) < before[1]:
            stop.set()

    effort = Effort(time_limit_s=120, workers=1, report=report, stop=stop)
    serve_due_times(shop, incumbent, before[0], bound(shop), effort, str)
    assert incumbent.value(MAKESPAN) <= before[0]
    assert incumbent.value(TARDINESS) < before[1]


def test_tails_shorten_a_square():
    """Ten by ten, uniform on 1 to 99: the first list is above the load bound, the tail brings it down."""
    shop = shop_of(np.random.default_rng(4).integers(1, 100, (10, 10)))
    incumbent = begun(shop)
    before = incumbent.value(MAKESPAN)
    assert before > bound(shop)
    shorten_by_tails(shop, incumbent, bound(shop), Effort(time_limit_s=30), str)
    assert incumbent.value(MAKESPAN) < before


# ---- running the solver --------------------------------------------------------------------------------


def test_a_task_that_fails_fails_the_search_with_its_own_error():
    def bad() -> None:
        raise ZeroDivisionError("on purpose")

    def waits() -> None:
        while board.solve(tiny_model(), cp_model.CpSolver(), print).answer is not Answer.UNKNOWN:
            time.sleep(0.001)

    board = Switchboard()
    with pytest.raises(ZeroDivisionError, match="on purpose"):
        watch([waits, bad], board, Effort(time_limit_s=60), lambda: Progress("", None, 0, 0.0))


def tiny_model() -> cp_model.CpModel:
    model = cp_model.CpModel()
    model.new_bool_var("")
    return model


def test_a_board_that_is_off_solves_nothing_more():
    board = Switchboard()
    assert board.solve(tiny_model(), cp_model.CpSolver(), lambda value: None).answer is Answer.PROVED
    board.off()
    assert board.solve(tiny_model(), cp_model.CpSolver(), lambda value: None).answer is Answer.UNKNOWN


def test_a_pointless_question_is_not_asked():
    found = Switchboard().solve(tiny_model(), cp_model.CpSolver(), lambda value: None, lambda: True)
    assert found.answer is Answer.UNKNOWN


def test_a_stop_from_another_thread_ends_a_solver_at_work():
    stop = threading.Event()
    shop = PUBLISHED["j7-per0-0"].shop()
    incumbent = begun(shop)
    threading.Timer(0.5, stop.set).start()
    effort = Effort(time_limit_s=600, stop=stop)
    bracket = Bracket(shop, incumbent, bound(shop), effort)
    bracket.run()
    assert effort.left_s > 300
    assert not bracket.repeatable
    assert not bracket.closed


def test_a_moment_to_stop_at_leaves_the_rest_of_the_time():
    """The next goal gets what is left: provers, finders and windows end at the moment they were given."""
    effort = Effort(time_limit_s=600)
    shop = PUBLISHED["j7-per0-0"].shop()
    bracket = Bracket(shop, begun(shop), bound(shop), effort)
    bracket.run(until=time.monotonic() + 0.5)
    late = begun(late_shop(), MAKESPAN, TARDINESS)
    latest_s = late.value(MAKESPAN)
    assert not serve_due_times(late.shop, late, latest_s, 0, effort, str, until=time.monotonic() + 0.5)
    assert effort.left_s > 300
    assert (bracket.repeatable, bracket.closed) == (False, False)


def test_workers_are_as_many_as_asked_or_one_a_core():
    assert threads(3) == 3
    assert threads(0) >= 1
