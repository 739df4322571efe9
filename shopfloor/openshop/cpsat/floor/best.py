"""The best legal plan so far, with ends and units, and what it has of each goal."""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_DUE, NO_FAMILY, Bools, Ints, Shop
from shopfloor.openshop.floor.rules import Rules
from shopfloor.openshop.floor.timetable import Timetable, serial
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, weights
from shopfloor.openshop.units import assign_units

CHANGEOVERS = "changeovers"


@dataclass(frozen=True, slots=True)
class Places:
    """Where every operation stands: start and end in seconds, unit from 1; an entry an operation."""

    start: Ints
    end: Ints
    unit: Ints

    @classmethod
    def of(cls, schedule: Schedule) -> Places:
        """Return the places of a schedule in which every operation is one row."""
        order = np.argsort(schedule.operation)
        return cls(schedule.start_s[order], schedule.end_s[order], schedule.unit[order])

    def schedule(self) -> Schedule:
        """Return them as a schedule."""
        return Schedule(np.arange(len(self.start)), self.start, self.end, unit=self.unit)


def family_name(shop: Shop, operation: int) -> str:
    """Return the family of an operation; blank is a family of its own."""
    family = int(shop.operations.family[operation])
    return "" if family == NO_FAMILY else shop.families[family]


def makespan_of(shop: Shop, places: Places) -> int:
    """Return the end of the last operation."""
    return int(places.end.max(initial=0))


def tardiness_of(shop: Shop, places: Places, chosen: Bools | None = None) -> int:
    """Return seconds late × thousandths of priority, summed over the orders; of `chosen` operations only."""
    done, job = np.full(len(shop.orders), -1, np.int64), shop.operations.job
    rows = np.arange(len(job)) if chosen is None else np.flatnonzero(chosen)
    np.maximum.at(done, job[rows], places.end[rows])
    due = shop.orders.due_s
    late = np.flatnonzero((due != NO_DUE) & (done > due))
    weight = weights(shop) if len(late) else []
    return sum(weight[job] * int(done[job] - due[job]) for job in late.tolist())


def changes(shop: Shop, places: Places) -> Iterator[tuple[int, int]]:
    """Yield each operation on a machine with changeovers, and the seconds to change over for it."""
    for index, machine in enumerate(shop.machines):
        times = shop.changeovers.get(machine.id)
        if times is None or times.none:
            continue
        rows = np.flatnonzero(shop.operations.machine == index)
        before: dict[int, str | None] = {}
        for row in rows[np.argsort(places.start[rows], kind="stable")].tolist():
            unit, family = int(places.unit[row]), family_name(shop, row)
            old = before.get(unit, machine.family)
            yield row, 0 if old is None else times.seconds(old, family)
            before[unit] = family


def changeovers_of(shop: Shop, places: Places) -> int:
    """Return the seconds of all changeovers, from the shift's start on."""
    return sum(seconds for _, seconds in changes(shop, places))


def costly_changes(shop: Shop, places: Places) -> Ints:
    """Return the operations that a unit is changed over for."""
    return np.array([row for row, seconds in changes(shop, places) if seconds], np.int64)


MEASURES: dict[str, Callable[[Shop, Places], int]] = {
    MAKESPAN: makespan_of,
    TARDINESS: tardiness_of,
    CHANGEOVERS: changeovers_of,
}


class Best:
    """The best places found; may be offered better ones from any thread.

    Parameters
    ----------
    places
        A legal plan.
    goals
        What counts first, second, …; the rest of :data:`MEASURES` does not count.

    Attributes
    ----------
    values
        What the best plan has of each goal.
    """

    def __init__(self, shop: Shop, places: Places, goals: tuple[str, ...]) -> None:
        self.shop, self.goals, self.places = shop, goals, places
        self.values = self.measure(places)
        self._rules = Rules.of(shop)
        self._lock = threading.Lock()
        self.offer(places)

    def measure(self, places: Places) -> tuple[int, ...]:
        """Return what a plan has of each goal; compared as tuples, less is better."""
        return tuple(MEASURES[goal](self.shop, places) for goal in self.goals)

    def value(self, goal: str) -> int:
        """Return what the best plan has of a goal, or of anything else that is measured."""
        if goal in self.goals:
            return self.values[self.goals.index(goal)]
        return MEASURES[goal](self.shop, self.places)

    def offer(self, places: Places) -> bool:
        """Keep a legal plan, pushed to the left, if it is better; tell whether it was.

        A push may move an operation into an earlier gap of its unit, so it may add changeovers: where
        those count, the plan as it is is looked at too.
        """
        pushed = self._pushed(places)
        offers = [places] if pushed is None else [pushed]
        if pushed is not None and CHANGEOVERS in self.goals:
            offers.append(places)
        better = False
        for each in offers:
            values = self.measure(each)
            with self._lock:
                earlier = int(each.start.sum()) < int(self.places.start.sum())
                if values < self.values or (values == self.values and earlier):
                    better |= values < self.values
                    self.places, self.values = each, values
        return better

    def _pushed(self, places: Places) -> Places | None:
        sequence = np.lexsort((np.arange(len(places.start)), places.start)).tolist()
        table = serial(self._rules, sequence, (places.unit - 1).tolist())
        return None if table is None else _places_of(self.shop, table)


def _places_of(shop: Shop, table: Timetable) -> Places:
    spots = [spot for spot in table.spots if spot is not None]
    start = np.array([spot.start for spot in spots], np.int64)
    end = np.array([spot.end for spot in spots], np.int64)
    unit = np.array([spot.unit for spot in spots], np.int64)
    return Places(start, end, np.where(unit < 0, assign_units(shop, start, end), unit + 1))
