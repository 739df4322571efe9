"""One machine by itself, in the manner of a list: how late its orders would be, and what its time is worth.

The list only says where prices had better begin and which machines make nothing late; whatever it says, no
bound depends on it. Its index is that of apparent tardiness cost (A. P. J. Vepsalainen, T. E. Morton,
Management Science 33 (1987) 1035-1047) with quotients in the place of exponentials, which not every
machine rounds alike.
"""

from __future__ import annotations

import numpy as np

from shopfloor.bounds.places import Places
from shopfloor.model.shop import NO_FAMILY, Floats, Ints, Shop

LOOK_AHEAD = (0.5, 1.0, 2.0, 4.0)  # mean run times of slack at which an operation is half as urgent
RUNS_MOST = 400  # operations up to which every look-ahead is tried


def alone(shop: Shop, places: Places, weight: Ints) -> tuple[Ints, Floats]:
    """Return by how much each operation's order is late, and a price for each slot but the last.

    Parameters
    ----------
    weight
        What a second of lateness costs, an entry an operation.
    """
    ways = LOOK_AHEAD if len(places.rows) <= RUNS_MOST else LOOK_AHEAD[1:2]
    tried = [_list(shop, places, weight, ahead) for ahead in ways]
    late, block, end = min(tried, key=lambda one: int((one[0] * weight).sum()))
    middle = (places.open_at[0, 1:] + places.open_at[0, :-1]) / 2
    worth = np.zeros(len(places.edges) - 1)
    for line in np.flatnonzero(late).tolist():  # a second more before its end makes it a second later
        worth[(middle >= block[line]) & (middle < end[line])] += weight[line]
    return late, worth


def _list(shop: Shop, places: Places, weight: Ints, ahead: float) -> tuple[Ints, Ints, Ints]:
    """Return lateness, and in open time when the busy time that an operation ends in began, and its end."""
    index = int(shop.operations.machine[places.rows[0]])
    hall, clock, rows = shop.machines[index], shop.machine_clocks[index], places.rows
    seconds = places.taken.astype(np.float64)
    head = np.asarray(clock.worked(shop.head_s[rows])).astype(np.float64)
    due = np.asarray(clock.worked(places.late_from - shop.tail_s[rows])).astype(np.float64)
    worth, mean = weight / seconds, float(seconds.sum()) / len(rows)
    change, family, state = _changes(shop, index, rows)
    free, since, now = [0.0] * hall.count, [0.0] * hall.count, [state] * hall.count
    left = np.ones(len(rows), np.bool_)
    block, end = np.zeros(len(rows), np.int64), np.zeros(len(rows), np.int64)
    for _ in range(len(rows)):
        unit = min(range(hall.count), key=lambda k: free[k])
        earliest = free[unit] + change[now[unit], family]
        start = np.maximum(head, earliest)
        slack = np.maximum(0.0, due - seconds - start)
        index_of = worth / (1 + slack / (ahead * mean)) / (1 + (start - free[unit]) / (0.5 * mean)) ** 2
        chosen = int(np.where(left, index_of, -1.0).argmax())
        if head[chosen] > earliest[chosen]:
            since[unit] = float(head[chosen])
        free[unit] = float(start[chosen] + seconds[chosen])
        now[unit] = int(family[chosen])
        left[chosen] = False
        block[chosen], end[chosen] = int(since[unit]), int(free[unit])
    finish = np.asarray(clock.end(end))
    tail = shop.tail_s[rows]
    finish = np.where(tail > 0, shop.work_clock.end(shop.work_clock.worked(finish) + tail), finish)
    return np.maximum(finish - places.late_from, 0), block, end


def _changes(shop: Shop, machine: int, rows: Ints) -> tuple[Floats, Ints, int]:
    """Return seconds from family to family, the family of each operation, and the one it begins in."""
    hall = shop.machines[machine]
    times = shop.changeovers.get(hall.id)
    if times is None or times.none:
        return np.zeros((1, 1)), np.zeros(len(rows), np.int64), 0
    named = ["" if k == NO_FAMILY else shop.families[k] for k in shop.operations.family[rows].tolist()]
    names = sorted({*named, *([] if hall.family is None else [hall.family])})
    table = np.array([[times.seconds(old, new) for new in names] for old in names], np.float64)
    table = np.vstack([table, np.zeros(len(names))])  # last: in no family yet
    begin = len(names) if hall.family is None else names.index(hall.family)
    return table, np.array([names.index(name) for name in named], np.int64), begin
