"""When a machine is open, as plain lists: the clock rules of the model for one moment at a time.

:class:`~shopfloor.model.calendar.WorkClock` answers for arrays; a loop that asks for one moment after the
other is several times faster on lists. The tests hold both against each other.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterable

from shopfloor.model.calendar import united


class Openings:
    """The time outside closures. Every question takes O(log c) for c closures, and one step a closure met.

    Parameters
    ----------
    closures
        Pairs (start, end) in seconds, in any order; they may overlap.
    pauses
        Whether work may stop for a closure and go on after it.
    """

    __slots__ = ("_ends", "_starts", "_total", "always", "pauses")

    def __init__(self, closures: Iterable[tuple[int, int]], *, pauses: bool) -> None:
        spans = united((max(start, 0), end) for start, end in closures if end > 0)
        self._starts = [start for start, _ in spans]
        self._ends = [end for _, end in spans]
        self._total = [0]  # seconds shut before each closure
        for start, end in spans:
            self._total.append(self._total[-1] + end - start)
        self.pauses = pauses
        self.always = not spans  # open without end: loops may skip every question

    def at(self, moment: int) -> int:
        """Return the first open moment from `moment` on."""
        place = bisect_right(self._ends, moment)
        return self._ends[place] if place < len(self._ends) and self._starts[place] <= moment else moment

    def after(self, moment: int, work: int) -> int:
        """Return when `work` seconds of open time have passed since `moment`; `moment` itself for none."""
        if not work:
            return moment
        starts, ends = self._starts, self._ends
        place, size = bisect_right(ends, moment), len(ends)
        if place < size and starts[place] <= moment:
            moment = ends[place]
            place += 1
        moment += work
        while place < size and starts[place] < moment:
            moment += ends[place] - starts[place]
            place += 1
        return moment

    def fit(self, moment: int, work: int) -> tuple[int, int]:
        """Return start and end of a visit of `work` seconds, as early as it fits from `moment` on."""
        starts, ends = self._starts, self._ends
        place, size = bisect_right(ends, moment), len(ends)
        if self.pauses:
            if place < size and starts[place] <= moment:
                moment = ends[place]
                place += 1
            end = moment + work
            while place < size and starts[place] < end:
                end += ends[place] - starts[place]
                place += 1
            return moment, end
        while place < size and starts[place] < moment + work:
            moment = max(moment, ends[place])
            place += 1
        return moment, moment + work

    def worked(self, moment: int) -> int:
        """Return the open seconds before `moment`."""
        place = bisect_right(self._ends, moment)
        inside = place < len(self._ends) and self._starts[place] <= moment
        return (self._starts[place] if inside else moment) - self._total[place]

    def stretches(self, start: int, work: int) -> list[tuple[int, int]]:
        """Return the stretches in which `work` seconds are worked, begun at `start`, an open moment."""
        starts, ends = self._starts, self._ends
        place, size = bisect_right(ends, start), len(ends)
        found = []
        while place < size and starts[place] < start + work:
            found.append((start, starts[place]))
            work -= starts[place] - start
            start = ends[place]
            place += 1
        found.append((start, start + work))
        return found
