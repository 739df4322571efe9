"""Everything placed so far, and the earliest legal place for one operation more.

Operations may be placed in any order, into gaps too, and taken out again. :func:`serial` fills a whole
timetable from a list: a serial generation of schedules (R. Kolisch, E.J.O.R. 90 (1996) 320-333). Taken
in order of the starts of a schedule that is best by makespan or tardiness, each on its unit there, no
operation is placed later than in it: what stands earlier never hinders a move to the left, as no way
round takes longer and a pause never makes an earlier start end later. So some list gives the best.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.timeline import FOR_EVER, Level, Line

NOWHERE = None  # no legal place: heads that never come, or a higher step that stands before


@dataclass(frozen=True, slots=True)
class Spot:
    """Where an operation may stand: `unit` counts from 0, ``NONE`` where units are alike and dealt later."""

    start: int
    end: int
    unit: int


class Timetable:
    """What stands where.

    Attributes
    ----------
    spots
        Of each operation, None if it does not stand anywhere yet.
    """

    def __init__(self, rules: Rules) -> None:
        self.rules = rules
        self.spots: list[Spot | None] = [None] * len(rules)
        self._orders = [Line(rules.transport) for _ in rules.release]
        self._crews = [Level(since[:], heads[:]) for since, heads in rules.crews]
        self._groups: list[Level | None] = []
        self._units: list[list[Line]] = []
        for count, change, begins, openings in zip(
            rules.count, rules.change, rules.begins, rules.openings, strict=True
        ):
            alike = count > 1 and change is None
            self._groups.append(Level([0], [count]) if alike else None)
            self._units.append([] if alike else [Line(change, openings.after, begins) for _ in range(count)])
        self._steps: list[list[int]] = [[] for _ in rules.release]
        for operation, (job, step) in enumerate(zip(rules.job, rules.step, strict=True)):
            if step != NONE:
                self._steps[job].append(operation)

    def earliest(self, operation: int, begin: int = 0, unit: int | None = None) -> Spot | None:
        """Return the first legal place of an operation at `begin` or later, beside all that stands.

        Parameters
        ----------
        unit
            The only unit, counted from 0, on which it may stand; any if left out. Without effect where
            units are alike. Of several that are as early, the one that is free for the shortest time.

        Returns
        -------
        None if there is no place.
        """
        rules = self.rules
        begin, latest = max(begin, rules.release[rules.job[operation]]), FOR_EVER
        if rules.step[operation] != NONE:
            begin, latest = self._between_steps(operation, begin)
        units = self._units[rules.machine[operation]]
        places: Iterable[int] = range(len(units)) if unit is None or not units else (unit,)
        found: tuple[int, int, int] | None = None
        best = None
        for place in places if units else (NONE,):
            spot = self._earliest_on(operation, begin, place, latest)
            if spot is not None:
                key = (spot.start, self._idle_before(operation, spot), place)
                if found is None or key < found:
                    found, best = key, spot
        return best

    def place(self, operation: int, spot: Spot) -> None:
        """Let an operation stand at a legal place."""
        rules = self.rules
        machine, start, end = rules.machine[operation], spot.start, spot.end
        self._orders[rules.job[operation]].take(start, end, machine, operation)
        group = self._groups[machine]
        if group is not None:
            group.take(start, end, 1)
        else:
            self._units[machine][spot.unit].take(start, end, rules.family[operation], operation)
        self._attend(operation, start, rules.heads[operation])
        self.spots[operation] = spot

    def remove(self, operation: int) -> None:
        """Take an operation that stands somewhere out."""
        rules, spot = self.rules, self.spots[operation]
        if spot is None:
            raise ValueError(f"operation {operation} stands nowhere")
        machine = rules.machine[operation]
        self._orders[rules.job[operation]].give_back(spot.start, operation)
        group = self._groups[machine]
        if group is not None:
            group.take(spot.start, spot.end, -1)
        else:
            self._units[machine][spot.unit].give_back(spot.start, operation)
        self._attend(operation, spot.start, -rules.heads[operation])
        self.spots[operation] = None

    def _attend(self, operation: int, start: int, heads: int) -> None:
        for begin, end in self.rules.stretches(operation, start):
            self._crews[self.rules.crew[operation]].take(begin, end, heads)

    def _between_steps(self, operation: int, begin: int) -> tuple[int, int]:
        """Return when lower steps of the order have ended and when higher ones start."""
        latest, step = FOR_EVER, self.rules.step
        for other in self._steps[self.rules.job[operation]]:
            spot = self.spots[other]
            if spot is not None and step[other] < step[operation]:
                begin = max(begin, spot.end)
            elif spot is not None and step[other] > step[operation]:
                latest = min(latest, spot.start)
        return begin, latest

    def _idle_before(self, operation: int, spot: Spot) -> int:
        """Return for how long the unit has been free before `spot`."""
        if spot.unit == NONE:
            return 0
        line = self._units[self.rules.machine[operation]][spot.unit]
        place = bisect_right(line.end, spot.start)
        return spot.start - (line.end[place - 1] if place else 0)

    def _earliest_on(self, operation: int, begin: int, unit: int, latest: int) -> Spot | None:
        rules = self.rules
        machine, work, need = rules.machine[operation], rules.seconds[operation], rules.heads[operation]
        order, group = self._orders[rules.job[operation]], self._groups[machine]
        line = None if group is not None else self._units[machine][unit]
        family, crew, fit = rules.family[operation], rules.crew[operation], rules.openings[machine].fit
        moment = begin
        while True:
            start, end = fit(moment, work)
            if end > latest:
                return NOWHERE
            moment = order.clash(start, end, work, machine)
            if moment > start:
                continue
            if line is not None:
                moment = line.clash(start, end, work, family)
                if moment > start:
                    continue
            elif group is not None:
                moment = group.clash(start, end, 1)
                if moment > start:
                    continue
            if crew == NONE:
                return Spot(start, end, unit)
            moment = self._unattended(operation, start, need)
            if moment == NONE:
                return Spot(start, end, unit)
            if moment == FOR_EVER:
                return NOWHERE

    def _unattended(self, operation: int, start: int, need: int) -> int:
        level = self._crews[self.rules.crew[operation]]
        for begin, end in self.rules.stretches(operation, start):
            moment = level.clash(begin, end, need)
            if moment != NONE:
                return moment
        return NONE


def serial(rules: Rules, sequence: Sequence[int], units: Sequence[int] | None = None) -> Timetable | None:
    """Return the timetable in which each operation of a list stands as early as it may beside those before.

    Parameters
    ----------
    sequence
        Every operation once; lower steps of an order before higher ones.
    units
        Of each operation, counted from 0; the earliest free one if left out.

    Returns
    -------
    None if some operation finds no place, because its crew is never large enough again. About
    O(n log n), and one step for each gap that is too short.
    """
    timetable = Timetable(rules)
    for operation in sequence:
        spot = timetable.earliest(operation, unit=None if units is None else units[operation])
        if spot is None:
            return None
        timetable.place(operation, spot)
    return timetable
