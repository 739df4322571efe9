"""Where the operations of one machine or crew may stand: the few starts among which a best one always is.

Time is cut into slots, at whose edges prices may change; closures begin and end at edges. The cost of a
start is then linear between starts at which the operation begins, ends or has its attended part end at
an edge, or its order ends at an edge or begins to be late. Seconds are kept whole: nothing is rounded to
the slots.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shopfloor.model.shop import Bools, Ints, Shop

FAR = np.iinfo(np.int64).max


@dataclass(frozen=True)
class Spots:
    """Candidate starts: a line an operation, a column a candidate.

    Attributes
    ----------
    begin
        In open time of the operation's machine.
    finish
        The earliest end of its order, on the clock.
    legal
        Whether it may start there.
    taken_from, taken_to, late
        Slot, and seconds into it, at which what is priced begins and ends and at which its order ends, late.
    """

    begin: Ints
    finish: Ints
    legal: Bools
    taken_from: tuple[Ints, Ints]
    taken_to: tuple[Ints, Ints]
    late: tuple[Ints, Ints]


@dataclass(frozen=True)
class Places:
    """The operations of one machine or crew, and where they may stand.

    Attributes
    ----------
    machine
        Its index, -1 for a crew.
    rows
        Index of each operation into the shop's.
    taken, rate
        For how long each takes what the prices are for, and how much of it.
    late_from
        From when on each one's order is late beyond what it is in any case.
    edges, open_at, line
        Edges of the slots: on the clock; in open time, a line a machine; which line is each operation's.
    room
        What there is in each slot, in seconds of one unit or head; the last, without end, has no price.
    """

    machine: int
    rows: Ints
    taken: Ints
    rate: Ints
    late_from: Ints
    edges: Ints
    open_at: Ints
    line: Ints
    room: Ints
    spots: Spots

    def late_in(self, finish: Ints, which: Ints | None = None) -> Ints:
        """Return the seconds that orders are late in each slot when they end then, a line an operation.

        `which` names the operations, all of them if None.
        """
        since = self.late_from if which is None else self.late_from[which]
        upper = np.minimum(np.append(self.edges[1:], FAR), finish[:, None])
        late: Ints = np.maximum(upper - np.maximum(self.edges, since[:, None]), 0)
        return late

    def taken_in(self, begin: Ints) -> Ints:
        """Return the seconds that each takes of each slot but the last, when it begins then."""
        edges = self.open_at[self.line]
        upper = np.minimum(edges[:, 1:], (begin + self.taken)[:, None])
        taken: Ints = np.maximum(upper - np.maximum(edges[:, :-1], begin[:, None]), 0)
        return taken


def places(shop: Shop, machine: int, rows: Ints, late_from: Ints, edges: Ints, room: Ints) -> Places:
    """Return where `rows` may stand: operations of one machine, or of a crew where `machine` is -1.

    Parameters
    ----------
    late_from
        For each order of the shop.
    edges
        From zero on, with those of every closure that begins before the last.
    """
    columns = shop.operations
    taken, rate = columns.seconds[rows], np.ones(len(rows), np.int64)
    if machine < 0:
        taken, rate = attended_s(shop, rows), columns.heads[rows]
    since = late_from[columns.job[rows]]
    indices, line = np.unique(columns.machine[rows], return_inverse=True)
    open_at = np.array([shop.machine_clocks[index].worked(edges) for index in indices.tolist()], np.int64)
    mine = [np.flatnonzero(line == place) for place in range(len(indices))]
    found = [
        _spots(shop, index, rows[here], taken[here], since[here], edges)
        for index, here in zip(indices.tolist(), mine, strict=True)
    ]
    spots = _joined(found, np.concatenate(mine))
    return Places(machine, rows, taken, rate, since, edges, open_at, line, room, spots)


def attended_s(shop: Shop, rows: Ints) -> Ints:
    """Return for how many seconds each of `rows` takes its heads, from its start."""
    columns = shop.operations
    only_set_up = np.array([each.set_up_only for each in shop.machines], np.bool_)[columns.machine[rows]]
    attended: Ints = np.where(only_set_up, columns.setup_s[rows], columns.seconds[rows])
    return attended


def _spots(shop: Shop, machine: int, rows: Ints, taken: Ints, since: Ints, edges: Ints) -> Spots:
    """Return the candidates of operations of one machine."""
    clock, hall = shop.machine_clocks[machine], shop.work_clock
    length, tail = shop.operations.seconds[rows][:, None], shop.tail_s[rows][:, None]
    open_at = np.asarray(clock.worked(edges))
    moments = np.c_[np.broadcast_to(edges, (len(rows), len(edges))), since]
    order_ends = hall.end(np.maximum(hall.worked(moments) - tail, 0))  # the latest end with which it does
    every = np.broadcast_to(open_at, (len(rows), len(edges)))
    head = np.asarray(clock.worked(shop.head_s[rows]))[:, None]
    at = [every, every - length, every - taken[:, None], np.asarray(clock.worked(order_ends)) - length, head]
    at = [*at, np.asarray(clock.worked(moments[:, -1:])) - length]
    begin = np.sort(np.maximum(np.concatenate(at, axis=1), head), axis=1)
    end = np.asarray(clock.end(begin + length))
    finish = np.where(tail > 0, hall.end(hall.worked(end) + tail), end)
    legal = np.c_[np.ones((len(rows), 1), np.bool_), begin[:, 1:] != begin[:, :-1]]
    if not shop.machines[machine].pauses:  # none across a closure
        # after the last edge every place is taken for one: what it costs later is no less
        legal &= (np.asarray(clock.start(begin)) + length == end) | (begin >= open_at[-1])
    late = np.searchsorted(edges, finish, side="right") - 1
    into = np.maximum(finish, since[:, None]) - np.maximum(edges[late], since[:, None])
    keep = np.argsort(~legal, axis=1, kind="stable")[:, : int(legal.sum(axis=1).max(initial=1))]
    begin, finish, late, into = (np.take_along_axis(each, keep, 1) for each in (begin, finish, late, into))
    legal = np.take_along_axis(legal, keep, 1)

    def located(moment: Ints) -> tuple[Ints, Ints]:
        slot = np.searchsorted(open_at, moment, side="right") - 1
        return slot, moment - open_at[slot]

    return Spots(begin, finish, legal, located(begin), located(begin + taken[:, None]), (late, into))


def _joined(found: list[Spots], lines: Ints) -> Spots:
    """Return candidates of several machines as one table, its lines in the order of `lines`' places."""
    width = max(each.begin.shape[1] for each in found)
    back = np.argsort(lines, kind="stable")

    def table(parts: list[Ints]) -> Ints:
        return np.concatenate([np.pad(p, ((0, 0), (0, width - p.shape[1]))) for p in parts])[back]

    def pair(parts: list[tuple[Ints, Ints]]) -> tuple[Ints, Ints]:
        return table([slot for slot, _ in parts]), table([into for _, into in parts])

    return Spots(
        table([each.begin for each in found]),
        table([each.finish for each in found]),
        table([each.legal.astype(np.int64) for each in found]) > 0,
        pair([each.taken_from for each in found]),
        pair([each.taken_to for each in found]),
        pair([each.late for each in found]),
    )
