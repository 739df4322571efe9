"""Rules about the time from one row to the next: changeovers on a unit, transport of an order."""

from __future__ import annotations

import numpy as np

from shopfloor.audit.columns import run_starts
from shopfloor.audit.reading import Breaches, Reading, breaches
from shopfloor.model.calendar import duration
from shopfloor.model.shop import NO_FAMILY, Ints

SHIFT_START = -1  # stands for the row before the first one of a unit


def transports(reading: Reading) -> Breaches:
    """An order has the time to get from one machine to the next; overlaps are reported as such."""
    stated, transport = reading.stated, reading.shop.transport
    ids = [machine.id for machine in reading.shop.machines]
    rows = np.flatnonzero(reading.lasting & (reading.job >= 0) & (reading.machine >= 0))
    if transport.none:
        rows = rows[:0]
    rows = rows[np.lexsort((rows, stated.end_s[rows], stated.start_s[rows], reading.job[rows]))]
    one, two = _neighbours(rows, reading.job[rows])
    pairs, which = np.unique(
        reading.machine[one] * max(1, len(ids)) + reading.machine[two], return_inverse=True
    )
    times = [transport.seconds(ids[pair // len(ids)], ids[pair % len(ids)]) for pair in pairs.tolist()]
    gap = stated.start_s[two] - stated.end_s[one]
    short = (gap >= 0) & (gap < np.array(times, np.int64)[which])

    def say(before: int, after: int) -> str:
        way = f"from {stated.machine[before]} to {stated.machine[after]}"
        needed = transport.seconds(stated.machine[before], stated.machine[after])
        return (
            f"{stated.order[after]} needs {duration(needed)} to get {way}, but leaves at "
            f"{reading.at(stated.end_s[before])} and starts at {reading.at(stated.start_s[after])}."
        )

    return breaches(say, one[short], two[short])


def changeovers(reading: Reading) -> Breaches:
    """A unit has the open time to change from one family to the next, from the shift's start on."""
    stated, found = reading.stated, [np.zeros((0, 3), np.int64)]
    rows = np.flatnonzero((reading.operation >= 0) & reading.lasting)
    if not reading.shop.changeovers:
        rows = rows[:0]
    machine = reading.machine[rows]
    rows = rows[np.lexsort((rows, stated.end_s[rows], stated.start_s[rows], stated.unit[rows], machine))]
    for of_machine in np.split(rows, np.flatnonzero(run_starts(reading.machine[rows]))[1:]):
        if len(of_machine):
            found.append(_too_quick(reading, of_machine))
    clashes = np.concatenate(found)
    has = {(one, two): gap for one, two, gap in clashes.tolist()}

    def say(before: int, after: int) -> str:
        machine = reading.shop.machines[int(reading.machine[after])]
        old = machine.family or "" if before == SHIFT_START else _family(reading, before)
        new = _family(reading, after)
        when = (
            f"before {stated.order[after]} starts at {reading.at(stated.start_s[after])}"
            if before == SHIFT_START
            else f"between {stated.order[before]}, to {reading.at(stated.end_s[before])}, and "
            f"{stated.order[after]}, from {reading.at(stated.start_s[after])}"
        )
        needed = duration(reading.shop.changeovers[machine.id].seconds(old, new))
        return (
            f"{reading.place(after)} needs {needed} to change from {old or 'no family'} to "
            f"{new or 'no family'} {when}, but has {duration(has[before, after])}."
        )

    return breaches(say, clashes[:, 0], clashes[:, 1])


def _too_quick(reading: Reading, rows: Ints) -> Ints:
    """Return which rows of one machine follow too soon: the row before, the row, the open time between.

    The rows are sorted by unit and time.
    """
    stated, machine = reading.stated, int(reading.machine[rows[0]])
    times = reading.shop.changeovers.get(reading.shop.machines[machine].id)
    if times is None or times.none:
        return np.zeros((0, 3), np.int64)
    one, two = _neighbours(rows, stated.unit[rows])
    end, start = stated.end_s[one], stated.start_s[two]
    family = reading.shop.machines[machine].family
    before = [_family(reading, row) for row in one.tolist()]
    if family is not None:
        first = rows[run_starts(stated.unit[rows])]
        one, two = np.r_[one, np.full(len(first), SHIFT_START)], np.r_[two, first]
        end, start = np.r_[end, np.zeros(len(first), np.int64)], np.r_[start, stated.start_s[first]]
        before += [family] * len(first)
    after = [_family(reading, row) for row in two.tolist()]
    needed = np.array([times.seconds(*pair) for pair in zip(before, after, strict=True)], np.int64)
    gap = start - end - reading.shut[machine].within(end, start)
    short = (start >= end) & (gap < needed)
    return np.column_stack([one, two, gap])[short]


def _family(reading: Reading, row: int) -> str:
    family = int(reading.shop.operations.family[reading.operation[row]])
    return "" if family == NO_FAMILY else reading.shop.families[family]


def _neighbours(rows: Ints, group: Ints) -> tuple[Ints, Ints]:
    """Return the rows, sorted by group and time, that follow each other in one group."""
    follows = np.flatnonzero(~run_starts(group))
    return rows[follows - 1], rows[follows]
