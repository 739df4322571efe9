"""Rules about what the hall provides: machines that are open, and crews."""

from __future__ import annotations

import numpy as np

from shopfloor.audit.columns import latest_so_far
from shopfloor.audit.reading import Breaches, Reading, breaches
from shopfloor.audit.shut import Shut
from shopfloor.model.shop import Bools, Crew, Ints


def closures(reading: Reading) -> Breaches:
    """Nothing starts or ends while its machine is shut, and only machines that pause go on afterwards."""
    found = [np.zeros((0, 3), np.int64)]
    for shut, machines in reading.calendars:
        if len(shut):
            found.append(_shut_out(reading, shut, machines))
    rows, place, how = np.concatenate(found).T
    which = dict(zip(rows.tolist(), zip(place.tolist(), how.tolist(), strict=True), strict=True))

    def say(row: int) -> str:
        place, how = which[row]
        machine = reading.stated.machine[row]
        shut = reading.shut[int(reading.machine[row])].each[place]
        named = f" ({shut.reason})" if shut.reason else ""
        span = f"while {machine} is shut from {reading.at(shut.start_s)} to {reading.at(shut.end_s)}{named}"
        does = ("runs on", "starts", "ends")[how]
        return f"{reading.visit(row)} {does} {span}{'' if how else ', and it does not pause'}."

    return breaches(say, rows)


def _shut_out(reading: Reading, shut: Shut, machines: Bools) -> Ints:
    """Return offending rows on some machines, the closure each meets, and how: 0 across, 1 start, 2 end."""
    rows = np.flatnonzero(reading.lasting & (reading.machine >= 0))
    rows = rows[machines[reading.machine[rows]]]
    start, end = reading.stated.start_s[rows], reading.stated.end_s[rows]
    met = shut.next(start) < shut.begun(end)
    rows, start, end = rows[met], start[met], end[met]
    first, last = shut.next(start), shut.begun(end) - 1  # the closures a row meets, from first to last
    starts_in, ends_in = shut.start[first] <= start, end <= shut.end[last]
    how = np.where(starts_in, 1, np.where(ends_in, 2, 0))
    place = np.where(how == 2, last, first)
    wrong = (how > 0) | ~reading.pauses[reading.machine[rows]]
    return np.column_stack([rows, place, how])[wrong]


def crews(reading: Reading) -> Breaches:
    """At no moment do the operations that are attended take more heads from a crew than it has then."""
    clashes = [np.zeros((0, 2), np.int64)]
    told: dict[tuple[int, int], tuple[str, int, int, int]] = {}
    for crew in reading.shop.crews:
        row, start, end = _attended(reading, crew)
        for other, mine, moment, taken, there in _overdrawn(reading, crew, row, start, end):
            told.setdefault((other, mine), (crew.id, moment, taken, there))
    clashes.append(np.array(list(told), np.int64).reshape(-1, 2))

    def say(other: int, row: int) -> str:
        name, moment, taken, there = told[other, row]
        beside = "" if other == row else f" beside {reading.stated.order[other]} on {reading.place(other)}"
        has = "1 head" if there == 1 else f"{there} heads"
        return (
            f"Crew {name} has {has} at {reading.at(moment)}, but {taken} are taken, by "
            f"{reading.stated.order[row]} on {reading.place(row)}{beside}."
        )

    return breaches(say, *np.concatenate(clashes).T)


def _attended(reading: Reading, crew: Crew) -> tuple[Ints, Ints, Ints]:
    """Return row, start and end of every stretch in which the crew is wanted.

    That is while a row is worked; on machines where only the set-up is attended, until the operation has
    been worked on for as long as its set-up takes.
    """
    machines, operations = reading.shop.machines, reading.shop.operations
    theirs = np.array([machine.crew == crew.id for machine in machines], bool)
    only_set_up = np.array([machine.set_up_only for machine in machines], bool)
    rows, first = reading.pieces
    worked = reading.seconds[rows]
    before = np.cumsum(worked) - worked
    before -= before[first][np.cumsum(first) - 1] if len(rows) else 0
    set_up = np.clip(operations.setup_s[reading.operation[rows]] - before, 0, worked)
    wanted = np.where(only_set_up[reading.machine[rows]], set_up, worked)
    ours = theirs[reading.machine[rows]] & (operations.heads[reading.operation[rows]] > 0)
    ours &= reading.lasting[rows] & (wanted > 0)
    rows, wanted = rows[ours], wanted[ours]
    start, end = reading.stated.start_s[rows], reading.stated.end_s[rows]
    broken = reading.seconds[rows] != end - start  # work that paused for a closure
    stretches = [
        (row, *stretch)
        for row, begin, work in np.column_stack([rows, start, wanted])[broken].tolist()
        for stretch in reading.shut[int(reading.machine[row])].stretches(begin, work)
    ]
    whole = np.column_stack([rows, start, start + wanted])[~broken]
    row, begin, finish = np.concatenate([whole, np.array(stretches, np.int64).reshape(-1, 3)]).T
    return row, begin, finish


def _overdrawn(
    reading: Reading, crew: Crew, row: Ints, start: Ints, end: Ints
) -> list[tuple[int, int, int, int, int]]:
    """Return the moments at which too much is taken: another row, the row, the moment, taken, there.

    It is enough to look where a stretch begins, counting those begun by then less those ended, and where
    the crew shrinks.
    """
    order = np.lexsort((row, end, start))
    row, start, end = row[order], start[order], end[order]
    heads = reading.shop.operations.heads[reading.operation[row]]
    by_end = np.argsort(end, kind="stable")
    begun, ended = np.r_[0, np.cumsum(heads)], np.r_[0, np.cumsum(heads[by_end])]
    last_to_end = latest_so_far(np.arange(len(row)) == 0, end)

    moments = np.array(sorted({moment for level in crew.levels for moment in level[:2]}), np.int64)
    moment = np.r_[start, moments]
    count = np.r_[np.arange(1, len(row) + 1), np.searchsorted(start, moments, "left")]
    taken = begun[count] - ended[np.searchsorted(end[by_end], moment, "right")]
    there = _heads_there(crew, moment)
    found = []
    for k in np.flatnonzero((taken > there) & (count > 0)).tolist():
        mine = count[k] - 1 if k < len(row) else last_to_end[count[k] - 1]
        other = last_to_end[mine - 1] if mine else mine
        if end[other] <= moment[k]:
            other = mine
        found.append((int(row[other]), int(row[mine]), int(moment[k]), int(taken[k]), int(there[k])))
    return sorted(found, key=lambda clash: clash[2])


def _heads_there(crew: Crew, moment: Ints) -> Ints:
    there = np.full(len(moment), crew.heads, np.int64)
    for start, end, heads in crew.levels:
        there[(moment >= start) & (moment < end)] = heads
    return there
