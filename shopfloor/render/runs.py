"""What the floor's rules make of each run of a plan: work, set-up, family, changeover, heads, the way on.

A run is one assignment of the schedule. Everything here is a column with an entry a run, in the order of
the schedule, worked out once for every page, sheet and workbook. O(m log m) for m runs.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from shopfloor.model.shop import NO_FAMILY, Bools, Ints, Shop

if TYPE_CHECKING:
    from shopfloor.model.results import Plan
    from shopfloor.model.schedule import Schedule

NONE_BEFORE = -1  # stands for the run before the first one of a unit, and after the last one of an order


@dataclass(frozen=True, eq=False)
class Changes:
    """The changeovers of a plan, one entry each, in the order of the runs they are made for.

    Each is drawn as late as its run allows: in the open time right before the run starts.

    Attributes
    ----------
    run
        Index of the run that follows.
    start_s, end_s
        From when to when; a closure may lie between.
    seconds
        How much open time it takes.
    before
        Index into :attr:`Runs.families` of the family it changes from.
    """

    run: Ints
    start_s: Ints
    end_s: Ints
    seconds: Ints
    before: Ints

    def __len__(self) -> int:
        return len(self.run)


@dataclass(frozen=True, eq=False)
class Gaps:
    """Open time in which a unit neither runs nor is changed over: one entry a gap."""

    row: Ints
    start_s: Ints
    end_s: Ints
    seconds: Ints


class Runs:
    """The runs of `plan` as columns; each is worked out when first asked for.

    Attributes
    ----------
    families
        Names that `family` and `Changes.before` point at; the last is "", no family.
    first_row
        For each machine the row of its first unit, where every unit has a row of its own.
    """

    def __init__(self, plan: Plan) -> None:
        self.shop: Shop = plan.shop
        self.schedule: Schedule = plan.schedule
        self.job: Ints = self.shop.operations.job[self.schedule.operation]
        self.machine: Ints = self.shop.operations.machine[self.schedule.operation]
        counts = np.array([machine.count for machine in self.shop.machines], np.int64)
        self.first_row: Ints = np.cumsum(counts) - counts
        starting = {machine.family for machine in self.shop.machines if machine.family}
        self.families: tuple[str, ...] = (
            *self.shop.families,
            *sorted(starting - set(self.shop.families)),
            "",
        )

    # ---- places --------------------------------------------------------------------------------

    @cached_property
    def row(self) -> Ints:
        """Row of each run, where every unit of every machine has one, in the shop's order."""
        if not len(self.schedule):
            return np.zeros(0, np.int64)
        row: Ints = self.first_row[self.machine] + self.schedule.unit - 1
        return row

    @cached_property
    def by_unit(self) -> Ints:
        """The runs unit by unit, each unit's in sequence."""
        return np.lexsort((self.schedule.end_s, self.schedule.start_s, self.row))

    @cached_property
    def by_order(self) -> Ints:
        """The runs order by order, each order's in sequence."""
        return np.lexsort((self.schedule.end_s, self.schedule.start_s, self.job))

    @cached_property
    def before_on_unit(self) -> Ints:
        """The run before each run on its unit, or ``NONE_BEFORE``."""
        return _neighbours(self.by_unit, self.row)

    @cached_property
    def after_in_order(self) -> Ints:
        """The run after each run in its order, or ``NONE_BEFORE``."""
        return _neighbours(self.by_order[::-1], self.job)

    # ---- time ----------------------------------------------------------------------------------

    @cached_property
    def worked_s(self) -> Ints:
        """How long each run is worked on: closures inside it are no work."""
        start, end = self.schedule.start_s, self.schedule.end_s
        worked = end - start
        for machine, hall in enumerate(self.shop.machines):
            if hall.pauses and (hall.closed or self.shop.breaks):
                mine, clock = self._on(machine), self.shop.machine_clocks[machine]
                worked[mine] = clock.worked(end[mine]) - clock.worked(start[mine])
        return worked

    @cached_property
    def set_up_s(self) -> Ints:
        """How much of each run is set-up: an operation begins with it, whatever parts it is cut into."""
        set_up = self.shop.operations.setup_s[self.schedule.operation]
        if not set_up.any():
            return set_up
        order = np.lexsort((self.schedule.part, self.schedule.operation))
        worked, operation = self.worked_s[order], self.schedule.operation[order]
        before = np.cumsum(worked) - worked
        first = np.flatnonzero(_starts(operation))
        before -= np.repeat(before[first], np.diff(np.r_[first, len(order)]))
        left = np.empty_like(set_up)
        left[order] = np.clip(set_up[order] - before, 0, worked)
        return left

    @cached_property
    def set_up_end_s(self) -> Ints:
        """When the set-up of each run is done; its start where it has none."""
        end: Ints = self.schedule.start_s + self.set_up_s
        for machine, hall in enumerate(self.shop.machines):
            if hall.pauses and (hall.closed or self.shop.breaks):
                mine, clock = self._on(machine), self.shop.machine_clocks[machine]
                mine = mine[self.set_up_s[mine] > 0]
                end[mine] = clock.end(clock.worked(self.schedule.start_s[mine]) + self.set_up_s[mine])
        return end

    # ---- families and changeovers --------------------------------------------------------------

    @cached_property
    def family(self) -> Ints:
        """Family of each run, as an index into `families`."""
        family = self.shop.operations.family[self.schedule.operation]
        return np.where(family == NO_FAMILY, len(self.families) - 1, family)

    @cached_property
    def changing(self) -> tuple[int, ...]:
        """The machines on which another family may cost time."""
        return tuple(
            machine
            for machine, hall in enumerate(self.shop.machines)
            if (rule := self.shop.changeovers.get(hall.id)) is not None and not rule.none
        )

    @cached_property
    def changes(self) -> Changes:
        """The changeovers, each as late as its run allows."""
        found = [np.zeros((0, 5), np.int64), *map(self._changes_on, self.changing)]
        columns = np.concatenate(found)
        return Changes(*columns[np.argsort(columns[:, 0], kind="stable")].T)

    @cached_property
    def change_s(self) -> Ints:
        """Open time of the changeover before each run, 0 where there is none."""
        seconds = np.zeros(len(self.schedule), np.int64)
        seconds[self.changes.run] = self.changes.seconds
        return seconds

    def _changes_on(self, machine: int) -> Ints:
        """Return run, start, end, open time and former family of every changeover of one machine."""
        hall, clock = self.shop.machines[machine], self.shop.machine_clocks[machine]
        run = self._on(machine)
        before = self.before_on_unit[run]
        first = before == NONE_BEFORE
        old = np.where(first, self._starting(machine), self.family[before])
        run, before, old = run[old >= 0], before[old >= 0], old[old >= 0]
        seconds = self._between(self.shop.changeovers[hall.id].seconds, self.families, old, self.family[run])
        run, before, old, seconds = (column[seconds > 0] for column in (run, before, old, seconds))
        free = np.where(before == NONE_BEFORE, 0, clock.worked(self.schedule.end_s[before]))
        until = clock.worked(self.schedule.start_s[run])
        start = clock.start(np.maximum(until - seconds, np.minimum(free, until)))
        end = np.maximum(clock.end(until), start)
        return np.column_stack([run, start, end, seconds, old])

    def _starting(self, machine: int) -> int:
        """The family that a machine starts in, or -1 where its first run needs no changeover."""
        family = self.shop.machines[machine].family
        return -1 if family is None else self.families.index(family)

    # ---- people and ways -----------------------------------------------------------------------

    @cached_property
    def heads(self) -> Ints:
        """Heads that each run takes from its machine's crew; 0 on machines without one."""
        manned = np.array([machine.crew is not None for machine in self.shop.machines], bool)
        heads = self.shop.operations.heads[self.schedule.operation]
        return np.where(manned[self.machine], heads, 0) if len(heads) else heads

    @cached_property
    def way_s(self) -> Ints:
        """How long each run's order is then on its way to its next machine; 0 for the last."""
        way = np.zeros(len(self.schedule), np.int64)
        if self.shop.transport.none:
            return way
        ids = [machine.id for machine in self.shop.machines]
        run = np.flatnonzero(self.after_in_order != NONE_BEFORE)
        there = self.machine[self.after_in_order[run]]
        way[run] = self._between(self.shop.transport.seconds, ids, self.machine[run], there)
        return way

    # ---- idle time -----------------------------------------------------------------------------

    def gaps(self, machine: int) -> Gaps:
        """Return the idle open time of a machine's units, from the shift's start to each unit's last run."""
        clock = self.shop.machine_clocks[machine]
        run = self._on(machine)
        before = self.before_on_unit[run]
        free = np.where(before == NONE_BEFORE, 0, clock.worked(self.schedule.end_s[before]))
        until = clock.worked(self.schedule.start_s[run]) - self.change_s[run]
        idle = until > free
        start, end = clock.start(free), clock.end(until)
        return Gaps(*(column[idle] for column in (self.row[run], start, end, until - free)))

    # ---- small steps ---------------------------------------------------------------------------

    def _on(self, machine: int) -> Ints:
        """The runs of one machine, unit by unit and in sequence."""
        first, last = np.searchsorted(self._machine_by_unit, [machine, machine + 1])
        runs: Ints = self.by_unit[first:last]
        return runs

    @cached_property
    def _machine_by_unit(self) -> Ints:
        return self.machine[self.by_unit]

    def _between(
        self, seconds: Callable[[str, str], int], names: tuple[str, ...] | list[str], one: Ints, two: Ints
    ) -> Ints:
        """Return the time from each name to the next, asking once for each pair that occurs."""
        pairs, which = np.unique(one * len(names) + two, return_inverse=True)
        each = [seconds(names[pair // len(names)], names[pair % len(names)]) for pair in pairs.tolist()]
        return np.array(each, np.int64)[which] if each else np.zeros(0, np.int64)


def _starts(keys: Ints) -> Bools:
    """Whether each entry of sorted keys is the first of its key."""
    return np.r_[True, keys[1:] != keys[:-1]] if len(keys) else np.zeros(0, bool)


def _neighbours(order: Ints, group: Ints) -> Ints:
    """Return for each entry the one before it in `order`, where it belongs to the same group."""
    found = np.full(len(order), NONE_BEFORE, np.int64)
    follows = np.flatnonzero(~_starts(group[order]))
    found[order[follows]] = order[follows - 1]
    return found
