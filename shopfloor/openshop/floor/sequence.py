"""A list of all operations as a schedule: each stands after those before it on its unit and in its order.

This is what the search varies: a change in the list costs one pass over what comes after it, a few
microseconds an operation. Nothing is put into a gap, but some list gives the best schedule all the same:
its operations by their starts. Seconds and thousandths of priority throughout.
"""

from __future__ import annotations

from bisect import bisect_right, insort
from dataclasses import dataclass, field

from shopfloor.openshop.floor.rules import FAR, NONE, Rules
from shopfloor.openshop.floor.timeline import FOR_EVER, Level

APART, NOTES = 64, 64  # a pass notes where it stands every 64 places, or at most so often in a long list
BY_CREW = -2  # stands for the operation waited for where it was heads that were missing

ALONE, CHANGES, ALIKE, SEVERAL = range(4)  # one unit; with changeovers; units alike; units with changeovers


class State:
    """Where a pass over a list stands."""

    __slots__ = (
        "at", "changed", "crews", "family", "free", "groups", "late", "latest", "order", "unit", "work"
    )  # fmt: skip

    def __init__(self, rules: Rules, first: list[int]) -> None:
        units = sum(rules.count)
        self.order = list(rules.release)  # when each order is free
        self.at = [NONE] * len(rules.release)  # the operation it did last
        self.work = [0] * len(rules.release)  # run time left
        for job, seconds in zip(rules.job, rules.seconds, strict=True):
            self.work[job] += seconds
        self.free = [0] * units  # when each unit is free, machine after machine
        self.unit = [NONE] * units  # the operation it did last
        self.family = [NONE] * units
        for machine, place in enumerate(first):
            for unit in range(rules.count[machine]):
                self.family[place + unit] = rules.begins[machine]
        self.groups = [
            [(0, NONE)] * count if count > 1 and change is None else []
            for count, change in zip(rules.count, rules.change, strict=True)
        ]  # where units are alike: when each is free and what it did last, in order of time
        self.crews = [Level(since[:], heads[:]) for since, heads in rules.crews]
        self.latest = self.late = self.changed = 0

    def copy(self) -> State:
        """Return a state that changes by itself."""
        twin = State.__new__(State)
        twin.order, twin.at, twin.work = self.order[:], self.at[:], self.work[:]
        twin.free, twin.unit, twin.family = self.free[:], self.unit[:], self.family[:]
        twin.groups = [group[:] for group in self.groups]
        twin.crews = [level.copy() for level in self.crews]
        twin.latest, twin.late, twin.changed = self.latest, self.late, self.changed
        return twin


@dataclass(frozen=True, slots=True)
class Limits:
    """What a pass may come to at most: makespan, weighted tardiness, seconds of changeovers."""

    latest: int = FAR
    late: int = FAR
    changed: int = FAR


@dataclass(slots=True)
class Pass:
    """What a list came to.

    Attributes
    ----------
    start, end, unit
        An entry an operation; the unit counts from 0, ``NONE`` where units are alike.
    cause
        The operation that each one waited for last: before it in its order or on its unit; ``NONE`` if it
        waited for none, ``BY_CREW`` if for heads.
    states
        Where the pass stood at the places that are multiples of :attr:`Sequencer.apart`.
    done, last
        For each order, when it is done, and its last operation.
    makespan, late, changed
        The end of the last operation, weighted tardiness, seconds of changeovers.
    """

    sequence: list[int]
    start: list[int]
    end: list[int]
    unit: list[int]
    cause: list[int]
    states: list[State]
    done: list[int] = field(default_factory=list)
    last: list[int] = field(default_factory=list)
    makespan: int = 0
    late: int = 0
    changed: int = 0


class Sequencer:
    """Passes over lists of one floor.

    Attributes
    ----------
    apart
        How many places lie between two notes of where a pass stands.
    """

    def __init__(self, rules: Rules) -> None:
        self.rules = rules
        self.apart = max(APART, -(-len(rules) // NOTES))
        self._first: list[int] = []
        total = 0
        for count in rules.count:
            self._first.append(total)
            total += count
        self._kind = [
            (SEVERAL if change is not None else ALIKE) if count > 1 else ALONE if change is None else CHANGES
            for count, change in zip(rules.count, rules.change, strict=True)
        ]

    def whole(self, sequence: list[int]) -> Pass | None:
        """Return what a list comes to; None if some operation's heads never come."""
        size = len(sequence)
        blank = Pass(sequence, [0] * size, [0] * size, [NONE] * size, [NONE] * size, [])
        return self._run(blank, State(self.rules, self._first), 0, Limits())

    def again(self, old: Pass, sequence: list[int], begin: int, limits: Limits) -> Pass | None:
        """Return what a list comes to that agrees with that of `old` before place `begin`.

        Returns
        -------
        None as soon as it is sure to pass one of the limits.
        """
        mark = begin // self.apart
        trial = Pass(sequence, old.start[:], old.end[:], old.unit[:], old.cause[:], old.states[:mark])
        return self._run(trial, old.states[mark].copy(), mark * self.apart, limits)

    def _run(self, made: Pass, state: State, begin: int, limits: Limits) -> Pass | None:
        rules = self.rules
        most_latest, most_late, most_changed = limits.latest, limits.late, limits.changed
        job_of, machine_of, seconds = rules.job, rules.machine, rules.seconds
        due, weight, crew_of, openings = rules.due, rules.weight, rules.crew, rules.openings
        change_of, family_of, transport = rules.change, rules.family, rules.transport
        kind, first = self._kind, self._first
        order, at, work = state.order, state.at, state.work
        free, on_unit, family, groups = state.free, state.unit, state.family, state.groups
        starts, ends, cause, unit_of = made.start, made.end, made.cause, made.unit
        latest, late, changed = state.latest, state.late, state.changed
        sequence, states, apart = made.sequence, made.states, self.apart
        for place in range(begin, len(sequence)):
            if not place % apart:
                state.latest, state.late, state.changed = latest, late, changed
                states.append(state.copy())
            operation = sequence[place]
            job, machine, lasts = job_of[operation], machine_of[operation], seconds[operation]
            start, why = order[job], at[job]
            if transport is not None and why != NONE:
                start += transport[machine_of[why]][machine]
            unit, how = first[machine], kind[machine]
            if how == ALONE:
                if free[unit] > start:
                    start, why = free[unit], on_unit[unit]
            elif how == ALIKE:
                ready, before = groups[machine][0]
                if ready > start:
                    start, why = ready, before
            else:
                table = change_of[machine]
                assert table is not None
                mine, hours = family_of[operation], openings[machine]
                if how == CHANGES:
                    old = family[unit]
                    needed = 0 if old == NONE else table[old][mine]
                    ready = hours.after(free[unit], needed) if needed else free[unit]
                else:
                    best = (FOR_EVER, 0, 0, 0)
                    for one in range(unit, unit + rules.count[machine]):
                        old = family[one]
                        needed = 0 if old == NONE else table[old][mine]
                        ready = hours.after(free[one], needed) if needed else free[one]
                        best = min(best, (max(ready, start), needed, -free[one], one))
                    needed, unit = best[1], best[3]
                    ready = hours.after(free[unit], needed) if needed else free[unit]
                changed += needed
                if changed > most_changed:
                    return None
                family[unit] = mine
                if ready > start:
                    start, why = ready, on_unit[unit]
            hours = openings[machine]
            if hours.always:
                end = start + lasts
            else:
                start, end = hours.fit(start, lasts)
            if crew_of[operation] != NONE:
                begun = start
                start, end = self._attended(state, operation, start, end)
                if start == FOR_EVER:
                    return None
                if start > begun:
                    why = BY_CREW
            starts[operation], ends[operation], cause[operation] = start, end, why
            order[job], at[job] = end, operation
            if how == ALIKE:
                group = groups[machine]
                del group[bisect_right(group, (start, FOR_EVER)) - 1]
                insort(group, (end, operation))
            else:
                free[unit], on_unit[unit] = end, operation
                unit_of[operation] = unit - first[machine]
            left = work[job] - lasts
            work[job] = left
            if end + left > most_latest:
                return None
            if end > latest:
                latest = end
            if not left and end > due[job]:
                late += weight[job] * (end - due[job])
                if late > most_late:
                    return None
        made.done, made.last = order, at
        made.makespan, made.late, made.changed = latest, late, changed
        return made

    def _attended(self, state: State, operation: int, start: int, end: int) -> tuple[int, int]:
        """Return start and end when the heads are there, and take them; ``FOR_EVER`` if they never are."""
        rules = self.rules
        level, need = state.crews[rules.crew[operation]], rules.heads[operation]
        while True:
            stretches = rules.stretches(operation, start)
            moment = NONE
            for begin, until in stretches:
                moment = level.clash(begin, until, need)
                if moment != NONE:
                    break
            if moment == NONE:
                break
            if moment == FOR_EVER:
                return FOR_EVER, FOR_EVER
            start, end = rules.openings[rules.machine[operation]].fit(moment, rules.seconds[operation])
        for begin, until in stretches:
            level.take(begin, until, need)
        return start, end
