"""The general method: proved optima of published shops, brute force on tiny ones, limits and stops."""

from __future__ import annotations

import threading
import time

import numpy as np
import pytest
from hypothesis import given, settings

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Outcome, Plan
from shopfloor.model.shop import Machine, Operations, Orders, Shop, shop_of
from shopfloor.model.stated import state
from shopfloor.openshop.general import AGAIN_S, General
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, tardiness_of
from shopfloor.openshop.method import Effort, Progress
from tests.bench.instances import Instance, instances, orders_csv
from tests.oracle import optimum
from tests.strategies import shops

PUBLISHED = {instance.name: instance for instance in instances()}
SMALL = ("tai4", "tai5", "gp03", "gp04", "gp05", "gp06", "j3", "j4")


def solved(shop: Shop, method: General | None = None, **how: object) -> Outcome:
    """Solve with the best combinatorial bound, and audit."""
    bounds = lower_bounds(shop)
    effort = Effort(bound_s=bounds[0].value_s if bounds else 0, **how)
    outcome = (method or General()).solve(shop, effort)
    assert outcome.schedule is not None
    assert audit(shop, state(Plan(shop, outcome.schedule, bounds, Choice("", "", {})))) == []
    return outcome


def starts_of(shop: Shop, outcome: Outcome) -> np.ndarray:
    start = np.empty(len(shop), np.int64)
    start[outcome.schedule.operation] = outcome.schedule.start_s
    return start


# ---- published instances -----------------------------------------------------------------------------


@pytest.mark.parametrize("name", [name for name, each in PUBLISHED.items() if each.group in SMALL])
def test_small_published_shops_are_solved_and_proved(name):
    """Optima as in ``data/benchmarks/optima.csv``: Taillard (1993), Guéret and Prins (1999), Brucker et al.

    (1997), each proved again with CP-SAT; the file names the source of each value.
    """
    instance = PUBLISHED[name]
    assert instance.proved
    shop = instance.shop()
    outcome = solved(shop, time_limit_s=60)
    assert outcome.schedule.makespan_s == instance.best_known * 60
    assert max(outcome.proven_s, instance.load_bound * 60) == instance.best_known * 60
    assert (outcome.stopped, outcome.repeatable) == ("done", True)


def test_the_published_numbers_have_the_marks_of_their_sources():
    """Guéret and Prins: all sums are 1000. Brucker et al.: the largest sum is 1000, the least 1000 - 10p.

    Taillard: the lower bounds that he printed are the load bounds.
    """
    assert len(PUBLISHED) == 104
    for instance in PUBLISHED.values():
        times = np.array(instance.times)
        sums = np.r_[times.sum(0), times.sum(1)]
        assert sums.max() == instance.load_bound
        if instance.set == "gueret-prins":
            assert set(sums.tolist()) == {1000}
        if instance.set == "brucker":
            assert sums.max() == 1000
            assert sums.min() >= 1000 - 10 * int(instance.name.split("per")[1].split("-")[0])


def test_an_instance_as_an_orders_file_leaves_out_what_takes_no_time():
    times = ((3, 0), (2, 5))
    assert orders_csv(Instance("none", "two", times, 5, 7, proved=True)) == (
        "order,machine,minutes\nJ1,M1,3\nJ2,M1,2\nJ2,M2,5\n"
    )


# ---- brute force ---------------------------------------------------------------------------------------


@settings(max_examples=60, deadline=None)
@given(shops(groups=True, max_operations=7, max_orders=4))
def test_makespan_then_lateness_as_brute_force_finds_them(shop):
    best = optimum(shop)
    outcome = solved(shop, time_limit_s=30)
    assert outcome.schedule.makespan_s == best.makespan_s
    assert outcome.proven_s <= best.makespan_s
    assert tardiness_of(shop, starts_of(shop, outcome)) == best.tardiness_at_makespan
    assert (outcome.stopped, outcome.repeatable) == ("done", True)


@settings(max_examples=40, deadline=None)
@given(shops(groups=True, max_operations=7, max_orders=4))
def test_lateness_first_as_brute_force_finds_it(shop):
    outcome = solved(shop, General(goals=(TARDINESS, MAKESPAN)), time_limit_s=30)
    late = tardiness_of(shop, starts_of(shop, outcome))
    assert late == optimum(shop).tardiness
    assert outcome.proven_s <= optimum(shop).makespan_s


# ---- what is said ------------------------------------------------------------------------------------


def late_shop() -> Shop:
    """One machine, 10 and 20 minutes, both due at 10 minutes: the short one first, the other 20 late."""
    return Shop(
        (Machine("M"),),
        Orders(("A", "B"), due_s=np.array([600, 600]), priority=np.array([1.0, 1.0])),
        Operations([0, 1], [0, 0], [600, 1200]),
    )


def test_lateness_is_told_with_its_proof():
    assert solved(late_shop()).remarks == (
        "Weighted lateness is 20 min (priority × time late, summed); no plan of this makespan has less.",
    )


def test_no_lateness_is_told_in_three_words():
    shop = Shop((Machine("M"),), Orders(("A",), due_s=np.array([600])), Operations([0], [0], [600]))
    assert solved(shop).remarks == ("Nothing is late.",)


def test_a_priority_with_too_many_decimals_is_told():
    shop = late_shop()
    orders = Orders(shop.orders.ids, due_s=shop.orders.due_s, priority=np.array([1.0, 0.12345]))
    assert (
        "Priorities were taken to three decimals."
        in solved(Shop(shop.machines, orders, shop.operations)).remarks
    )


@pytest.mark.parametrize(("goals", "late_min"), [((MAKESPAN,), 30), ((TARDINESS,), 20), ((), 30)])
def test_goals_may_be_left_out(goals, late_min):
    """Without due times there is still a shortest plan; without asking for it lateness is only told."""
    shop = shop_of([[60, 120], [120, 60]])
    assert solved(shop, General(goals=goals)).schedule.makespan_s == 180
    late = solved(late_shop(), General(goals=goals), time_limit_s=30)
    assert late.schedule.makespan_s == 1800
    assert late.remarks[0].startswith(f"Weighted lateness is {late_min} min")


def test_lateness_that_may_be_more_than_need_be_is_told_as_open():
    """Forty orders on one machine: in a second the search cannot prove how late they must be."""
    rng = np.random.default_rng(0)
    shop = Shop(
        (Machine("M"),),
        Orders(tuple(f"J{k}" for k in range(40)), due_s=rng.integers(3600, 9000, 40)),
        Operations(range(40), [0] * 40, rng.integers(60, 600, 40)),
    )
    (remark,) = solved(shop, time_limit_s=1.0).remarks
    assert remark.endswith("; whether a plan of this makespan could have less is not known.")


def test_nothing_to_do_is_done():
    outcome = General().solve(Shop((), Orders(()), Operations([], [], [])), Effort())
    assert len(outcome.schedule) == 0


def test_what_it_does_not_know_it_refuses():
    shop = late_shop().with_crew(1)
    assert General().accepts(shop) == "a crew limits how much runs at once"
    assert General().accepts(late_shop()) is None


# ---- limits and stops --------------------------------------------------------------------------------


def hard_shop() -> Shop:
    """Far too hard to settle in the time given below: j7-per0-0, open until 2009."""
    return PUBLISHED["j7-per0-0"].shop()


def test_a_time_limit_keeps_the_best():
    outcome = solved(hard_shop(), time_limit_s=2.0)
    assert (outcome.stopped, outcome.repeatable) == ("time limit", False)
    assert outcome.schedule.makespan_s >= 1048 * 60 >= outcome.proven_s


def test_no_time_at_all_still_gives_a_list_schedule():
    outcome = solved(hard_shop(), time_limit_s=0.0)
    assert (outcome.stopped, outcome.repeatable) == ("time limit", False)


def test_a_stop_ends_the_search_and_keeps_the_best():
    stop = threading.Event()
    seen: list[Progress] = []

    def report(progress: Progress) -> None:
        seen.append(progress)
        if progress.stage != "lists":
            stop.set()

    began = time.monotonic()
    outcome = solved(hard_shop(), time_limit_s=600.0, report=report, stop=stop)
    assert (outcome.stopped, outcome.repeatable) == ("interrupted", False)
    assert time.monotonic() - began < 300  # it ends because it was asked to, not by its limit
    assert {progress.best_s for progress in seen} >= {seen[-1].best_s}
    assert outcome.schedule.makespan_s <= seen[-1].best_s


def test_time_that_a_later_goal_leaves_goes_back_to_the_first():
    """j7-per0-0 with due times that are always kept: the search for the makespan has all the time."""
    shop = hard_shop()
    due = Shop(shop.machines, Orders(shop.orders.ids, due_s=np.full(7, 10**6)), shop.operations)
    seen: list[Progress] = []
    outcome = solved(due, time_limit_s=8.0, report=seen.append)
    assert outcome.stopped == "time limit"
    assert outcome.remarks == ("Nothing is late.",)
    assert min(progress.left_s for progress in seen if progress.stage != "lists") < AGAIN_S


def test_progress_is_told_while_it_searches():
    seen: list[Progress] = []
    outcome = solved(hard_shop(), time_limit_s=3.0, report=seen.append)
    assert seen[0].stage == "lists"
    assert len(seen) >= 4
    assert all(progress.best_s >= progress.bound_s >= 1000 * 60 for progress in seen)
    assert [p.best_s for p in seen] == sorted((p.best_s for p in seen), reverse=True)
    assert outcome.schedule.makespan_s <= seen[-1].best_s


@pytest.mark.parametrize("name", ["j6-per10-0", "gp07-01"])
def test_one_worker_repeats(name):
    made = [solved(PUBLISHED[name].shop(), time_limit_s=120, workers=1, seed=5) for _ in range(2)]
    assert all(outcome.repeatable for outcome in made)
    assert made[0].schedule.start_s.tolist() == made[1].schedule.start_s.tolist()
    assert made[0].schedule.operation.tolist() == made[1].schedule.operation.tolist()


def test_a_search_that_proves_its_own_bound_hands_it_on():
    """gp03-01: the load bound is 1000, the optimum 1168 (Guéret and Prins 1999)."""
    outcome = solved(PUBLISHED["gp03-01"].shop())
    assert outcome.proven_s == 1168 * 60


def test_meeting_the_bound_leaves_the_solver_unused(monkeypatch):
    import sys

    monkeypatch.setitem(sys.modules, "ortools", None)
    monkeypatch.setitem(sys.modules, "ortools.sat.python", None)
    outcome = solved(shop_of(np.random.default_rng(0).integers(1, 100, (50, 10))))
    assert outcome.repeatable
