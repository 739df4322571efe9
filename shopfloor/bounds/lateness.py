"""A lower bound of weighted lateness: priority × time late, summed over the orders.

Two parts that add up:

- *Alone*: what an order is late by even when it never waits, from its release, its work, the openings of
  its machines and its ways between them.
- *Together*: what the orders are late by beyond that because a machine or crew cannot serve all of them
  in time. Each machine and crew is looked at by itself, under prices on its time (:mod:`.prices`) or, where
  it changes over, under rewards (:mod:`.family_path`). An order's lateness may be counted only once: in
  every slot of time the priority of an order is shared out among the machines that it visits (Lagrangian
  decomposition: M. Guignard, S. Kim, Mathematical Programming 39 (1987) 215-228, here slot by slot).

Any shares, prices, rewards and tolls give a valid bound; they are improved for a number of steps that the
size of the shop fixes. It holds for every plan, whatever its makespan. All that is summed is whole
numbers, so that the same shop gives the same bound everywhere.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import gcd

import numpy as np

from shopfloor.bounds.alone import alone
from shopfloor.bounds.ascent import Climb
from shopfloor.bounds.crew import CrewClock
from shopfloor.bounds.family_path import Runs, arcs_of
from shopfloor.bounds.places import Places, attended_s, places
from shopfloor.bounds.prices import Prices
from shopfloor.model.shop import NO_DUE, Bools, Crew, Floats, Ints, Shop

PRIORITY_UNIT = 1_000  # priorities count in thousandths
SLOTS = 32  # of equal length, beside the edges of closures
EDGES_MOST = 400
OPERATIONS_MOST = 4_000  # of orders with due times; beyond, each order alone
BITS = 46  # of the largest sum of lateness: so no sum of sums passes 64
FINE_BITS = 6  # multipliers are whole; so many bits below a thousandth of priority
FIRST_LENGTH, LAST_LENGTH = 0.7, 0.004  # of a step, in mean priorities
WORK = 40_000_000  # candidate starts looked at, in all steps together
STEPS = (60, 240)  # at least and at most
PRICED_SHARE = 0.1  # of the steps, before machines with changeovers get rewards
CROWDED = 0.7  # of what a crew has until some time is due by then: else it is not looked at
FACTORS = (1.0, 0.5, 0.25, 0.0)  # of the prices that a list suggests


@dataclass(frozen=True, slots=True)
class LeastLateness:
    """What every plan has of weighted lateness, at least, in thousandths of priority × seconds.

    Attributes
    ----------
    alone
        The part that orders have even when they never wait.
    together
        What machines and crews force beyond that.
    names
        The machines and crews that it comes from.
    """

    alone: int
    together: int
    names: tuple[str, ...] = ()

    @property
    def value(self) -> int:
        """Both parts."""
        return self.alone + self.together


@dataclass(frozen=True, slots=True)
class Parts:
    """Which parts of the bound to take; all of them unless somebody wants to compare.

    `shared` tells whether an order's priority is shared among machines; else the best single one counts.
    `slots` of equal length, beside the edges of closures.
    """

    machines: bool = True
    crews: bool = True
    changeovers: bool = True
    shared: bool = True
    slots: int = SLOTS


EVERYTHING = Parts()


def least_lateness(shop: Shop, parts: Parts = EVERYTHING) -> LeastLateness:
    """Return a lower bound of the weighted lateness of every plan of `shop`.

    Running time near-linear in operations times slots for each step; seconds at most, since larger shops
    take fewer steps. Operations that may be split count only in their orders' own time.
    """
    weight = np.rint(shop.orders.priority * PRIORITY_UNIT)
    due = shop.orders.due_s
    dated = (due != NO_DUE) & (shop.job_load_s > 0)
    earliest = earliest_ends(shop)
    own = sum(
        int(weight[job]) * int(earliest[job] - due[job])
        for job in np.flatnonzero(dated & (earliest > due)).tolist()
    )
    rows = np.flatnonzero(dated[shop.operations.job] & (shop.operations.splittable == 0))
    if not len(rows) or len(rows) > OPERATIONS_MOST:
        return LeastLateness(own, 0)
    late_from = np.where(dated, np.maximum(due, earliest), NO_DUE)
    edges = _edges(shop, rows, earliest, parts.slots)
    if len(edges) > EDGES_MOST:
        return LeastLateness(own, 0)
    bits = BITS - int(weight[dated].sum() * int(edges[-1])).bit_length()
    scale = 2.0 ** min(FINE_BITS, bits)
    whole = np.floor(weight * scale).astype(np.int64)
    crowded = _crowded(shop, rows, late_from, edges, whole, parts)
    if not crowded or not all(one.places.spots.legal.any(axis=1).all() for one in crowded):
        return LeastLateness(own, 0)
    climbs = [[one] for one in crowded]
    if parts.shared and len(crowded) > 1:  # one that stands out gets further where it shares with none
        cost = [int((one.late * whole[shop.operations.job[one.places.rows]]).sum()) for one in crowded]
        climbs = [crowded, climbs[cost.index(max(cost))]]
    found = [_Together(shop, each, whole, parts).run() for each in climbs]
    best = max(range(len(found)), key=lambda k: found[k])
    names = tuple(one.name for one in climbs[best]) if found[best] else ()
    least = int(found[best] // scale)
    unit = _unit(shop, dated)
    return LeastLateness(own, -(-(own + least) // unit) * unit - own if least else 0, names)


def _unit(shop: Shop, dated: Bools) -> int:
    """Return what the lateness of some best plan is a multiple of, and so the least lateness too.

    Pushed to the left, a plan starts its operations at multiples of the greatest common divisor of all times;
    not so where operations are cut.
    """
    orders, columns = shop.orders, shop.operations
    weights = np.rint(orders.priority[dated] * PRIORITY_UNIT).astype(np.int64).tolist()
    if shop.has_splits:
        return gcd(*weights)
    shut = [*shop.breaks, *(each for machine in shop.machines for each in machine.closed)]
    between = [shop.transport, *shop.changeovers.values()]
    times = [
        *columns.seconds.tolist(), *columns.setup_s.tolist(),
        *orders.release_s.tolist(), *orders.due_s[dated].tolist(),
        *(moment for each in shut for moment in (each.start_s, each.end_s)),
        *(moment for crew in shop.crews for level in crew.levels for moment in level[:2]),
        *(seconds for each in between for seconds in (each.between, *each.pairs.values())),
    ]  # fmt: skip
    return gcd(*weights) * gcd(*times)


def earliest_ends(shop: Shop) -> Ints:
    """Return when each order can end when it never waits for another; its release where it has no work."""
    hall, columns, orders = shop.work_clock, shop.operations, shop.orders
    ends: Ints = np.where(
        shop.job_load_s > 0, hall.end(hall.worked(orders.release_s) + shop.job_load_s), orders.release_s
    )
    ways = [shop.transport.between, *shop.transport.pairs.values()]
    visits = np.unique(np.stack([columns.job, columns.machine]), axis=1)[0]
    changes = np.maximum(np.bincount(visits, minlength=len(orders)) - 1, 0)
    ends = np.maximum(ends, orders.release_s + shop.job_load_s + changes * min(ways))
    for machine in np.unique(columns.machine).tolist():
        clock = shop.machine_clocks[machine]
        rows = np.flatnonzero(columns.machine == machine)
        end = np.asarray(clock.end(clock.worked(shop.head_s[rows]) + columns.seconds[rows]))
        tail = shop.tail_s[rows]
        end = np.where(tail > 0, hall.end(hall.worked(end) + tail), end)
        np.maximum.at(ends, columns.job[rows], end)
    return ends


def _edges(shop: Shop, rows: Ints, earliest: Ints, slots: int) -> Ints:
    """Return the edges of the slots: even ones until the work could be done, and those of closures."""
    columns = shop.operations
    last = int(earliest[columns.job[rows]].max())
    for machine in np.unique(columns.machine[rows]).tolist():
        clock, mine = shop.machine_clocks[machine], rows[columns.machine[rows] == machine]
        load = -(-int(columns.seconds[mine].sum()) // shop.machines[machine].count)
        times = shop.changeovers.get(shop.machines[machine].id)
        if times is not None:  # each family entered once, dearly
            load += max(times.between, *times.pairs.values(), 0) * len(np.unique(columns.family[mine]))
        last = max(last, int(clock.end(clock.worked(int(shop.head_s[mine].min())) + load)))
    for crew, mine in _attended(shop, rows):
        energy = int((attended_s(shop, mine) * columns.heads[mine]).sum())
        if energy and crew.heads:
            last = max(last, int(CrewClock(shop, crew).finish(0, np.array([energy]))[0]))
    last += last // 20
    even = np.arange(slots + 1) * last // slots
    used = {shop.machines[machine] for machine in np.unique(columns.machine[rows]).tolist()}
    shut = [*shop.breaks, *(each for machine in used for each in machine.closed)]
    ends = [moment for each in shut for moment in (each.start_s, each.end_s) if moment > 0]
    # a closure that begins before the last edge ends before it too
    last = max([last, *(each.end_s for each in shut if each.start_s <= last)])
    return np.unique([*even.tolist(), last, *(moment for moment in ends if moment <= last)])


@dataclass(frozen=True)
class _Crowded:
    """A machine or crew that may make orders late: places, lateness on a list, prices to begin with."""

    name: str
    places: Places
    late: Ints
    prices: Floats


def _crowded(
    shop: Shop, rows: Ints, late_from: Ints, edges: Ints, weight: Ints, parts: Parts
) -> list[_Crowded]:
    columns = shop.operations
    found = []
    for machine in np.unique(columns.machine[rows]).tolist() if parts.machines else ():
        mine = rows[columns.machine[rows] == machine]
        room = np.diff(shop.machine_clocks[machine].worked(edges)) * shop.machines[machine].count
        here = places(shop, machine, mine, late_from, edges, room)
        late, prices = alone(shop, here, weight[columns.job[mine]])
        if late.any():  # else it can serve all in time, and bounds nothing
            found.append(_Crowded(shop.machines[machine].id, here, late, prices))
    for crew, mine in _attended(shop, rows) if parts.crews else ():
        here = places(shop, -1, mine, late_from, edges, _heads(shop, crew, edges))
        if _scarce(here):
            nothing = np.zeros(len(mine), np.int64), np.zeros(len(edges) - 1)
            found.append(_Crowded(f"crew {crew.id}", here, *nothing))
    return found


def _attended(shop: Shop, rows: Ints) -> list[tuple[Crew, Ints]]:
    """Return each crew that takes part in `rows`, with those it attends."""
    columns, found = shop.operations, []
    for crew in shop.crews:
        there = np.array([machine.crew == crew.id for machine in shop.machines], np.bool_)
        mine = rows[there[columns.machine[rows]] & (columns.heads[rows] > 0)]
        if len(mine):
            found.append((crew, mine))
    return found


def _heads(shop: Shop, crew: Crew, edges: Ints) -> Ints:
    """Return the head-seconds of a crew in each slot."""
    there: Ints = np.diff(CrewClock(shop, crew).by(edges))
    return there


def _scarce(here: Places) -> bool:
    """Whether what is due by some edge takes most of what there is until then."""
    order = np.argsort(here.late_from, kind="stable")
    work = np.r_[0, np.cumsum((here.taken * here.rate)[order])]
    wanted = work[np.searchsorted(here.late_from[order], here.edges[1:], side="right")]
    return bool((wanted > CROWDED * np.cumsum(here.room)).any())


class _Together:
    """Shares of priority among machines and crews, and the prices or rewards of each, improved together."""

    def __init__(self, shop: Shop, crowded: list[_Crowded], weight: Ints, parts: Parts) -> None:
        self.shop, self.parts = shop, parts
        self.crowded = crowded
        jobs = np.concatenate([shop.operations.job[one.places.rows] for one in crowded])
        used, self.job = np.unique(jobs, return_inverse=True)
        self.weight = weight[used].astype(np.float64)
        self.copies = np.bincount(self.job)
        ends = np.cumsum([len(one.places.rows) for one in crowded]).tolist()
        self.lines = [slice(a, b) for a, b in zip([0, *ends], ends, strict=False)]
        late = np.concatenate([one.late for one in crowded]).astype(np.float64)
        begin = (late + 1) * (late + 1)
        self.shares = Climb(np.repeat(begin[:, None], len(crowded[0].places.edges), axis=1))
        self._level()
        cells = sum(one.places.spots.begin.size for one in crowded)
        self.steps = min(max(WORK // cells, STEPS[0]), STEPS[1])

    def run(self) -> int:
        """Return the best bound found, in the weights' own unit."""
        ways: list[Prices | Runs] = [self._begun(k) for k in range(len(self.crowded))]
        priced = int(PRICED_SHARE * self.steps)
        best = 0
        length = FIRST_LENGTH * float(self.weight.mean())
        shorter = round((LAST_LENGTH / FIRST_LENGTH) ** (1 / self.steps), 6)  # alike on every machine
        for step in range(self.steps):
            if step == priced and self.parts.changeovers:
                ways = [self._with_changeovers(k, way) for k, way in enumerate(ways)]
            shares = np.floor(self.shares.values).astype(np.int64)
            found = [way.step(shares[lines], length) for way, lines in zip(ways, self.lines, strict=True)]
            best = max(best, sum(max(0, value) for value, _ in found))
            late = np.concatenate([late if value > 0 else 0 * late for value, late in found])
            self._share(late, length)
            length *= shorter
        return best

    def _begun(self, k: int) -> Prices:
        """Return a machine with the prices its list suggests, or some part of them."""
        one, shares = self.crowded[k], np.floor(self.shares.values[self.lines[k]]).astype(np.int64)
        # the list priced whole priorities; a machine has only a share of them
        whole = int((self.weight[self.job[self.lines[k]]].astype(np.int64) * one.late).sum())
        part = int((shares[:, 0] * one.late).sum()) / max(1, whole)
        tried = [Prices(one.places, one.prices * factor * part) for factor in FACTORS]
        return max(tried, key=lambda way: way.value(shares)[0])

    def _with_changeovers(self, k: int, way: Prices | Runs) -> Prices | Runs:
        """Return a machine with changeovers with rewards for what its operations cost at least."""
        found = arcs_of(self.shop, way.places) if way.places.machine >= 0 else None
        if found is None or not isinstance(way, Prices):
            return way
        return Runs(self.shop, way.places, *found, way.least)

    def _share(self, late: Ints, length: float) -> None:
        """Move priority to where it finds more lateness, slot by slot."""
        total = np.zeros((len(self.weight), late.shape[1]), np.int64)
        np.add.at(total, self.job, late)
        self.shares.step(late - (total / self.copies[:, None])[self.job], length)
        self._level()

    def _level(self) -> None:
        """Let the shares of each order come to its priority in each slot."""
        shares = self.shares.values
        total = np.zeros((len(self.weight), shares.shape[1]))
        np.add.at(total, self.job, shares)
        even = (1.0 / self.copies)[self.job][:, None]
        part = np.where(total[self.job] > 0, shares / np.maximum(total[self.job], 1e-300), even)
        shares[:] = part * self.weight[self.job][:, None]
