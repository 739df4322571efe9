"""List schedules: legal in one pass, near-linear, and often at the bound already.

Each goal has a fixed sequence of runs, the plain rule first; later runs hold machines for tight
orders (:class:`~shopfloor.openshop.dense.Holds`), place near-bound orders in advance
(:mod:`shopfloor.openshop.reserve`) or blur their keys at random from the seed. How many are made
depends on the size of the shop, never on the clock, so that they repeat.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import partial
from itertools import cycle, product

from shopfloor.model.shop import Ints, Shop
from shopfloor.openshop.dense import Chance, Floor, Holds, MostWork, starts
from shopfloor.openshop.due_rules import Index, MostUrgent, apparent_cost, earliest_due, modified_due
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, Incumbent
from shopfloor.openshop.reserve import may_reserve, near_bound_orders, reserved_starts

DISPATCHED = 60_000  # operations placed in all the runs for one goal together, if that is several runs
FEWEST, MOST = 2, 40  # runs for one goal
RESERVATIONS = 6  # ways tried to place near-bound orders in advance

Run = Callable[[], Ints]


def list_schedules(
    shop: Shop,
    incumbent: Incumbent,
    goal: str,
    target: int,
    *,
    seed: int = 0,
    over: Callable[[], bool] = lambda: False,
) -> bool:
    """Offer `incumbent` one list schedule after the other, until the goal is met or the runs are spent.

    Parameters
    ----------
    goal
        ``MAKESPAN``: met when the makespan is `target`. ``TARDINESS``: met when no order is late
        and the makespan is no more than `target`.
    target
        The makespan aimed at, in seconds: the lower bound, or the best that is known to exist.
    seed
        Seed of the random runs.
    over
        Asked before each run but the first.

    Returns
    -------
    Whether every run was made that the size of the shop allows, or the goal was met.
    """
    if not len(shop):
        incumbent.offer(shop.operations.seconds.copy())
        return True
    allowed = max(FEWEST, min(MOST, DISPATCHED // len(shop)))
    runs = makespan_runs(shop, target, seed) if goal == MAKESPAN else due_runs(shop, target)
    for number, run in zip(range(allowed), runs, strict=False):
        if number and over():
            return False
        incumbent.offer(run())
        if _met(incumbent, goal, target):
            break
    return True


def _met(incumbent: Incumbent, goal: str, target: int) -> bool:
    if incumbent.value(MAKESPAN) > target:
        return False
    return goal == MAKESPAN or incumbent.value(TARDINESS) == 0


def makespan_runs(shop: Shop, target: int, seed: int) -> Iterator[Run]:
    """Yield runs for the least makespan without end, the most promising first."""
    floor = Floor.of(shop)
    near = near_bound_orders(shop, target)
    yield partial(_heavy, floor, None, 0.0, 0.0, target, 0)
    yield partial(_heavy, floor, None, 0.0, 0.0, target, 1)
    if near and may_reserve(shop, near):
        for number in range(RESERVATIONS):
            yield partial(reserved_starts, shop, floor, near, target, (seed, number) if number else None)
    for tight in (2, 4, 8):
        yield partial(_heavy, floor, None, 0.0, 0.0, target, tight)
    blurs = cycle(product((0.02, 0.1, 0.3), (0.0, 1.0), (0, 1, 2, 4)))
    for number, (noise, longest, tight) in enumerate(blurs):
        yield partial(_heavy, floor, (seed, number), noise, longest, target, tight)


def due_runs(shop: Shop, deadline: int) -> Iterator[Run]:
    """Yield the runs for weighted tardiness, each keeping a makespan of `deadline` in view."""
    floor = Floor.of(shop)
    heaviest = float(shop.orders.priority.max())
    for tight in (0, 2):
        for pull, flow, look_ahead in product((1.0, 0.1, 10.0), (1.0, 0.0), (1.0, 3.0)):
            index = apparent_cost(look_ahead, flow, deadline, pull * heaviest)
            yield partial(_urgent, shop, floor, index, deadline, tight)
        yield partial(_urgent, shop, floor, modified_due(deadline), deadline, tight)
        yield partial(_urgent, shop, floor, earliest_due(deadline), deadline, tight)


def _heavy(floor: Floor, chance: Chance, noise: float, longest: float, target: int, tight: int) -> Ints:
    queue = MostWork(chance, noise=noise, longest=longest)
    return starts(floor, queue, Holds(target, tight) if tight else None)


def _urgent(shop: Shop, floor: Floor, index: Index, deadline: int, tight: int) -> Ints:
    return starts(floor, MostUrgent(shop, index), Holds(deadline, tight) if tight else None)
