"""Pushing a schedule to the left: same sequences, every operation as early as they allow."""

from __future__ import annotations

import heapq

import numpy as np

from shopfloor.model.shop import NO_STEP, Ints, Shop


def left_shift(shop: Shop, start: Ints) -> Ints:
    """Return a schedule with the sequences of `start`, every operation as early as they allow.

    Operations are taken by start, each as early as its order, the machine's units and the steps allow
    after those before it. O(n log n).

    Parameters
    ----------
    start
        Starts of a legal schedule: then none is later in the result, since nothing before it ends later
        than it did. Or any numbers that put lower steps first (:func:`steps_in_sequence`): these only
        say the sequence, and the result is legal all the same.
    """
    columns = shop.operations
    job, machine = columns.job.tolist(), columns.machine.tolist()
    seconds, step = columns.seconds.tolist(), columns.step.tolist()
    ready = shop.orders.release_s.tolist()
    lower = list(ready)  # for each order, when all its steps below the one reached are done
    reached = [NO_STEP] * len(ready)
    at_step = list(ready)  # when what has been placed of the step reached is done
    free = [[0] * each.count for each in shop.machines]
    shifted = np.empty(len(start), np.int64)
    for row in np.lexsort((np.arange(len(start)), start)).tolist():
        order, units = job[row], free[machine[row]]
        begin = max(ready[order], units[0])
        if step[row] != NO_STEP:
            if step[row] != reached[order]:
                reached[order], lower[order] = step[row], at_step[order]
            begin = max(begin, lower[order])
            at_step[order] = max(at_step[order], begin + seconds[row])
        heapq.heapreplace(units, begin + seconds[row])
        ready[order] = begin + seconds[row]
        shifted[row] = begin
    return shifted


def steps_in_sequence(shop: Shop, start: Ints) -> bool:
    """Tell whether `start` puts the lower steps of each order before its higher ones."""
    columns = shop.operations
    rows = np.flatnonzero(columns.step != NO_STEP)
    rows = rows[np.lexsort((rows, start[rows], columns.job[rows]))]
    step, same = columns.step[rows], np.diff(columns.job[rows]) == 0
    return bool((np.diff(step)[same] >= 0).all())
