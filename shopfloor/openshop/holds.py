"""Waiting on purpose: a machine or an order kept back for a tight line that will be free in a moment."""

from __future__ import annotations

import heapq

from shopfloor.openshop.dense import Dispatch


class Holds:
    """Keeps a machine or an order back for a moment, so that a tight line need not wait.

    A line (an order or a machine) is tight when hardly more time is left before `target` than its work
    takes. A rule that never waits gives a machine away just before a tight order becomes free, and the
    order then loses a little at each of its operations. So before a tight line ends what it does, one
    free partner that can afford it is kept for it, unless another partner will be free in time anyway;
    that is decided anew at every moment, and so as late as can be.

    Parameters
    ----------
    target
        The makespan aimed at, usually the lower bound.
    tight
        How many lines, those with the least slack, are waited for.
    patience
        The share of its own slack that a partner may lose at once.
    """

    def __init__(self, target: int, tight: int, patience: float = 1.0) -> None:
        self._target, self._tight, self._patience = target, tight, patience
        self._lines: list[tuple[bool, int]] = []
        self._refresh_in = 0

    def decide(self, loop: Dispatch) -> tuple[set[int], set[int]]:
        """Return the orders and the machines to be kept back now."""
        if self._refresh_in == 0:
            self._refresh(loop)
            self._refresh_in = max(1, len(loop.start) // 400)
        self._refresh_in -= 1
        orders: set[int] = set()
        machines: set[int] = set()
        ends: dict[int, int] | None = None
        plenty = loop.waiting_orders > 2 * len(loop.load)  # then no machine need have an order kept for it
        for is_order, line in self._lines:
            if is_order:
                if loop.work[line] and not loop.idle[line] and loop.end[line] > loop.now:
                    ends = self._machine_ends(loop) if ends is None else ends
                    self._keep_machine(loop, line, ends, machines)
            elif not plenty and loop.load[line] and not loop.units[line]:
                self._keep_order(loop, line, orders)
        return orders, machines

    def _refresh(self, loop: Dispatch) -> None:
        now, target, lists = loop.now, self._target, loop.lists
        slack = [
            (target - max(now, loop.end[job]) - work, 0, job) for job, work in enumerate(loop.work) if work
        ]
        slack += [(target - now - load // lists.count[m], 1, m) for m, load in enumerate(loop.load) if load]
        nearest = heapq.nsmallest(self._tight, slack)
        self._lines = [(kind == 0, line) for _, kind, line in nearest]
        self._tight_orders = {line for is_order, line in self._lines if is_order}
        self._tight_machines = {line for is_order, line in self._lines if not is_order}

    @staticmethod
    def _machine_ends(loop: Dispatch) -> dict[int, int]:
        """Return when each machine without a free unit next has one."""
        ends: dict[int, int] = {}
        for operation, end in loop.running.items():
            machine = loop.lists.machine[operation]
            if not loop.units[machine] and end < ends.get(machine, end + 1):
                ends[machine] = end
        return ends

    def _keep_machine(self, loop: Dispatch, job: int, ends: dict[int, int], kept: set[int]) -> None:
        """Keep one free machine for the running order `job`, unless one will be free in time."""
        end, best = loop.end[job], None
        for machine in loop.open_at[job]:
            if machine in ends:
                if ends[machine] <= end and machine not in self._tight_machines:
                    return
            elif machine not in kept and machine not in self._tight_machines and loop.units[machine]:
                slack = self._target - loop.now - loop.load[machine] // loop.lists.count[machine]
                if end - loop.now <= self._patience * slack and (best is None or (slack, machine) > best):
                    best = (slack, machine)
        if best is not None:
            kept.add(best[1])

    def _keep_order(self, loop: Dispatch, machine: int, kept: set[int]) -> None:
        """Keep one free order for the running `machine`, unless one will be free in time."""
        lists = loop.lists
        end = min(end for operation, end in loop.running.items() if lists.machine[operation] == machine)
        for operation, its_end in loop.running.items():
            job = lists.job[operation]
            if its_end <= end and job not in self._tight_orders and machine in loop.open_at[job]:
                return
        best = None
        for job, idle in enumerate(loop.idle):
            if idle and machine in loop.open_at[job] and job not in kept and job not in self._tight_orders:
                slack = self._target - loop.now - loop.work[job]
                if end - loop.now <= self._patience * slack and (best is None or (slack, job) > best):
                    best = (slack, job)
        if best is not None:
            kept.add(best[1])
