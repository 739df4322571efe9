"""Queues for due times: the most urgent operation first, by an index that changes with time.

The index of apparent tardiness cost (A. P. J. Vepsalainen, T. E. Morton, Management Science 33 (1987)
1035-1047): weight over run time, discounted by exp(-slack / (κ × mean run time)); here as a logarithm,
so that far due times do not vanish. A common deadline joins as a due time of every order, so that a
plan for due times keeps a makespan in view. To add a rule: one function from :class:`Waiting` to an
index an operation, and a line in the grid of :mod:`shopfloor.openshop.due_search`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from shopfloor.model.shop import NO_DUE, Floats, Ints, Shop
from shopfloor.openshop.dense import NOTHING, Dispatch

FAR = 2**52  # stands for a due time that an order does not have; exact as a float


@dataclass(frozen=True, slots=True)
class Waiting:
    """What waits at one machine now, an entry an operation; times in seconds."""

    now: int
    seconds: Ints
    work: Ints  # left of the operation's order, the operation included
    due: Ints  # of the order, FAR if none
    weight: Floats
    bias: Floats  # of the operation, added to the logarithm of its weight
    usual: float  # mean run time of the shop


Index = Callable[[Waiting], Floats]


def apparent_cost(look_ahead: float, flow: float, deadline: int, pull: float) -> Index:
    """Return the index of apparent tardiness cost.

    Parameters
    ----------
    look_ahead
        κ: how many mean run times before it becomes urgent an operation counts noticeably.
    flow
        The share of the order's other work that is taken off its slack.
    deadline, pull
        Every order is also due at `deadline` with the weight `pull`.
    """

    def index(waiting: Waiting) -> Floats:
        scale = look_ahead * waiting.usual
        rest = waiting.work - waiting.seconds
        slack = waiting.due - waiting.now - waiting.seconds - flow * rest
        own = np.log(waiting.weight) + waiting.bias - np.maximum(slack, 0.0) / scale
        common = np.log(pull) - np.maximum(deadline - waiting.now - waiting.work, 0.0) / scale
        urgency: Floats = np.maximum(own, common) - np.log(waiting.seconds)
        return urgency

    return index


def earliest_due(deadline: int) -> Index:
    """Return the index of the earliest due time, or of `deadline` where that is earlier."""

    def index(waiting: Waiting) -> Floats:
        urgency: Floats = waiting.work / FAR - np.minimum(waiting.due, deadline)
        return urgency

    return index


def modified_due(deadline: int) -> Index:
    """Return the index of the time to the due time, or of the work left if that is more, over the weight.

    J. J. Kanet, X. Li, Journal of Scheduling 7 (2004) 261-276.
    """

    def index(waiting: Waiting) -> Floats:
        left = np.minimum(waiting.due, deadline) - waiting.now
        urgency: Floats = -np.maximum(waiting.work, left) / waiting.weight
        return urgency

    return index


class MostUrgent:
    """A queue that hands out the operation with the highest index; O(waiting operations) each time.

    `bias` is what :class:`Waiting` calls so, an entry an operation.
    """

    def __init__(self, shop: Shop, index: Index, bias: Floats | None = None) -> None:
        self._shop, self._index = shop, index
        self._bias = np.zeros(len(shop)) if bias is None else bias

    def attach(self, loop: Dispatch) -> None:
        """Learn the loop whose state the queue reads."""
        shop, operations = self._shop, self._shop.operations
        self._loop = loop
        self._job, self._seconds = operations.job, operations.seconds
        self._due: Any = np.where(shop.orders.due_s == NO_DUE, FAR, shop.orders.due_s)
        self._weight = shop.orders.priority
        self._usual = float(operations.seconds.mean()) if len(shop) else 1.0
        self._work = np.array(loop.work, np.int64)
        self._idle = np.zeros(len(shop.orders), np.bool_)
        self._open = np.zeros(len(shop), np.bool_)
        self._gone = np.zeros(len(shop), np.bool_)
        by_machine = np.argsort(operations.machine, kind="stable")
        ends = np.cumsum(np.bincount(operations.machine, minlength=len(shop.machines)))
        self._rows = np.split(by_machine, ends[:-1])
        self._started = [0] * len(shop.machines)

    def add(self, operation: int) -> None:
        """`operation` may run from now on, whenever its order is free."""
        self._open[operation] = True

    def returned(self, job: int) -> None:
        """Order `job` is free again."""
        self._idle[job] = True

    def take(self, machine: int) -> int:
        """Remove and return the operation that `machine` should start now, or ``NOTHING``."""
        rows = self._rows[machine]
        rows = rows[self._open[rows] & self._idle[self._job[rows]]]
        held = self._loop.held_orders
        if held:
            rows = rows[~np.isin(self._job[rows], list(held))]
        if not len(rows):
            return NOTHING
        if len(rows) == 1:
            operation = int(rows[0])
        else:
            jobs = self._job[rows]
            waiting = Waiting(
                self._loop.now,
                self._seconds[rows],
                self._work[jobs],
                self._due[jobs],
                self._weight[jobs],
                self._bias[rows],
                self._usual,
            )
            operation = int(rows[int(self._index(waiting).argmax())])
        job = int(self._job[operation])
        self._open[operation] = self._idle[job] = False
        self._gone[operation] = True
        self._work[job] -= int(self._seconds[operation])
        self._started[machine] += 1
        if 2 * self._started[machine] > len(self._rows[machine]):
            self._rows[machine] = self._rows[machine][~self._gone[self._rows[machine]]]
            self._started[machine] = 0
        return operation
