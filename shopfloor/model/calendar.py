"""Working time: the clock with breaks and closures squeezed out, and back.

With :mod:`shopfloor.model.clock`, whose names stand here too, the only home of clock rules. A journal
needs wall time alone, many short calls a shift, and takes it from there without loading NumPy.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from shopfloor.model.clock import DAY as DAY
from shopfloor.model.clock import HOUR as HOUR
from shopfloor.model.clock import MINUTE as MINUTE
from shopfloor.model.clock import Clock as Clock
from shopfloor.model.clock import duration as duration
from shopfloor.model.clock import elapsed as elapsed
from shopfloor.model.clock import minutes_exact as minutes_exact
from shopfloor.model.clock import minutes_text as minutes_text

if TYPE_CHECKING:
    from collections.abc import Iterable

Ints = np.ndarray[Any, np.dtype[np.int64]]


def united(spans: Iterable[tuple[int, int]]) -> list[tuple[int, int]]:
    """Return the union of spans (start, end), in order of time and apart from each other."""
    out: list[tuple[int, int]] = []
    for start, end in sorted(spans):
        if out and start <= out[-1][1]:
            out[-1] = (out[-1][0], max(out[-1][1], end))
        else:
            out.append((start, end))
    return out


class WorkClock:
    """Working time around closures: the clock with its closures squeezed out, and back again.

    Second w of working time is the w-th second that is not closed. Methods that know no closures run
    on working time; their answers are put back on the clock here. All functions take whole seconds,
    one or a NumPy array of them, and take O(log n) each for n closures.

    Parameters
    ----------
    closures
        Pairs (start, end), in order of time and apart from each other.
    """

    def __init__(self, closures: Iterable[tuple[int, int]]) -> None:
        pairs = [(start, end) for start, end in closures if end > 0]
        starts = np.array([max(start, 0) for start, _ in pairs], np.int64)
        ends = np.array([end for _, end in pairs], np.int64)
        self._starts, self._ends = starts, ends
        self._closed = np.r_[0, np.cumsum(ends - starts)]
        # Working time at which each closure begins: there the clock jumps.
        self._jumps = starts - self._closed[:-1]

    def worked(self, moment: Any) -> Any:
        """Return the working time before a moment of the clock."""
        done = np.searchsorted(self._ends, moment, side="right")
        inside = np.searchsorted(self._starts, moment, side="right") > done
        if not len(self._starts):
            return moment
        begun = self._starts[np.minimum(done, len(self._starts) - 1)]
        return np.where(inside, begun, moment) - self._closed[done]

    def start(self, work: Any) -> Any:
        """Return the moment at which the next second of work begins: after a closure, if at one."""
        return work + self._closed[np.searchsorted(self._jumps, work, side="right")]

    def end(self, work: Any) -> Any:
        """Return the moment at which `work` seconds of work are done: before a closure, if at one."""
        return work + self._closed[np.searchsorted(self._jumps, work, side="left")]

    def finish(self, begin: int, work: int) -> int:
        """Return when `work` seconds are done that may begin at `begin` and pause over closures."""
        if not work:
            return begin
        return int(self.end(self.worked(begin) + work))

    def whole(self, begin: int, length: int, count: int) -> Ints:
        """Return the starts of `count` pieces of `length`, one after the other, none across a closure.

        The first starts at `begin` or later. No other way of placing them ends earlier, since each
        opening takes as many as fit.
        """
        starts: list[int] = []
        moment, next_closure = begin, int(np.searchsorted(self._ends, begin, side="right"))
        while len(starts) < count:
            if next_closure < len(self._starts) and moment + length > self._starts[next_closure]:
                moment = max(moment, int(self._ends[next_closure]))
                next_closure += 1
            else:
                starts.append(moment)
                moment += length
        return np.array(starts, np.int64)
