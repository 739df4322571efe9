"""Large shops: a part of the schedule is placed again by the exact model, the rest stays, over and over.

* A *tail* is everything that starts after some moment: for the makespan.
* A *window* is some operations that follow each other in time, with an operation of a late order among
  them: for due times. What starts before stays before, what starts after stays after.

After each gain the whole schedule is pushed to the left. A neighbourhood searched by an exact method, in
the manner of P. Shaw, CP98, LNCS 1520 (1998) 417-431.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.shop import NO_DUE, Ints, Shop
from shopfloor.openshop.cpsat.constraints import add_rules
from shopfloor.openshop.cpsat.extract import starts_of
from shopfloor.openshop.cpsat.objective import makespan, tardiness
from shopfloor.openshop.cpsat.solve import ROOM_S, Answer, Switchboard, threads, watch
from shopfloor.openshop.cpsat.variables import Grid, declare
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, Incumbent, weights
from shopfloor.openshop.left_shift import left_shift, steps_in_sequence
from shopfloor.openshop.method import Effort, Progress

WINDOW_SIZES = (40, 60, 80, 110)
WINDOW_WORK, TAIL_WORK = 0.1, 1.5  # the solver's own units, about two seconds each
TAIL_SIZES = (150, 300, 600, 1_200, 2_400)
FRUITLESS = 60  # windows without a gain, in one thread, after which the search ends


def shorten_by_tails(
    shop: Shop,
    incumbent: Incumbent,
    bound_s: int,
    effort: Effort,
    words: Callable[[], str],
    *,
    until: float | None = None,
) -> bool:
    """Place growing tails of the best schedule again, until its makespan is `bound_s` or all were tried.

    Returns whether that ended before any limit.
    """
    board = Switchboard()

    def run() -> None:
        for size in TAIL_SIZES:
            while size < 2 * len(shop) and not board.is_off and incumbent.value(MAKESPAN) > bound_s:
                if not _shorten_tail(shop, incumbent, bound_s, min(size, len(shop)), board, effort):
                    break

    def progress() -> Progress:
        return Progress(words(), incumbent.makespan_s, bound_s, effort.left_s)

    return watch([run], board, effort, progress, until=until)


def _shorten_tail(
    shop: Shop, incumbent: Incumbent, bound_s: int, size: int, board: Switchboard, effort: Effort
) -> bool:
    start = incumbent.start
    assert start is not None
    rows = np.lexsort((np.arange(len(start)), start))[-size:]
    latest_s = incumbent.value(MAKESPAN) - Grid.of(shop).unit_s
    if least_end_s(shop, start, rows) > latest_s:
        return False
    model = declare(shop, latest_s, rows=rows, at_s=start)
    add_rules(model)
    model.cp.minimize(makespan(model, bound_s).expression)
    model.hint(start)
    solver = cp_model.CpSolver()
    _set(solver, effort, threads(effort.workers), TAIL_WORK * max(1.0, size / 600))

    def keep(value: Callable[[cp_model.IntVar], int]) -> None:
        incumbent.offer(left_shift(shop, starts_of(model, value, start)))

    return board.solve(model.cp, solver, keep).answer in (Answer.PROVED, Answer.FOUND)


def least_end_s(shop: Shop, start_s: Ints, rows: Ints) -> int:
    """Return a time that no schedule of `rows` after the rest of `start_s` can beat."""
    columns = shop.operations
    is_past = np.ones(len(shop), bool)
    is_past[rows] = False
    past = np.flatnonzero(is_past)
    least = 0
    counts = np.array([machine.count for machine in shop.machines])
    for column, single in (
        (columns.job, np.ones(len(shop.orders), bool)),
        (columns.machine, counts == 1),
    ):
        ready = np.zeros(len(single), np.int64)
        np.maximum.at(ready, column[past], start_s[past] + columns.seconds[past])
        np.add.at(ready, column[rows], columns.seconds[rows])
        least = max(least, int(ready[single].max(initial=0)))
    return least


def serve_due_times(
    shop: Shop,
    incumbent: Incumbent,
    latest_s: int,
    bound_s: int,
    effort: Effort,
    words: Callable[[], str],
    *,
    until: float | None = None,
) -> bool:
    """Lower weighted tardiness window by window, with no operation ending after `latest_s`.

    One window after the other in each of the effort's threads, from the best schedule of the moment,
    until none helps any more. Returns whether that ended before any limit; with one thread it then
    repeats.
    """
    board = Switchboard()

    def run(number: int) -> None:
        rng = np.random.default_rng([effort.seed, number])
        fruitless = 0
        while fruitless < FRUITLESS and not board.is_off and incumbent.value(TARDINESS):
            gained = _window(shop, incumbent, latest_s, rng, board, effort)
            fruitless = 0 if gained else fruitless + 1

    def progress() -> Progress:
        return Progress(words(), incumbent.makespan_s, bound_s, effort.left_s)

    tasks = [partial(run, number) for number in range(threads(effort.workers))]
    return watch(tasks, board, effort, progress, until=until)


def _window(
    shop: Shop,
    incumbent: Incumbent,
    latest_s: int,
    rng: np.random.Generator,
    board: Switchboard,
    effort: Effort,
) -> bool:
    start = incumbent.start
    assert start is not None
    rows = around_late_order(shop, start, rng)
    if not len(rows):
        return False
    model = declare(shop, latest_s, rows=rows, at_s=start)
    add_rules(model)
    model.cp.minimize(tardiness(model).expression)
    model.hint(start)
    solver = cp_model.CpSolver()
    _set(solver, effort, 1, WINDOW_WORK)
    better = False

    def keep(value: Callable[[cp_model.IntVar], int]) -> None:
        nonlocal better
        current = incumbent.start  # another thread may have found a better one meanwhile
        assert current is not None
        placed = starts_of(model, value, current)
        if current is start or steps_in_sequence(shop, placed):
            better = incumbent.offer(left_shift(shop, placed)) or better

    board.solve(model.cp, solver, keep)
    return better


def around_late_order(shop: Shop, start: Ints, rng: np.random.Generator) -> Ints:
    """Return some operations that follow each other in time, one of a late order among them.

    The order is drawn by what its lateness costs. Empty when nothing is late.
    """
    columns, due = shop.operations, shop.orders.due_s
    done = np.zeros(len(shop.orders), np.int64)
    np.maximum.at(done, columns.job, start + columns.seconds)
    late = np.flatnonzero((due != NO_DUE) & (done > due))
    if not len(late):
        return np.zeros(0, np.int64)
    cost = np.array(weights(shop), np.float64)[late] * (done[late] - due[late])
    job = int(rng.choice(late, p=cost / cost.sum()))
    by_start = np.lexsort((np.arange(len(start)), start))
    place = np.empty(len(start), np.int64)
    place[by_start] = np.arange(len(start))
    size = int(rng.choice(WINDOW_SIZES))
    chosen = int(place[rng.choice(np.flatnonzero(columns.job == job))])
    first = max(0, min(chosen - int(rng.integers(size)), len(start) - size))
    rows: Ints = np.sort(by_start[first : first + size])
    return rows


def _set(solver: cp_model.CpSolver, effort: Effort, workers: int, work: float) -> None:
    chosen = solver.parameters
    chosen.num_workers = workers
    chosen.random_seed = effort.seed % 2**31
    chosen.max_deterministic_time = work
    chosen.max_time_in_seconds = max(effort.left_s, ROOM_S)
    chosen.catch_sigint_signal = False
    chosen.linearization_level = 0
    chosen.cp_model_probing_level = 0
    chosen.symmetry_level = 0
