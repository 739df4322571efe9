"""List schedules: legal in one pass, near-linear, and often at the bound already.

For the makespan there is a fixed sequence of runs, the plain rule first; later runs hold machines for
tight orders (:class:`~shopfloor.openshop.holds.Holds`), place near-bound orders in advance
(:mod:`shopfloor.openshop.reserve`) or blur their keys at random from the seed. For due times a grid
of rules is tried, and the best of them is then varied (:mod:`shopfloor.openshop.due_search`). How many
runs are made depends on the size of the shop, never on the clock, so that they repeat.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import partial
from itertools import cycle, product

from shopfloor.model.shop import Ints, Shop
from shopfloor.openshop.dense import Chance, MostWork, ShopLists, starts
from shopfloor.openshop.due_search import due_runs
from shopfloor.openshop.holds import Holds
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, Incumbent
from shopfloor.openshop.reserve import may_reserve, near_bound_orders, reserved_starts

# For each goal: operations placed in all its runs together, and the fewest and the most runs.
BUDGETS = {MAKESPAN: (60_000, 2, 40), TARDINESS: (300_000, 4, 600)}
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
    placed, fewest, most = BUDGETS[goal]
    allowed = max(fewest, min(most, placed // max(len(shop), 1)))
    runs = makespan_runs(shop, target, seed) if goal == MAKESPAN else due_runs(shop, incumbent, target, seed)
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
    lists = ShopLists.of(shop)
    near = near_bound_orders(shop, target)
    reserved = bool(near) and may_reserve(shop, near)
    yield partial(_heavy, lists, None, 0.0, 0.0, target, 0)
    yield partial(_heavy, lists, None, 0.0, 0.0, target, 1)
    if reserved:
        for number in range(RESERVATIONS):
            yield partial(reserved_starts, shop, lists, near, target, (seed, number) if number else None)
    for tight in (2, 4, 8):
        yield partial(_heavy, lists, None, 0.0, 0.0, target, tight)
    blurs = cycle(product((0.02, 0.1, 0.3), (0.0, 1.0), (0, 1, 2, 4)))
    for number, (noise, longest, tight) in enumerate(blurs):
        yield partial(_heavy, lists, (seed, number), noise, longest, target, tight)
        if reserved:
            yield partial(reserved_starts, shop, lists, near, target, (seed, RESERVATIONS + number))


def _heavy(lists: ShopLists, chance: Chance, noise: float, longest: float, target: int, tight: int) -> Ints:
    queue = MostWork(chance, noise=noise, longest=longest)
    return starts(lists, queue, Holds(target, tight) if tight else None)
