"""One machine with changeovers: the cheapest way through its families, each operation as often as it likes.

Every operation has a reward for being done; the machine takes the cheapest path through time and families,
and the rewards are paid back. Changeovers take their time on the path, which prices on slots of time do
not see. That an operation may be repeated is what keeps it quick (N. Christofides, A. Mingozzi, P. Toth,
Networks 11 (1981) 145-164). So that the families are not all served at once, each by a part of the path,
operations wait for their family to be entered: a toll for each operation and stretch of time charges what
is done and rewards the entry. Any rewards and tolls give a lower bound.

Time is in steps of equal length; what does not fit them is rounded down, which makes no path dearer.
Running time of a pass: linear in steps times operations.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import gcd

import numpy as np

from shopfloor.bounds.ascent import Climb
from shopfloor.bounds.places import Places
from shopfloor.bounds.prices import summed
from shopfloor.model.shop import NO_FAMILY, Bools, Ints, Shop

STEPS_MOST = 600  # of time
TOLLS = 32  # stretches of time with a toll of their own
TOLL_SHARE = 0.3  # how far a toll moves beside a reward
NEVER = 2**60  # the cost of where no path goes


@dataclass(frozen=True)
class Arcs:
    """The ways from one step and family on, in order of the family they lead to.

    Attributes
    ----------
    after, before, steps
        Family led to, family come from, steps of time.
    row
        The operation done, -1 where the machine waits or changes over.
    first
        The first arc to each family.
    begins
        Whether the machine may begin in each family.
    """

    after: Ints
    before: Ints
    steps: Ints
    row: Ints
    first: Ints
    begins: Bools


def arcs_of(shop: Shop, places: Places) -> tuple[Arcs, int] | None:
    """Return the arcs of a machine and the seconds of a step; None if some change is shorter than that."""
    hall = shop.machines[places.machine]
    times = shop.changeovers.get(hall.id)
    if times is None or times.none:
        return None
    index = shop.operations.family[places.rows].tolist()
    named = ["" if family == NO_FAMILY else shop.families[family] for family in index]
    names = sorted({*named, *([] if hall.family is None else [hall.family])})
    change = [[times.seconds(old, new) for new in names] for old in names]
    seconds = [*places.taken.tolist(), *(change[a][b] for a in range(len(names)) for b in range(a))]
    seconds += [change[a][b] for a in range(len(names)) for b in range(a + 1, len(names))]
    common = gcd(*seconds)
    if not common:
        return None
    unit = common * max(1, -(-int(places.open_at[0, -1]) // (STEPS_MOST * common)))
    if min(seconds) < unit:
        return None
    ways = [(k, k, 1, -1) for k in range(len(names))]
    ways += [(b, a, change[a][b] // unit, -1) for a in range(len(names)) for b in range(len(names)) if a != b]
    at = [names.index(name) for name in named]
    ways += [(at[row], at[row], int(places.taken[row]) // unit, row) for row in range(len(at))]
    ways.sort()
    after, before, steps, row = (np.array(column, np.int64) for column in zip(*ways, strict=True))
    first = np.searchsorted(after, np.arange(len(names)))
    begins = np.array([hall.family is None or name == hall.family for name in names])
    return Arcs(after, before, steps, row, first, begins), unit


class Runs:
    """One machine with changeovers under rewards and tolls; asked like :class:`~.prices.Prices`.

    Parameters
    ----------
    arcs, unit_s
        As :func:`arcs_of` gives them.
    rewards
        Where they begin: an entry an operation of `places`.
    """

    def __init__(self, shop: Shop, places: Places, arcs: Arcs, unit_s: int, rewards: Ints) -> None:
        self.places, self.arcs = places, arcs
        self.count = shop.machines[places.machine].count
        self.last = int(places.open_at[0, -1]) // unit_s
        self.done = np.flatnonzero(arcs.row >= 0)
        self.entered = np.flatnonzero((arcs.row < 0) & (arcs.after != arcs.before))
        self.row = arcs.row[self.done]
        self.family = np.empty(len(places.rows), np.int64)
        self.family[self.row] = arcs.after[self.done]
        self._mean_s = float(places.taken.mean())
        self._late_s = np.diff(np.maximum(places.edges, places.late_from[:, None]), axis=1)
        stretch = -(-(self.last + 1) // TOLLS)
        moments = np.arange(self.last + 1)
        self._toll_at = moments // stretch
        start = moments[:, None] - arcs.steps[self.done]
        self._toll_from = np.maximum(start, 0) // stretch
        self._finish, self._barred = self._where(shop, start, unit_s)
        self._slot = np.searchsorted(places.edges, self._finish, side="right") - 1
        since = places.late_from[self.row]
        self._into = np.maximum(self._finish, since) - np.maximum(places.edges[self._slot], since)
        self.rewards = Climb(np.maximum(rewards, 0) / places.taken)
        self.tolls = Climb(np.zeros((len(places.rows), TOLLS)))

    def step(self, shares: Ints, length: float) -> tuple[int, Ints]:
        """Return a lower bound of the lateness, and the seconds of it in each slot, a line an operation; move
        rewards and tolls.

        Parameters
        ----------
        shares
            What a second of lateness costs: a line an operation, a column a slot.
        length
            Of the step.
        """
        value, visits, entries, late = self._path(shares)
        missing = 1 - visits.sum(axis=1)
        self.rewards.step((missing * self.places.taken).astype(np.float64), length)
        early = np.cumsum(visits, axis=1) - np.cumsum(entries, axis=1)[self.family]
        self.tolls.step(early.astype(np.float64), length * TOLL_SHARE * self._mean_s)
        return value, late

    def _where(self, shop: Shop, start: Ints, unit_s: int) -> tuple[Ints, Bools]:
        """Return for each step and operation that ends then: its order's end, and whether it cannot be."""
        places, machine = self.places, shop.machines[self.places.machine]
        clock, hall = shop.machine_clocks[places.machine], shop.work_clock
        rows = places.rows[self.row]
        tail = shop.tail_s[rows]
        end = np.asarray(clock.end(np.arange(self.last + 1) * unit_s))[:, None]
        finish = np.where(tail > 0, hall.end(hall.worked(end) + tail), end)
        barred = start < np.asarray(clock.worked(shop.head_s[rows])) // unit_s
        if not machine.pauses:  # wherever in its step it starts, it runs into a closure
            length, shut = places.taken[self.row], np.diff(places.open_at[0]) == 0
            for jump in np.unique(places.open_at[0, :-1][shut]).tolist():
                barred |= ((start + 1) * unit_s <= jump) & (start * unit_s + length > jump)
        return finish, barred

    def _path(self, shares: Ints) -> tuple[int, Ints, Ints, Ints]:
        """Return the bound; on the cheapest path visits by operation and entries by family, each by stretch,
        and the lateness in each slot."""
        arcs, families = self.arcs, len(self.arcs.first)
        cost, paid_back, first_entry = self._costs(shares)
        longest = int(arcs.steps.max())
        best = np.full((longest + self.last + 1) * families, NEVER, np.int64)
        best[longest * families : (longest + 1) * families] = np.where(arcs.begins, -first_entry, NEVER)
        source = (longest - arcs.steps) * families + arcs.before
        ways = np.empty(len(source), np.int64)
        for moment in range(1, self.last + 1):
            source += families
            np.take(best, source, out=ways)
            ways += cost[moment]
            place = (longest + moment) * families
            np.minimum.reduceat(ways, arcs.first, out=best[place : place + families])
        table = best.reshape(-1, families)[longest:]
        value = self.count * int(table[-1].min()) + paid_back
        return value, *self._walked(table, cost)

    def _costs(self, shares: Ints) -> tuple[Ints, int, Ints]:
        """Return what each arc costs that ends at a step, all rewards, and what a first entry is rewarded."""
        row, slot = self.row, self._slot
        late = summed(shares, self._late_s)[row, slot] + shares[row, slot] * self._into
        # What is done after the last step is on no path: it must not be worth doing then.
        rewards = np.floor(self.rewards.values * self.places.taken).astype(np.int64)
        rewards[row] = np.minimum(rewards[row], late[-1])
        tolls = np.cumsum(np.floor(self.tolls.values[:, ::-1]).astype(np.int64), axis=1)[:, ::-1]
        entry = np.zeros((len(self.arcs.first), TOLLS), np.int64)
        np.add.at(entry, self.family, tolls)
        cost = np.zeros((self.last + 1, len(self.arcs.row)), np.int64)
        worth = late - rewards[row] + tolls[row, self._toll_from]
        cost[:, self.done] = np.where(self._barred, NEVER, worth)
        cost[:, self.entered] = -entry[self.arcs.after[self.entered]].T[self._toll_at]
        return cost, int(rewards.sum()), entry[:, 0]

    def _walked(self, table: Ints, cost: Ints) -> tuple[Ints, Ints, Ints]:
        """Follow the cheapest path back: visits by operation, entries by family, lateness by slot."""
        arcs, moment = self.arcs, self.last
        visits = np.zeros((len(self.places.rows), TOLLS), np.int64)
        entries = np.zeros((len(arcs.first), TOLLS), np.int64)
        finish: list[int] = []
        done: list[int] = []
        ends = np.append(arcs.first[1:], len(arcs.row)).tolist()
        firsts, rows = arcs.first.tolist(), arcs.row.tolist()
        column = {arc: place for place, arc in enumerate(self.done.tolist())}
        family = int(table[-1].argmin())
        while moment:
            if table[moment, family] == table[moment - 1, family]:
                moment -= 1
                continue
            here = slice(firsts[family], ends[family])
            steps = arcs.steps[here]
            before = np.where(steps <= moment, table[np.maximum(moment - steps, 0), arcs.before[here]], NEVER)
            arc = firsts[family] + int((before + cost[moment, here]).argmin())
            if rows[arc] >= 0:
                visits[rows[arc], self._toll_from[moment, column[arc]]] += self.count
                done.append(rows[arc])
                finish.append(int(self._finish[moment, column[arc]]))
            else:
                entries[family, self._toll_at[moment]] += self.count
            moment -= int(arcs.steps[arc])
            family = int(arcs.before[arc])
        entries[family, 0] += self.count
        late = np.zeros((len(visits), len(self.places.edges)), np.int64)
        if done:
            np.add.at(late, done, self.count * self.places.late_in(np.array(finish), np.array(done)))
        return visits, entries, late
