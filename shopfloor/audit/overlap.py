"""Rules between rows: one order in one place, one order on a unit, releases, steps."""

from __future__ import annotations

import numpy as np

from shopfloor.audit.columns import latest_so_far, run_starts
from shopfloor.audit.reading import Breaches, Reading, breaches
from shopfloor.model.calendar import duration
from shopfloor.model.shop import NO_STEP, Ints


def order_overlaps(reading: Reading) -> Breaches:
    """No order is in two places at once."""
    stated = reading.stated

    def say(one: int, two: int) -> str:
        return (
            f"{stated.order[one]} is on {reading.place(one)} {reading.span(one)} and on "
            f"{reading.place(two)} {reading.span(two)}: in two places for {_together(reading, one, two)}."
        )

    rows = np.flatnonzero(reading.lasting & (reading.job >= 0))
    return breaches(say, *_clashes(reading, rows, reading.job[rows]))


def machine_overlaps(reading: Reading) -> Breaches:
    """No unit of a machine runs two rows at once."""
    stated = reading.stated

    def say(one: int, two: int) -> str:
        return (
            f"{reading.place(one)} runs {stated.order[one]} {reading.span(one)} and {stated.order[two]} "
            f"{reading.span(two)}: two at once for {_together(reading, one, two)}."
        )

    rows = np.flatnonzero(reading.lasting & (reading.machine >= 0))
    return breaches(say, *_clashes(reading, rows, reading.machine[rows], stated.unit[rows]))


def _clashes(reading: Reading, rows: Ints, *place: Ints) -> tuple[Ints, Ints]:
    """Return the rows that start before an earlier row in the same place has ended, after that row.

    Each row is held against the row with the latest end among those before it, so there is at most one
    clash for every row, and none is found only if no two rows overlap.
    """
    start, end = reading.stated.start_s[rows], reading.stated.end_s[rows]
    order = np.lexsort((rows, end, start, *place[::-1]))
    rows, start, end = rows[order], start[order], end[order]
    first = run_starts(*(column[order] for column in place))
    before = np.r_[0, latest_so_far(first, end)[:-1]] if len(rows) else np.zeros(0, np.int64)
    clash = np.flatnonzero(~first & (start < end[before]))
    return rows[before[clash]], rows[clash]


def _together(reading: Reading, one: int, two: int) -> str:
    end = reading.stated.end_s
    return duration(int(min(end[one], end[two]) - reading.stated.start_s[two]))


def releases(reading: Reading) -> Breaches:
    """No order starts before its release; a start before the shift is reported as that alone."""
    stated, release = reading.stated, reading.shop.orders.release_s
    known = np.flatnonzero((reading.job >= 0) & (stated.start_s >= 0))
    early = known[stated.start_s[known] < release[reading.job[known]]]

    def say(row: int) -> str:
        return (
            f"{stated.order[row]} on {reading.place(row)} starts at {reading.at(stated.start_s[row])}, "
            f"before its release at {reading.at(release[reading.job[row]])}."
        )

    return breaches(say, early)


def steps(reading: Reading) -> Breaches:
    """Within an order, lower steps finish before higher ones start."""
    stated, step = reading.stated, reading.shop.operations.step
    rows = np.flatnonzero((reading.operation >= 0) & reading.lasting)
    rows = rows[step[reading.operation[rows]] != NO_STEP]
    rank, job = step[reading.operation[rows]], reading.job[rows]
    order = np.lexsort((rows, stated.end_s[rows], rank, job))
    rows, rank, job = rows[order], rank[order], job[order]

    def say(lower: int, row: int) -> str:
        return (
            f"{stated.order[row]} on {reading.place(row)} (step {step[reading.operation[row]]}) starts at "
            f"{reading.at(stated.start_s[row])}, before step {step[reading.operation[lower]]} on "
            f"{reading.place(lower)} ends at {reading.at(stated.end_s[lower])}."
        )

    if not len(rows):
        return breaches(say, rows, rows)
    new_job = run_starts(job)
    latest = latest_so_far(new_job, stated.end_s[rows])
    level = run_starts(job, rank)
    # of the rows of lower steps, the last to end: the latest so far just before this step begins
    before = np.r_[0, latest[:-1]][np.flatnonzero(level)][np.cumsum(level) - 1]
    lowest = new_job[np.flatnonzero(level)][np.cumsum(level) - 1]
    early = ~lowest & (stated.start_s[rows] < stated.end_s[rows][before])
    return breaches(say, rows[before[early]], rows[early])
