"""Sequences of what is left become timetables: what runs stays put, the rest goes as early as it fits."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_STEP, Shop
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.timetable import Spot, Timetable
from shopfloor.openshop.incumbent import weights
from shopfloor.replan.movement import Place
from shopfloor.replan.residual import Residual
from shopfloor.rolling.blocks import blocks_of, with_blocks


class Visit(NamedTuple):
    """Where an operation, or a part of it, stands on the clock that starts at begin; `unit` from 1."""

    operation: int
    start: int
    end: int
    unit: int


@dataclass(frozen=True)
class Timed:
    """Where everything left stands.

    Attributes
    ----------
    visits
        In order of operation and start.
    places
        First start, last end and first unit of each operation.
    makespan_s, tardiness
        When the last is done; seconds late × thousandths of priority, over all orders.
    value
        What counts first, second and so on; less is better.
    """

    visits: tuple[Visit, ...]
    places: tuple[Place, ...]
    makespan_s: int
    tardiness: int
    value: tuple[int, ...]


class Bench:
    """Times sequences of one residual shop.

    Parameters
    ----------
    rest
        What is left.
    was
        Where operations were to run, from begin on; units that are alike are kept where they can be.
    goals
        What counts first, second and so on: ``makespan``, ``tardiness``, ``changeovers``.

    Attributes
    ----------
    movable
        The operations that do not run yet, in the order of the shop.
    lines
        The operations of each machine.
    rules
        The rules of what is left, as lists.
    """

    def __init__(self, rest: Residual, was: Mapping[int, Place], goals: Sequence[str]) -> None:
        self.rest, self.was, self.goals = rest, was, tuple(goals)
        self._count = len(rest.solve)
        self._blocks = tuple(blocks_of(rest))
        self.rules = Rules.of(with_blocks(rest.solve, self._blocks))
        self._weights = weights(rest.solve)
        self._steps = _ranked(rest.solve)
        self.movable = [k for k in range(self._count) if k not in rest.pinned]
        self._pins = {k: self._spot(k) for k in sorted(rest.pinned)}
        self.lines: list[list[int]] = [[] for _ in rest.solve.machines]
        for k in range(self._count):
            self.lines[self.rules.machine[k]].append(k)

    @property
    def free_units(self) -> bool:
        """Whether `rest.fresh` says all there is: nothing runs in a group, and no unit of one is down."""
        return not self._blocks and len(self.rest.fresh) == len(self.movable)

    def alike(self, machine: int) -> bool:
        """Whether any unit of a machine of several does, so that units are dealt after the times."""
        return self.rules.count[machine] > 1 and self.rules.change[machine] is None

    def _spot(self, k: int) -> Spot:
        """Return where running work stands on the clock that starts at begin."""
        one, origin = self.rest.pinned[k], self.rest.begin_s
        unit = NONE if self.alike(one.machine) else one.unit - 1
        return Spot(max(0, one.resumes_s - origin), one.ends_s - origin, unit)

    # ---- timing ------------------------------------------------------------------------------------

    def time(self, sequence: Iterable[int], units: Mapping[int, int] | None = None) -> Timed | None:
        """Return the timetable of a sequence of what can be moved.

        Parameters
        ----------
        sequence
            Every operation that does not run yet, once. Higher steps of an order are put after lower ones.
        units
            The unit, from 1, that an operation shall have; any where it says nothing. Without effect where
            units are alike.

        Returns
        -------
        None if some operation finds no place, because its crew is never large enough again.
        """
        table = self.table()
        wanted = units or {}
        for k in self._in_steps(list(sequence)):
            found = table.earliest(k, unit=wanted[k] - 1 if k in wanted else None)
            if found is None:
                return None
            table.place(k, found)
        return self.told(table)

    def table(self) -> Timetable:
        """Return a timetable in which only what runs stands, and what keeps units of groups."""
        table = Timetable(self.rules)
        for k, block in enumerate(self._blocks, self._count):
            table.place(k, Spot(0, block.until_s, NONE if self.alike(block.machine) else block.unit - 1))
        for k, spot in self._pins.items():
            table.place(k, spot)
        return table

    def told(self, table: Timetable) -> Timed:
        """Return a timetable in which everything stands, with its units and what counts of it."""
        unit: dict[int, int] = {}
        for machine in range(len(self.lines)):
            unit |= self.units(machine, table.spots)
        spots = enumerate(table.spots[: self._count])
        return self.timed(Visit(k, spot.start, spot.end, unit[k]) for k, spot in spots if spot is not None)

    def of_fresh(self, schedule: Schedule) -> Timed:
        """Return a schedule of `rest.fresh` as it is, with what runs; only where `free_units`."""
        operation = self.rest.from_fresh[schedule.operation].tolist()
        columns = (operation, schedule.start_s.tolist(), schedule.end_s.tolist(), schedule.unit.tolist())
        running = (Visit(k, spot.start, spot.end, self.rest.pinned[k].unit) for k, spot in self._pins.items())
        return self.timed([*(Visit(*row) for row in zip(*columns, strict=True)), *running])

    def timed(self, visits: Iterable[Visit]) -> Timed:
        """Return visits with what counts of them."""
        rules, found = self.rules, tuple(sorted(visits))
        done = [0] * len(self.rest.solve.orders)
        places: dict[int, Place] = {}
        for k, begin, end, unit in found:
            done[rules.job[k]] = max(done[rules.job[k]], end)
            first = places.get(k)
            places[k] = Place(begin, end, unit) if first is None else first._replace(end_s=end)
        listed = [places[k] for k in range(self._count)]
        changed = 0
        if "changeovers" in self.goals:
            changed = sum(self.changed(machine, listed) for machine in range(len(self.lines)))
        makespan, tardiness = max(done, default=0), self.tardiness(done)
        return Timed(found, tuple(listed), makespan, tardiness, self.value(done, changed))

    def tardiness(self, done: Sequence[int]) -> int:
        """Return seconds late × thousandths of priority over all orders, `done` being when each is."""
        rows = zip(self._weights, done, self.rules.due, strict=False)
        return sum(weight * (end - due) for weight, end, due in rows if end > due)

    def value(self, done: Sequence[int], changed: int) -> tuple[int, ...]:
        """Return what counts first, second and so on, from when orders are done and seconds of changeover."""
        values = {
            "makespan": lambda: max(done, default=0),
            "tardiness": lambda: self.tardiness(done),
            "changeovers": lambda: changed,
        }
        return tuple(values[goal]() for goal in self.goals)

    def changed(self, machine: int, places: Sequence[Place]) -> int:
        """Return the seconds of all changeovers of a machine."""
        rules, total = self.rules, 0
        table = rules.change[machine]
        if table is None:
            return 0
        last: dict[int, int] = {}
        for k in sorted(self.lines[machine], key=lambda k: (places[k].start_s, k)):
            before = last.get(places[k].unit, rules.begins[machine])
            if before != NONE:
                total += table[before][rules.family[k]]
            last[places[k].unit] = rules.family[k]
        return total

    def _in_steps(self, sequence: list[int]) -> list[int]:
        """Return a sequence in which no step of an order comes before a lower one: ranks change places."""
        if not self._steps:
            return sequence
        place = {k: index for index, k in enumerate(sequence)}
        step = self.rules.step
        for ranked in self._steps:
            mine = [k for k in ranked if k in place]
            slots = sorted(place[k] for k in mine)
            for slot, k in zip(slots, sorted(mine, key=lambda k: (step[k], place[k])), strict=True):
                sequence[slot] = k
        return sequence

    def units(self, machine: int, spots: Sequence[Spot | None]) -> dict[int, int]:
        """Return the unit of each operation of a machine, from 1; running work has its own.

        Where units are alike they are dealt here: by start each operation has the unit it was to have, if
        that is free, else of the free ones that which is wanted last. One always is free: at no moment
        there are more visits than units, and what is blocked is so from begin on.
        """
        if not self.alike(machine):
            return {k: spot.unit + 1 for k in self.lines[machine] if (spot := spots[k]) is not None}
        free = [0] * self.rules.count[machine]
        for block in self._blocks:
            if block.machine == machine:
                free[block.unit - 1] = max(free[block.unit - 1], block.until_s)
        found: dict[int, int] = {}
        waiting: list[tuple[int, int, int]] = []
        wanted: list[list[int]] = [[] for _ in free]  # starts of those that were to run there, last first
        for k in self.lines[machine]:
            spot = spots[k]
            if spot is None:
                continue
            if k in self._pins:
                found[k] = self.rest.pinned[k].unit
                free[found[k] - 1] = max(free[found[k] - 1], spot.end)
                continue
            waiting.append((spot.start, k, spot.end))
            if k in self.was and self.was[k].unit <= len(free):
                wanted[self.was[k].unit - 1].append(spot.start)
        for starts in wanted:
            starts.sort(reverse=True)
        for start, k, end in sorted(waiting):
            for starts in wanted:
                while starts and starts[-1] < start:
                    starts.pop()
            own = self.was[k].unit if k in self.was else 0
            open_ = [unit for unit, until in enumerate(free, 1) if until <= start]
            if own not in open_:
                own = min(open_, key=lambda unit: (-min([end, *wanted[unit - 1][-1:]]), unit))
            found[k], free[own - 1] = own, end
        return found

    # ---- back on the shift's clock -------------------------------------------------------------------

    def schedules(self, timed: Timed) -> tuple[Schedule, Schedule]:
        """Return the schedule of `rest.solve`, and that of `rest.shop` on the shift's clock."""
        rest = self.rest
        operation, start, end, unit = np.array(timed.visits, np.int64).reshape(-1, 4).T
        strict = Schedule(operation, start, end, unit=unit)
        begun, done = start + rest.begin_s, end + rest.begin_s
        for k, one in rest.pinned.items():
            begun[operation == k] = one.since_s
        if rest.begin.rounds is None or not _in_rounds(begun, done):
            return strict, Schedule(operation, begun, done, unit=unit)
        rounds = np.unique(begun, return_inverse=True)[1] + rest.begin.rounds + 1
        return strict, Schedule(operation, begun, done, unit=unit, round=rounds)


def _in_rounds(start: np.ndarray, end: np.ndarray) -> bool:
    """Whether whatever starts together is done before anything else starts."""
    order = np.argsort(start, kind="stable")
    latest = np.maximum.accumulate(end[order])
    turns = np.flatnonzero(np.diff(start[order]) > 0)
    return bool((start[order][turns + 1] >= latest[turns]).all())


def _ranked(shop: Shop) -> list[list[int]]:
    """Return the operations with a step of each order that has several."""
    found: dict[int, list[int]] = {}
    for k in np.flatnonzero(shop.operations.step != NO_STEP).tolist():
        found.setdefault(int(shop.operations.job[k]), []).append(k)
    return [mine for _, mine in sorted(found.items()) if len(mine) > 1]
