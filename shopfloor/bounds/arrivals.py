"""Run bounds: when one machine that changes over can be done at the earliest, alone in the hall.

Its work arrives over the shift, in families. Running every family once costs least in changeovers, but then
work that arrives late holds everything up; coming back to a family costs another changeover. The best of
both is found exactly, by a recursion over how much of each family is done and which was last.

In open time of the machine, with no tails, two exchanges keep the end and break nothing, since no way round
is shorter (`Changeovers` checks that):

* inside a family, work may go by arrival, the earliest first (for unequal lengths too: what is moved ahead
  only delays what lies between the two places, and that ends by the same time as before);
* work of the family that the machine is set up for, and that is there, may go before the next changeover.

So a state is a number of arrivals of each family, all that arrive together counting once (C. L. Monma, C. N.
Potts, Operations Research 37 (1989) 798-804, there without arrivals). Every rule left out (other machines,
crews, what may not pause, higher steps) can only make a plan end later.
"""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass
from itertools import accumulate

import numpy as np

from shopfloor.bounds.load import machine_bounds
from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound
from shopfloor.model.shop import NO_FAMILY, Shop

MACHINES_MOST = 8  # the latest ones
FAMILIES_MOST, ARRIVALS_MOST = 10, 400  # of one machine; more arrivals are put on a coarser grid at once
STATES_MOST = 20_000  # beyond, arrivals are put earlier, on a coarser grid, which only weakens the bound
GRIDS_S = (1, 60, 300, 900, 3_600, 14_400, 2**40)


@dataclass(frozen=True, slots=True)
class Work:
    """What one machine has to do, in seconds of its open time.

    Attributes
    ----------
    arrivals
        For each family pairs (when work arrives, how much), the earliest first.
    change, first
        Seconds from family to family, and before each family if it is the first.
    """

    arrivals: list[list[tuple[int, int]]]
    change: list[list[int]]
    first: list[int]

    def run(self, family: int, count: int, ready: int) -> tuple[int, int]:
        """Take what arrives next, waiting if need be, and all that is there by then; return count and end."""
        work = self.arrivals[family]
        moment = max(ready, work[count][0]) + work[count][1]
        count += 1
        while count < len(work) and work[count][0] <= moment:
            moment += work[count][1]
            count += 1
        return count, moment


def run_bounds(shop: Shop) -> list[Bound]:
    """Return a bound for each machine of one unit with several families that says more than its load.

    At most ``STATES_MOST`` states for each grid, some tens of milliseconds a machine; none where a quick
    sequence shows that there is nothing to gain.
    """
    machines = [machine for machine in range(len(shop.machines)) if _changes(shop, machine)]
    if not machines:
        return []
    by_load = {bound.witness["machine"]: bound.value_s for bound in machine_bounds(shop)}
    ends = [(_quick_end(shop, machine), machine) for machine in machines]
    hopeful = [(end, machine) for end, machine in ends if end > by_load[shop.machines[machine].id]]
    hopeful.sort(key=lambda each: (-each[0], each[1]))
    bounds = [_run_bound(shop, machine) for _, machine in hopeful[:MACHINES_MOST]]
    return [bound for bound in bounds if bound and bound.value_s > by_load[bound.witness["machine"]]]


def _changes(shop: Shop, machine: int) -> bool:
    hall = shop.machines[machine]
    rule = shop.changeovers.get(hall.id)
    if rule is None or rule.none or hall.count > 1:
        return False
    families = np.unique(shop.operations.family[shop.operations.machine == machine])
    return 2 <= len(families) <= FAMILIES_MOST


def _quick_end(shop: Shop, machine: int) -> int:
    return shop.machine_clocks[machine].finish(0, quick_end(_work(shop, machine, 1)))


def _run_bound(shop: Shop, machine: int) -> Bound | None:
    for grid_s in GRIDS_S:
        work = _work(shop, machine, grid_s)
        few = sum(map(len, work.arrivals)) <= ARRIVALS_MOST
        done = least_end(work, STATES_MOST) if few else None
        if done is not None:
            name, load = shop.machines[machine].id, sum(each for arr in work.arrivals for _, each in arr)
            value = shop.machine_clocks[machine].finish(0, done)
            return Bound(
                kind="runs",
                value_s=value,
                witness={"machine": name, "grid_s": grid_s, "load_s": load},
                sentence=f"{name} has {duration(load)} of work in {len(work.first)} families; as it arrives "
                f"and with the changeovers it then needs, nothing can end before {shop.clock.say(value)}.",
            )
    return None


def _work(shop: Shop, machine: int, grid_s: int) -> Work:
    """Return the work of a machine, each arrival put back to a multiple of `grid_s`."""
    operations = np.flatnonzero(shop.operations.machine == machine)
    heads = shop.machine_clocks[machine].worked(shop.head_s[operations]) // grid_s * grid_s
    family, seconds = shop.operations.family[operations], shop.operations.seconds[operations]
    arrivals, names = [], []
    for code in np.unique(family).tolist():
        mine = family == code
        when, which = np.unique(heads[mine], return_inverse=True)
        sums = np.bincount(which, weights=seconds[mine]).astype(np.int64)
        arrivals.append(list(zip(when.tolist(), sums.tolist(), strict=True)))
        names.append("" if code == NO_FAMILY else shop.families[code])
    rule, begins = shop.changeovers[shop.machines[machine].id], shop.machines[machine].family
    change = [[rule.seconds(before, after) for after in names] for before in names]
    return Work(arrivals, change, [0 if begins is None else rule.seconds(begins, name) for name in names])


def quick_end(work: Work) -> int:
    """Return when all is done if the family of which most work is there comes next, again and again."""
    done, last, moment = [0] * len(work.first), -1, 0
    when = [[arrival for arrival, _ in arr] for arr in work.arrivals]
    sums = [list(accumulate((size for _, size in arr), initial=0)) for arr in work.arrivals]
    while True:
        left = [family for family, count in enumerate(done) if count < len(work.arrivals[family])]
        if not left:
            return moment
        there = {
            family: sums[family][bisect_right(when[family], moment)] - sums[family][done[family]]
            for family in left
        }
        family = max(left, key=lambda each: (there[each], -when[each][done[each]], -each))
        moment += work.first[family] if last < 0 else work.change[last][family]
        done[family], moment = work.run(family, done[family], moment)
        last = family


def least_end(work: Work, states_most: int) -> int | None:
    """Return when all can be done at the earliest; None if that takes more than so many states."""
    families, most = range(len(work.first)), quick_end(work)
    enter = [min((work.change[b][f] for b in families if b != f), default=0) for f in families]
    left = [  # by family and what is done of it: the work left, and the way to it from another family
        [*[way + each for each in accumulate(size for _, size in reversed(arr))][::-1], 0]
        for arr, way in zip(work.arrivals, enter, strict=True)
    ]
    levels: list[dict[tuple[tuple[int, ...], int], int]] = [
        {} for _ in range(sum(map(len, work.arrivals)) + 1)
    ]

    def run(done: tuple[int, ...], family: int, ready: int) -> None:
        count, moment = work.run(family, done[family], ready)
        done = (*done[:family], count, *done[family + 1 :])
        saved = enter[family] if left[family][count] else 0
        if moment + sum(row[each] for row, each in zip(left, done, strict=True)) - saved <= most:
            level, key = levels[sum(done)], (done, family)
            if moment < level.get(key, moment + 1):
                level[key] = moment

    for family in families:
        run((0,) * len(families), family, work.first[family])
    states = 0
    for level in levels[:-1]:
        states += len(level)
        if states > states_most:
            return None
        for (done, last), moment in level.items():
            for family in families:
                if done[family] < len(work.arrivals[family]):
                    run(done, family, moment + work.change[last][family])
    return min(levels[-1].values())
