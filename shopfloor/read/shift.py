"""When the shift starts and ends, as said on the command line or in shop.toml."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import datetime, time, timedelta
from typing import TYPE_CHECKING

from shopfloor.model.calendar import DAY, Clock
from shopfloor.read.rules import Findings, Place

if TYPE_CHECKING:
    from zoneinfo import ZoneInfo

Moment = str | datetime | time

MAX_SHIFT_DAYS = 366
_YEARS = range(1970, 2201)


@dataclass(frozen=True, slots=True)
class Said:
    """A time as somebody wrote it, and where."""

    text: str
    place: Place


@dataclass(frozen=True, slots=True)
class Shift:
    """What was said about the shift; nothing about it has been checked but the zone."""

    start: Said | None = None
    end: Said | None = None
    zone: ZoneInfo | None = None

    def overruled(self, start: Moment | None, end: Moment | None) -> Shift:
        """Return the shift with what the command line said in place of the file."""
        shift = self
        if start is not None:
            shift = replace(shift, start=Said(written(start), Place("--start")))
        if end is not None:
            shift = replace(shift, end=Said(written(end), Place("--end")))
        return shift


def written(moment: Moment) -> str:
    """Return a date and time, or a time of day, as text."""
    return moment if isinstance(moment, str) else moment.isoformat()


def settle(shift: Shift, findings: Findings) -> tuple[Clock, int | None] | None:
    """Return the clock and the end of the shift in seconds, or None when its start or end is a fault.

    An end without a date is the next such time after the start; without a start it is elapsed time.
    """
    before = findings.count
    clock = Clock(zone=shift.zone)
    if shift.start is not None:
        start = _start(shift.start, shift.zone, findings)
        if start is None:
            return None
        clock = Clock(start, shift.zone)
    end_s = _end(shift.end, clock, findings) if shift.end is not None else None
    return (clock, end_s) if findings.count == before else None


def _start(said: Said, zone: ZoneInfo | None, findings: Findings) -> datetime | None:
    text = said.text.strip()
    if has_offset(text):
        findings.fault(said.place, "offset-not-allowed", text)
        return None
    anchor = Clock(datetime(2000, 1, 1))  # any start reads a full date and time alike
    try:
        if "-" not in text:
            raise ValueError("has no date")
        moment = anchor.moment(anchor.read(text))
    except (ValueError, OverflowError) as error:
        findings.fault(said.place, "start-unreadable", text, problem=str(error).partition("; ")[0])
        return None
    if moment.year not in _YEARS:
        findings.fault(said.place, "start-implausible", text)
        return None
    if not Clock(moment, zone).exists(moment):
        problem = "does not exist, the clocks go forward over it"
        findings.fault(said.place, "start-unreadable", text, problem=problem)
        return None
    return moment


def _end(said: Said, clock: Clock, findings: Findings) -> int | None:
    text = said.text.strip()
    if has_offset(text):
        findings.fault(said.place, "offset-not-allowed", text)
        return None
    try:
        seconds = clock.read(text)
        if seconds == 0 and clock.start is not None and "-" not in text:  # 06:00 to 06:00 is a whole day
            seconds = clock.seconds(clock.start + timedelta(days=1))
    except (ValueError, OverflowError) as error:
        problem, _, advice = str(error).partition("; ")
        findings.fault(said.place, "end-unreadable", text, problem=problem, advice=advice or "check the year")
        return None
    if seconds <= 0:
        findings.fault(said.place, "end-not-after-start", text)
        return None
    if seconds > MAX_SHIFT_DAYS * DAY:
        findings.fault(said.place, "end-too-late", text, days=MAX_SHIFT_DAYS)
        return None
    return seconds


def has_offset(text: str) -> bool:
    """Whether a date and time ends in `Z` or an offset such as `+01:00`."""
    clock_time = text.partition("T")[2] or text.partition(" ")[2]
    return bool(clock_time) and (clock_time[-1] in "Zz" or "+" in clock_time or "-" in clock_time)
