"""The dispatching loop: time runs forward, and a free machine takes the most pressing operation that waits.

The loop knows releases, steps, groups and that nothing is in two places at once; a :class:`Queue` knows
what is pressing; :class:`~shopfloor.openshop.holds.Holds` may keep a machine or an order back for a
moment. Closures, crews, changeovers and transport are beyond it: see ``floor``.
"""

from __future__ import annotations

import heapq
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

import numpy as np

from shopfloor.model.shop import NO_STEP, Ints, Shop

if TYPE_CHECKING:
    from shopfloor.openshop.holds import Holds

Chance = tuple[int, int] | None  # a seed and the number of the run; None for no random choice at all

NOTHING = -1  # no operation may start here now


@dataclass(frozen=True, slots=True)
class ShopLists:
    """A shop as plain lists, which loops read several times faster than arrays.

    Attributes
    ----------
    job, machine, seconds
        An entry an operation.
    release
        An entry an order.
    count
        Units of each machine.
    ranks
        For each order its operations with a step, lowest step first, equal steps together.
    anytime
        For each order its operations without a step.
    work, load
        Total run time of each order and of each machine.
    """

    job: list[int]
    machine: list[int]
    seconds: list[int]
    release: list[int]
    count: list[int]
    ranks: list[list[list[int]]]
    anytime: list[list[int]]
    work: list[int]
    load: list[int]

    @classmethod
    def of(cls, shop: Shop) -> ShopLists:
        """Return `shop` as lists; linear time but for one sort of the steps."""
        operations = shop.operations
        job, step = operations.job.tolist(), operations.step.tolist()
        anytime: list[list[int]] = [[] for _ in range(len(shop.orders))]
        ranks: list[list[list[int]]] = [[] for _ in range(len(shop.orders))]
        for index in np.flatnonzero(operations.step == NO_STEP).tolist():
            anytime[job[index]].append(index)
        ranked = np.flatnonzero(operations.step != NO_STEP)
        previous = None
        for index in ranked[np.lexsort((operations.step[ranked], operations.job[ranked]))].tolist():
            if (job[index], step[index]) != previous:
                ranks[job[index]].append([])
                previous = (job[index], step[index])
            ranks[job[index]][-1].append(index)
        return cls(
            job=job,
            machine=operations.machine.tolist(),
            seconds=operations.seconds.tolist(),
            release=shop.orders.release_s.tolist(),
            count=[machine.count for machine in shop.machines],
            ranks=ranks,
            anytime=anytime,
            work=shop.job_load_s.tolist(),
            load=shop.machine_load_s.tolist(),
        )


class Queue(Protocol):
    """What waits at the machines, and which of it is most pressing."""

    def attach(self, loop: Dispatch) -> None:
        """Learn the loop whose state the queue reads."""

    def add(self, operation: int) -> None:
        """`operation` may run from now on, whenever its order is free."""

    def returned(self, job: int) -> None:
        """Order `job` is free again."""

    def take(self, machine: int) -> int:
        """Remove and return the operation that `machine` should start now, or ``NOTHING``."""


class Dispatch:
    """One run of the loop over one shop.

    Attributes
    ----------
    now
        The time reached.
    start
        Start of each operation.
    end
        For each order, when it is next free, while it is running.
    idle
        Whether each order is released and on no machine.
    units
        Free units of each machine.
    work, load
        Run time of each order and machine not started yet.
    open_at
        For each order, the machines on which it may run now, with how many operations.
    held_orders, held_machines
        Kept back at this moment.
    """

    def __init__(self, lists: ShopLists, queue: Queue, *, holds: Holds | None = None) -> None:
        self.lists = lists
        self.queue = queue
        self.holds = holds
        self.now = 0
        self.start = [0] * len(lists.job)
        self.end = list(lists.release)
        self.idle = [False] * len(lists.release)
        self.units = list(lists.count)
        self.work = list(lists.work)
        self.load = list(lists.load)
        self.open_at: list[dict[int, int]] = [{} for _ in lists.release]
        self.held_orders: set[int] = set()
        self.held_machines: set[int] = set()
        self.waiting_orders = 0  # how many orders are idle
        self.running: dict[int, int] = {}  # operation to its end
        self._rank = [0] * len(lists.release)  # the step each order has reached
        self._left = [0] * len(lists.release)  # operations of that step not finished
        self._events: list[tuple[int, int]] = []  # (end, operation); -1 - order is a release
        self.blocks: list[tuple[int, int]] = []  # (start, operation) reserved and still to come, latest first
        self.next_block: list[list[int]] = [[] for _ in lists.count]  # starts still to come, latest first

    def reserve(self, blocks: Sequence[tuple[int, int]]) -> None:
        """Fix operations of whole orders in advance: `(start, operation)` each, on machines of one unit.

        The queue must then never hand out an operation that would run into a block.
        """
        self.blocks = sorted(blocks, reverse=True)
        for start, operation in self.blocks:
            self.next_block[self.lists.machine[operation]].append(start)

    def run(self) -> list[int]:
        """Return the start of each operation, in whole seconds."""
        lists, events = self.lists, self._events
        self.queue.attach(self)
        reserved = {lists.job[operation] for _, operation in self.blocks}
        events.extend((time, -1 - job) for job, time in enumerate(lists.release) if job not in reserved)
        heapq.heapify(events)
        while events or self.blocks:
            self.now = self._next_moment()
            touched = self._settle()
            if self.holds is not None:
                touched |= self._hold()
            if touched:
                self._begin(touched)
        return self.start

    def _next_moment(self) -> int:
        if not self.blocks:
            return self._events[0][0]
        block = self.blocks[-1][0]
        return min(block, self._events[0][0]) if self._events else block

    def _settle(self) -> set[int]:
        """Let everything happen that happens now; return the machines that may have something to start."""
        lists, events, now = self.lists, self._events, self.now
        touched: set[int] = set()
        while events and events[0][0] == now:
            operation = heapq.heappop(events)[1]
            if operation < 0:
                job = -1 - operation
                self._open(job, lists.anytime[job])
                self._next_rank(job)
            else:
                job, machine = lists.job[operation], lists.machine[operation]
                del self.running[operation]
                self.units[machine] += 1
                touched.add(machine)
                if lists.ranks[job]:
                    self._step_done(job, operation)
            self.idle[job] = True
            self.waiting_orders += 1
            self.queue.returned(job)
            touched.update(self.open_at[job])
        while self.blocks and self.blocks[-1][0] == now:
            operation = self.blocks.pop()[1]
            self.next_block[lists.machine[operation]].pop()
            self._start(operation)
        return touched

    def _open(self, job: int, operations: Iterable[int]) -> None:
        machines = self.open_at[job]
        for operation in operations:
            machine = self.lists.machine[operation]
            machines[machine] = machines.get(machine, 0) + 1
            self.queue.add(operation)

    def _next_rank(self, job: int) -> None:
        ranks = self.lists.ranks[job]
        if self._rank[job] < len(ranks):
            self._left[job] = len(ranks[self._rank[job]])
            self._open(job, ranks[self._rank[job]])

    def _step_done(self, job: int, operation: int) -> None:
        if (
            self._rank[job] < len(self.lists.ranks[job])
            and operation in self.lists.ranks[job][self._rank[job]]
        ):
            self._left[job] -= 1
            if not self._left[job]:
                self._rank[job] += 1
                self._next_rank(job)

    def _hold(self) -> set[int]:
        """Decide anew what is kept back; return the machines that this sets free to choose."""
        assert self.holds is not None
        before_orders, before_machines = self.held_orders, self.held_machines
        self.held_orders, self.held_machines = self.holds.decide(self)
        freed = set(before_machines)
        for job in sorted(before_orders - self.held_orders):
            if self.idle[job]:
                self.queue.returned(job)
                freed.update(self.open_at[job])
        return freed

    def _begin(self, touched: set[int]) -> None:
        """Start what can start now, on the machines with most work left for each unit first."""
        load, count, units = self.load, self.lists.count, self.units
        ready = [m for m in touched if units[m] and load[m] and m not in self.held_machines]
        if len(ready) > 1:
            ready.sort(key=lambda m: (-load[m] / count[m], m))
        for machine in ready:
            while units[machine]:
                operation = self.queue.take(machine)
                if operation == NOTHING:
                    break
                job = self.lists.job[operation]
                machines = self.open_at[job]
                if machines[machine] == 1:
                    del machines[machine]
                else:
                    machines[machine] -= 1
                self._start(operation)

    def _start(self, operation: int) -> None:
        lists, now = self.lists, self.now
        job, machine, seconds = lists.job[operation], lists.machine[operation], lists.seconds[operation]
        self.start[operation] = now
        if self.idle[job]:
            self.idle[job] = False
            self.waiting_orders -= 1
        self.end[job] = now + seconds
        self.units[machine] -= 1
        self.work[job] -= seconds
        self.load[machine] -= seconds
        self.running[operation] = now + seconds
        heapq.heappush(self._events, (now + seconds, operation))


class MostWork:
    """A queue that hands out the order with most work left, from one lazy heap a machine.

    An order's work left only falls, so a key too high is found out and refreshed when it comes to the
    top; an operation whose order is away waits beside the heap until the order returns. The whole run
    takes O(operations × log operations) but for orders that return to many machines.

    Parameters
    ----------
    chance, noise
        Keys are lowered by a random share of up to `noise`, drawn from the seed `chance`.
    longest
        How many times its own run time counts for an operation, besides its order's work left.
    """

    def __init__(self, chance: Chance = None, *, noise: float = 0.0, longest: float = 0.0) -> None:
        self._chance, self._noise, self._longest = chance, noise, longest

    def attach(self, loop: Dispatch) -> None:
        """Learn the loop whose state the queue reads."""
        self._loop = loop
        lists = loop.lists
        size = len(lists.job)
        self._share = [1.0] * size
        if self._chance is not None:
            self._share = (1.0 - self._noise * np.random.default_rng(self._chance).random(size)).tolist()
        self._bonus = [self._longest * seconds for seconds in lists.seconds]
        self._heaps: list[list[tuple[float, int]]] = [[] for _ in lists.count]
        self._aside: list[list[int]] = [[] for _ in lists.release]

    def _key(self, operation: int) -> float:
        loop = self._loop
        return -loop.work[loop.lists.job[operation]] * self._share[operation] - self._bonus[operation]

    def add(self, operation: int) -> None:
        """`operation` may run from now on, whenever its order is free."""
        heapq.heappush(self._heaps[self._loop.lists.machine[operation]], (self._key(operation), operation))

    def returned(self, job: int) -> None:
        """Order `job` is free again."""
        if self._aside[job]:
            for operation in self._aside[job]:
                self.add(operation)
            self._aside[job] = []

    def take(self, machine: int) -> int:
        """Remove and return the operation that `machine` should start now, or ``NOTHING``."""
        loop, heap = self._loop, self._heaps[machine]
        job_of, idle, held = loop.lists.job, loop.idle, loop.held_orders
        while heap:
            key, operation = heap[0]
            job = job_of[operation]
            if not idle[job] or job in held:
                heapq.heappop(heap)
                self._aside[job].append(operation)
                continue
            fresh = self._key(operation)
            if fresh > key:
                heapq.heapreplace(heap, (fresh, operation))
                continue
            heapq.heappop(heap)
            return operation
        return NOTHING


def starts(lists: ShopLists, queue: Queue, holds: Holds | None = None) -> Ints:
    """Return the start of each operation when the shop is run by `queue`, in whole seconds."""
    return np.array(Dispatch(lists, queue, holds=holds).run(), dtype=np.int64)
