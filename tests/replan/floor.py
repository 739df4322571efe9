"""A small hall for the running shift: a plan, a journal in memory, and how things stand at a moment."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

import numpy as np

from shopfloor.journal.entries import Entry
from shopfloor.journal.events import Journal
from shopfloor.journal.pieces import IssuedPlan, numbered
from shopfloor.journal.state import counting, state
from shopfloor.model.actuals import Kind, ShiftState
from shopfloor.model.calendar import Clock
from shopfloor.model.shop import NO_DUE, Closure, Crew, Machine, Operations, Orders, Shop
from shopfloor.model.stated import StatedPlan
from shopfloor.replan.current import Current, current
from shopfloor.replan.told import Told, told
from tests.journal.floor import machine, put, work

__all__ = ["CLOCK", "MIN", "Stand", "book", "hall", "machine", "put", "stand", "told_order", "work"]

CLOCK = Clock(datetime(2026, 3, 2, 6))
MIN = 60

# order, machine, minutes; the CMM has two units, the BENCH pauses over its breaks, the RIG does not
VISITS = (
    ("TQ-1", "RIG", 30),
    ("TQ-1", "CMM", 20),
    ("TQ-2", "CMM", 40),
    ("TQ-2", "BENCH", 60),
    ("TQ-3", "BENCH", 30),
    ("TQ-3", "RIG", 20),
)
# order, machine, unit, start, end: the plan, in minutes; a break from 60 to 75
ROWS = (
    ("TQ-1", "RIG", 1, 0, 30),
    ("TQ-2", "CMM", 2, 0, 40),
    ("TQ-3", "BENCH", 1, 0, 30),
    ("TQ-1", "CMM", 1, 30, 50),
    ("TQ-3", "RIG", 1, 30, 50),
    ("TQ-2", "BENCH", 1, 40, 115),
)
DUE = {"TQ-1": 45, "TQ-2": 120}


def hall(
    visits: Sequence[tuple[str, str, int]] = VISITS,
    *,
    setup: dict[str, int] | None = None,
    steps: Sequence[int] | None = None,
    splittable: bool = False,
    clock: Clock = CLOCK,
) -> Shop:
    """The hall with `visits`; set-ups in minutes by machine, included in the visits' minutes."""
    orders = tuple(dict.fromkeys(order for order, _, _ in visits))
    machines = (
        Machine("RIG", crew="fitters", closed=(Closure(90 * MIN, 100 * MIN, "gauge"),)),
        Machine("CMM", "Measuring machines", count=2, pauses=True),
        Machine("BENCH", pauses=True),
    )
    names = [each.id for each in machines]
    return Shop(
        machines=machines,
        orders=Orders(
            orders, due_s=np.array([DUE[name] * MIN if name in DUE else NO_DUE for name in orders], np.int64)
        ),
        operations=Operations(
            [orders.index(order) for order, _, _ in visits],
            [names.index(name) for _, name, _ in visits],
            [minutes * MIN for _, _, minutes in visits],
            step=steps,
            splittable=[int(splittable)] * len(visits),
            setup_s=[(setup or {}).get(name, 0) * MIN for _, name, _ in visits],
        ),
        crews=(Crew("fitters", 2),),
        breaks=(Closure(60 * MIN, 75 * MIN, "tea"),),
        clock=clock,
        shift_end_s=8 * 60 * MIN,
    )


def issued(
    rows: Iterable[tuple[str, str, int, int, int]], sha256: str = "0" * 64, *, clock: Clock = CLOCK
) -> IssuedPlan:
    """A plan of rows in minutes, as a journal takes it."""
    order, name, unit, start, end = (list(column) for column in zip(*rows, strict=True))
    count = len(order)
    part, parts = [1] * count, [1] * count
    for index, pair in enumerate(zip(order, name, strict=True)):
        alike = [k for k, other in enumerate(zip(order, name, strict=True)) if other == pair]
        part[index], parts[index] = alike.index(index) + 1, len(alike)
    stated = StatedPlan(
        row=np.arange(1, count + 1),
        order=order,
        machine=name,
        unit=np.array(unit),
        start_s=np.array(start) * MIN,
        end_s=np.array(end) * MIN,
        round=np.full(count, -1),
        part=np.array(part),
        parts=np.array(parts),
    )
    return IssuedPlan(sha256, "plan.json", clock, 8 * 60 * MIN, tuple(numbered(stated, {})), {"schema": 1})


def book(*entries: Entry, rows: Iterable[tuple[str, str, int, int, int]] = ROWS) -> Journal:
    """A journal of the plan `rows`, with entries."""
    opened = Journal.in_memory(issued(rows))
    put(opened, *entries)
    return opened


def told_order(kind: str, order: str, at: float, data: dict[str, Any] | None = None) -> Entry:
    """An entry about an order as a whole: added, changed or cancelled, `at` in minutes."""
    return Entry(Kind(kind), round(at * MIN), order=order, data=data or {})


@dataclass(frozen=True)
class Stand:
    """How a shift stands."""

    now: Current
    state: ShiftState
    told: Told


def stand(opened: Journal, at: float, shop: Shop | None = None) -> Stand:
    """How the shift of a journal stands at a moment, in minutes."""
    events, at_s = opened.events(), round(at * MIN)
    here, said = state(events, at_s), told(counting(events), at_s)
    return Stand(current(shop or hall(), here, said), here, said)
