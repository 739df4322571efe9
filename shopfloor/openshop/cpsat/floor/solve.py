"""Improving a legal plan of a floor with all its rules, one goal after the other.

A whole model, begun at the plan, up to ``MODEL_MOST`` operations: it may prove. Beyond that, parts of the
plan are placed again, over and over (``windows``).
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.calendar import duration, united
from shopfloor.model.feasible import FOR_GOOD_S
from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.openshop.cpsat.floor.best import CHANGEOVERS, Best, Places
from shopfloor.openshop.cpsat.floor.extract import keep
from shopfloor.openshop.cpsat.floor.objective import GOAL_BUILDERS
from shopfloor.openshop.cpsat.floor.rules import add_rules
from shopfloor.openshop.cpsat.floor.setting import set_parameters
from shopfloor.openshop.cpsat.floor.variables import Model
from shopfloor.openshop.cpsat.floor.windows import improve_in_parts
from shopfloor.openshop.cpsat.objective import Goal
from shopfloor.openshop.cpsat.solve import Answer, Found, Switchboard, threads, watch
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, least_tardiness
from shopfloor.openshop.method import Effort, Progress
from shopfloor.openshop.round_order import PRIORITY_UNIT

MODEL_MOST = 1_000  # operations up to which the whole shop is put into one model
BRIEF_MOST = 300  # operations up to which one thread may settle a goal in a moment, and repeatably
BRIEF_WORK = 0.5  # the solver's own units, about two seconds each
FULL = 8  # threads with which CP-SAT runs all of its strategies; on fewer cores they take turns
FEW_SHARE = 0.4  # of the time, on small floors, to a thread a core, which is quicker at first
LEAN_FROM = 400  # operations from which presolve is kept short: the first solution comes first
# For each goal: operations from which windows come before the whole model, and for what share of its time.
# For late orders the whole model finds more in the same time, up to some 400 operations.
WINDOWS_FROM = {TARDINESS: LEAN_FROM, CHANGEOVERS: 110}
WINDOWS_SHARE = {TARDINESS: 0.2, CHANGEOVERS: 0.5}
FIRST_SHARE = 0.6  # of the time left goes to a goal that another one follows
STAGES = {MAKESPAN: "shortening", TARDINESS: "late orders", CHANGEOVERS: "changeovers"}


def improve_floor(
    shop: Shop, schedule: Schedule, goals: tuple[str, ...], bound_s: int, effort: Effort
) -> Outcome:
    """Return the best plan found from a legal one, with the makespan bound proved on the way.

    Parameters
    ----------
    schedule
        A legal plan. Where it cuts operations into parts it is handed back as it is.
    goals
        What counts first, second, …: ``makespan``, ``tardiness``, ``changeovers``.
    bound_s
        A lower bound of the makespan, proved elsewhere.

    Returns
    -------
    Outcome
        Never worse than `schedule` in `goals`, compared one after the other. ``proven_s`` holds for every
        plan of the shop; it is `bound_s` or less where the solver added nothing.
    """
    if len(schedule) != len(shop):
        return Outcome(schedule, remarks=("Operations in parts were left as the list rule placed them.",))
    if not len(shop):
        return Outcome(schedule)
    return _Search(shop, Places.of(schedule), goals, bound_s, effort).run()


@dataclass(frozen=True, slots=True)
class StageResult:
    """A lower bound of a goal in its own measure, whether the search came to its end, and repeats."""

    bound: int
    ended: bool
    repeatable: bool


class _Search:
    """One run: what was found, what was proved, whether it repeats."""

    def __init__(
        self, shop: Shop, places: Places, goals: tuple[str, ...], bound_s: int, effort: Effort
    ) -> None:
        self.shop, self.goals, self.effort = shop, goals, effort
        self.best = Best(shop, places, goals)
        self.bound_s, self.proven_s = bound_s, 0
        self.least = dict.fromkeys(goals, 0) | {MAKESPAN: bound_s, TARDINESS: least_tardiness(shop)}
        self.complete = self.repeatable = True

    def run(self) -> Outcome:
        """Serve every goal in its turn."""
        for number, goal in enumerate(self.goals):
            last = number == len(self.goals) - 1
            until = None if last else time.monotonic() + FIRST_SHARE * self.effort.left_s
            self._serve(goal, self.goals[:number], until)
        stopped = "done"
        if not self.complete:
            stopped = "interrupted" if self.effort.stop.is_set() else "time limit"
        return Outcome(
            self.best.places.schedule(),
            proven_s=self.proven_s,
            stopped=stopped,
            repeatable=self.repeatable,
            remarks=self._remarks(),
        )

    def proved(self, goal: str) -> bool:
        """Whether the best plan is known to have the least there is of a goal, given the goals before."""
        return self.best.value(goal) <= self.least[goal]

    def _serve(self, goal: str, kept: tuple[str, ...], until: float | None) -> None:
        self._tell(goal)
        if goal == TARDINESS and not self.proved(goal):
            self.least[goal] = max(self.least[goal], self.effort.least_late(self.shop))
        size = len(self.shop)
        model, few = partial(self._model, goal, kept, until), threads(self.effort.workers)
        ways: list[Callable[[], None]] = []
        if size <= BRIEF_MOST:
            ways.append(partial(model, workers=1, work=BRIEF_WORK))
        if size > min(WINDOWS_FROM.get(goal, MODEL_MOST), MODEL_MOST):
            share = 1.0 if size > MODEL_MOST else WINDOWS_SHARE[goal]
            ways.append(partial(self._parts, goal, kept, until, share))
        if size < LEAN_FROM and not self.effort.workers and few < FULL:
            ways += [partial(model, workers=few, share=FEW_SHARE), partial(model, workers=FULL)]
        elif size <= MODEL_MOST:
            ways.append(partial(model, workers=few))
        for way in ways:
            if self.proved(goal):
                return
            if self.effort.over:
                self.complete = self.repeatable = False
                return
            way()

    def _parts(self, goal: str, kept: tuple[str, ...], until: float | None, share: float) -> None:
        """Place parts again for some share of the time left."""
        now = time.monotonic()
        left = self.effort.left_s if until is None else max(0.0, until - now)
        repeats = improve_in_parts(
            self.shop,
            self.best,
            goal,
            kept,
            self.least[goal],
            self.effort,
            self.progress,
            now + share * left,
        )
        self.repeatable &= repeats
        self.complete &= share < 1 or self.proved(goal)

    def _model(
        self,
        goal: str,
        kept: tuple[str, ...],
        until: float | None,
        *,
        workers: int,
        work: float | None = None,
        share: float = 1.0,
    ) -> None:
        """Give the whole model some share of the time left."""
        now = time.monotonic()
        end = now + self.effort.left_s if until is None else until
        result = improve(
            self.shop,
            self.best,
            goal,
            kept,
            self.least[goal],
            self.effort,
            self.progress,
            until=now + share * (end - now) if share < 1 else until,
            workers=workers,
            work=work,
        )
        self.repeatable &= result.repeatable
        self.least[goal] = max(self.least[goal], result.bound)
        self.complete &= share < 1 or self.proved(goal) or (result.ended and not self.effort.over)
        if goal == MAKESPAN and not kept and result.bound > self.bound_s:
            self.bound_s = self.proven_s = result.bound

    def progress(self, goal: str) -> Progress:
        """Say where the search stands."""
        return Progress(STAGES[goal], self.best.value(MAKESPAN), self.bound_s, self.effort.left_s)

    def _tell(self, goal: str) -> None:
        self.effort.report(self.progress(goal))

    def _remarks(self) -> tuple[str, ...]:
        return tuple(
            self._about(goal, number)
            for number, goal in enumerate(self.goals)
            if (goal == TARDINESS and self.shop.has_due)
            or (goal == CHANGEOVERS and any(not times.none for times in self.shop.changeovers.values()))
        )

    def _about(self, goal: str, number: int) -> str:
        """Say what a goal came to, and what is proved about it: nothing is called near that is not."""
        value, unit = self.best.value(goal), PRIORITY_UNIT if goal == TARDINESS else 1
        if not value:
            return "Nothing is late." if goal == TARDINESS else "Nothing is changed over."
        said = (
            f"Weighted lateness is {duration(value // unit)} (priority × time late, summed)"
            if goal == TARDINESS
            else f"Changeovers take {duration(value)} in all"
        )
        kind = "plan as good in what comes first" if number else "plan"
        if self.proved(goal):
            return f"{said}; no {kind} has less."
        if not self.least[goal]:
            return f"{said}; whether a {kind} could have less is not known."
        least = duration(self.least[goal] // unit)
        return f"{said}; all that is proved is that every {kind} has {least} or more."


def improve(
    shop: Shop,
    best: Best,
    goal: str,
    kept: tuple[str, ...],
    least: int,
    effort: Effort,
    progress: Callable[[str], Progress],
    *,
    until: float | None = None,
    workers: int,
    work: float | None = None,
) -> StageResult:
    """Lower `goal` with the whole model, without giving up anything of the goals in `kept`.

    Parameters
    ----------
    best
        Holds a legal plan; receives every better one.
    least
        A lower bound of the goal, put into the model: the solver's own is often weaker.
    until
        A moment of ``time.monotonic()`` at which to stop.
    workers
        Solver threads; the search of one repeats if it ends by itself.
    work
        How much to do at most, in the solver's own units, which do not depend on the machine.
    """
    board, solver = Switchboard(), cp_model.CpSolver()
    set_parameters(solver, effort, workers, work, lean=len(shop) >= LEAN_FROM)
    found: list[tuple[Goal, Found]] = []

    def search() -> None:
        model, aim = _whole_model(shop, best, goal, kept, least)
        found.append((aim, board.solve(model.cp, solver, partial(keep, model, best))))

    ended = watch([search], board, effort, lambda: progress(goal), until=until)
    aim, result = found[0]
    known = aim.exact and result.answer in (Answer.PROVED, Answer.FOUND)
    bound = max(least, aim.worth(result.bound)) if known else least
    return StageResult(bound, ended, repeatable=ended and workers == 1)


def _whole_model(shop: Shop, best: Best, goal: str, kept: tuple[str, ...], least: int) -> tuple[Model, Goal]:
    limited = goal == MAKESPAN or MAKESPAN in kept
    places = best.places
    latest_s = best.value(MAKESPAN) if limited else max(whole_horizon_s(shop), best.value(MAKESPAN))
    model = Model(shop, places, latest_s)
    add_rules(model)
    for other in kept:
        if other != MAKESPAN:
            limit = GOAL_BUILDERS[other](model, 0)
            model.cp.add(limit.expression <= limit.at_most(best.value(other)))
    aim = GOAL_BUILDERS[goal](model, least)
    model.cp.minimize(aim.expression)
    return model, aim


def whole_horizon_s(shop: Shop) -> int:
    """Return a time by which some best plan has ended: from the last change in the hall one after another.

    What begins after that and is pushed to the left begins when something else has ended, and the changeover
    of its machine or its way there is over. A machine that is shut for good, or a crew that is another for
    good, changes for the last time when that begins: nobody waits for its end.
    """
    hall, columns = shop.machines, shop.operations
    quiet = [0, *shop.orders.release_s.tolist()]
    for shut in {machine.closed for machine in hall} | {()}:
        spans = united((each.start_s, each.end_s) for each in (*shop.breaks, *shut))
        quiet += [_settled(start, end) for start, end in spans]
    quiet += [_settled(start, end) for crew in shop.crews for start, end, _ in crew.levels]
    way = max(shop.transport.between, *shop.transport.pairs.values(), 0)
    rules = [shop.changeovers.get(machine.id) for machine in hall]
    gap = [way if rule is None else max(way, rule.between, *rule.pairs.values()) for rule in rules]
    visits = np.bincount(columns.machine, minlength=len(hall)) + 1
    return int(max(quiet) + np.sum(columns.seconds) + np.dot(visits, gap))


def _settled(start: int, end: int) -> int:
    """Return when a stretch changes the hall for the last time."""
    return max(0, start if end - start >= FOR_GOOD_S else end)
