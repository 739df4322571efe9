"""Unit rounds: all times equal, any order. A schedule is an edge colouring; Δ rounds always suffice.

Operations are edges of a bipartite multigraph between orders and machines. A round serves each order
and each machine at most once, which is what one colour class of a proper edge colouring is. So the
makespan is at least Δ rounds, the degree of the busiest order or machine, and by D. König (Math.
Annalen 77 (1916) 453-465) a bipartite multigraph always has a colouring in exactly Δ.

A group of k units is k nodes: its operations are dealt out evenly, so the busiest unit has
⌈load/k⌉, and the same theorem gives max(order degree, ⌈load/k⌉) rounds, which nothing beats.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from shopfloor.kernel.colouring import colour_edges
from shopfloor.kernel.equitable import even_colours
from shopfloor.model.calendar import duration
from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Ints, Shop
from shopfloor.openshop.method import Effort, why_not_plain
from shopfloor.openshop.round_order import order_rounds


@dataclass(frozen=True, slots=True)
class UnitRounds:
    """Exact for unit-time shops, with or without groups, by edge colouring."""

    name: str = "unit rounds"
    reaches_bound: bool = True

    def accepts(self, shop: Shop) -> str | None:
        """Return None, or why the shop is no unit-time open shop."""
        return why_not_unit(shop)

    def promise(self, shop: Shop) -> str:
        """Return the theorem in a sentence."""
        length = duration(int(shop.operations.seconds[0])) if len(shop) else "one round"
        return (
            f"every operation takes {length} and orders may visit their machines in any order, so a plan "
            "is an edge colouring, and as many rounds as the busiest order or machine has operations "
            "always suffice (König 1916)"
        )

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return a schedule in the fewest rounds, its rounds in a good order for the due times."""
        if not len(shop):
            return Outcome(Schedule(*(np.zeros(0, np.int64),) * 3))
        node, unit = deal_out(shop)
        job = shop.operations.job
        if effort.even:
            rounds = max(int(np.bincount(job).max()), int(np.bincount(node).max()))
            colour = even_colours(job, node, rounds, seed=effort.seed)
        else:
            colour = colour_edges(job, node, seed=effort.seed)
        return rounds_to_outcome(shop, unit, colour)


def why_not_unit(shop: Shop) -> str | None:
    """Return None when all times are equal and nothing else restricts, or the reason why not."""
    seconds = shop.operations.seconds
    if len(seconds) and int(seconds.min()) != int(seconds.max()):
        return f"times differ ({duration(int(seconds.min()))} to {duration(int(seconds.max()))})"
    if shop.breaks and any(machine.pauses for machine in shop.machines):
        return "some machines pause over the breaks and others do not"
    if shop.has_splits and any(machine.count > 1 for machine in shop.machines):
        return "cutting operations uses the units of a group better"
    return why_not_plain(replace(shop, breaks=()))


def deal_out(shop: Shop) -> tuple[Ints, Ints]:
    """Split every group of k units into k nodes of nearly equal degree.

    Returns
    -------
    node, unit
        An entry an operation: the node's number among all units of all machines, and the unit
        within its group, from 1. Operations are dealt in file order, so the result is repeatable.
    """
    machine = shop.operations.machine
    counts = np.array([m.count for m in shop.machines], dtype=np.int64)
    first = np.r_[0, np.cumsum(counts)]
    order = np.argsort(machine, kind="stable")
    begins = np.searchsorted(machine[order], np.arange(len(counts)))
    rank = np.empty(len(machine), np.int64)
    rank[order] = np.arange(len(machine)) - begins[machine[order]]
    unit = rank % counts[machine]
    return first[machine] + unit, unit + 1


def rounds_to_outcome(shop: Shop, unit: Ints, colour: Ints) -> Outcome:
    """Turn a colouring into a schedule: put its rounds in a good order and say how good it is."""
    # Rounds start as early as they fit, never across a break: each opening then holds as many whole
    # rounds as it can, for every machine and every order alike, so the fewest rounds end earliest.
    length = int(shop.operations.seconds[0])
    starts = shop.work_clock.whole(0, length, int(colour.max()) + 1)
    ends = starts + length
    orders = shop.orders
    over = np.r_[0, ends]  # when the first, second, … round is over, by how many have run
    order = order_rounds(
        colour, shop.operations.job, np.ones(len(ends), int), over.__getitem__, orders.due_s, orders.priority
    )
    place = order.position[colour]
    schedule = Schedule(np.arange(len(shop)), starts[place], ends[place], unit=unit, round=place + 1)
    return Outcome(schedule, remarks=(order.about("rounds"),) if shop.has_due else ())
