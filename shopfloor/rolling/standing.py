"""A timetable under change: parts are taken out and put in again, and that is kept or undone.

Whatever is put in goes *home* where it can: to where it was to run in the old plan, give or take what is no
move. What stands is measured as it changes, machine by machine and order by order.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import NamedTuple

from shopfloor.openshop.floor.rules import NONE
from shopfloor.openshop.floor.timetable import Spot
from shopfloor.replan.movement import Place, Reference
from shopfloor.rolling.archive import Limits
from shopfloor.rolling.bench import Bench, Timed

FRESHEN = 400  # attempts, after which the timetable is set up anew: each leaves marks in crews and groups


class Part(NamedTuple):
    """What is taken out of a timetable, in the order in which it is put in again.

    `first` and `last` go as early as they can. `some` go home where they can, and then the others of them
    go as early as they can, but with `push` not before they were to start.
    """

    some: Sequence[int] = ()
    first: Sequence[int] = ()
    last: Sequence[int] = ()
    push: bool = False


class Standing:
    """What stands where, and what that comes to.

    Parameters
    ----------
    bench
        Knows the rules and what runs.
    reference
        The old plan, on the bench's clock.
    rank
        By which operations are placed that do not go home: old starts, or what stands for them.
    limits
        The most of each goal.
    strict
        Whether goals count before movement, also within limits.

    Attributes
    ----------
    movable
        The operations that do not run yet, by rank.
    visits
        The operations of each order.
    places, done, value
        Where each operation stands, when each order is done, what the goals come to.
    placed
        How many places have been looked for so far.
    """

    def __init__(
        self,
        bench: Bench,
        reference: Reference,
        rank: Mapping[int, float],
        limits: Limits,
        *,
        strict: bool,
    ) -> None:
        self.bench, self.reference, self.rank = bench, reference, rank
        self.limits, self.strict = limits, strict
        self.movable = sorted(bench.movable, key=lambda k: (rank[k], k))
        self.visits: list[list[int]] = [[] for _ in bench.rest.solve.orders.ids]
        for k, job in enumerate(bench.rules.job[: len(bench.rest.solve)]):
            self.visits[job].append(k)
        self.placed = self._tried = 0
        self._line = {bench.rules.machine[line[0]]: line for line in reference.lines}
        self._table = bench.table()
        self._out: dict[int, Spot | None] = {}  # where what an attempt has touched stood before it

    # ---- whole timetables ----------------------------------------------------------------------------

    def load(self, timed: Timed) -> bool:
        """Take over a timetable; tell whether that can be, which it cannot where work is cut."""
        if len(timed.visits) != len(self.bench.rest.solve):
            return False
        self._table, self._out = self.bench.table(), {}
        for k, start, end, unit in timed.visits:
            if k not in self.bench.rest.pinned:
                alike = self.bench.alike(self.bench.rules.machine[k])
                self._table.place(k, Spot(start, end, NONE if alike else unit - 1))
        self._measure()
        return True

    def build(self, first: Iterable[int]) -> bool:
        """Build a timetable anew: some operations first, the others around the old plan; tell if all fit."""
        front = set(first)
        self._table, self._out = self.bench.table(), {}
        part = Part(
            some=[k for k in self.movable if k not in front], first=[k for k in self.movable if k in front]
        )
        if not self._put_in(part):
            return False
        self._measure()
        return True

    def timed(self) -> Timed:
        """Return the timetable as it is."""
        return self.bench.told(self._table)

    # ---- what it comes to ------------------------------------------------------------------------------

    @property
    def weights(self) -> Mapping[int, int]:
        """How much it moves, by machine."""
        return self._weight

    @property
    def fine(self) -> bool:
        """Whether it is within limits."""
        return all(value <= limit for value, limit in zip(self.value, self.limits, strict=True))

    @property
    def key(self) -> tuple[int, ...]:
        """What is to be made less: what passes the limits first; goals before or after movement."""
        passed = (max(0, value - limit) for value, limit in zip(self.value, self.limits, strict=True))
        weight = sum(self._weight.values())
        return (*passed, *self.value, weight) if self.strict else (*passed, weight, *self.value)

    def at_home(self, k: int) -> bool:
        """Whether an operation stands where it was to run."""
        return k in self.reference.was and not self.reference.moved(k, self.places[k])

    def away(self, some: Iterable[int]) -> list[int]:
        """Return those that can be moved and are not at home."""
        return [k for k in some if k not in self.bench.rest.pinned and not self.at_home(k)]

    def line(self, machine: int) -> list[int]:
        """Return what a machine was to run, as it stands now."""
        return sorted(self._line[machine], key=lambda k: (self.places[k].start_s, k))

    def _measure(self) -> None:
        self.places = [Place(0, 0, 0)] * len(self.bench.rest.solve)
        self.done = [0] * len(self.visits)
        self._weight: dict[int, int] = {}
        self._changed: dict[int, int] = {}
        self._retell(range(len(self.bench.lines)), range(len(self.visits)))

    def _retell(self, machines: Iterable[int], jobs: Iterable[int]) -> None:
        """Take over what stands on some machines and of some orders."""
        spots, bench = self._table.spots, self.bench
        for machine in machines:
            for k, unit in bench.units(machine, spots).items():
                spot = spots[k]
                assert spot is not None
                self.places[k] = Place(spot.start, spot.end, unit)
            if machine in self._line:
                self._weight[machine] = self.reference.moves_of(self._line[machine], self.places)[2]
            if "changeovers" in bench.goals:
                self._changed[machine] = bench.changed(machine, self.places)
        for job in jobs:
            self.done[job] = max((self.places[k].end_s for k in self.visits[job]), default=0)
        self.value = bench.value(self.done, sum(self._changed.values()))

    # ---- attempts --------------------------------------------------------------------------------------

    def attempt(self, part: Part, *, even: bool = False) -> None:
        """Put a part in anew; keep that if it is better, or if `even` as good; else undo it."""
        self._out = {}
        for k in (*part.first, *part.some, *part.last):
            self._take(k)
        if not (self._put_in(part) and self._better(even)):
            for k in self._out:
                if self._table.spots[k] is not None:
                    self._table.remove(k)
            for k, spot in self._out.items():
                self._put(k, spot)
        self._tried += 1
        if self._tried % FRESHEN == 0:
            spots, self._table = self._table.spots, self.bench.table()
            for k in self.movable:
                self._put(k, spots[k])

    def _better(self, even: bool) -> bool:
        """Measure what an attempt has touched; tell if that is to be kept, and forget it if not."""
        rules = self.bench.rules
        machines = sorted({rules.machine[k] for k in self._out})
        jobs = sorted({rules.job[k] for k in self._out})
        before, value = self.key, self.value
        weight, changed, done = dict(self._weight), dict(self._changed), self.done[:]
        places = [(k, self.places[k]) for machine in machines for k in self.bench.lines[machine]]
        self._retell(machines, jobs)
        if self.key < before or (even and self.key == before):
            return True
        self.value, self._weight, self._changed, self.done = value, weight, changed, done
        for k, place in places:
            self.places[k] = place
        return False

    def _put_in(self, part: Part) -> bool:
        """Place a part; tell whether all of it has found a place."""
        if not all(self._stands(k) or self._anywhere(k) for k in part.first):
            return False
        away = [k for k in part.some if not (self._stands(k) or self._put(k, self._home(k)))]
        was = self.reference.was
        for k in away:
            begin = max(0, was[k].start_s) if part.push and k in was else 0
            if not (self._stands(k) or self._anywhere(k, begin)):
                return False
        return all(self._stands(k) or self._anywhere(k) for k in part.last)

    def _stands(self, k: int) -> bool:
        return self._table.spots[k] is not None

    def _take(self, k: int) -> None:
        self._out.setdefault(k, self._table.spots[k])
        if self._stands(k):
            self._table.remove(k)

    def _put(self, k: int, spot: Spot | None) -> bool:
        if spot is not None:
            self._table.place(k, spot)
        return spot is not None

    def _earliest(self, k: int, begin: int = 0, unit: int | None = None) -> Spot | None:
        self.placed += 1
        return self._table.earliest(k, begin, unit)

    def _home(self, k: int) -> Spot | None:
        """Return where an operation would stand nearly as in the old plan, if it can."""
        was = self.reference.was.get(k)
        if was is None:
            return None
        for begin in (max(0, was.start_s), max(0, was.start_s - self.reference.moved_s)):
            spot = self._earliest(k, begin, was.unit - 1)
            if spot is None:
                return None
            unit = was.unit if spot.unit == NONE else spot.unit + 1
            if not self.reference.moved(k, Place(spot.start, spot.end, unit)):
                return spot
        return None

    def _anywhere(self, k: int, begin: int = 0) -> bool:
        """Place an operation as early as it can; later steps of its order make way where they must."""
        if self._put(k, self._earliest(k, begin)):
            return True
        step = self.bench.rules.step
        if step[k] == NONE:
            return False
        mine = self.visits[self.bench.rules.job[k]]
        higher = [
            j for j in mine if step[j] > step[k] and self._stands(j) and j not in self.bench.rest.pinned
        ]
        for j in higher:
            self._take(j)
        order = sorted(higher, key=lambda j: (step[j], self.rank[j], j))
        return bool(higher) and all(self._put(j, self._earliest(j)) for j in (k, *order))
