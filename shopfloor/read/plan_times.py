"""The times of a plan file: what a spreadsheet may have made of them, and the hour that occurs twice."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from functools import cache

import numpy as np

from shopfloor.model.calendar import DAY, Clock
from shopfloor.model.shop import Ints, Shop
from shopfloor.read.cells import FAR_YEARS, CellFault

FAR_S = FAR_YEARS * 366 * DAY

_DATE_ONLY = re.compile(r"\d{4}-\d{2}-\d{2}")
_LOCAL_DATE = re.compile(r"\d{1,4}[./\-]\s?\d{1,2}[./\-]\s?\d{1,4}\.?([ ,T].*)?")
_TWELVE_HOURS = re.compile(r"\d{1,2}(:\d{2}){0,2}\s?[AaPp]\.?[Mm]\.?")
_SERIAL = re.compile(r"\d{1,6}([.,]\d+)?")


def moment_reader(clock: Clock) -> Callable[[str], tuple[int, int]]:
    """Return the reader of one time: seconds since the shift's start, at the first and the second pass.

    The two differ only for a wall time in the hour that a clock set back repeats. The reader raises
    :class:`CellFault` for a text that is no time, or that may mean several.
    """
    return cache(lambda text: _moment(text, clock))


def _moment(text: str, clock: Clock) -> tuple[int, int]:
    try:
        seconds = clock.read(text)
        again = seconds
        if clock.zone is not None and clock.running:
            again = clock.seconds(clock.moment(seconds).replace(fold=1))
    except OverflowError:
        raise CellFault("time-far-away", years=FAR_YEARS) from None
    except ValueError as error:
        raise _refusal(text, clock, str(error)) from None
    if abs(seconds) > FAR_S:
        raise CellFault("time-far-away", years=FAR_YEARS)
    return seconds, again


def _refusal(text: str, clock: Clock, said: str) -> CellFault:
    example = clock.write(0)
    if _DATE_ONLY.fullmatch(text) and clock.running:
        return CellFault("time-without-hours", example=example)
    if _LOCAL_DATE.fullmatch(text) and not _DATE_ONLY.match(text):
        return CellFault("date-ambiguous", example=example)
    if _TWELVE_HOURS.fullmatch(text):
        return CellFault("time-12-hour", example=example)
    if _SERIAL.fullmatch(text):
        return CellFault("time-a-number", example=example)
    problem, _, advice = said.partition("; ")
    return CellFault("time-unreadable", problem=problem, advice=advice)


def choose_passes(
    shop: Shop,
    order: Sequence[str],
    machine: Sequence[str],
    first: Mapping[str, Ints],
    second: Mapping[str, Ints],
) -> tuple[Ints, Ints]:
    """Return start and end of each row, choosing the pass of times in an hour that occurs twice.

    Of the up to four readings those count in which the row lasts as long as the order's operation on the
    machine; else those in which it lasts at all; else all. Of these the first is taken that does not start
    before the row above, since plans are written in order of start; else the first.
    """
    start, end = first["start"].copy(), first["end"].copy()
    twice = np.flatnonzero((start != second["start"]) | (end != second["end"]))
    if not len(twice):
        return start, end
    wanted = set(map(order.__getitem__, twice.tolist()))
    lengths: dict[tuple[str, str], set[int]] = {}
    for operation in shop:
        if operation.order in wanted:
            lengths.setdefault((operation.order, operation.machine_id), set()).add(operation.seconds)
    for row in twice.tolist():
        readings = [
            (int(begin), int(finish))
            for begin in (first["start"][row], second["start"][row])
            for finish in (first["end"][row], second["end"][row])
        ]
        known = lengths.get((order[row], machine[row]), set())
        fitting = [pair for pair in readings if pair[1] - pair[0] in known]
        lasting = [pair for pair in readings if pair[1] > pair[0]]
        candidates = fitting or lasting or readings
        above = start[row - 1] if row else start[row]
        start[row], end[row] = next((pair for pair in candidates if pair[0] >= above), candidates[0])
    return start, end
