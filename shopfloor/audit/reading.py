"""A plan read beside its shop: what every rule looks at, and what a rule hands back."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from shopfloor.audit.columns import run_starts
from shopfloor.audit.match import match_rows
from shopfloor.audit.shut import Shut
from shopfloor.audit.witness import Verdict, judge
from shopfloor.audit.words import moment
from shopfloor.model.calendar import duration
from shopfloor.model.shop import Bools, Ints, Shop
from shopfloor.model.stated import StatedPlan


@dataclass(frozen=True)
class Breaches:
    """Every place where a plan breaks one rule; sentences are made only for those that are shown.

    Attributes
    ----------
    at
        Shape (breaches, width): what :attr:`say` is called with, one breach a line.
    say
        Makes the sentence of one breach.
    are_rows
        Whether the entries of `at` are rows of the plan (positions from 0), or something else.
    """

    at: Ints
    say: Callable[..., str]
    are_rows: bool = True

    def __len__(self) -> int:
        return len(self.at)


def breaches(say: Callable[..., str], *columns: Ints | Sequence[int], are_rows: bool = True) -> Breaches:
    """Return the breaches whose k-th is described by the k-th entry of each column, in row order."""
    at = np.column_stack([np.asarray(column, np.int64) for column in columns])
    return Breaches(at[np.lexsort(at.T[::-1])], say, are_rows)


def claim(broken: bool, say: Callable[[], str]) -> Breaches:
    """Return the one breach of a claim about the whole plan, or none."""
    return Breaches(np.zeros((int(broken), 0), np.int64), say)


@dataclass(frozen=True, eq=False)
class Reading:
    """A stated plan and the shop it is for, with each row's order, machine and operation looked up."""

    shop: Shop
    stated: StatedPlan

    # ---- which order, machine and operation ----------------------------------------------------

    @cached_property
    def job(self) -> Ints:
        """Index of each row's order, -1 when the shop has none of that name."""
        return _indices(self.shop.orders.ids, self.stated.order)

    @cached_property
    def machine(self) -> Ints:
        """Index of each row's machine, -1 when the shop has none of that name."""
        return _indices([machine.id for machine in self.shop.machines], self.stated.machine)

    @cached_property
    def operation(self) -> Ints:
        """Index of the operation each row runs, wholly or in part; -1 for a row that runs none."""
        return match_rows(self.shop, self.stated, self.job, self.machine, self.seconds)

    @cached_property
    def shut(self) -> list[Shut]:
        """When each machine is shut: the hall's breaks and its own closures; like machines share one."""
        made = {machine.closed: Shut((*self.shop.breaks, *machine.closed)) for machine in self.shop.machines}
        return [made[machine.closed] for machine in self.shop.machines]

    @cached_property
    def calendars(self) -> list[tuple[Shut, Bools]]:
        """Each different calendar, and which machines keep it."""
        keepers: dict[int, list[int]] = {}
        for place, shut in enumerate(self.shut):
            keepers.setdefault(id(shut), []).append(place)
        calendars = []
        for places in keepers.values():
            machines = np.zeros(len(self.shut), bool)
            machines[places] = True
            calendars.append((self.shut[places[0]], machines))
        return calendars

    @cached_property
    def pauses(self) -> Bools:
        """Whether each machine's work pauses while it is shut."""
        return np.array([machine.pauses for machine in self.shop.machines], bool)

    @cached_property
    def lasting(self) -> Bools:
        """Whether each row has a length at all; only such rows can overlap."""
        lasting: Bools = self.stated.end_s > self.stated.start_s
        return lasting

    @cached_property
    def seconds(self) -> Ints:
        """Seconds worked in each row: its length, less the time the machine is shut, where it pauses."""
        seconds = self.stated.end_s - self.stated.start_s
        rows = np.flatnonzero(self.lasting & (self.machine >= 0))
        rows = rows[self.pauses[self.machine[rows]]]
        for shut, machines in self.calendars if len(rows) else ():
            if len(shut):
                here = rows[machines[self.machine[rows]]]
                seconds[here] -= shut.within(self.stated.start_s[here], self.stated.end_s[here])
        return seconds

    @cached_property
    def pieces(self) -> tuple[Ints, Bools]:
        """Rows that run an operation, sorted by operation and start, and where each operation begins."""
        stated = self.stated
        rows = np.flatnonzero(self.operation >= 0)
        rows = rows[np.lexsort((rows, stated.end_s[rows], stated.start_s[rows], self.operation[rows]))]
        return rows, run_starts(self.operation[rows])

    @cached_property
    def latest_row(self) -> int:
        """The row that ends last, -1 in an empty plan."""
        return int(self.stated.end_s.argmax()) if len(self.stated) else -1

    @cached_property
    def latest_end_s(self) -> int:
        """Finish of the last row, 0 in an empty plan: the true makespan."""
        return int(self.stated.end_s[self.latest_row]) if len(self.stated) else 0

    @cached_property
    def verdicts(self) -> list[Verdict]:
        """What became of each stated bound when derived again from its witness."""
        return judge(self.shop, self.stated.bounds)

    @cached_property
    def supported_s(self) -> int:
        """The largest stated bound that its witness supports; 0 without one."""
        values = [verdict.bound.value_s for verdict in self.verdicts if verdict.holds]
        return max(values, default=0)

    # ---- in words ------------------------------------------------------------------------------

    def at(self, seconds: Any) -> str:
        """A moment, for a sentence; elapsed where a plan states a time that no calendar holds."""
        return moment(self.shop.clock, int(seconds))

    def span(self, row: int) -> str:
        """When a row runs: `from 06:30 to 07:00`."""
        return f"from {self.at(self.stated.start_s[row])} to {self.at(self.stated.end_s[row])}"

    def place(self, row: int) -> str:
        """The machine of a row, with the unit where there are several: `CMM unit 2`."""
        index, name = int(self.machine[row]), self.stated.machine[row]
        several = index >= 0 and self.shop.machines[index].count > 1
        return f"{name} unit {self.stated.unit[row]}" if several or self.stated.unit[row] != 1 else name

    def visit(self, row: int) -> str:
        """What a row says: `TQ-101 on CMM from 06:30 to 07:00`."""
        return f"{self.stated.order[row]} on {self.place(row)} {self.span(row)}"

    def need(self, operation: int) -> str:
        """An operation of the shop: `TQ-101 on CMM (30 min)`."""
        columns = self.shop.operations
        order = self.shop.orders.ids[int(columns.job[operation])]
        machine = self.shop.machines[int(columns.machine[operation])].id
        return f"{order} on {machine} ({duration(int(columns.seconds[operation]))})"


def _indices(ids: Sequence[str], names: Sequence[str]) -> Ints:
    index = {name: position for position, name in enumerate(ids)}
    return np.fromiter((index.get(name, -1) for name in names), np.int64, len(names))
