"""The best schedule so far, and how schedules are compared: one goal after the other, in whole numbers."""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence

import numpy as np

from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_DUE, Ints, Shop
from shopfloor.openshop.round_order import PRIORITY_UNIT
from shopfloor.openshop.units import assign_units

MAKESPAN, TARDINESS = "makespan", "tardiness"
GOALS = (MAKESPAN, TARDINESS)


def weights(shop: Shop) -> list[int]:
    """Return the priorities in thousandths: exact, since a priority has at most three decimals."""
    return [int(value) for value in np.rint(shop.orders.priority * PRIORITY_UNIT)]


def makespan_of(shop: Shop, start: Ints) -> int:
    """Return the finish of the last operation."""
    return int((start + shop.operations.seconds).max()) if len(start) else 0


def tardiness_of(shop: Shop, start: Ints) -> int:
    """Return weighted tardiness: over all late orders, seconds late × thousandths of priority, summed."""
    if not shop.has_due:
        return 0
    done = np.full(len(shop.orders), -1, np.int64)
    np.maximum.at(done, shop.operations.job, start + shop.operations.seconds)
    late = np.flatnonzero((shop.orders.due_s != NO_DUE) & (done > shop.orders.due_s))
    weight = weights(shop)  # Python's own integers: such sums may pass 64 bits
    return sum(weight[job] * int(done[job] - shop.orders.due_s[job]) for job in late.tolist())


def least_tardiness(shop: Shop) -> int:
    """Return the weighted tardiness that orders have even when they never wait."""
    orders = shop.orders
    soonest = orders.release_s + shop.job_load_s
    late = np.flatnonzero((orders.due_s != NO_DUE) & (soonest > orders.due_s) & (shop.job_load_s > 0))
    weight = weights(shop) if len(late) else []
    return sum(weight[job] * int(soonest[job] - orders.due_s[job]) for job in late.tolist())


MEASURES: dict[str, Callable[[Shop, Ints], int]] = {MAKESPAN: makespan_of, TARDINESS: tardiness_of}


class Incumbent:
    """The best starts found for one shop; may be offered better ones from any thread.

    Parameters
    ----------
    shop
        The shop.
    goals
        What counts first, second, …
    """

    def __init__(self, shop: Shop, goals: Sequence[str] = GOALS) -> None:
        self.shop = shop
        self.goals = tuple(goals)
        self.start: Ints | None = None
        self._values: tuple[int, ...] = ()
        self._lock = threading.Lock()

    def measure(self, start: Ints) -> tuple[int, ...]:
        """Return what a schedule has of each goal; compared as tuples, less is better."""
        return tuple(MEASURES[goal](self.shop, start) for goal in self.goals)

    def offer(self, start: Ints) -> bool:
        """Keep `start` if it is better than what is kept; tell whether it was."""
        values = self.measure(start)
        with self._lock:
            if self.start is not None and values >= self._values:
                return False
            self.start, self._values = start, values
            return True

    def value(self, goal: str) -> int:
        """Return what the kept schedule has of `goal`."""
        return self._values[self.goals.index(goal)]

    @property
    def makespan_s(self) -> int | None:
        """Makespan of the kept schedule; None before there is one."""
        return None if self.start is None else self.value(MAKESPAN)

    def schedule(self) -> Schedule | None:
        """Return the kept schedule with its units."""
        if self.start is None:
            return None
        end = self.start + self.shop.operations.seconds
        unit = assign_units(self.shop, self.start, end)
        return Schedule(np.arange(len(self.start)), self.start, end, unit=unit)
