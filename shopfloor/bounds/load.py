"""Load bounds: an order or a machine has this much work, so nothing can end before it is done.

Both are classical: an order is in one place at a time, a machine serves one order at a time
(T. Gonzalez, S. Sahni, J. ACM 23 (1976) 665-679). Release times and steps give each operation a
*head*, the earliest start its order allows, and a *tail*, what its order still needs afterwards.
Running time O(m log m) for m operations.
"""

from __future__ import annotations

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound
from shopfloor.model.shop import Ints, Shop

ORDERS_SHOWN = 5  # a shop may hold 100,000 orders; the longest few are worth printing


def order_bounds(shop: Shop) -> list[Bound]:
    """Return the bounds of the longest few orders: release plus all of the order's run time."""
    totals = shop.orders.release_s + shop.job_load_s
    busy = np.flatnonzero(shop.job_load_s)
    longest = busy[np.lexsort((busy, -totals[busy]))][:ORDERS_SHOWN]
    return [_order_bound(shop, int(job)) for job in longest]


def _order_bound(shop: Shop, job: int) -> Bound:
    name, release, load = shop.orders.ids[job], int(shop.orders.release_s[job]), int(shop.job_load_s[job])
    when = f" and cannot start before {shop.clock.say(release)}" if release else ""
    return Bound(
        kind="order",
        value_s=release + load,
        witness={"order": name},
        sentence=f"Order {name} needs {duration(load)} of machine time, one machine at a time{when}, "
        f"so nothing can end before {shop.clock.say(release + load)}.",
    )


def machine_bounds(shop: Shop) -> list[Bound]:
    """Return a bound for each machine with work: the best over all release thresholds.

    For a threshold h, the operations whose head is at least h cannot start before h, take their
    total time divided by the units, and leave at least their least tail to do.
    """
    order = np.argsort(shop.operations.machine, kind="stable")
    ends = np.searchsorted(shop.operations.machine[order], np.arange(len(shop.machines) + 1))
    return [
        _machine_bound(shop, machine, order[ends[machine] : ends[machine + 1]])
        for machine in range(len(shop.machines))
        if ends[machine] < ends[machine + 1]
    ]


def _machine_bound(shop: Shop, machine: int, operations: Ints) -> Bound:
    count = shop.machines[machine].count
    heads = shop.head_s[operations]
    latest_first = np.argsort(-heads, kind="stable")
    heads = heads[latest_first]
    loads = np.cumsum(shop.operations.seconds[operations][latest_first])
    tails = np.minimum.accumulate(shop.tail_s[operations][latest_first])
    values = heads - (-loads // count) + tails
    # A threshold is only honest once every operation with that same head is inside it.
    whole = np.r_[heads[1:] != heads[:-1], True]
    best = int(np.where(whole, values, -1).argmax())
    head, load, tail = int(heads[best]), int(loads[best]), int(tails[best])
    return Bound(
        kind="machine",
        value_s=int(values[best]),
        witness={"machine": shop.machines[machine].id, "from_s": head, "tail_s": tail, "load_s": load},
        sentence=_machine_sentence(shop, machine, head, load, tail, int(values[best])),
    )


def _machine_sentence(shop: Shop, machine: int, head: int, load: int, tail: int, value: int) -> str:
    name, count = shop.machines[machine].id, shop.machines[machine].count
    start = f"that cannot start before {shop.clock.say(head)}" if head else "for this shift"
    has = (
        f"{name} has {duration(load)} of work {start}"
        if count == 1
        else f"The {count} units of {name} share {duration(load)} of work {start}"
    )
    after = f", and each of these orders needs at least {duration(tail)} more afterwards" if tail else ""
    return f"{has}{after}, so nothing can end before {shop.clock.say(value)}."


def round_bounds(shop: Shop) -> list[Bound]:
    """Return bounds in whole rounds for groups, where all operations take the same time.

    With d operations on k units some unit runs at least ⌈d/k⌉ of them, which may be more than the
    load divided by k. Empty when times differ or no group has more than one unit.
    """
    seconds = shop.operations.seconds
    if not len(seconds) or int(seconds.min()) != int(seconds.max()):
        return []
    length = int(seconds[0])
    degrees = np.bincount(shop.operations.machine, minlength=len(shop.machines))
    bounds = []
    for degree, machine in zip(degrees.tolist(), shop.machines, strict=True):
        if machine.count > 1 and degree:
            rounds = -(-degree // machine.count)
            bounds.append(
                Bound(
                    kind="rounds",
                    value_s=rounds * length,
                    witness={"node": "machine", "id": machine.id, "operations": degree, "round_s": length},
                    sentence=f"The {machine.count} units of {machine.id} share {degree} operations of "
                    f"{duration(length)}, so one of them runs at least {rounds}, "
                    f"and nothing can end before {shop.clock.say(rounds * length)}.",
                )
            )
    return bounds
