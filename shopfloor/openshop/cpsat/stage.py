"""One goal at a time on the whole shop: the model of intervals, begun at the best schedule so far."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

from ortools.sat.python import cp_model

from shopfloor.model.shop import Shop
from shopfloor.openshop.cpsat.constraints import add_rules
from shopfloor.openshop.cpsat.extract import starts_of
from shopfloor.openshop.cpsat.objective import GOAL_BUILDERS, Goal
from shopfloor.openshop.cpsat.solve import ROOM_S, Answer, Found, Switchboard, threads, watch
from shopfloor.openshop.cpsat.variables import Model, declare
from shopfloor.openshop.incumbent import MAKESPAN, Incumbent
from shopfloor.openshop.left_shift import left_shift
from shopfloor.openshop.method import Effort, Progress

BRIEF_WORK = 0.3  # the solver's own units, about two seconds each
LEAN_FROM = 400  # operations from which presolve is kept short: the first solution comes first


@dataclass(frozen=True, slots=True)
class StageResult:
    """What a stage proved: a lower bound of its goal (in the goal's own measure), and how it ended."""

    bound: int
    ended: bool
    repeatable: bool


def improve(
    shop: Shop,
    incumbent: Incumbent,
    goal: str,
    kept: Sequence[str],
    least: int,
    effort: Effort,
    words: Callable[[], str],
    *,
    bound_s: int,
    until: float | None = None,
    brief: bool = False,
) -> StageResult:
    """Lower `goal` without giving up anything of the goals in `kept`.

    Parameters
    ----------
    incumbent
        Holds a schedule already; receives every better one.
    least
        A lower bound of the goal, put into the model: the solver's own is often weaker.
    words
        Names the stage for whoever watches.
    bound_s
        The best lower bound of the makespan, for whoever watches.
    until
        A moment of ``time.monotonic()`` at which to stop.
    brief
        Search a short while in one thread, which repeats; else to the end in all of them.

    Returns
    -------
    StageResult
        The bound holds among all schedules that are as good in `kept`.
    """
    workers = 1 if brief else threads(effort.workers)
    board, solver = Switchboard(), cp_model.CpSolver()
    _set(solver, effort, workers, BRIEF_WORK if brief else None, len(shop))
    found: list[tuple[Goal, Found]] = []
    ended = watch(
        [partial(_search, shop, incumbent, goal, kept, least, board, solver, found)],
        board,
        effort,
        lambda: Progress(words(), incumbent.makespan_s, bound_s, effort.left_s),
        until=until,
    )
    aim, result = found[0]
    known = aim.exact and result.answer in (Answer.PROVED, Answer.FOUND)
    bound = max(least, aim.worth(result.bound)) if known else least
    return StageResult(bound, ended, repeatable=ended and workers == 1)


def _search(
    shop: Shop,
    incumbent: Incumbent,
    goal: str,
    kept: Sequence[str],
    least: int,
    board: Switchboard,
    solver: cp_model.CpSolver,
    found: list[tuple[Goal, Found]],
) -> None:
    model, aim = _model(shop, incumbent, goal, kept, least)

    def keep(value: Callable[[cp_model.IntVar], int]) -> None:
        incumbent.offer(left_shift(shop, starts_of(model, value)))

    found.append((aim, board.solve(model.cp, solver, keep)))


def _model(
    shop: Shop, incumbent: Incumbent, goal: str, kept: Sequence[str], least: int
) -> tuple[Model, Goal]:
    limited = goal == MAKESPAN or MAKESPAN in kept
    latest_s = incumbent.value(MAKESPAN) if limited else whole_horizon_s(shop)
    model = declare(shop, latest_s)
    add_rules(model)
    for other in kept:
        if other != MAKESPAN:
            limit = GOAL_BUILDERS[other](model, 0)
            model.cp.add(limit.expression <= limit.at_most(incumbent.value(other)))
    aim = GOAL_BUILDERS[goal](model, least)
    model.cp.minimize(aim.expression)
    assert incumbent.start is not None
    model.hint(incumbent.start)
    return model, aim


def whole_horizon_s(shop: Shop) -> int:
    """Return a time by which every schedule pushed to the left has ended."""
    return int(shop.orders.release_s.max(initial=0) + shop.operations.seconds.sum())


def _set(solver: cp_model.CpSolver, effort: Effort, workers: int, work: float | None, size: int) -> None:
    chosen = solver.parameters
    chosen.num_workers = workers
    chosen.random_seed = effort.seed % 2**31
    chosen.max_time_in_seconds = max(effort.left_s, ROOM_S)
    chosen.catch_sigint_signal = False
    if work is not None:
        chosen.max_deterministic_time = work
    if size >= LEAN_FROM:
        chosen.linearization_level = 0
        chosen.cp_model_probing_level = 0
        chosen.symmetry_level = 0
