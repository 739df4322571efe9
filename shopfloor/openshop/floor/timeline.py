"""What is taken when: the line of one order or one unit, and the level of a crew or a group.

Both answer one question: may this visit stand here, and if not, from when on might it? Whoever places a
visit asks all of them in turn and moves it later until none objects. That finds the earliest place, since
no answer ever skips one.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Callable

from shopfloor.openshop.floor.rules import NONE, Table


def elapsed(moment: int, seconds: int) -> int:
    """Return `moment` and `seconds` more: time that runs through closures."""
    return moment + seconds


class Line:
    """Visits one after the other, in order of time, with time between neighbours.

    The line of an order, whose visits are labelled by machine, with transport between them; or that of a
    unit, whose visits are labelled by family, with changeovers between them. As no way round is shorter,
    what holds for neighbours holds for all.

    Parameters
    ----------
    between
        Seconds from label to label, None where there are none.
    after
        When such seconds have passed, from a moment on: in elapsed or in open time.
    begins
        The label before the first visit, ``NONE`` if any will do.
    """

    __slots__ = ("_after", "_begins", "_between", "end", "label", "operation", "start")

    def __init__(
        self, between: Table | None, after: Callable[[int, int], int] = elapsed, begins: int = NONE
    ) -> None:
        self.start: list[int] = []
        self.end: list[int] = []
        self.label: list[int] = []
        self.operation: list[int] = []
        self._between, self._after, self._begins = between, after, begins

    def clash(self, start: int, end: int, work: int, label: int) -> int:
        """Return `start` if a visit may stand there, else a later moment before which it may not start.

        `work` is the least time it may take. O(log n) and one step for each gap too short for it.
        """
        starts, ends, between = self.start, self.end, self._between
        place, size = bisect_right(ends, start), len(ends)
        if between is not None:
            before, free = (self.label[place - 1], ends[place - 1]) if place else (self._begins, 0)
            if before != NONE:
                ready = self._after(free, between[before][label])
                if ready > start:
                    return ready
            if place < size:
                end = self._after(end, between[label][self.label[place]])
        if place == size or end <= starts[place]:
            return start
        place += 1
        while place < size and starts[place] - ends[place - 1] < work:
            place += 1
        return ends[place - 1]

    def take(self, start: int, end: int, label: int, operation: int) -> None:
        """Let a visit stand where it may."""
        place = bisect_right(self.end, start)
        self.start.insert(place, start)
        self.end.insert(place, end)
        self.label.insert(place, label)
        self.operation.insert(place, operation)

    def give_back(self, start: int, operation: int) -> None:
        """Remove the visit of an operation that starts at `start`; one of no length may start there too."""
        place = bisect_left(self.start, start)
        while self.operation[place] != operation:
            place += 1
        for column in (self.start, self.end, self.label, self.operation):
            del column[place]


class Level:
    """How much is free from when on: the heads of a crew, or the units of a group that are all alike.

    Parameters
    ----------
    since, free
        The moments of change from zero on, and what is free from each.
    """

    __slots__ = ("free", "since")

    def __init__(self, since: list[int], free: list[int]) -> None:
        self.since, self.free = since, free

    def copy(self) -> Level:
        """Return a level that changes by itself."""
        return Level(self.since[:], self.free[:])

    def clash(self, start: int, end: int, need: int) -> int:
        """Return ``NONE`` if `need` is free from `start` to `end`, else when too little has last been free.

        The first stretch with too little counts: until its end, a moment returned, nothing that starts
        at `start` or later and lasts as long may start. ``FOR_EVER`` if that never ends.
        """
        since, free = self.since, self.free
        place, size = bisect_right(since, start) - 1, len(since)
        while place < size and since[place] < end:
            if free[place] < need:
                place += 1
                while place < size and free[place] < need:
                    place += 1
                return since[place] if place < size else FOR_EVER
            place += 1
        return NONE

    def take(self, start: int, end: int, amount: int) -> None:
        """Take `amount` from `start` to `end`; a negative amount gives it back."""
        free = self.free
        first = self._cut(start)
        for place in range(first, self._cut(end)):
            free[place] -= amount

    def _cut(self, moment: int) -> int:
        """Let a stretch begin at `moment` and return its place."""
        place = bisect_left(self.since, moment)
        if place == len(self.since) or self.since[place] != moment:
            self.since.insert(place, moment)
            self.free.insert(place, self.free[place - 1])
        return place


FOR_EVER = 2**62  # later than any moment of a plan
