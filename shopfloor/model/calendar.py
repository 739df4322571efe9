"""Clock rules: the only home of everything that turns seconds into wall time and back.

Inside the tool time is a whole number of elapsed seconds since the start of the shift. Elapsed
means as a stopwatch counts: across a daylight-saving change the wall clock jumps, these do not.
Without a shift start the clock starts at zero and is written as elapsed time.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import UTC, datetime, time, timedelta
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterable
    from zoneinfo import ZoneInfo

Ints = np.ndarray[Any, np.dtype[np.int64]]

MINUTE = 60
HOUR = 3600
DAY = 24 * HOUR

_DATE_TIME = re.compile(r"(\d{4}-\d{2}-\d{2})[T ](\d{2}):(\d{2})(?::(\d{2}))?")
_TIME = re.compile(r"(\d{1,2}):(\d{2})(?::(\d{2}))?")
_ELAPSED = re.compile(r"(\d{1,5}):([0-5]\d)(?::([0-5]\d))?")


@dataclass(frozen=True, slots=True)
class Clock:
    """Turns seconds since the shift's start into wall time and back.

    Parameters
    ----------
    start
        Wall time of second zero, without time zone; None for a clock that starts at zero.
    zone
        Time zone of the hall; None when wall time is taken to run evenly.
    """

    start: datetime | None = None
    zone: ZoneInfo | None = None

    @property
    def running(self) -> bool:
        """Whether wall time is known."""
        return self.start is not None

    def seconds(self, moment: datetime) -> int:
        """Return the elapsed seconds from the shift's start to the wall time `moment`.

        In the hour that a clock set back repeats, `moment.fold` tells which pass is meant.
        """
        if self.start is None:
            raise ValueError("a clock that starts at zero has no wall time")
        elapsed = self._absolute(moment) - self._absolute(self.start)
        return round(elapsed.total_seconds())

    def moment(self, seconds: int) -> datetime:
        """Return the wall time `seconds` after the shift's start, without time zone."""
        if self.start is None:
            raise ValueError("a clock that starts at zero has no wall time")
        if self.zone is None:
            return self.start + timedelta(seconds=seconds)
        absolute = self._absolute(self.start) + timedelta(seconds=seconds)
        return absolute.astimezone(self.zone).replace(tzinfo=None)

    def exists(self, moment: datetime) -> bool:
        """Whether the wall time occurs at all: false in the hour a clock set forward skips."""
        if self.zone is None:
            return True
        return self._absolute(moment).astimezone(self.zone).replace(tzinfo=None) == moment.replace(fold=0)

    def _absolute(self, moment: datetime) -> datetime:
        if self.zone is None:
            return moment.replace(tzinfo=UTC)
        return moment.replace(tzinfo=self.zone).astimezone(UTC)

    def say(self, seconds: int) -> str:
        """Write a moment for people: `13:30`, `Tue 01:15` on another day, or elapsed `7:30`."""
        if self.start is None:
            return elapsed(seconds)
        moment = self.moment(seconds)
        text = f"{moment:%H:%M:%S}" if moment.second else f"{moment:%H:%M}"
        if moment.date() == self.start.date():
            return text
        away = abs((moment.date() - self.start.date()).days)
        day = _WEEKDAYS[moment.weekday()] if away < 7 else f"{moment:%Y-%m-%d}"
        return f"{day} {text}"

    def write(self, seconds: int) -> str:
        """Write a moment for files: `2026-03-02T13:30:00`, or elapsed `7:30:00`."""
        if self.start is None:
            return elapsed(seconds, with_seconds=True)
        return self.moment(seconds).isoformat(timespec="seconds")

    def read(self, text: str) -> int:
        """Read a moment as people and files write it; the inverse of :meth:`write`.

        With a shift start: `YYYY-MM-DDTHH:MM[:SS]`, or `HH:MM[:SS]` on the shift's date, taken as past
        midnight when it lies before the start. Without one: elapsed `h:mm[:ss]`.

        Raises
        ------
        ValueError
            If the text is neither, or names a wall time that a clock set forward skips. The message
            is a rule followed by a semicolon and what to do.
        """
        text = text.strip()
        if self.start is None:
            found = _ELAPSED.fullmatch(text)
            if found is None:
                what = "is a date but the shift has no start" if _DATE_TIME.fullmatch(text) else "is no time"
                raise ValueError(f"{what}; give --start, or write elapsed time as h:mm, such as 1:30")
            return _total(found)
        moment = self._wall(text)
        if not self.exists(moment):
            raise ValueError("does not exist, the clocks go forward over it; write the time after the change")
        return self.seconds(moment)

    def _wall(self, text: str) -> datetime:
        assert self.start is not None
        advice = "write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"
        if found := _TIME.fullmatch(text):
            hour, minute, second = (int(part or 0) for part in found.groups())
            try:
                moment = datetime.combine(self.start.date(), time(hour, minute, second))
            except ValueError:
                raise ValueError(f"is no time of day; {advice}") from None
            return moment + timedelta(days=1) if moment < self.start else moment
        if _DATE_TIME.fullmatch(text):
            try:
                return datetime.fromisoformat(text.replace(" ", "T"))
            except ValueError:
                raise ValueError(f"is no date; {advice}") from None
        raise ValueError(f"is no time this tool reads; {advice}")


_WEEKDAYS = ("Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun")


def _total(found: re.Match[str]) -> int:
    hours, minutes, seconds = (int(part or 0) for part in found.groups())
    return hours * HOUR + minutes * MINUTE + seconds


def elapsed(seconds: int, *, with_seconds: bool = False) -> str:
    """Write elapsed time as `h:mm`, or `h:mm:ss` when asked or when needed: `7:30`, `0:00:45`."""
    sign = "-" if seconds < 0 else ""
    minutes, rest = divmod(abs(seconds), MINUTE)
    text = f"{sign}{minutes // 60}:{minutes % 60:02d}"
    return f"{text}:{rest:02d}" if rest or with_seconds else text


def duration(seconds: int) -> str:
    """Write a length of time for a sentence: `7 h 30`, `2 h`, `45 min`, `90 s`, `12 min 30 s`."""
    if seconds < 0:
        return f"-{duration(-seconds)}"
    hours, rest = divmod(seconds, HOUR)
    minutes, odd = divmod(rest, MINUTE)
    if hours:
        if odd:
            return f"{hours} h {minutes} min {odd} s"
        return f"{hours} h {minutes:02d}" if minutes else f"{hours} h"
    if minutes:
        return f"{minutes} min {odd} s" if odd else f"{minutes} min"
    return f"{odd} s"


def minutes_exact(seconds: int) -> str:
    """Write a length so that it reads back exactly: `12.5`, or `0:12:20` where decimals end nowhere."""
    whole, rest = divmod(seconds, MINUTE)
    if rest == 0:
        return str(whole)
    text = f"{seconds / MINUTE:.2f}".rstrip("0")
    return text if round(float(text) * MINUTE * 100) == seconds * 100 else elapsed(seconds, with_seconds=True)


def minutes_text(seconds: int) -> str:
    """Write a length as decimal minutes, exactly where two digits allow: `30`, `12.5`, `0.25`."""
    whole, rest = divmod(seconds, MINUTE)
    return str(whole) if not rest else f"{seconds / MINUTE:.2f}".rstrip("0")


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
