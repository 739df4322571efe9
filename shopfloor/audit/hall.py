"""Rules about what the hall shares: its breaks and its crews."""

from __future__ import annotations

import numpy as np

from shopfloor.audit.columns import latest_so_far
from shopfloor.audit.reading import Breaches, Reading, breaches
from shopfloor.model.shop import Ints


def breaks(reading: Reading) -> Breaches:
    """Nothing starts or ends inside a break, and only machines that pause go on after one."""
    stated, hall = reading.stated, reading.breaks
    rows = np.flatnonzero(reading.lasting & (reading.machine >= 0)) if len(hall) else np.zeros(0, np.int64)
    start, end = stated.start_s[rows], stated.end_s[rows]
    touched = hall.next(start) < hall.begun(end)
    rows, start, end = rows[touched], start[touched], end[touched]
    first, last = hall.next(start), hall.begun(end) - 1  # the breaks a row meets, from first to last
    begins = np.array([pause.start_s for pause in hall.each], np.int64)
    ends = np.array([pause.end_s for pause in hall.each], np.int64)
    starts_in = begins[first] <= start if len(rows) else np.zeros(0, bool)
    ends_in = end <= ends[last] if len(rows) else np.zeros(0, bool)
    wrong = ~reading.pauses[reading.machine[rows]] | starts_in | ends_in
    which = dict(zip(rows.tolist(), np.where(starts_in | ~ends_in, first, last).tolist(), strict=True))
    starting, ending = set(rows[starts_in].tolist()), set(rows[ends_in].tolist())

    def say(row: int) -> str:
        pause = hall.each[which[row]]
        named = f" ({pause.reason})" if pause.reason else ""
        span = f"the break from {reading.at(pause.start_s)} to {reading.at(pause.end_s)}{named}"
        if row in starting:
            return f"{reading.visit(row)} starts inside {span}."
        if row in ending:
            return f"{reading.visit(row)} ends inside {span}."
        return f"{reading.visit(row)} runs across {span}, over which {stated.machine[row]} does not pause."

    return breaches(say, rows[wrong])


def crews(reading: Reading) -> Breaches:
    """At no moment do the operations that run take more heads from a crew than it has."""
    heads = {crew.id: crew.heads for crew in reading.shop.crews}
    clashes, using = [np.zeros((0, 2), np.int64)], dict[int, int]()
    running = np.flatnonzero((reading.operation >= 0) & reading.lasting)
    for crew in reading.shop.crews:
        theirs = np.array([machine.crew == crew.id for machine in reading.shop.machines], bool)
        one, two, taken = _overdrawn(reading, running[theirs[reading.machine[running]]], crew.heads)
        clashes.append(np.column_stack([one, two]))
        using.update(zip(two.tolist(), taken.tolist(), strict=True))

    def say(other: int, row: int) -> str:
        crew = reading.shop.machines[int(reading.machine[row])].crew
        assert crew is not None
        beside = "" if other == row else f" beside {reading.stated.order[other]} on {reading.place(other)}"
        has = "1 head" if heads[crew] == 1 else f"{heads[crew]} heads"
        return (
            f"Crew {crew} has {has}, but {using[row]} are taken when {reading.stated.order[row]} on "
            f"{reading.place(row)} starts at {reading.at(reading.stated.start_s[row])}{beside}."
        )

    return breaches(say, *np.concatenate(clashes).T)


def _overdrawn(reading: Reading, rows: Ints, heads: int) -> tuple[Ints, Ints, Ints]:
    """Return each row at whose start too many heads are taken, after one that runs beside it, and how many.

    The heads taken when a row starts are those of the rows begun by then, less those of the rows ended.
    """
    start, end = reading.stated.start_s[rows], reading.stated.end_s[rows]
    order = np.lexsort((rows, end, start))
    rows, start, end = rows[order], start[order], end[order]
    taken = reading.shop.operations.heads[reading.operation[rows]]
    by_end = np.argsort(end, kind="stable")
    given_back = np.r_[0, np.cumsum(taken[by_end])][np.searchsorted(end[by_end], start, "right")]
    using = np.cumsum(taken) - given_back
    over = np.flatnonzero((using > heads) & (taken > 0))
    before = latest_so_far(np.arange(len(rows)) == 0, end)[np.maximum(over - 1, 0)]
    beside = np.where((over > 0) & (end[before] > start[over]), rows[before], rows[over])
    return beside, rows[over], using[over]
