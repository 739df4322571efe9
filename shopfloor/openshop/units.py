"""Which unit of a group runs what, once the times are known."""

from __future__ import annotations

import heapq

import numpy as np

from shopfloor.model.shop import Ints, Shop


def assign_units(shop: Shop, start: Ints, end: Ints) -> Ints:
    """Return the unit, 1 … count, of each operation; no unit runs two at once.

    The times of a group's operations are intervals, at no moment more of them than units. Taken by
    start, each may have the lowest unit then free: intervals with at most k in common anywhere can
    be coloured with k colours. O(n log n).

    Raises
    ------
    ValueError
        If more operations run at once than the group has units.
    """
    unit = np.ones(len(start), np.int64)
    for index, machine in enumerate(shop.machines):
        if machine.count == 1:
            continue
        rows = np.flatnonzero(shop.operations.machine == index)
        rows = rows[np.lexsort((rows, start[rows]))]
        free = list(range(1, machine.count + 1))
        busy: list[tuple[int, int]] = []
        for row in rows.tolist():
            while busy and busy[0][0] <= start[row]:
                heapq.heappush(free, heapq.heappop(busy)[1])
            if not free:
                raise ValueError(f"machine {machine.id}: more than {machine.count} operations at once")
            unit[row] = heapq.heappop(free)
            heapq.heappush(busy, (int(end[row]), int(unit[row])))
    return unit
