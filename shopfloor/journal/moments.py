"""Moments of a shift as recorders read and write them; the arithmetic is the model's clock's."""

from __future__ import annotations

from datetime import UTC, datetime

from shopfloor.journal.errors import EntryError
from shopfloor.model.clock import Clock, elapsed


def now_s(clock: Clock, wall: datetime) -> int | None:
    """Return the seconds from the shift's start to the wall time `wall`; None if the plan has no start.

    `wall` carries its offset from UTC. A hall with a time zone is told the exact time from it; in one
    without, the wall time of the computer is taken to be the hall's.
    """
    if not clock.running:
        return None
    if clock.zone is None:
        return clock.seconds(wall.replace(tzinfo=None, microsecond=0))
    local = wall.astimezone(UTC).astimezone(clock.zone)
    return clock.seconds(local.replace(tzinfo=None, microsecond=0))


def read(clock: Clock, text: str, now: int | None, *, field: str = "at") -> int:
    """Read a moment that somebody typed.

    Besides what the clock reads, a wall time may carry its offset: `2026-10-25T01:40+01:00`. In the hour
    that a clock set back repeats, a time without one is the latest pass that is not in the future.

    Raises
    ------
    EntryError
        If the text is no moment.
    """
    text = text.strip()
    exact = _with_offset(clock, text)
    if exact is not None:
        return exact
    try:
        first = clock.read(text)
    except (ValueError, OverflowError) as error:
        problem, _, advice = str(error).partition("; ")
        if isinstance(error, OverflowError):
            problem, advice = "is too far away", "check the year"
        raise EntryError(field, text[:40], f"{field}-unreadable", problem, advice) from None
    second = _second_pass(clock, first)
    return second if now is not None and first < second <= now else first


def _with_offset(clock: Clock, text: str) -> int | None:
    if clock.start is None or clock.zone is None or "T" not in text.upper():
        return None
    try:
        moment = datetime.fromisoformat(text)
    except ValueError:
        return None
    if moment.tzinfo is None:
        return None
    return clock.seconds(moment.astimezone(clock.zone).replace(tzinfo=None))


def _second_pass(clock: Clock, seconds: int) -> int:
    """Return the second pass of a wall time that occurs twice, else the same moment."""
    if clock.zone is None or clock.start is None:
        return seconds
    return max(seconds, clock.seconds(clock.moment(seconds).replace(fold=1)))


def write(clock: Clock, seconds: int) -> str:
    """Write a moment for files: local time, with its offset where the zone is known."""
    if clock.start is None:
        sign, size = ("-", -seconds) if seconds < 0 else ("", seconds)
        return sign + elapsed(size, with_seconds=True)
    moment = clock.moment(seconds)
    if clock.zone is not None:
        moment = moment.replace(tzinfo=clock.zone)
    return moment.isoformat(timespec="seconds")


def say(clock: Clock, seconds: int) -> str:
    """Write a moment for people; in an hour that occurs twice, with the name of the zone's time."""
    text = clock.say(seconds)
    if clock.start is None or clock.zone is None:
        return text
    moment = clock.moment(seconds)
    twice = clock.seconds(moment.replace(fold=0)) != clock.seconds(moment.replace(fold=1))
    return f"{text} {moment.replace(tzinfo=clock.zone):%Z}" if twice and clock.exists(moment) else text
