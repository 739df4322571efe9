"""Floors as they are: closures, changeovers, crews, set-ups and transport, together with everything else.

List schedules that honour every rule come first (``floor``), then the exact model of the same rules
(``cpsat.floor``), which starts from the best list and may prove it shortest.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, replace

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.openshop.cpsat.floor.best import Places, tardiness_of
from shopfloor.openshop.floor.plan import floor_plan
from shopfloor.openshop.incumbent import GOALS, MAKESPAN, TARDINESS
from shopfloor.openshop.method import Effort, Progress
from shopfloor.openshop.round_order import PRIORITY_UNIT

CHANGEOVERS = "changeovers"
LISTS_SHARE = 0.4  # of the time, at most, goes to list schedules; small floors end their rounds sooner
ALONE_SHARE = 0.8  # the same where only the makespan counts: a large floor gains little from the exact model
TRIAL_SHARE = 0.05  # of the time is kept for a look at due times first, where some order is late
FAR_LESS = 0.5  # of the lateness: a plan that leaves no more of it, and ends later, is worth a word


@dataclass(frozen=True, slots=True)
class WholeFloor:
    """Accepts every shop; knows every rule of the floor.

    Parameters
    ----------
    goals
        What counts first, and what then.
    """

    goals: tuple[str, ...] = GOALS
    name: str = "whole floor"
    reaches_bound: bool = False

    def accepts(self, shop: Shop) -> str | None:
        """Return None: every shop has a list schedule."""
        return None

    def promise(self, shop: Shop) -> str:
        """Return what the method guarantees: a legal plan, and an honest gap."""
        return (
            "the floor has rules that no exact method knows, so list schedules that keep them all are "
            "improved by search; the plan is proved shortest where it meets a lower bound, and shows its gap "
            "elsewhere"
        )

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return the best schedule found in the time given, with the makespan bound proved by search."""
        if not len(shop):
            return Outcome(Schedule(*(np.zeros(0, np.int64),) * 3))
        goals = tuple(goal for goal in self.goals if goal != TARDINESS or shop.has_due)
        if goals[0] == TARDINESS or TARDINESS not in goals:
            return self._solve(shop, goals, effort)
        found = self._solve(
            shop, goals, replace(effort, time_limit_s=(1 - TRIAL_SHARE) * effort.time_limit_s)
        )
        return replace(found, remarks=(*found.remarks, *_due_times_first(shop, found.schedule, effort)))

    def _solve(self, shop: Shop, goals: tuple[str, ...], effort: Effort) -> Outcome:
        share = ALONE_SHARE if goals == (MAKESPAN,) else LISTS_SHARE
        lists = replace(effort, time_limit_s=share * effort.left_s, began=time.monotonic())
        found = floor_plan(shop, goals, lists)
        best = found.schedule
        if best is None or found.stopped == "interrupted" or effort.over:
            return found
        effort.report(Progress("lists", best.makespan_s, effort.bound_s, effort.left_s))
        if best.makespan_s <= effort.bound_s and not _late(shop, best) and CHANGEOVERS not in goals:
            return replace(found, stopped="done", repeatable=found.repeatable)
        from shopfloor.openshop.cpsat.floor.solve import improve_floor  # the solver is heavy to import

        outcome = improve_floor(shop, best, goals, effort.bound_s, effort)
        return replace(outcome, repeatable=outcome.repeatable and found.repeatable)


def _late(shop: Shop, schedule: Schedule) -> bool:
    """Whether any order ends after its due time."""
    return tardiness_of(shop, Places.of(schedule)) > 0


def _due_times_first(shop: Shop, schedule: Schedule | None, effort: Effort) -> tuple[str, ...]:
    """Say what due times first would leave of the lateness, where lists show that it is far less."""
    if schedule is None or len(schedule) < len(shop) or effort.stop.is_set():
        return ()
    late = tardiness_of(shop, Places.of(schedule))
    if not late:
        return ()
    trial = replace(effort, time_limit_s=TRIAL_SHARE * effort.time_limit_s, began=time.monotonic())
    other = floor_plan(shop, (TARDINESS, MAKESPAN), trial, rounds=1).schedule
    if other is None:
        return ()
    less, later = tardiness_of(shop, Places.of(other)), other.makespan_s - schedule.makespan_s
    if less > FAR_LESS * late or later <= 0:
        return ()
    before, after = (duration(value // PRIORITY_UNIT) for value in (late, less))
    leaves = f"{after} of weighted lateness instead of {before}" if less else "nothing late"
    return (
        f"With due times first (--objective tardiness,makespan) a plan was found that leaves {leaves} and "
        f"ends {duration(later)} later.",
    )
