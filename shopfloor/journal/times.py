"""What the floor teaches about run times, by machine and family. Shown, never applied by itself."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from statistics import median, quantiles

from shopfloor.journal.state import counting, state
from shopfloor.journal.walk import WORK
from shopfloor.model.actuals import Event, MachineState, PieceState, Status, Stretch

Worked = Callable[[str, int, int], int]
Family = Callable[[str, str], str]


@dataclass(frozen=True, slots=True)
class Timing:
    """One finished operation: how long it was planned to run and how long it did, in seconds."""

    order: str
    machine: str
    family: str
    planned_s: int
    actual_s: int


@dataclass(frozen=True, slots=True)
class Learned:
    """The timings of one machine and family: medians, and the quartiles of the actual seconds.

    `ratio` is the median of actual over planned, each operation by itself.
    """

    machine: str
    family: str
    count: int
    planned_s: float
    actual_s: float
    low_s: float
    high_s: float
    ratio: float


def _whole(machine: str, start_s: int, end_s: int) -> int:
    return end_s - start_s


def _none(order: str, machine: str) -> str:
    return ""


def timings(events: Sequence[Event], *, family: Family = _none, worked: Worked = _whole) -> list[Timing]:
    """Return the timing of every operation of one journal that was started and finished in good order.

    Left out are operations with an entry that was accepted against a rule, and those nothing planned.
    Stops and outages count neither as planned nor as actual.

    Parameters
    ----------
    events
        All entries.
    family
        Gives the family of (order, machine); empty where it is not known.
    worked
        Gives the working time of (machine, start, end): to leave out breaks over which a machine pauses.
    """
    doubtful = {event.key for event in counting(events) if event.accepted and event.kind in WORK}
    now = state(events)
    found: list[Timing] = []
    for piece in now.pieces.values():
        key, row = piece.key, piece.planned
        if piece.status is not Status.DONE or piece.start_s is None or key in doubtful:
            continue
        planned = piece.total_s or 0
        if row is not None and row.start_s is not None and row.end_s is not None and row.seconds == planned:
            planned = worked(key.machine, row.start_s, row.end_s)
        actual = sum(worked(key.machine, *span) for span in _up(piece, now.machines[key.machine]))
        if planned > 0 and actual > 0:
            found.append(Timing(key.order, key.machine, family(key.order, key.machine), planned, actual))
    return found


def _up(piece: PieceState, machine: MachineState) -> list[tuple[int, int]]:
    """Return when an operation that is done ran on a machine that was up."""
    found: list[tuple[int, int]] = []
    for run in piece.runs:
        holes = [one for one in machine.outages if one.unit in (0, run.unit)]
        found += _without(run, holes)
    return found


def _without(run: Stretch, holes: Iterable[Stretch]) -> list[tuple[int, int]]:
    end = run.start_s if run.end_s is None else run.end_s
    found: list[tuple[int, int]] = []
    start = run.start_s
    for hole in holes:  # by start
        if hole.start_s >= end:
            break
        if hole.start_s > start:
            found.append((start, hole.start_s))
        start = max(start, hole.until(end))
    if start < end:
        found.append((start, end))
    return found


def learned(found: Iterable[Timing]) -> list[Learned]:
    """Return the timings of one or many journals by machine and family, in order of name.

    Quartiles interpolate between neighbours (Hyndman and Fan 1996, definition 7); of one timing they are
    that timing itself.
    """
    groups: dict[tuple[str, str], list[Timing]] = defaultdict(list)
    for one in found:
        groups[one.machine, one.family].append(one)
    return [_learned(*key, group) for key, group in sorted(groups.items())]


def _learned(machine: str, family: str, group: Sequence[Timing]) -> Learned:
    actual = [one.actual_s for one in group]
    low, _, high = quantiles(actual, n=4, method="inclusive") if len(actual) > 1 else (actual * 3)
    return Learned(
        machine=machine,
        family=family,
        count=len(group),
        planned_s=median(one.planned_s for one in group),
        actual_s=median(actual),
        low_s=low,
        high_s=high,
        ratio=median(one.actual_s / one.planned_s for one in group),
    )
