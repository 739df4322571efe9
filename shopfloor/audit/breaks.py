"""Plain arithmetic on the hall's breaks: how much of a span is break, and when work ends that pauses."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from shopfloor.model.shop import Closure, Ints


class Breaks:
    """The breaks of a hall, in order of time and apart from each other."""

    def __init__(self, breaks: Sequence[Closure]) -> None:
        self.each = tuple(breaks)
        self._start = np.array([pause.start_s for pause in breaks], np.int64)
        self._end = np.array([pause.end_s for pause in breaks], np.int64)
        self._total = np.r_[0, np.cumsum(self._end - self._start)]

    def __len__(self) -> int:
        return len(self.each)

    def within(self, start: Ints, end: Ints) -> Ints:
        """Return the seconds of break between each start and end; O(n log b)."""
        return self._before(end) - self._before(start)

    def next(self, moment: Ints) -> Ints:
        """Return the first break that ends after each moment, by its place; their number if there is none."""
        found: Ints = np.searchsorted(self._end, moment, "right")
        return found

    def begun(self, moment: Ints) -> Ints:
        """Return how many breaks start before each moment."""
        found: Ints = np.searchsorted(self._start, moment, "left")
        return found

    def _before(self, moment: Ints) -> Ints:
        over = self.next(moment)
        if not len(self):
            return np.zeros(len(moment), np.int64)
        running = self._start[np.minimum(over, len(self) - 1)]
        partly = np.where(over < len(self), np.maximum(0, moment - running), 0)
        before: Ints = self._total[over] + partly
        return before

    def finish(self, begin: int, work: int) -> int:
        """Return when `work` seconds are done at the earliest, begun at `begin`, with none in a break."""
        moment, left = begin, work
        for pause in self.each:
            if not left or pause.end_s <= moment:
                continue
            gap = max(0, pause.start_s - moment)
            if left <= gap:
                break
            moment, left = pause.end_s, left - gap
        return moment + left

    def finish_pieces(self, begin: int, length: int, count: int) -> int:
        """Return when `count` pieces of `length` are done, one after another, none of them across a break."""
        moment, left = begin, count
        for pause in self.each:
            if pause.end_s <= moment:
                continue
            fit = min(left, max(0, pause.start_s - moment) // length)
            left -= fit
            if not left:
                return moment + fit * length
            moment = pause.end_s
        return moment + left * length
