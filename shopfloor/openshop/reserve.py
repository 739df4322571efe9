"""Reservation: the few orders nearly as long as the whole plan are placed first, the rest around them.

Such an order cannot afford to wait at any of its machines. So the near-bound orders are scheduled by
themselves, which few orders on many machines seldom find hard, and their operations become fixed
blocks. A machine that comes near a block then takes what fills the time before it exactly (a subset of
the waiting operations with that sum, found in bit sets), or else leaves as little as can be.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from shopfloor.model.shop import Ints, Shop
from shopfloor.openshop.dense import NOTHING, Chance, Dispatch, MostWork, ShopLists
from shopfloor.openshop.holds import Holds

FEW = 6  # more orders than this are not placed in advance
NEAR = 4  # a block is near when this many of the longest operations would reach it
TRIED = 12  # waiting operations tried for the first place in an exact filling


def near_bound_orders(shop: Shop, target: int) -> list[int]:
    """Return the orders that can afford no wait before `target`, tightest first; empty if there are many.

    An order is near the bound when its slack is less than half a mean operation at each machine it
    visits: about what a rule loses that waits for no order.
    """
    size = np.maximum(np.bincount(shop.operations.machine, minlength=len(shop.machines)), 1)
    usual = (shop.machine_load_s / size)[shop.operations.machine] / 2
    wait = np.bincount(shop.operations.job, weights=usual, minlength=len(shop.orders))
    slack = target - shop.orders.release_s - shop.job_load_s
    near = np.flatnonzero((slack < wait) & (shop.job_load_s > 0))
    if len(near) > min(FEW, len(shop.machines) // 2):
        return []
    return [int(order) for order in near[np.argsort(slack[near], kind="stable")]]


def reserved_starts(shop: Shop, lists: ShopLists, orders: list[int], target: int, chance: Chance) -> Ints:
    """Return the start of each operation when `orders` go first and the others fill in around them.

    Only for orders without steps on machines of one unit, which :func:`may_reserve` tells.
    """
    columns = shop.operations
    ours = np.isin(columns.job, orders)
    alone = ShopLists.of(shop.keep(ours))
    if chance is not None:  # another sequence of machines: the loop serves those with most load first
        share = 1.0 + np.random.default_rng(chance).random(len(alone.load))
        alone = replace(alone, load=[int(load * by) for load, by in zip(alone.load, share, strict=True)])
    starts = Dispatch(alone, MostWork(), holds=Holds(target, len(orders))).run()
    loop = Dispatch(lists, Filling(chance, noise=0.05))
    loop.reserve(list(zip(starts, np.flatnonzero(ours).tolist(), strict=True)))
    return np.array(loop.run(), np.int64)


def may_reserve(shop: Shop, orders: list[int]) -> bool:
    """Whether blocks of `orders` can stand fixed: no steps, and machines of one unit."""
    ours = np.isin(shop.operations.job, orders)
    counts = np.array([machine.count for machine in shop.machines])
    return not shop.has_steps and bool((counts[shop.operations.machine[ours]] == 1).all())


class Filling(MostWork):
    """Most work first, but never into a block, and exactly up to it where that can be."""

    def attach(self, loop: Dispatch) -> None:
        """Learn the loop whose state the queue reads."""
        super().attach(loop)
        lists = loop.lists
        blocked = [bool(blocks) for blocks in loop.next_block]
        self._waiting: list[set[int]] = [set() for _ in lists.count]
        self._filled: set[int] = set()  # taken past the heap, which still lists them
        longest = [0] * len(lists.count)
        reserved = {operation for _, operation in loop.blocks}
        for operation, machine in enumerate(lists.machine):
            if blocked[machine] and operation not in reserved:
                longest[machine] = max(longest[machine], lists.seconds[operation])
        self._reach = [NEAR * seconds for seconds in longest]

    def add(self, operation: int) -> None:
        """`operation` may run from now on, whenever its order is free."""
        if operation in self._filled:
            return
        self._waiting[self._loop.lists.machine[operation]].add(operation)
        super().add(operation)

    def take(self, machine: int) -> int:
        """Remove and return the operation that `machine` should start now, or ``NOTHING``."""
        loop = self._loop
        blocks = loop.next_block[machine]
        gap = blocks[-1] - loop.now if blocks else None
        if gap is not None and gap < self._reach[machine]:
            operation = self._fill(machine, gap)
            if operation != NOTHING:
                self._filled.add(operation)
        else:
            operation = super().take(machine)
            while operation in self._filled:
                operation = super().take(machine)
        self._waiting[machine].discard(operation)
        return operation

    def _fill(self, machine: int, gap: int) -> int:
        """Return the most pressing operation that belongs to a best filling of `gap` seconds."""
        seconds, idle, job = self._loop.lists.seconds, self._loop.idle, self._loop.lists.job
        fitting = [o for o in self._waiting[machine] if seconds[o] <= gap and idle[job[o]]]
        if not fitting:
            return NOTHING
        fitting.sort(key=lambda operation: (self._key(operation), operation))
        within = (1 << (gap + 1)) - 1
        best = _sums([seconds[operation] for operation in fitting], within).bit_length() - 1
        for operation in fitting[:TRIED]:
            others = _sums([seconds[other] for other in fitting if other != operation], within)
            if seconds[operation] <= best and others >> (best - seconds[operation]) & 1:
                return operation
        return max(fitting, key=lambda operation: (seconds[operation], -operation))


def _sums(values: list[int], within: int) -> int:
    """Return the sums of all subsets of `values` as a bit set, cut to the bits of `within`."""
    bits = 1
    for value in values:
        bits |= bits << value & within
        if bits == within:
            break
    return bits
