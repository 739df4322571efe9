"""Floors as they are: closures, changeovers, crews, set-ups and transport, together with everything else.

List schedules that honour every rule come first (``floor``), then the exact model of the same rules
(``cpsat.floor``), which starts from the best list and may prove it shortest.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_STEP, Shop
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.timetable import Timetable, serial
from shopfloor.openshop.incumbent import GOALS
from shopfloor.openshop.method import Effort, Progress
from shopfloor.openshop.units import assign_units


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
        best = self._lists(shop, effort)
        if best is None:
            return Outcome(None)
        effort.report(Progress("lists", best.makespan_s, effort.bound_s, effort.left_s))
        if best.makespan_s <= effort.bound_s and not _late(shop, best):
            return Outcome(best)
        from shopfloor.openshop.cpsat.floor.solve import improve_floor  # the solver is heavy to import

        goals = tuple(goal for goal in self.goals if goal != "tardiness" or shop.has_due)
        return improve_floor(shop, best, goals, effort.bound_s, effort)

    def _lists(self, shop: Shop, effort: Effort) -> Schedule | None:
        """Return the best of a few lists, each filled in operation by operation."""
        rules = Rules.of(shop)
        best: tuple[tuple[int, int], Schedule] | None = None
        for sequence in _sequences(shop):
            if best is not None and (effort.over or (best[0] == (effort.bound_s, 0))):
                break
            timetable = serial(rules, sequence)
            if timetable is None:
                continue
            schedule = _schedule(shop, timetable)
            value = (schedule.makespan_s, _late(shop, schedule))
            if best is None or value < best[0]:
                best = value, schedule
        return None if best is None else best[1]


def _late(shop: Shop, schedule: Schedule) -> int:
    """Return weighted lateness in seconds × thousandths of priority."""
    if not shop.has_due:
        return 0
    finish = schedule.completion_s(shop.operations.job, len(shop.orders))
    late = np.maximum(finish, shop.orders.due_s) - shop.orders.due_s
    return int((np.rint(shop.orders.priority * 1000).astype(np.int64) * np.where(finish > 0, late, 0)).sum())


def _sequences(shop: Shop) -> Iterator[list[int]]:
    """Yield lists of all operations: most pressing first in one sense after the other."""
    columns, orders = shop.operations, shop.orders
    machine, job = columns.machine, columns.job
    load, work = shop.machine_load_s[machine], shop.job_load_s[job]
    due, index = orders.due_s[job], np.arange(len(shop))
    weight = -orders.priority[job]
    family = columns.family
    for keys in (
        (index, -columns.seconds, -work, -load),
        (index, -work, due),
        (index, -work, weight, due),
        (index, -work, family, machine),
        (index, -load, -work),
        (index, -columns.seconds, shop.head_s),
        (index, -(work + load)),
    ):
        yield _in_steps(shop, np.lexsort(keys).tolist())


def _in_steps(shop: Shop, sequence: list[int]) -> list[int]:
    """Return the list with the ranked operations of each order in the order of their steps."""
    step, job = shop.operations.step, shop.operations.job
    places: dict[int, list[int]] = {}
    for place, operation in enumerate(sequence):
        if step[operation] != NO_STEP:
            places.setdefault(int(job[operation]), []).append(place)
    out = list(sequence)
    for mine in places.values():
        ranked = sorted((sequence[place] for place in mine), key=lambda operation: int(step[operation]))
        for place, operation in zip(mine, ranked, strict=True):
            out[place] = operation
    return out


def _schedule(shop: Shop, timetable: Timetable) -> Schedule:
    spots = timetable.spots
    assert all(spot is not None for spot in spots)
    start = np.array([spot.start for spot in spots if spot is not None], np.int64)
    end = np.array([spot.end for spot in spots if spot is not None], np.int64)
    unit = np.array([spot.unit for spot in spots if spot is not None], np.int64)
    unit = np.where(unit == NONE, assign_units(shop, start, end), unit + 1)
    return Schedule(np.arange(len(shop)), start, end, unit=unit)
