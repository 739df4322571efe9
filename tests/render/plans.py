"""Plans to draw, made directly: the invented hall "Tern Quay valve overhaul", small and large.

The schedules are legal (a test checks it) and dense, but made by a plain rule, not by our methods.
"""

from __future__ import annotations

import random
from bisect import insort
from dataclasses import replace
from datetime import datetime

import numpy as np

from shopfloor.model.calendar import HOUR, Clock, duration
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import (
    NO_DUE,
    Changeovers,
    Closure,
    Crew,
    Machine,
    Operations,
    Orders,
    Shop,
    Transport,
)

TRADES = (
    *("Wash", "Blast", "Dye-penetrant", "CMM", "Pressure test", "Balancing", "Engraving", "Coating"),
    *("Lapping", "Hardness", "Deburr", "Torque bench"),
)
SHIFT = Clock(datetime(2026, 3, 2, 6, 0))
HOSTILE = (
    "<img src=x onerror=alert(1)>",
    "</script><script>alert(2)</script>",
    "<b>bold</b>",
    '<a href="javascript:alert(3)">here</a>',
    "&lt;i&gt;",
    "\u202eTQ-9\u202c طلب",
    "\"quoted\" 'both'",
    "two\nlines",
    "=1+1",
)


def hall_plan(
    operations: int = 200,
    *,
    seed: int = 0,
    clock: Clock = SHIFT,
    shift_end_s: int | None = 8 * HOUR,
    due: bool = True,
    rounds: bool = False,
    names: tuple[str, ...] = (),
    notes: bool = True,
    idle_s: int = 0,
    breaks: tuple[Closure, ...] = (),
) -> Plan:
    """Return a plan of about `operations` operations; 10, 24 or 60 machine rows by size.

    `names` are given to the first orders and machines in turn, to see what a page makes of them;
    `idle_s` holds the last operation back, so that the plan does not meet its bound.
    """
    draw = random.Random(seed)
    rows, visits = (9, 5) if operations <= 500 else (23, 5) if operations <= 5000 else (59, 8)
    machines = tuple(_machine(index, names) for index in range(rows))
    count = max(1, operations // visits)
    job, machine, seconds = [], [], []
    for order in range(count):
        for visit in sorted(draw.sample(range(rows), visits)):
            job.append(order)
            machine.append(visit)
            seconds.append(1800 if rounds else 60 * draw.choice((10, 15, 15, 20, 20, 25, 25, 30, 35)))
    orders = Orders(tuple(names[i] if i < len(names) else f"TQ-{1001 + i}" for i in range(count)))
    texts = ("seal kit on cart 4", "handle with gloves", "customer waits")
    noted = {index: texts[index // 17 % 3] for index in range(0, len(job), 17)} if notes else {}
    columns = Operations(np.array(job), np.array(machine), np.array(seconds), notes=noted)
    shop = Shop(
        machines=machines,
        orders=orders,
        operations=columns,
        breaks=breaks,
        clock=clock,
        shift_end_s=shift_end_s,
        unit_rounds=rounds,
    )
    schedule = _dense(shop, rounds, idle_s)
    if due:
        finish = schedule.completion_s(columns.job, count)
        shop = replace(shop, orders=replace(orders, due_s=_dues(draw, finish.tolist())))
    bounds = _bounds(shop)
    return Plan(
        shop=shop,
        schedule=schedule,
        bounds=bounds,
        choice=Choice("plain rule", "it is only for drawing", {"unit rounds": "times differ"}),
        inputs=(("orders.csv", "0" * 64),),
        options={"seed": seed},
        remarks=("Drawn for a test.",),
        would_help=("One more unit of CMM would let everything end by 12:40, 25 min earlier.",),
    )


def _machine(index: int, names: tuple[str, ...]) -> Machine:
    if index < len(names):
        return Machine(names[-1 - index] + " ")
    hall = index // len(TRADES)
    name = TRADES[index % len(TRADES)] + (f" {'ABCDE'[hall]}" if hall else "")
    return Machine(name, count=2 if index == 0 else 1)


def _dues(draw: random.Random, finish: list[int]) -> np.ndarray:
    """Most orders have half an hour to spare or more, some are late, some have no due time."""
    dues = [
        NO_DUE if draw.random() < 0.2 else max(900, (end + draw.randrange(-1200, 3 * HOUR)) // 900 * 900)
        for end in finish
    ]
    return np.array(dues, dtype=np.int64)


def _dense(shop: Shop, rounds: bool, idle_s: int) -> Schedule:
    """Whichever unit is free first takes the first waiting order that is free, or waits for the next."""
    waiting = [[] for _ in shop.machines]
    for index, machine in enumerate(shop.operations.machine.tolist()):
        waiting[machine].append(index)
    for machine, queue in enumerate(waiting):  # so that not all machines want the same order first
        cut = len(queue) * machine // len(waiting)
        queue[:] = queue[cut:] + queue[:cut]
    job, seconds = shop.operations.job.tolist(), shop.operations.seconds.tolist()
    order_free = [0] * len(shop.orders)
    free = sorted((0, m, u) for m, machine in enumerate(shop.machines) for u in range(machine.count))
    rows = []
    while free:
        now, machine, unit = free.pop(0)
        queue = waiting[machine]
        if not queue:
            continue
        chosen = next((i for i in queue if order_free[job[i]] <= now), None)
        if chosen is None:
            insort(free, (min(order_free[job[i]] for i in queue), machine, unit))
            continue
        queue.remove(chosen)
        end = now + seconds[chosen]
        order_free[job[chosen]] = end
        rows.append((chosen, now, end, unit + 1))
        insort(free, (end, machine, unit))
    operation, start, end, unit = (np.array(column, dtype=np.int64) for column in zip(*rows, strict=True))
    last = int(end.argmax())
    start[last], end[last] = start[last] + idle_s, end[last] + idle_s
    return Schedule(operation, start, end, unit, start // 1800 + 1 if rounds else None)


def _bounds(shop: Shop) -> tuple[Bound, ...]:
    loads = [-(-int(s) // m.count) for s, m in zip(shop.machine_load_s, shop.machines, strict=True)]
    busiest = max(range(len(loads)), key=lambda index: (loads[index], -index))
    longest = int(shop.job_load_s.argmax())
    name, order, load = shop.machines[busiest].id, shop.orders.ids[longest], int(shop.job_load_s[longest])
    found = [
        Bound(
            "machine",
            loads[busiest],
            {"machine": name, "load_s": int(shop.machine_load_s[busiest])},
            f"{name} has {duration(loads[busiest])} of work for this shift, "
            f"so nothing can end before {shop.clock.say(loads[busiest])}.",
        ),
        Bound(
            "order",
            load,
            {"order": order},
            f"Order {order} needs {duration(load)} of machine time, one machine at a time, "
            f"so nothing can end before {shop.clock.say(load)}.",
        ),
    ]
    return tuple(sorted(found, key=lambda bound: -bound.value_s))


def many_plan(operations: int, *, floor: bool = False, names: int = 0, notes: bool = False) -> Plan:
    """Return a plan of very many operations, made at once: blocks of 60 orders that change places 8 times.

    `floor` gives every operation a set-up, a family, heads and a way; `names` makes order names so long;
    `notes` gives every order a note of its own.
    """
    machines, rounds = 60, 8
    orders = -(-operations // rounds)
    job, turn = np.divmod(np.arange(orders * rounds), rounds)
    machine = (job + turn) % machines
    begin = (job // machines * rounds + turn) * 1800
    seconds = 60 * (10 + (job * 7 + turn * 13 + machine * 5) % 16)
    family = (job // machines + machine) % 7
    shop = Shop(
        machines=tuple(
            Machine(f"M{k + 1:02d}", crew="crew" if floor else None, family="fam 0" if floor else None)
            for k in range(machines)
        ),
        orders=Orders(
            tuple(f"TQ-{k:06d}".ljust(names, "x") for k in range(orders)),
            due_s=(np.arange(orders) // machines + 1) * rounds * 1800 - 7200 * (np.arange(orders) % 3 > 1),
        ),
        operations=Operations(
            job,
            machine,
            seconds,
            family=family if floor else None,
            setup_s=seconds // 300 * 60 if floor else None,
            heads=1 + job % 2 if floor else None,
            notes={k: f"note {k} on the way" for k in range(0, len(job), rounds)} if notes else {},
        ),
        crews=(Crew("crew", 2 * machines),) if floor else (),
        families=tuple(f"fam {k}" for k in range(7)) if floor else (),
        changeovers={f"M{k + 1:02d}": Changeovers(300) for k in range(machines)} if floor else {},
        transport=Transport(240) if floor else Transport(),
        clock=SHIFT,
        shift_end_s=8 * HOUR,
    )
    return Plan(
        shop=shop,
        schedule=Schedule(np.arange(len(job)), begin + 300, begin + 300 + seconds),
        bounds=_bounds(shop),
        choice=Choice("plain rule", "it is only for drawing", {}),
    )
