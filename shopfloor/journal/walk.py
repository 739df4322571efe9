"""The life of one operation, event by event: the only home of what may follow what.

    fresh --started--> running --stopped--> stopped --resumed--> running --finished--> done

A stopped operation may also be declared finished. Every sequence of events has an outcome: what does not
follow is listed as odd and taken in the likeliest sense, since a journal may hold it all the same.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field
from enum import Enum
from typing import Any

from shopfloor.model.actuals import Event, Kind, Odd, Stretch

WORK = frozenset({Kind.STARTED, Kind.STOPPED, Kind.RESUMED, Kind.FINISHED, Kind.LEFT})


class Phase(Enum):
    """Where an operation is in its life."""

    FRESH = "not started"
    RUNNING = "running"
    STOPPED = "stopped"
    DONE = "finished"


# What each phase makes of an event that does not follow.
_ODD: dict[tuple[Phase, Kind], str] = {
    (Phase.FRESH, Kind.STOPPED): "not-started",
    (Phase.FRESH, Kind.RESUMED): "not-started",
    (Phase.FRESH, Kind.FINISHED): "not-started",
    (Phase.FRESH, Kind.LEFT): "not-started",
    (Phase.RUNNING, Kind.STARTED): "already-running",
    (Phase.RUNNING, Kind.RESUMED): "already-running",
    (Phase.STOPPED, Kind.STARTED): "already-started",
    (Phase.STOPPED, Kind.STOPPED): "already-stopped",
    (Phase.DONE, Kind.STARTED): "already-finished",
    (Phase.DONE, Kind.STOPPED): "already-finished",
    (Phase.DONE, Kind.RESUMED): "already-finished",
    (Phase.DONE, Kind.FINISHED): "already-finished",
    (Phase.DONE, Kind.LEFT): "already-finished",
}


@dataclass(slots=True)
class Walk:
    """What the events of one operation add up to.

    `reports` are (time, seconds left) as somebody said; `since_s` is when the present phase began.
    """

    phase: Phase = Phase.FRESH
    since_s: int = 0
    unit: int = 0
    start_s: int | None = None
    end_s: int | None = None
    runs: list[Stretch] = field(default_factory=list)
    pauses: list[Stretch] = field(default_factory=list)
    reports: list[tuple[int, int]] = field(default_factory=list)
    good: int | None = None
    scrap: int | None = None
    odd: list[Odd] = field(default_factory=list)

    def step(self, event: Event) -> None:
        """Take one more event, later than those before or of the same time and a later place."""
        rule = _ODD.get((self.phase, event.kind))
        if rule is not None:
            self.odd.append(Odd(event.place, rule))
        at, data = event.at_s, event.data
        if event.kind in (Kind.STARTED, Kind.RESUMED):
            self._run(at, event.unit)
        elif event.kind is Kind.STOPPED and self.phase is Phase.RUNNING:
            self._close(at)
            self.pauses.append(Stretch(self.unit, at, None, str(data.get("reason", ""))))
            self._enter(Phase.STOPPED, at)
        elif event.kind is Kind.FINISHED:
            self._finish(at, data)
        if "left_s" in data and self.phase in (Phase.RUNNING, Phase.STOPPED):
            self.reports.append((at, int(data["left_s"])))

    def _enter(self, phase: Phase, at: int) -> None:
        self.phase, self.since_s = phase, at

    def _run(self, at: int, unit: int) -> None:
        if self.phase is Phase.RUNNING:
            return
        if self.phase is Phase.DONE:  # taken up again, whatever was said
            self.end_s = None
        self._close(at)
        self.unit = unit or self.unit or 1
        self.runs.append(Stretch(self.unit, at))
        if self.start_s is None:
            self.start_s = at
        self._enter(Phase.RUNNING, at)

    def _finish(self, at: int, data: Any) -> None:
        self._close(at)
        self.end_s = at
        self.good, self.scrap = data.get("good"), data.get("scrap")
        self._enter(Phase.DONE, at)

    def _close(self, at: int) -> None:
        """End the run or the pause that lasts."""
        for stretches in (self.runs, self.pauses):
            if stretches and stretches[-1].end_s is None:
                last = stretches[-1]
                stretches[-1] = Stretch(last.unit, last.start_s, at, last.reason)


def walk(events: Iterable[Event]) -> Walk:
    """Return what the events of one operation add up to; `events` in order of time and place. O(n)."""
    found = Walk()
    for event in events:
        found.step(event)
    return found
