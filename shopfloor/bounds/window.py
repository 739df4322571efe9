"""Window bounds: on one machine, what cannot start before h and leaves at least q to do must lie between.

This is the preemptive one-machine relaxation with heads and tails (J. R. Jackson, UCLA research report 43
(1955); J. Carlier, E.J.O.R. 11 (1982) 42-47): its optimum is the largest, over all thresholds h and q, of
h + load + q over the operations with head ≥ h and tail ≥ q. `load.machine_bounds` takes q as it comes;
here q is a threshold too, which pays where steps give tails. Closures are taken out of the clock.
Running time O(n log n) for each distinct tail of a machine, at most ``TAILS_TRIED`` of them.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound
from shopfloor.model.shop import Ints, Shop

TAILS_TRIED = 64  # evenly spread over the distinct tails of a machine that has more


def window_bounds(shop: Shop) -> list[Bound]:
    """Return a bound for each machine whose orders have to go on elsewhere; empty without steps."""
    if not shop.has_steps:
        return []
    bounds = []
    for machine in range(len(shop.machines)):
        operations = np.flatnonzero(shop.operations.machine == machine)
        if len(operations) and shop.tail_s[operations].any():
            bounds.append(_window(shop, machine, operations))
    return [bound for bound in bounds if bound.witness["tail_s"]]  # without a tail it is the load bound


def spread(values: Ints, most: int) -> Ints:
    """Return the distinct values, rising, or `most` of them evenly spread where there are more."""
    found: Ints = np.unique(values)
    if len(found) > most:
        found = found[np.linspace(0, len(found) - 1, most).astype(np.int64)]
    return found


def _window(shop: Shop, machine: int, operations: Ints) -> Bound:
    hall, clock = shop.machines[machine], shop.machine_clocks[machine]
    heads, tails = shop.head_s[operations], shop.tail_s[operations]
    latest_first = np.argsort(-heads, kind="stable")
    heads, tails = heads[latest_first], tails[latest_first]
    seconds = shop.operations.seconds[operations][latest_first]
    thresholds = spread(tails, TAILS_TRIED)
    best = -1
    witness: dict[str, Any] = {}
    for tail in thresholds.tolist():
        inside = tails >= tail
        head, load = heads[inside], np.cumsum(seconds[inside])
        done = clock.end(clock.worked(head) - (-load // hall.count))
        values = shop.work_clock.end(shop.work_clock.worked(done) + tail) if tail else done
        values = np.where(np.r_[head[1:] != head[:-1], True], values, -1)  # all of one head, or none of it
        place = int(values.argmax())
        if int(values[place]) > best:
            best = int(values[place])
            witness = {
                "machine": hall.id,
                "from_s": int(head[place]),
                "tail_s": tail,
                "load_s": int(load[place]),
            }
    head_s = witness["from_s"]
    begin = f"cannot start before {shop.clock.say(head_s)}" if head_s else "is there from the start"
    return Bound(
        kind="window",
        value_s=best,
        witness=witness,
        sentence=f"On {hall.id}, {duration(witness['load_s'])} of work {begin} and leaves its orders at "
        f"least {duration(witness['tail_s'])} to do elsewhere, so nothing can end before "
        f"{shop.clock.say(best)}.",
    )
