"""Timed matchings: when each load of a rectangular table runs, within the table's largest line total.

The engine under `decompose` and `units`; the first of them says why it works and how cuts are kept few.
"""

from __future__ import annotations

from bisect import bisect_left, insort
from collections.abc import Sequence
from heapq import heappop, heappush
from math import isqrt
from sys import maxsize
from typing import NamedTuple

__all__ = ["Load", "Spell", "fewest_cuts"]

Spell = tuple[int, int]

#: How the reserve of a try differs from two thirds of the root of the shorter side.
TRIES = (0, 1, -1)
#: A line can afford to wait while its spare time is above this many average loads.
AFFORDS = 1.5


class Load(NamedTuple):
    """Work of one row with one column, both numbered from 0; no two loads of the same pair."""

    row: int
    column: int
    #: Above 0.
    seconds: int
    #: Whether it stands for idleness, and so may be interrupted as often as one likes.
    idle: bool = False


def fewest_cuts(loads: Sequence[Load]) -> list[list[Spell]]:
    """Return the spells of each load, in order of time; all end by the largest total of any row or column.

    A row or column is in one spell at a time, and the spells of a load add up to its seconds. Spells of a
    load do not touch. Several reserves of waiting lines are tried; the first plan with the fewest cuts is
    returned.
    """
    if not loads:
        return []
    rows = 1 + max(load.row for load in loads)
    shorter = min(rows, 1 + max(load.column for load in loads))
    affords = int(AFFORDS * sum(load.seconds for load in loads) / len(loads))
    best: list[list[Spell]] = []
    fewest = maxsize
    for more in TRIES:
        table = _Table(loads, rows)
        if table.run(max(0, isqrt(shorter) * 2 // 3 + more), affords, fewest):
            best, fewest = table.spells, table.cuts
        if not fewest:
            break
    return best


class _Table:
    """The state of the schedule at one moment. Lines are numbered through: rows first, then columns."""

    def __init__(self, loads: Sequence[Load], rows: int) -> None:
        lines = rows + 1 + max(load.column for load in loads)
        self.ends = [(load.row, rows + load.column) for load in loads]
        self.left_over = [load.seconds for load in loads]
        self.idle = [load.idle for load in loads]
        self.spells: list[list[Spell]] = [[] for _ in loads]
        self.rows = rows
        self.now = 0
        #: Loads that were interrupted and not taken up again at once, idle ones aside.
        self.cuts = 0
        #: The loads of each line that are not done: the line at the other end, and the load.
        self.open: list[dict[int, int]] = [{} for _ in range(lines)]
        total = [0] * lines
        for load, (row, column) in enumerate(self.ends):
            self.open[row][column] = load
            self.open[column][row] = load
            total[row] += self.left_over[load]
            total[column] += self.left_over[load]
        self.span = max(total)
        #: For a free line the moment at which it becomes critical; for a busy one its spare time, which
        #: then stays.
        self.spare = [self.span - each for each in total]
        self.running = [-1] * lines
        self.began = [0] * len(loads)
        #: Free rows and free columns with work left, by the moment at which they become critical.
        self.free: tuple[list[Spell], list[Spell]] = ([], [])
        for line, spare in enumerate(self.spare):
            if total[line]:
                self.free[line >= rows].append((spare, line))
        for side in self.free:
            side.sort()
        self.finishes: list[tuple[int, int]] = []

    def run(self, reserve: int, affords: int, limit: int) -> bool:
        """Schedule everything, or give up and return False once there are ``limit`` cuts."""
        fresh = [line for side in self.free for _, line in side]
        while True:
            for side in self.free:
                while side and side[0][0] <= self.now:
                    fresh += self.serve(side[0][1])
            self.fill(fresh, reserve, affords)
            if self.cuts >= limit:
                return False
            moment = self.next_moment()
            if moment < 0:
                return True
            self.now = moment
            fresh = []
            while self.finishes and self.finishes[0][0] <= moment:
                _, load = heappop(self.finishes)
                if self.running[self.ends[load][0]] == load:
                    self.stop(load)
                    fresh += self.ends[load]

    def next_moment(self) -> int:
        """Return when the next load ends or the next free line becomes critical; -1 if all is done."""
        while self.finishes:
            end, load = self.finishes[0]
            if self.running[self.ends[load][0]] == load and self.began[load] + self.left_over[load] == end:
                break
            heappop(self.finishes)  # interrupted since
        moments = [side[0][0] for side in (*self.free, self.finishes) if side]
        return min(moments, default=-1)

    def start(self, load: int) -> None:
        row, column = self.ends[load]
        spare, now, (rows, columns) = self.spare, self.now, self.free
        del rows[bisect_left(rows, (spare[row], row))]
        del columns[bisect_left(columns, (spare[column], column))]
        spare[row] -= now
        spare[column] -= now
        self.running[row] = self.running[column] = load
        self.began[load] = now
        spells = self.spells[load]
        if spells and spells[-1][1] == now:
            self.cuts -= not self.idle[load]
        heappush(self.finishes, (now + self.left_over[load], load))

    def stop(self, load: int) -> None:
        row, column = self.ends[load]
        spare, start, now = self.spare, self.began[load], self.now
        spells = self.spells[load]
        if spells and spells[-1][1] == start:
            start = spells.pop()[0]
        if start < now:
            self.left_over[load] -= now - self.began[load]
            spells.append((start, now))
            if self.left_over[load]:
                self.cuts += not self.idle[load]
            else:
                del self.open[row][column]
                del self.open[column][row]
        self.running[row] = self.running[column] = -1
        spare[row] += now
        spare[column] += now
        if self.open[row]:
            insort(self.free[0], (spare[row], row))
        if self.open[column]:
            insort(self.free[1], (spare[column], column))

    def partner(self, line: int) -> int:
        """Return the load of this line with the free line that has least time to spare, or -1."""
        others = self.free[line < self.rows]
        own = self.open[line]
        # The head of the sorted list nearly always holds one; if not, the line's own loads are the shorter
        # list.
        for _, other in others[: len(own)]:
            if other in own:
                return own[other]
        found = -1
        if len(others) <= len(own):
            return found
        least = (self.span, 0)
        for other, load in own.items():
            if self.running[other] < 0 and (self.spare[other], other) < least:
                least = (self.spare[other], other)
                found = load
        return found

    def fill(self, fresh: list[int], reserve: int, affords: int) -> None:
        """Start what can start, the lines with least time to spare first, but keep a reserve of free lines.

        Only lines just freed, and those kept in reserve, can find a partner that was not there before.
        """
        rows, columns = self.free
        if not rows or not columns:
            return
        shorter = rows if len(rows) <= len(columns) else columns
        if len(shorter) <= reserve + len(fresh):
            waiting = shorter.copy()
        else:
            free = (line for line in fresh if self.running[line] < 0 and self.open[line])
            waiting = sorted((self.spare[line], line) for line in free)
        patience = self.now + affords
        for spare, line in waiting:
            if self.running[line] >= 0:
                continue
            load = self.partner(line)
            if load < 0:
                continue
            row, column = self.ends[load]
            if (
                spare <= patience
                or self.spare[row] + self.spare[column] - spare <= patience
                or (len(rows) > reserve and len(columns) > reserve)
            ):
                self.start(load)

    def serve(self, line: int) -> tuple[int, ...]:
        """Give a free critical line something to run, at the price of as few cuts as will do.

        Returns the line that was left idle instead, if any. Lines of the same side are reached through the
        loads that would have to make way, in order of cuts; the search ends at one that finds a free
        partner, else at the one with most time to spare. A critical line is never left idle.
        """
        load = self.partner(line)
        if load >= 0:
            self.start(load)
            return ()
        came: dict[int, tuple[int, int, int]] = {line: (-1, -1, -1)}
        level = [line]
        while level:
            dearer: dict[int, tuple[int, int, int]] = {}
            for via in level:  # grows as cuts that cost nothing are followed
                for other, load in self.open[via].items():
                    giving = self.running[other]
                    reached = self.ends[giving][other < self.rows]
                    if reached in came:
                        continue
                    if self.idle[giving] or self.began[giving] == self.now:
                        came[reached] = (via, load, giving)
                        level.append(reached)
                    else:
                        dearer.setdefault(reached, (via, load, giving))
            for reached in level:
                load = self.partner(reached)
                if load >= 0:
                    self.reroute(came, reached, load)
                    return ()
            spared = max(level, key=lambda each: (self.running[each] >= 0 and self.spare[each], -each))
            if self.running[spared] >= 0 and self.spare[spared] > 0:
                self.reroute(came, spared, -1)
                return (spared,)
            level = [reached for reached in dearer if reached not in came]
            came.update((reached, dearer[reached]) for reached in level)
        raise AssertionError("a critical line could not be served, which the totals rule out")

    def reroute(self, came: dict[int, tuple[int, int, int]], line: int, load: int) -> None:
        """Move each line on the way from the one served on by a partner; give the last one ``load``."""
        starting = [load] if load >= 0 else []
        while came[line][0] >= 0:
            line, load, giving = came[line]
            self.stop(giving)
            starting.append(load)
        for load in starting:
            self.start(load)
