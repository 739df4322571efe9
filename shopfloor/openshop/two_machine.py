"""Two machines, or two orders: the linear rule of Gonzalez and Sahni, exact.

T. Gonzalez and S. Sahni (Open shop scheduling to minimize finish time, J. ACM 23 (1976) 665-679)
showed that an open shop on two machines ends at the largest machine load or order total, whichever
is more, and gave a linear rule. The argument, in our words: call the times of order j on the two
machines a_j and b_j, and let `left` be the orders with a_j < b_j, `right` the others.

* Run every order on the first machine and then on the second, in the sequence f, left, right, g,
  where f has the largest b of `left` and g the largest a of `right`. Each left order brings the
  second machine more work than it waits for, so the second machine never starves after f; read
  backwards the same holds for the right orders and g. So the second machine can run as one block
  that neither waits nor is waited for, starting no earlier than a_f.
* If the first machine has more to do besides f than the second has besides g, slide the block
  right against the end and move g's second operation to the very front, where the second machine
  stands idle anyway. Otherwise slide it left and move f's first operation to the very end. Either
  way one order changes its direction and nothing waits but that order for itself: the finish is the
  larger machine load, or that order's own total.

Two orders on many machines is the same problem with the parts exchanged.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Ints, Shop
from shopfloor.openshop.method import Effort, why_not_plain


@dataclass(frozen=True, slots=True)
class TwoMachine:
    """Exact for two machines, or two orders, of any times and nothing else."""

    name: str = "two machines"
    reaches_bound: bool = True

    def accepts(self, shop: Shop) -> str | None:
        """Return None, or why the shop is no plain open shop on two machines or of two orders."""
        machines, orders = _busy(shop)
        if min(machines, orders) > 2:
            return f"{machines} machines and {orders} orders have work, not two of either"
        if any(machine.count > 1 for machine in shop.machines):
            return "a machine has several units"
        if shop.has_due:
            return "the rule knows no due times"
        return why_not_plain(shop)

    def promise(self, shop: Shop) -> str:
        """Return the theorem in a sentence."""
        two = "two machines" if _busy(shop)[0] <= 2 else "two orders"
        return (
            f"only {two} have work, and then the longest order or machine load is always enough "
            "(Gonzalez and Sahni 1976)"
        )

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return a schedule that ends at the largest order or machine load; linear time."""
        operations = shop.operations
        if _busy(shop)[0] <= 2:
            travels, stands = operations.job, operations.machine
        else:
            travels, stands = operations.machine, operations.job
        return Outcome(Schedule(np.arange(len(shop)), *_start_end(travels, stands, operations.seconds)))


def _busy(shop: Shop) -> tuple[int, int]:
    """Return how many machines and how many orders have work."""
    operations = shop.operations
    return len(np.unique(operations.machine)), len(np.unique(operations.job))


def _start_end(travels: Ints, stands: Ints, seconds: Ints) -> tuple[Ints, Ints]:
    """Return start and end of each operation; several of one order on one machine run back to back."""
    if not len(seconds):
        return seconds, seconds
    _, side = np.unique(stands, return_inverse=True)
    _, who = np.unique(travels, return_inverse=True)
    cell = who * 2 + side
    total = np.bincount(cell, weights=seconds, minlength=2 * (int(who.max()) + 1)).astype(np.int64)
    begin = np.stack(open_shop_of_two(total[0::2], total[1::2]), axis=1).ravel()
    # Within a cell, operations follow each other in file order.
    order = np.argsort(cell, kind="stable")
    before = np.cumsum(seconds[order]) - seconds[order]
    first = np.searchsorted(cell[order], cell[order])
    start = np.empty_like(seconds)
    start[order] = begin[cell[order]] + before - before[first]
    return start, start + seconds


def open_shop_of_two(a: Ints, b: Ints) -> tuple[Ints, Ints]:
    """Return the start of each order on the first and on the second machine.

    Parameters
    ----------
    a, b
        Times of each order on the two machines, zero where it has none there.

    Returns
    -------
    first, second
        Starts; the last end is ``max(sum(a), sum(b), max(a + b))``. Time O(n) for n orders.
    """
    size = len(a)
    if size == 1:
        return np.zeros(1, np.int64), a.copy()
    left, right = np.flatnonzero(a < b), np.flatnonzero(a >= b)
    f = int(left[b[left].argmax()]) if len(left) else -1
    g = int(right[a[right].argmax()]) if len(right) else int(left[0] if left[0] != f else left[1])
    if f < 0:
        f = int(right[0] if right[0] != g else right[1])
    rest = np.r_[left[(left != f) & (left != g)], right[(right != f) & (right != g)]]
    load_a, load_b = int(a.sum()), int(b.sum())
    first, second = np.empty(size, np.int64), np.empty(size, np.int64)
    if load_a - a[f] >= load_b - b[g]:
        _back_to_back(first, a, np.r_[f, rest], 0)
        first[g] = max(load_a - int(a[g]), int(b[g]))
        second[g] = 0
        _back_to_back(second, b, np.r_[f, rest], max(load_a - load_b, 0) + int(b[g]))
    else:
        _back_to_back(first, a, np.r_[rest, g], 0)
        first[f] = max(load_a - int(a[f]), int(b[f]))
        _back_to_back(second, b, np.r_[f, rest, g], 0)
    return first, second


def _back_to_back(start: Any, times: Ints, sequence: Ints, begin: int) -> None:
    ends = begin + np.cumsum(times[sequence])
    start[sequence] = ends - times[sequence]
