"""Heads at work against heads there: one step line a crew."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shopfloor.model.calendar import united
from shopfloor.model.shop import Crew, Ints, Machine, Shop
from shopfloor.render.runs import Runs


@dataclass(frozen=True, eq=False)
class CrewUse:
    """How many heads of a crew are at work, and how many are there: steps that hold up to the next one.

    Attributes
    ----------
    crew
        Which crew.
    at_s
        When each step begins, from 0; the last step begins at `until_s` of :func:`crew_use`.
    used, there
        Heads at work, and heads there, from then on.
    """

    crew: Crew
    at_s: Ints
    used: Ints
    there: Ints

    @property
    def peak(self) -> int:
        """Most heads at work at once."""
        return int(self.used.max(initial=0))

    @property
    def work_s(self) -> int:
        """Work of all heads together, in seconds of one head."""
        return int((self.used[:-1] * np.diff(self.at_s)).sum())

    def coarse(self, steps: int) -> CrewUse:
        """Return the same in at most so many even steps, each with the most heads at work in it.

        Where heads there change within a step the fewest count, so that what looks possible is.
        """
        if len(self.at_s) <= steps + 1:
            return self
        until = int(self.at_s[-1])
        edges = np.unique(np.linspace(0, until, steps + 1).astype(np.int64))
        first = np.searchsorted(self.at_s, edges[:-1], side="right") - 1
        last = np.searchsorted(self.at_s, edges[1:], side="left")
        bounds = np.column_stack([first, np.maximum(last, first + 1)]).ravel()
        used = np.maximum.reduceat(np.r_[self.used, 0], bounds)[::2]
        there = np.minimum.reduceat(np.r_[self.there, 0], bounds)[::2]
        return CrewUse(self.crew, edges, np.r_[used, self.used[-1]], np.r_[there, self.there[-1]])


def crew_use(runs: Runs, until_s: int) -> tuple[CrewUse, ...]:
    """Return the use of every crew from 0 to `until_s`, in the shop's order; O(m log m) for m runs.

    A run takes its heads while it is worked: on machines of which only the set-up is attended until that
    is done, and nowhere while its machine is shut.
    """
    return tuple(_use(runs, crew, until_s) for crew in runs.shop.crews)


def heads_there(crew: Crew, moments: Ints) -> Ints:
    """Return how many heads of a crew are there at each moment."""
    there = np.full(len(moments), crew.heads, np.int64)
    for start, end, heads in crew.levels:
        there[(moments >= start) & (moments < end)] = heads
    return there


def head_time_s(shop: Shop, crew: Crew, until_s: int) -> int:
    """Return how long the heads of a crew are there up to `until_s`, all together, without hall breaks."""
    edges = sorted({0, until_s, *(min(max(at, 0), until_s) for level in crew.levels for at in level[:2])})
    moments = np.array(edges, np.int64)
    worked = np.diff(shop.work_clock.worked(moments))
    return int((heads_there(crew, moments[:-1]) * worked).sum())


def _use(runs: Runs, crew: Crew, until_s: int) -> CrewUse:
    shop, schedule = runs.shop, runs.schedule
    moments, changes = [np.zeros(0, np.int64)], [np.zeros(0, np.int64)]
    for machine, hall in enumerate(shop.machines):
        if hall.crew != crew.id:
            continue
        mine = np.flatnonzero(runs.machine == machine)
        start, heads = schedule.start_s[mine], runs.heads[mine]
        end = runs.set_up_end_s[mine] if hall.set_up_only else schedule.end_s[mine]
        moments += [start, end]
        changes += [heads, -heads]
        if hall.pauses and (hall.closed or shop.breaks):
            shut = _shut_inside(shop, hall, start, end, heads)
            moments += shut[:2]
            changes += shut[2:]
    levels = [at for level in crew.levels for at in level[:2]]
    moment = np.concatenate([*moments, np.array([0, until_s, *levels], np.int64)])
    change = np.concatenate([*changes, np.zeros(2 + len(levels), np.int64)])
    at, place = np.unique(np.clip(moment, 0, until_s), return_inverse=True)
    total = np.zeros(len(at), np.int64)
    np.add.at(total, place, change)
    return CrewUse(crew, at, np.cumsum(total), heads_there(crew, at))


def _shut_inside(shop: Shop, hall: Machine, start: Ints, end: Ints, heads: Ints) -> list[Ints]:
    """Return when closures inside stretches of work begin and end, and how many heads leave and return."""
    closures = ((shut.start_s, shut.end_s) for shut in (*shop.breaks, *hall.closed))
    shuts = np.array(united(closures), np.int64).reshape(-1, 2)
    over = (start[:, None] < shuts[None, :, 0]) & (end[:, None] > shuts[None, :, 1])
    away = (over * heads[:, None]).sum(axis=0)
    return [shuts[:, 0], shuts[:, 1], -away, away]
