"""Tells equally long visits of one order to one machine apart where only some of them have a step."""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass, field

import numpy as np

from shopfloor.audit.columns import run_starts
from shopfloor.model.shop import NO_STEP, Bools, Ints, Shop
from shopfloor.model.stated import StatedPlan


@dataclass
class _Alike:
    """Visits of one order to one machine, of one length, to be given out to their operations."""

    coming: deque[int] = field(default_factory=deque)  # by start
    early: deque[int] = field(default_factory=deque)  # passed over by a step

    def take(self, begin_s: Ints, ready_s: int) -> int:
        """Take the earliest visit from `ready_s` on, or any if there is none."""
        while self.coming and begin_s[self.coming[0]] < ready_s:
            self.early.append(self.coming.popleft())
        return self.coming.popleft() if self.coming else self.early.popleft()

    def take_any(self) -> int:
        """Take a visit that no step can use."""
        return self.early.popleft() if self.early else self.coming.popleft()


def settle_steps(shop: Shop, stated: StatedPlan, operation: Ints) -> Ints:
    """Return `operation` with equally long visits given out so that the steps hold if they can.

    Going up the steps of an order, each operation takes the earliest visit that starts once the lower
    steps are done. That keeps every later choice open: a visit passed over starts too early for any
    higher step too, and is left to the operations without a step. O(n log n).
    """
    columns = shop.operations
    stepped = columns.step != NO_STEP
    mixed, kind = _mixed(shop, stepped)
    if not mixed.any():
        return operation
    matched = np.flatnonzero(operation >= 0)
    begin = np.full(len(shop), np.iinfo(np.int64).max)
    end = np.full(len(shop), np.iinfo(np.int64).min)
    done = np.zeros(len(shop), np.int64)
    np.minimum.at(begin, operation[matched], stated.start_s[matched])
    np.maximum.at(end, operation[matched], stated.end_s[matched])
    np.add.at(done, operation[matched], stated.end_s[matched] - stated.start_s[matched])

    concerned = np.zeros(len(shop.orders), bool)
    concerned[columns.job[mixed]] = True
    whole = done == columns.seconds
    alike: dict[int, _Alike] = {}
    pool = np.flatnonzero(concerned[columns.job] & whole)
    for index in pool[np.argsort(begin[pool], kind="stable")].tolist():
        alike.setdefault(int(kind[index]), _Alike()).coming.append(index)

    given = np.arange(len(shop))
    needs = np.flatnonzero(concerned[columns.job] & (done > 0))
    needs = needs[np.lexsort((needs, columns.step[needs], ~stepped[needs], columns.job[needs]))]
    job = step = -1
    ready = latest = 0
    for index in needs.tolist():
        if columns.job[index] != job:
            job, step, ready, latest = int(columns.job[index]), NO_STEP, 0, 0
        if columns.step[index] != step:
            step, ready = int(columns.step[index]), latest
        visit = index
        if whole[index]:
            choice = alike[int(kind[index])]
            visit = choice.take(begin, ready) if stepped[index] else choice.take_any()
            given[visit] = index
        if stepped[index]:
            latest = max(latest, int(end[visit]))
    settled = operation.copy()
    settled[matched] = given[operation[matched]]
    return settled


def _mixed(shop: Shop, stepped: Bools) -> tuple[Bools, Ints]:
    """Return whether each operation has a like one that differs in having a step, and the kinds."""
    columns = shop.operations
    order = np.lexsort((columns.seconds, columns.machine, columns.job))
    first = run_starts(columns.job[order], columns.machine[order], columns.seconds[order])
    kind = np.empty(len(order), np.int64)
    kind[order] = np.cumsum(first) - 1
    size = len(order) + 1
    both = (np.bincount(kind[stepped], minlength=size) > 0) & (
        np.bincount(kind[~stepped], minlength=size) > 0
    )
    return both[kind], kind
