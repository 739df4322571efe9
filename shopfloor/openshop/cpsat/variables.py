"""The variables of the general model: when each operation starts, on the coarsest grid that loses nothing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import gcd

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.shop import Bools, Ints, Shop


@dataclass(frozen=True, slots=True)
class Grid:
    """Times as multiples of `unit_s`, the greatest common divisor of all run times and releases.

    Pushed to the left, a schedule starts each operation at a release or at the end of another one, so
    at a multiple of it; and whatever is best, some such schedule is as good.
    """

    unit_s: int

    @classmethod
    def of(cls, shop: Shop) -> Grid:
        """Return the grid of `shop`."""
        return cls(gcd(0, *shop.operations.seconds.tolist(), *shop.orders.release_s.tolist()) or 1)

    def down(self, seconds: int) -> int:
        """Return the last grid point no later than `seconds`."""
        return seconds // self.unit_s

    def up(self, seconds: int) -> int:
        """Return the first grid point no earlier than `seconds`."""
        return -(-seconds // self.unit_s)


@dataclass(slots=True)
class Model:
    """A model being built: what the rules constrain. All times are on the grid.

    Attributes
    ----------
    latest
        No operation ends later.
    seconds
        Run time of every operation of the shop.
    rows
        The operations that are still to be placed, in the order in which their variables were made.
    start, interval
        By operation; only those of `rows`.
    lines
        The rows of each order and of each machine of one unit: one of them at a time runs.
    groups
        For each machine of several units its rows, and what stays on it and may run meanwhile.
    """

    cp: cp_model.CpModel
    shop: Shop
    grid: Grid
    latest: int
    seconds: list[int]
    rows: list[int]
    start: dict[int, cp_model.IntVar]
    interval: dict[int, cp_model.IntervalVar]
    lines: list[list[int]]
    groups: list[tuple[int, list[int], list[cp_model.IntervalVar]]]

    def end(self, operation: int) -> cp_model.LinearExprT:
        """Return the end of an operation."""
        return self.start[operation] + self.seconds[operation]

    def hint(self, starts_s: Ints) -> None:
        """Begin the search at `starts_s`, in seconds, an entry an operation of the shop."""
        for operation in self.rows:
            moment = self.grid.down(int(starts_s[operation]))
            self.cp.add_hint(self.start[operation], min(moment, self.latest - self.seconds[operation]))


def declare(
    shop: Shop, latest_s: int, *, rows: Sequence[int] | Ints | None = None, at_s: Ints | None = None
) -> Model:
    """Return a model with starts and intervals but no rule yet.

    Parameters
    ----------
    latest_s
        No operation may end later, in seconds.
    rows
        The operations to be placed, all unless said, in the order in which their variables are made:
        another order leads the solver another way.
    at_s
        Starts of a legal schedule, an entry an operation of the shop, when `rows` are not all but
        some that follow each other by start and number: the others stay. Those before `rows` stay before
        them on their orders and machines of one unit, those after stay behind them.

    Returns
    -------
    Model
        Starts keep to releases, to what stays, to the time that lower and higher steps of their orders
        take, and to `latest_s`.
    """
    grid, columns = Grid.of(shop), shop.operations
    cp = cp_model.CpModel()
    chosen = np.arange(len(shop)) if rows is None else np.asarray(rows, np.int64)
    single = np.array([machine.count == 1 for machine in shop.machines], bool)
    surroundings = Surroundings(shop, latest_s, chosen, at_s, single)
    seconds = (columns.seconds // grid.unit_s).tolist()
    start: dict[int, cp_model.IntVar] = {}
    interval: dict[int, cp_model.IntervalVar] = {}
    for operation, first_s, last_s in surroundings.spans():
        first, last = grid.up(first_s), grid.down(last_s)
        if last < first:
            cp.add_bool_or([])  # no place left: the model has no solution
        start[operation] = cp.new_int_var(first, max(first, last), "")
        interval[operation] = cp.new_fixed_size_interval_var(start[operation], seconds[operation], "")
    lines = _grouped(columns.job[chosen], chosen)
    machine = columns.machine[chosen]
    lines += _grouped(machine[single[machine]], chosen[single[machine]])
    groups: list[tuple[int, list[int], list[cp_model.IntervalVar]]] = []
    for members in _grouped(machine[~single[machine]], chosen[~single[machine]], least=1):
        index = int(columns.machine[members[0]])
        staying = [
            cp.new_fixed_size_interval_var(grid.down(int(begin)), seconds[each], "")
            for each, begin in surroundings.beside(index)
        ]
        groups.append((index, members, staying))
    latest = grid.down(latest_s)
    return Model(cp, shop, grid, latest, seconds, chosen.tolist(), start, interval, lines, groups)


class Surroundings:
    """What stays around the operations to be placed, and the time it leaves them. All in seconds."""

    def __init__(self, shop: Shop, latest_s: int, rows: Ints, at_s: Ints | None, single: Bools) -> None:
        columns = shop.operations
        self._shop, self._rows = shop, rows
        self._first = shop.head_s.copy()
        self._last = latest_s - columns.seconds - shop.tail_s
        self._at = np.zeros(len(shop), np.int64) if at_s is None else at_s
        stays = np.ones(len(shop), bool)
        stays[rows] = False
        self._staying = np.flatnonzero(stays)
        if not len(self._staying):
            return
        place = np.empty(len(shop), np.int64)
        place[np.lexsort((np.arange(len(shop)), self._at))] = np.arange(len(shop))
        before = place[self._staying] < place[rows].min()
        for column, usable in (
            (columns.job, np.ones(len(shop.orders), bool)),
            (columns.machine, single),
        ):
            ready, shut = np.zeros(len(usable), np.int64), np.full(len(usable), latest_s, np.int64)
            past, future = self._staying[before], self._staying[~before]
            np.maximum.at(ready, column[past], self._at[past] + columns.seconds[past])
            np.minimum.at(shut, column[future], self._at[future])
            ready[~usable], shut[~usable] = 0, latest_s
            self._first = np.maximum(self._first, ready[column])
            self._last = np.minimum(self._last, shut[column] - columns.seconds)

    def spans(self) -> list[tuple[int, int, int]]:
        """Return each operation to be placed with its first and its last possible start."""
        rows = self._rows
        return list(zip(rows.tolist(), self._first[rows].tolist(), self._last[rows].tolist(), strict=True))

    def beside(self, machine: int) -> list[tuple[int, int]]:
        """Return what stays on a group and may run at the same time as what is placed, with its start."""
        columns, rows = self._shop.operations, self._rows
        first = self._first[rows].min()
        last = (self._last[rows] + columns.seconds[rows]).max()
        here = self._staying[columns.machine[self._staying] == machine]
        meets = (self._at[here] < last) & (self._at[here] + columns.seconds[here] > first)
        return list(zip(here[meets].tolist(), self._at[here[meets]].tolist(), strict=True))


def _grouped(key: Ints, rows: Ints, least: int = 2) -> list[list[int]]:
    """Return `rows` by equal `key`, groups smaller than `least` left out, sequences kept."""
    by_key = np.argsort(key, kind="stable")
    cuts = np.flatnonzero(np.diff(key[by_key])) + 1
    return [rows[group].tolist() for group in np.split(by_key, cuts) if len(group) >= least]
