"""Plain arithmetic on the times a machine or the hall is shut: breaks and closures, laid over each other."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np

from shopfloor.model.shop import Closure, Ints


class Shut:
    """When nothing is worked: closures in any order; those that meet or overlap are made one."""

    def __init__(self, closures: Iterable[Closure]) -> None:
        self.each = tuple(_laid_over(closures))
        self.start = np.array([closure.start_s for closure in self.each], np.int64)
        self.end = np.array([closure.end_s for closure in self.each], np.int64)
        self._total = np.r_[0, np.cumsum(self.end - self.start)]

    def __len__(self) -> int:
        return len(self.each)

    def within(self, start: Ints, end: Ints) -> Ints:
        """Return the seconds shut between each start and end; O(n log c)."""
        return self._before(end) - self._before(start)

    def next(self, moment: Ints) -> Ints:
        """Return the place of the first closure that ends after each moment; their number if none does."""
        found: Ints = np.searchsorted(self.end, moment, "right")
        return found

    def begun(self, moment: Ints) -> Ints:
        """Return how many closures start before each moment."""
        found: Ints = np.searchsorted(self.start, moment, "left")
        return found

    def _before(self, moment: Ints) -> Ints:
        if not len(self):
            return np.zeros(len(moment), np.int64)
        over = self.next(moment)
        running = self.start[np.minimum(over, len(self) - 1)]
        partly = np.where(over < len(self), np.maximum(0, moment - running), 0)
        before: Ints = self._total[over] + partly
        return before

    def stretches(self, begin: int, work: int) -> Iterator[tuple[int, int]]:
        """Yield the stretches in which `work` seconds are worked, begun at `begin` and paused while shut."""
        moment, left = begin, work
        place = int(np.searchsorted(self.end, begin, "right"))
        while left > 0:
            shut = self.each[place] if place < len(self) else None
            gap = left if shut is None else min(left, max(0, shut.start_s - moment))
            if gap:
                yield moment, moment + gap
            left -= gap
            if shut is not None:
                moment = shut.end_s
                place += 1

    def finish(self, begin: int, work: int) -> int:
        """Return when `work` seconds are done at the earliest, begun at `begin`, none of them while shut."""
        moment = begin
        for _, end in self.stretches(begin, work):
            moment = end
        return moment

    def finish_pieces(self, begin: int, length: int, count: int) -> int:
        """Return when `count` pieces of `length` are done, one after another, none across a closure."""
        moment, left = begin, count
        for shut in self.each:
            if shut.end_s <= moment:
                continue
            fit = min(left, max(0, shut.start_s - moment) // length)
            left -= fit
            if not left:
                return moment + fit * length
            moment = shut.end_s
        return moment + left * length


def _laid_over(closures: Iterable[Closure]) -> list[Closure]:
    laid: list[list[Closure]] = []
    end = 0
    for closure in sorted(closures, key=lambda closure: (closure.start_s, closure.end_s, closure.reason)):
        if laid and closure.start_s <= end:
            laid[-1].append(closure)
        else:
            laid.append([closure])
        end = max(end, closure.end_s) if len(laid[-1]) > 1 else closure.end_s
    return [_one(together) for together in laid]


def _one(together: list[Closure]) -> Closure:
    reasons = dict.fromkeys(closure.reason for closure in together if closure.reason)
    return Closure(together[0].start_s, max(closure.end_s for closure in together), ", ".join(reasons))
