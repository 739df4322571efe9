"""When a machine, or one unit of it, was down. Each unit has a track of its own; track 0 is all of it."""

from __future__ import annotations

from bisect import bisect_left
from itertools import accumulate
from typing import NamedTuple

from shopfloor.model.actuals import Event, Kind, Stretch


class _Down(NamedTuple):
    """Times apart from each other and in order; `before[k]` is the length of the first k."""

    starts: list[int]
    ends: list[int]
    before: list[int]


class Outages:
    """The outages of one machine, event by event in order of time."""

    def __init__(self) -> None:
        self._tracks: dict[int, list[Stretch]] = {}
        self._merged: dict[int, _Down] = {}

    def step(self, event: Event) -> str:
        """Take one more event; return the rule it breaks, or nothing. An odd event changes nothing."""
        track = self._tracks.setdefault(event.unit, [])
        down = bool(track) and track[-1].end_s is None
        if down is (event.kind is Kind.DOWN):
            return "already-down" if down else "not-down"
        self._merged.clear()
        if event.kind is Kind.DOWN:
            track.append(Stretch(event.unit, event.at_s, None, str(event.data.get("reason", ""))))
        else:
            last = track[-1]
            track[-1] = Stretch(last.unit, last.start_s, event.at_s, last.reason)
        return ""

    def stretches(self) -> list[Stretch]:
        """Return every outage, by start and unit."""
        found = [stretch for track in self._tracks.values() for stretch in track]
        return sorted(found, key=lambda one: (one.start_s, one.unit))

    def up_time(self, unit: int, start_s: int, end_s: int) -> int:
        """Return the seconds from start to end in which `unit` was up; 0 if the end comes first.

        O(log n) for n outages, once they have been put in order.
        """
        if end_s <= start_s:
            return 0
        return end_s - start_s - (self._down_before(unit, end_s) - self._down_before(unit, start_s))

    def _down_before(self, unit: int, moment_s: int) -> int:
        down = self._merged.get(unit)
        if down is None:
            down = self._merged[unit] = self._merge(unit)
        count = bisect_left(down.starts, moment_s)  # outages that began before then
        if not count:
            return 0
        return down.before[count - 1] + min(down.ends[count - 1], moment_s) - down.starts[count - 1]

    def _merge(self, unit: int) -> _Down:
        """Join the outages of `unit` and of the whole machine where they overlap."""
        forever = 1 << 62
        starts: list[int] = []
        ends: list[int] = []
        for one in self.stretches():
            if one.unit not in (0, unit):
                continue
            end = one.until(forever)
            if ends and one.start_s <= ends[-1]:
                ends[-1] = max(ends[-1], end)
            else:
                starts.append(one.start_s)
                ends.append(end)
        lengths = (end - start for start, end in zip(starts, ends, strict=True))
        return _Down(starts, ends, [0, *accumulate(lengths)])
