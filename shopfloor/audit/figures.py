"""The figures of a shop that a witness is held against, worked out from its columns by plain sums."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property

import numpy as np

from shopfloor.audit.columns import run_starts, run_sums
from shopfloor.audit.families import forced_changeover
from shopfloor.audit.shut import Shut
from shopfloor.model.calendar import duration
from shopfloor.model.shop import NO_FAMILY, NO_STEP, Bools, Crew, Ints, Shop


class NoProofError(Exception):
    """The witness proves nothing; the message is the end of a sentence that begins with its name."""


class Figures:
    """The work of a shop, by order and by machine, with heads and tails; sums made when first needed."""

    def __init__(self, shop: Shop) -> None:
        self.shop = shop
        self.job, self.machine = shop.operations.job, shop.operations.machine
        self.seconds, self.step = shop.operations.seconds, shop.operations.step
        self.breaks = Shut(shop.breaks)

    def order(self, name: str) -> int:
        """Index of the order of a name."""
        return _find(self._orders, name, "order")

    def machine_of(self, name: str) -> int:
        """Index of the machine of a name."""
        return _find(self._machines, name, "machine")

    def of_order(self, job: int) -> Ints:
        """Operations of one order."""
        return _slice(self._by_job, self.job, job)

    def on_machine(self, machine: int) -> Ints:
        """Operations on one machine."""
        return _slice(self._by_machine, self.machine, machine)

    def attended(self, name: str, begin: int) -> tuple[Crew, Ints]:
        """The crew of a name, and the operations it attends that cannot start before `begin`."""
        for crew in self.shop.crews:
            if crew.id == name:
                if crew.heads < 1:
                    raise NoProofError(f"counts on the heads of crew {name}, which has none")
                theirs = np.array([machine.crew == name for machine in self.shop.machines], bool)
                return crew, self.from_on(np.flatnonzero(theirs[self.machine]), begin)
        raise NoProofError(f"names crew {name!r}, which the shop does not have")

    def attended_until(self, crew: Crew, begin: int, head_seconds: int) -> int:
        """When a crew has worked so many head-seconds from `begin` on, all its heads at once."""
        breaks = [(each.start_s, each.end_s, 0) for each in self.shop.breaks]
        edges = {moment for start, end, _ in (*crew.levels, *breaks) for moment in (start, end)}
        moment = begin
        for edge in sorted(edge for edge in edges if edge > begin):
            heads = _there(crew, breaks, moment)
            if head_seconds <= heads * (edge - moment):
                return moment + per_unit(head_seconds, heads) if head_seconds else moment
            head_seconds -= heads * (edge - moment)
            moment = edge
        return moment + per_unit(head_seconds, crew.heads)

    def only_set_up(self, operations: Ints) -> Bools:
        """Whether each operation is attended only during its set-up."""
        only: Bools = np.array([machine.set_up_only for machine in self.shop.machines], bool)
        return only[self.machine[operations]]

    def from_on(self, operations: Ints, begin: int) -> Ints:
        """Those of the operations that their orders keep from starting before `begin`; at least one."""
        late = operations[self.heads_and_tails[0][operations] >= begin]
        if not len(late):
            raise NoProofError(f"counts no operation: none must wait until {begin} s")
        return late

    def after(self, machine: int, begin: int, load: int, tail: int) -> int:
        """When `load` over the units of a machine, begun at `begin`, and `tail` elsewhere are done.

        The machine rests while it is shut; the tail is only known to rest in the hall's breaks.
        """
        hall = self.shop.machines[machine]
        done = Shut((*self.shop.breaks, *hall.closed)).finish(begin, per_unit(load, hall.count))
        return self.breaks.finish(done, tail)

    def forced_changeover(self, machine: int, operations: Ints, begin: int) -> int:
        """The changeovers that some operations on a machine force from `begin` on.

        Only if all of its work is counted, from the shift's start on, is the family it starts in known
        to come before: later it may stand in any, or have been changed while it waited.
        """
        hall = self.shop.machines[machine]
        rule = self.shop.changeovers.get(hall.id)
        if rule is None:
            return 0
        latest_first = operations[np.argsort(-self.heads_and_tails[0][operations], kind="stable")]
        codes = dict.fromkeys(self.shop.operations.family[latest_first].tolist())
        families = ["" if code == NO_FAMILY else self.shop.families[code] for code in codes]
        whole = begin == 0 and len(operations) == len(self.on_machine(machine))
        return forced_changeover(rule, families, hall.count, hall.family if whole else None)

    def arrivals(self, machine: int, grid_s: int) -> dict[str, list[tuple[int, int]]]:
        """By family, when work of a machine can start in its open time, put back to a grid, and how much."""
        operations = self.on_machine(machine)
        head = self.heads_and_tails[0][operations]
        hours = Shut((*self.shop.breaks, *self.shop.machines[machine].closed))
        opened = head - hours.within(np.zeros(len(head), np.int64), head)
        found: dict[str, dict[int, int]] = {}
        for when, operation in zip((opened // grid_s * grid_s).tolist(), operations.tolist(), strict=True):
            code = int(self.shop.operations.family[operation])
            work = found.setdefault("" if code == NO_FAMILY else self.shop.families[code], {})
            work[when] = work.get(when, 0) + int(self.seconds[operation])
        return {family: sorted(work.items()) for family, work in found.items()}

    def demand_rounds(self, operations: Ints, length: int, name: str) -> None:
        """Refuse operations that are not all of one length and whole, or none at all."""
        if not len(operations):
            raise NoProofError(f"counts the visits of {name}, which has none")
        other = operations[self.seconds[operations] != length]
        if len(other):
            seconds = duration(int(self.seconds[other[0]]))
            raise NoProofError(f"counts rounds of {duration(length)}, but {name} has a visit of {seconds}")
        if self.shop.operations.splittable[operations].any():
            raise NoProofError(f"counts whole rounds, but visits of {name} may be split")

    @cached_property
    def heads_and_tails(self) -> tuple[Ints, Ints]:
        """Earliest start of each operation that its order allows, and the order's work after its end."""
        head = self.shop.orders.release_s[self.job].astype(np.int64)
        tail = np.zeros(len(self.job), np.int64)
        ranked = np.flatnonzero(self.step != NO_STEP)
        order = ranked[np.lexsort((self.step[ranked], self.job[ranked]))]
        if not len(order):
            return head, tail
        level = run_starts(self.job[order], self.step[order])  # a level: one step of one order
        work = run_sums(level, self.seconds[order])
        job = self.job[order][level]
        done = np.cumsum(work)
        orders = run_starts(job)
        before_order = (done - work)[orders][np.cumsum(orders) - 1]
        order_work = run_sums(orders, work)[np.cumsum(orders) - 1]
        lower = done - work - before_order
        place = np.cumsum(level) - 1
        head[order] += lower[place]
        tail[order] = (order_work - lower - work)[place]
        return head, tail

    @cached_property
    def _orders(self) -> dict[str, int]:
        return {name: index for index, name in enumerate(self.shop.orders.ids)}

    @cached_property
    def _machines(self) -> dict[str, int]:
        return {machine.id: index for index, machine in enumerate(self.shop.machines)}

    @cached_property
    def _by_job(self) -> Ints:
        return np.argsort(self.job, kind="stable")

    @cached_property
    def _by_machine(self) -> Ints:
        return np.argsort(self.machine, kind="stable")


def _there(crew: Crew, breaks: list[tuple[int, int, int]], moment: int) -> int:
    """Return how many heads of a crew are at work at a moment."""
    for start, end, heads in (*breaks, *crew.levels):
        if start <= moment < end:
            return heads
    return crew.heads


def _find(index: Mapping[str, int], name: str, what: str) -> int:
    if name not in index:
        raise NoProofError(f"names {what} {name!r}, which the shop does not have")
    return index[name]


def _slice(sorter: Ints, column: Ints, value: int) -> Ints:
    left = np.searchsorted(column, value, "left", sorter=sorter)
    return sorter[left : np.searchsorted(column, value, "right", sorter=sorter)]


def per_unit(load: int, count: int) -> int:
    """Return what one of `count` units has at least, when `load` is shared out."""
    return -(-load // count)
