"""Large floors: a part of the plan is placed again by the exact model, the rest stays, over and over.

* A *tail* is everything that starts after some moment: for the makespan.
* A *window* is some operations that follow each other in time, with one among them that costs something:
  an operation of a late order, or one that a unit is changed over for. They are placed anew within their
  own span of time.

After each gain the whole plan is pushed to the left, which hands the time gained on. To let what follows a
window slide inside the model as well gained less at every size tried: fewer windows fit the time.
A neighbourhood searched by an exact method, in the manner of P. Shaw, CP98, LNCS 1520 (1998) 417-431.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import partial

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.shop import NO_DUE, Ints, Shop
from shopfloor.openshop.cpsat.floor.best import CHANGEOVERS, Best, Places, costly_changes, tardiness_of
from shopfloor.openshop.cpsat.floor.extract import keep
from shopfloor.openshop.cpsat.floor.objective import GOAL_BUILDERS
from shopfloor.openshop.cpsat.floor.rules import add_rules
from shopfloor.openshop.cpsat.floor.setting import set_parameters
from shopfloor.openshop.cpsat.floor.variables import Model, Part
from shopfloor.openshop.cpsat.solve import Switchboard, threads, watch
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, weights
from shopfloor.openshop.method import Effort, Progress

WINDOW_SIZES = (40, 80, 120, 160)  # smaller ones are solved in a moment but end 8 to 40 % worse
TAIL_SIZES = (80, 150, 300, 600, 1_200, 2_400)
WINDOW_WORK, TAIL_WORK = 0.2, 1.5  # the solver's own units, about two seconds each
FRUITLESS = 150  # windows without a gain, in one thread, after which the search ends


def improve_in_parts(
    shop: Shop,
    best: Best,
    goal: str,
    kept: Sequence[str],
    least: int,
    effort: Effort,
    progress: Callable[[str], Progress],
    until: float | None,
) -> bool:
    """Lower `goal` part by part, until it is `least`, nothing more is gained, or time is up.

    Parameters
    ----------
    kept
        Goals of which nothing is given up.

    Returns
    -------
    Whether that ended before any limit and in one thread, and so would be found again.
    """
    board, workers = Switchboard(), threads(effort.workers)

    def done() -> bool:
        return effort.over or best.value(goal) <= least

    def tails() -> None:
        for size in TAIL_SIZES:
            while size < 2 * len(shop) and not done():
                rows = _tail(best.places, size)
                work = TAIL_WORK * max(1.0, size / 600)
                if not _place_again(best, goal, kept, least, rows, work, workers, board, effort):
                    break

    def windows(number: int) -> None:
        rng, fruitless = np.random.default_rng([effort.seed, number]), 0
        while fruitless < FRUITLESS and not done():
            rows = _window(shop, best.places, goal, rng)
            gained = bool(len(rows)) and _place_again(
                best, goal, kept, 0, rows, WINDOW_WORK, 1, board, effort
            )
            fruitless = 0 if gained else fruitless + 1

    tasks = [tails] if goal == MAKESPAN else [partial(windows, number) for number in range(workers)]
    ended = watch(tasks, board, effort, lambda: progress(goal), until=until)
    return ended and workers == 1


def _place_again(
    best: Best,
    goal: str,
    kept: Sequence[str],
    least: int,
    rows: Ints,
    work: float,
    workers: int,
    board: Switchboard,
    effort: Effort,
) -> bool:
    """Place `rows` again beside all that stays; tell whether the plan is better now."""
    places, shop = best.places, best.shop
    part = part_of(shop, places, rows, goal)
    model = Model(shop, places, int(places.end.max()), part)
    add_rules(model)
    if TARDINESS in kept:
        limit = GOAL_BUILDERS[TARDINESS](model, 0)
        if limit.exact:
            placed = np.isin(shop.operations.job, shop.operations.job[rows])
            model.cp.add(limit.expression <= limit.at_most(tardiness_of(shop, places, placed)))
    model.cp.minimize(GOAL_BUILDERS[goal](model, least).expression)
    solver = cp_model.CpSolver()
    set_parameters(solver, effort, workers, work, lean=True)
    before = best.values
    board.solve(model.cp, solver, partial(keep, model, best))
    return best.values < before


def part_of(shop: Shop, places: Places, rows: Ints, goal: str = "") -> Part:
    """Return `rows` as what is placed again, and all that might be in their way.

    That is whatever runs in their time, the rest of their orders, and their neighbours on every unit, as
    no way round is shorter. For the makespan they may take until the plan's end.
    """
    job, machine = shop.operations.job, shop.operations.machine
    begin = int(places.start[rows].min())
    end = int((places.end if goal == MAKESPAN else places.end[rows]).max())
    near = (places.start < end) & (places.end > begin)
    near |= np.isin(job, job[rows])
    order = np.lexsort((places.start, places.unit, machine))
    line = machine[order] * (int(places.unit.max()) + 1) + places.unit[order]
    first = np.r_[True, line[1:] != line[:-1]]
    early, late = places.end[order] <= begin, places.start[order] >= end
    near[order] |= early & np.r_[~early[1:] | first[1:], True]  # the last before
    near[order] |= late & (first | np.r_[False, ~late[:-1]])  # the first after
    near[rows] = False
    return Part(frozenset(rows.tolist()), frozenset(np.flatnonzero(near).tolist()), begin, end)


def _tail(places: Places, size: int) -> Ints:
    return np.lexsort((np.arange(len(places.start)), places.start))[-size:]


def _window(shop: Shop, places: Places, goal: str, rng: np.random.Generator) -> Ints:
    """Return operations that follow each other in time around a costly one; empty if none is."""
    costly = costly_changes(shop, places) if goal == CHANGEOVERS else _of_a_late_order(shop, places, rng)
    if not len(costly):
        return costly
    by_start = np.lexsort((np.arange(len(places.start)), places.start))
    place = np.empty(len(by_start), np.int64)
    place[by_start] = np.arange(len(by_start))
    size = int(rng.choice(WINDOW_SIZES))
    chosen = int(place[rng.choice(costly)])
    first = max(0, min(chosen - int(rng.integers(size)), len(by_start) - size))
    rows: Ints = np.sort(by_start[first : first + size])
    return rows


def _of_a_late_order(shop: Shop, places: Places, rng: np.random.Generator) -> Ints:
    """Return the operations of one late order, drawn by what its lateness costs."""
    job, due = shop.operations.job, shop.orders.due_s
    done = np.zeros(len(shop.orders), np.int64)
    np.maximum.at(done, job, places.end)
    late = np.flatnonzero((due != NO_DUE) & (done > due))
    if not len(late):
        return late
    cost = np.array(weights(shop), np.float64)[late] * (done[late] - due[late])
    return np.flatnonzero(job == int(rng.choice(late, p=cost / cost.sum())))
