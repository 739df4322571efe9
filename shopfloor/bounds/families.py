"""The least time of changeovers that a machine's families force, whatever the sequence.

A machine that has to run families F is set up for each of them at some time. Leaving out all others
never makes a sequence cheaper to change, since no way round is shorter (`Changeovers` checks that). So
one unit pays at least the cheapest path through F: found exactly by a recursion over sets (M. Held,
R. M. Karp, J. SIAM 10 (1962) 196-210) up to ``EXACT_FAMILIES``. Beyond, and for several units, every
family but the first of each unit is entered at least once, at its cheapest entrance.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from shopfloor.model.shop import NO_FAMILY, Ints, Shop

EXACT_FAMILIES = 10


def least_changeover(shop: Shop, machine: int, operations: Ints, *, from_start: bool) -> int:
    """Return the seconds of changeover that running `operations` on `machine` forces, over all its units.

    Parameters
    ----------
    from_start
        Whether the machine is known to be in its starting family when these operations begin; else it
        may stand in any.
    """
    hall = shop.machines[machine]
    rule = shop.changeovers.get(hall.id)
    if rule is None or rule.none:
        return 0
    names = [
        "" if f == NO_FAMILY else shop.families[f] for f in np.unique(shop.operations.family[operations])
    ]
    start = hall.family if from_start else None
    if hall.count == 1 and len(names) <= EXACT_FAMILIES:
        return _shortest_path(names, start, rule.seconds)
    entered = [name for name in names if name != start]
    others = [*names, *([start] if start is not None else [])]
    entrances = sorted(
        min((rule.seconds(o, name) for o in others if o != name), default=0) for name in entered
    )
    free = hall.count if start is None else 0  # each unit stands in its first family without a change
    return sum(entrances[: max(0, len(entrances) - free)])


def _shortest_path(names: Sequence[str], start: str | None, seconds: Callable[[str, str], int]) -> int:
    """Return the cheapest way to be set up for every name once, beginning anywhere or at `start`."""
    size = len(names)
    full = (1 << size) - 1
    least: dict[tuple[int, int], int] = {
        (1 << k, k): 0 if start is None else seconds(start, names[k]) for k in range(size)
    }
    for done in range(1, full):
        for last in range(size):
            cost = least.get((done, last))
            if cost is None:
                continue
            for after in range(size):
                if not done >> after & 1:
                    key = (done | 1 << after, after)
                    least[key] = min(least.get(key, cost + 10**12), cost + seconds(names[last], names[after]))
    return min(least[full, last] for last in range(size))
