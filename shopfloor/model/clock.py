"""Wall time: everything that turns seconds into the time of day, or into words, and back. No NumPy here.

Inside the tool time is a whole number of elapsed seconds since the start of the shift. Elapsed
means as a stopwatch counts: across a daylight-saving change the wall clock jumps, these do not.
Without a shift start the clock starts at zero and is written as elapsed time.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import UTC, datetime, time, timedelta
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from zoneinfo import ZoneInfo

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
