"""What a shift can hold: linear limits that any set of orders must keep, and whether keeping them is enough.

In unit rounds a set of operations fits K rounds exactly when no order and no machine has more than K
of them (König 1916); with work that may be cut, and on two machines, the same holds with seconds for
rounds (Gonzalez and Sahni 1976). Elsewhere the limits are necessary, and a plan has to confirm.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shopfloor.errors import NoPlanError
from shopfloor.model.calendar import duration
from shopfloor.model.shop import Crew, Ints, Shop
from shopfloor.openshop.choose import choose


@dataclass(frozen=True, slots=True)
class Limit:
    """The work of `operations` (indices), each weighing `weight`, must not exceed `room`."""

    name: str
    operations: Ints
    weight: Ints
    room: int


@dataclass(frozen=True, slots=True)
class Budget:
    """The limits of a shift.

    Attributes
    ----------
    limits
        One for each machine (for each release threshold of it) and crew, in operations or seconds.
    order_room
        The most that one order may have: rounds or seconds.
    unit
        ``rounds`` or ``seconds``.
    room
        How many of these the shift has.
    enough
        Whether any set within the limits is guaranteed to fit.
    theorem
        Why, or why not, in half a sentence.
    """

    limits: tuple[Limit, ...]
    order_room: Ints
    cost: Ints
    unit: str
    room: int
    enough: bool
    theorem: str

    def room_text(self) -> str:
        """Say how much one machine can hold."""
        return f"{self.room} rounds" if self.unit == "rounds" else duration(self.room)


def budget(shop: Shop) -> Budget:
    """Return what the shift of `shop` can hold.

    Raises
    ------
    NoPlanError
        If the shift's end is not known.
    """
    end = shop.shift_end_s
    if end is None:
        raise NoPlanError("the shift has no end, so everything fits; give --end, or end in shop.toml")
    method, choice = choose(shop)
    if choice.name in ROUND_METHODS:
        return _rounds(shop, end, choice.why)
    return _seconds(shop, end, method.reaches_bound, choice.why)


ROUND_METHODS = frozenset({"unit rounds", "crew rounds"})


def _rounds(shop: Shop, end: int, why: str) -> Budget:
    length = int(shop.operations.seconds[0]) if len(shop) else 1
    if shop.breaks and all(machine.pauses for machine in shop.machines):
        rounds = int(shop.work_clock.worked(end)) // length
    else:
        starts = shop.work_clock.whole(0, length, end // length + 1)
        rounds = int((starts + length <= end).sum())
    one = np.ones(len(shop), np.int64)
    limits = [
        Limit(machine.id, np.flatnonzero(shop.operations.machine == index), one, rounds * machine.count)
        for index, machine in enumerate(shop.machines)
    ]
    for crew in shop.crews:
        attended = _attended(shop, crew.id)
        if len(attended):
            at_once = crew.heads // max(1, int(shop.operations.heads[attended[0]]))
            limits.append(Limit(f"crew {crew.id}", attended, one, rounds * at_once))
    return Budget(tuple(limits), np.full(len(shop.orders), rounds), one, "rounds", rounds, True, why)


def _seconds(shop: Shop, end: int, enough: bool, why: str) -> Budget:
    clock, seconds = shop.work_clock, shop.operations.seconds
    total = int(clock.worked(end))
    limits = []
    for index, machine in enumerate(shop.machines):
        its_clock = shop.machine_clocks[index]
        mine = np.flatnonzero(shop.operations.machine == index)
        for head in np.unique(shop.head_s[mine]).tolist():
            late = mine[shop.head_s[mine] >= head]
            room = max(0, int(its_clock.worked(end)) - int(its_clock.worked(head))) * machine.count
            limits.append(Limit(machine.id, late, seconds, room))
    for crew in shop.crews:
        attended = _attended(shop, crew.id)
        if len(attended):
            need = _attended_s(shop) * shop.operations.heads
            limits.append(Limit(f"crew {crew.id}", attended, need, _head_seconds(shop, crew, end)))
    room = np.maximum(0, total - clock.worked(shop.orders.release_s))
    return Budget(tuple(limits), room, seconds, "seconds", total, enough, why)


def _attended_s(shop: Shop) -> Ints:
    """Return how long each operation takes heads: all the time, or only during its set-up."""
    only_setup = np.array([machine.set_up_only for machine in shop.machines], bool)[shop.operations.machine]
    attended: Ints = np.where(only_setup, shop.operations.setup_s, shop.operations.seconds)
    return attended


def _head_seconds(shop: Shop, crew: Crew, end: int) -> int:
    """Return the head-seconds that a crew has before `end`, outside the hall's breaks."""
    worked = shop.work_clock.worked
    total = crew.heads * int(worked(end))
    for start, until, heads in crew.levels:
        span = int(worked(min(max(until, 0), end))) - int(worked(min(max(start, 0), end)))
        total += (heads - crew.heads) * span
    return total


def _attended(shop: Shop, crew: str) -> Ints:
    of_crew = np.array([machine.crew == crew for machine in shop.machines], bool)
    return np.flatnonzero(of_crew[shop.operations.machine]) if len(of_crew) else np.zeros(0, np.int64)
