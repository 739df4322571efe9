"""Load bounds: an order or a machine has this much work, so nothing can end before it is done.

Both are classical: an order is in one place at a time, a machine serves one order at a time
(T. Gonzalez, S. Sahni, J. ACM 23 (1976) 665-679). Release times and steps give each operation a
*head*, the earliest start its order allows, and a *tail*, what its order still needs afterwards.
Running time O(m log m) for m operations.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from shopfloor.bounds.families import least_changeover
from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound
from shopfloor.model.shop import Ints, Machine, Shop

ORDERS_SHOWN = 5  # a shop may hold 100,000 orders; the longest few are worth printing


def order_bounds(shop: Shop) -> list[Bound]:
    """Return the bounds of the longest few orders: release plus all of the order's run time."""
    totals = shop.work_clock.worked(shop.orders.release_s) + shop.job_load_s
    busy = np.flatnonzero(shop.job_load_s)
    longest = busy[np.lexsort((busy, -totals[busy]))][:ORDERS_SHOWN]
    return [_order_bound(shop, int(job)) for job in longest]


def _order_bound(shop: Shop, job: int) -> Bound:
    name, release, load = shop.orders.ids[job], int(shop.orders.release_s[job]), int(shop.job_load_s[job])
    value = shop.work_clock.finish(release, load)
    when = f" and cannot start before {shop.clock.say(release)}" if release else ""
    return Bound(
        kind="order",
        value_s=value,
        witness={"order": name},
        sentence=f"Order {name} needs {duration(load)} of machine time, one machine at a time{when}, "
        f"so nothing can end before {shop.clock.say(value)}.",
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
    hall, clock = shop.machines[machine], shop.machine_clocks[machine]
    heads = shop.head_s[operations]
    latest_first = np.argsort(-heads, kind="stable")
    operations, heads = operations[latest_first], heads[latest_first]
    loads = np.cumsum(shop.operations.seconds[operations])
    tails = np.minimum.accumulate(shop.tail_s[operations])
    changes = _forced_changeovers(shop, machine, operations, heads)
    # The tail runs on other machines, whose closures are not this one's: only the hall's breaks hold it up.
    done = clock.end(clock.worked(heads) - (-(loads + changes) // hall.count))
    values = np.where(tails > 0, shop.work_clock.end(shop.work_clock.worked(done) + tails), done)
    # A threshold is only honest once every operation with that same head is inside it.
    whole = np.r_[heads[1:] != heads[:-1], True]
    best = int(np.where(whole, values, -1).argmax())
    witness = {
        "machine": hall.id,
        "from_s": int(heads[best]),
        "tail_s": int(tails[best]),
        "load_s": int(loads[best]),
    }
    if changes[best]:
        witness["changeover_s"] = int(changes[best])
    return Bound(
        "machine", int(values[best]), witness, _machine_sentence(shop, machine, witness, int(values[best]))
    )


def _forced_changeovers(shop: Shop, machine: int, operations: Ints, heads: Ints) -> Ints:
    """Return the least changeover time of each prefix of `operations`, which come latest head first."""
    changes = np.zeros(len(operations), np.int64)
    rule = shop.changeovers.get(shop.machines[machine].id)
    if rule is None or rule.none:
        return changes
    families = shop.operations.family[operations]
    seen: set[int] = set()
    least = 0
    for place, family in enumerate(families.tolist()):
        everything = place == len(operations) - 1
        if family not in seen or everything:
            seen.add(family)
            # Only the whole load, begun with the shift, meets the machine in its starting family; what comes
            # later may find it in any, changed while it waited.
            begins = everything and heads[place] == 0
            least = max(least, least_changeover(shop, machine, operations[: place + 1], from_start=begins))
        changes[place] = least
    return changes


def _machine_sentence(shop: Shop, machine: int, witness: Mapping[str, Any], value: int) -> str:
    name, count = shop.machines[machine].id, shop.machines[machine].count
    head, load, tail = witness["from_s"], witness["load_s"], witness["tail_s"]
    start = f"that cannot start before {shop.clock.say(head)}" if head else "for this shift"
    has = (
        f"{name} has {duration(load)} of work {start}"
        if count == 1
        else f"The {count} units of {name} share {duration(load)} of work {start}"
    )
    change = witness.get("changeover_s", 0)
    changes = f", and its families force at least {duration(change)} of changeovers" if change else ""
    shut = ", around its closures" if shop.machines[machine].closed else ""
    after = f", and each of these orders needs at least {duration(tail)} more afterwards" if tail else ""
    return f"{has}{changes}{shut}{after}, so nothing can end before {shop.clock.say(value)}."


def round_bounds(shop: Shop) -> list[Bound]:
    """Return bounds in whole rounds where all operations take the same time and none may be cut.

    With d operations on k units some unit runs at least ⌈d/k⌉ of them, which may be more than the load
    divided by k; and where work does not pause, none of them runs across a break, so a machine or an
    order needs that many openings. Empty when neither says more than the load does.
    """
    seconds = shop.operations.seconds
    if not len(seconds) or int(seconds.min()) != int(seconds.max()) or shop.has_splits:
        return []
    degrees = np.bincount(shop.operations.machine, minlength=len(shop.machines)).tolist()
    stiff = bool(shop.breaks) and not any(machine.pauses for machine in shop.machines)
    bounds = [
        _rounds_of_machine(shop, machine, degree)
        for degree, machine in zip(degrees, shop.machines, strict=True)
        if degree and (stiff or machine.count > 1)
    ]
    if stiff:
        visits = np.bincount(shop.operations.job, minlength=len(shop.orders))
        busiest = np.lexsort((np.arange(len(visits)), -visits))[:ORDERS_SHOWN]
        bounds += [_rounds_of_order(shop, int(job), int(visits[job])) for job in busiest if visits[job]]
    return bounds


def _rounds_of_machine(shop: Shop, machine: Machine, degree: int) -> Bound:
    length, rounds = int(shop.operations.seconds[0]), -(-degree // machine.count)
    value = _end_of_rounds(shop, machine.pauses, length, rounds)
    has = f"{machine.id} has" if machine.count == 1 else f"The {machine.count} units of {machine.id} share"
    least = "" if machine.count == 1 else f", so one of them runs at least {rounds}"
    return Bound(
        kind="rounds",
        value_s=value,
        witness={"node": "machine", "id": machine.id, "operations": degree, "round_s": length},
        sentence=f"{has} {_operations(degree)} of {duration(length)}{least}{_around(shop, machine.pauses)}, "
        f"so nothing can end before {shop.clock.say(value)}.",
    )


def _rounds_of_order(shop: Shop, job: int, degree: int) -> Bound:
    length, name = int(shop.operations.seconds[0]), shop.orders.ids[job]
    value = _end_of_rounds(shop, False, length, degree)
    return Bound(
        kind="rounds",
        value_s=value,
        witness={"node": "order", "id": name, "operations": degree, "round_s": length},
        sentence=f"Order {name} has {_operations(degree)} of {duration(length)}, one at a time"
        f"{_around(shop, False)}, so nothing can end before {shop.clock.say(value)}.",
    )


def _end_of_rounds(shop: Shop, pauses: bool, length: int, rounds: int) -> int:
    if pauses or not shop.breaks:
        return shop.work_clock.finish(0, rounds * length)
    return int(shop.work_clock.whole(0, length, rounds)[-1]) + length


def _operations(count: int) -> str:
    return "1 operation" if count == 1 else f"{count} operations"


def _around(shop: Shop, pauses: bool) -> str:
    return " and none across a break" if shop.breaks and not pauses else ""
