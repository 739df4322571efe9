"""The dispatching loop of a floor: time runs forward, and a free unit takes the most pressing operation.

A parallel generation of schedules (R. Kolisch, E.J.O.R. 90 (1996) 320-333) with one exception from "as
soon as anything can start, something does": an operation whose unit must be changed over, or whose order
must still be brought, competes as if it could start now, at a price for the wait. If it wins, unit and
order are kept for it. A rule that never waits never changes over while the old family has work, and the
other families starve. What a closure or a missing head keeps from starting does not compete: the unit
may do something shorter, and looks again when that is over.
"""

from __future__ import annotations

import heapq
from bisect import bisect_left, insort
from collections.abc import Sequence
from dataclasses import dataclass
from math import log

from shopfloor.openshop.floor.indices import MakeIndex, usual_s
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.timeline import FOR_EVER, Level

LOOKED_AT = 128  # operations compared at one moment on one machine, the most pressing when they came


@dataclass(frozen=True, slots=True)
class Charges:
    """What a rule asks for waits, and what it gives.

    Attributes
    ----------
    patience
        κ, for each machine: a wait of so many mean run times costs one unit of the index.
    batch
        How many units of the index a change earns for each power of e by which the work of the new family
        that waits exceeds the operation's own: one change then serves many.
    bias
        Added to the index, an entry an order.
    """

    patience: Sequence[float]
    batch: float
    bias: Sequence[float]


@dataclass(frozen=True, slots=True)
class Times:
    """Start, end and unit of each operation; units from 0, ``NONE`` where they are alike and dealt later."""

    start: list[int]
    end: list[int]
    unit: list[int]


class Dispatch:
    """One run of the loop: `make_index` says what is pressing, `charges` what a wait costs."""

    def __init__(self, rules: Rules, make_index: MakeIndex, charges: Charges) -> None:
        self.rules = rules
        orders, machines = range(len(rules.release)), range(len(rules.count))
        self._work = [0] * len(rules.release)
        self._load = [0.0] * len(rules.count)
        for job, machine, seconds in zip(rules.job, rules.machine, rules.seconds, strict=True):
            self._work[job] += seconds
            self._load[machine] += seconds / rules.count[machine]
        self._index = make_index(rules, self._work)
        self._bias, self._batch = charges.bias, charges.batch
        self._price = [1.0 / (each * usual_s(rules)) for each in charges.patience] if len(rules) else []
        self._crews = [Level(since[:], heads[:]) for since, heads in rules.crews]
        self._start, self._end = [0] * len(rules), [0] * len(rules)
        self._unit = [NONE] * len(rules)
        self._idle = [False] * len(rules.release)
        self._ready = list(rules.release)
        self._at = [NONE] * len(rules.release)  # the machine an order was on last
        # What may run, by machine: minus how pressing it was when it came, and the operation.
        self._waits: list[list[tuple[float, int]]] = [[] for _ in machines]
        self._key = [0.0] * len(rules)
        self._open: list[list[int]] = [[] for _ in orders]  # the same by order
        self._free = [[0] * count for count in rules.count]  # since when each unit is free
        self._family = [[begins] * count for begins, count in zip(rules.begins, rules.count, strict=True)]
        self._queued = [[0] * len(change or ()) for change in rules.change]  # work waiting, by family
        self._wake = [FOR_EVER] * len(rules.count)
        self._left = [0] * len(rules.release)  # operations of the step reached that have not ended
        self._ranks = _ranks(rules)
        # Time, and what happens: an operation ends; −1 − order: released; operations + machine: looks again.
        self._events: list[tuple[int, int]] = []

    def run(self) -> Times | None:
        """Return the times, or None if some operation's heads never came.

        Each operation is compared with at most ``LOOKED_AT`` others: O(n × queue) for short queues, and
        O(n log n) beyond.
        """
        rules, events, size = self.rules, self._events, len(self.rules)
        events.extend((time, -1 - job) for job, time in enumerate(rules.release) if rules.visits[job])
        heapq.heapify(events)
        load = self._load
        while events:
            now = events[0][0]
            touched: set[int] = set()
            while events and events[0][0] == now:
                event = heapq.heappop(events)[1]
                if event >= size:
                    machine = event - size
                    if self._wake[machine] <= now:
                        self._wake[machine] = FOR_EVER
                        touched.add(machine)
                else:
                    self._returned(event, now, touched)
            ready = [machine for machine in touched if self._waits[machine]]
            if len(ready) > 1:
                ready.sort(key=lambda machine: (-load[machine], machine))
            for machine in ready:
                self._serve(machine, now)
        return None if any(self._waits) else Times(self._start, self._end, self._unit)

    # ---- what becomes possible ----------------------------------------------------------------------

    def _returned(self, event: int, now: int, touched: set[int]) -> None:
        """Let an order be free again, or for the first time, and note the machines it matters to."""
        rules = self.rules
        if event < 0:
            job = -1 - event
            for operation in self._ranks[job].pop(NONE, ()):
                self._let(operation, now)
            self._next_rank(job, now)
        else:
            job = rules.job[event]
            touched.add(rules.machine[event])
            if rules.step[event] != NONE:
                self._left[job] -= 1
                if not self._left[job]:
                    self._next_rank(job, now)
        self._idle[job] = True
        touched.update([rules.machine[operation] for operation in self._open[job]])

    def _next_rank(self, job: int, now: int) -> None:
        ranks = self._ranks[job]
        if ranks:
            operations = ranks.pop(min(ranks))
            self._left[job] = len(operations)
            for operation in operations:
                self._let(operation, now)

    def _let(self, operation: int, now: int) -> None:
        rules = self.rules
        job, machine = rules.job[operation], rules.machine[operation]
        self._key[operation] = -self._index(operation, now) - self._bias[job]
        insort(self._waits[machine], (self._key[operation], operation))
        self._open[job].append(operation)
        if rules.change[machine] is not None:
            self._queued[machine][rules.family[operation]] += rules.seconds[operation]

    # ---- what starts --------------------------------------------------------------------------------

    def _serve(self, machine: int, now: int) -> None:
        """Start on a machine what can start there now, or be held for."""
        free, openings = self._free[machine], self.rules.openings[machine]
        units = [unit for unit, since in enumerate(free) if since <= now]
        if not units:
            return
        if openings.at(now) > now:
            self._look_again(machine, openings.at(now))
            return
        while units and self._waits[machine]:
            found = self._most_pressing(machine, now, units)
            if found is None:
                return
            self._begin(*found)
            units.remove(found[3])

    def _look_again(self, machine: int, moment: int) -> None:
        if moment < self._wake[machine]:
            self._wake[machine] = moment
            heapq.heappush(self._events, (moment, len(self.rules) + machine))

    def _most_pressing(self, machine: int, now: int, units: list[int]) -> tuple[int, int, int, int] | None:
        """Return an operation with its start, end and unit, or None when nothing may begin."""
        rules, idle, job_of, index, bias = self.rules, self._idle, self.rules.job, self._index, self._bias
        seconds, change, transport = rules.seconds, rules.change[machine], rules.transport
        openings, price = rules.openings[machine], self._price[machine]
        always, looked = openings.always, 0
        best, found, look_at = 0.0, None, FOR_EVER
        for _, operation in self._waits[machine]:
            job = job_of[operation]
            if not idle[job]:
                continue
            begin, unit, earned = now, units[0], 0.0
            if change is not None:
                begin, unit, earned = self._changed(machine, operation, now, units)
            if transport is not None and self._at[job] != NONE:
                begin = max(begin, self._ready[job] + transport[self._at[job]][machine])
            if always:
                end = begin + seconds[operation]
            else:
                first, end = openings.fit(begin, seconds[operation])
                if first > begin:
                    look_at = min(look_at, first)
                    continue
            if rules.crew[operation] != NONE:
                moment = self._heads_from(operation, begin)
                if moment != NONE:
                    look_at = min(look_at, moment)
                    continue
            value = index(operation, now) + bias[job] + earned - (begin - now) * price
            if found is None or value > best or (value == best and operation < found[0]):
                best, found = value, (operation, begin, end, unit)
            looked += 1
            if looked == LOOKED_AT:
                break
        if found is None and look_at < FOR_EVER:
            self._look_again(machine, look_at)
        return found

    def _changed(self, machine: int, operation: int, now: int, units: list[int]) -> tuple[int, int, float]:
        """Return when which free unit can be ready, the least changed of the first, and what that earns."""
        rules = self.rules
        change, openings, mine = rules.change[machine], rules.openings[machine], rules.family[operation]
        assert change is not None
        best = (FOR_EVER, 0, 0)
        for unit in units:
            family = self._family[machine][unit]
            needed = 0 if family == NONE else change[family][mine]
            ready = max(now, openings.after(self._free[machine][unit], needed)) if needed else now
            best = min(best, (ready, needed, unit))
        ready, needed, unit = best
        if not needed or not self._batch:
            return ready, unit, 0.0
        return ready, unit, self._batch * log(self._queued[machine][mine] / rules.seconds[operation])

    def _heads_from(self, operation: int, start: int) -> int:
        """Return ``NONE`` if the heads are there, else when to look again."""
        level, need = self._crews[self.rules.crew[operation]], self.rules.heads[operation]
        for begin, end in self.rules.stretches(operation, start):
            moment = level.clash(begin, end, need)
            if moment != NONE:
                return moment
        return NONE

    def _begin(self, operation: int, start: int, end: int, unit: int) -> None:
        rules = self.rules
        job, machine = rules.job[operation], rules.machine[operation]
        self._start[operation], self._end[operation] = start, end
        if rules.change[machine] is not None:
            self._queued[machine][rules.family[operation]] -= rules.seconds[operation]
            self._family[machine][unit] = rules.family[operation]
        if rules.change[machine] is not None or rules.count[machine] == 1:
            self._unit[operation] = unit
        self._idle[job] = False
        self._ready[job], self._at[job] = end, machine
        self._work[job] -= rules.seconds[operation]
        self._load[machine] -= rules.seconds[operation] / rules.count[machine]
        self._free[machine][unit] = end
        waits = self._waits[machine]
        del waits[bisect_left(waits, (self._key[operation], operation))]
        self._open[job].remove(operation)
        for begin, until in rules.stretches(operation, start):
            self._crews[rules.crew[operation]].take(begin, until, rules.heads[operation])
        heapq.heappush(self._events, (end, operation))


def _ranks(rules: Rules) -> list[dict[int, list[int]]]:
    """Return the operations of each order by step."""
    ranks: list[dict[int, list[int]]] = [{} for _ in rules.release]
    for operation, (job, step) in enumerate(zip(rules.job, rules.step, strict=True)):
        ranks[job].setdefault(step, []).append(operation)
    return ranks
