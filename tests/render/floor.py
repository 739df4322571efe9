"""A plan that meets every rule of the floor, scheduled by a plain rule that the tests can vouch for.

The greedy looks minute by minute for the first moment at which an operation breaks no rule. It is slow and
short; `test_runs.py` holds its plans against the audit.
"""

from __future__ import annotations

import random
from dataclasses import replace
from functools import cache

import numpy as np

from shopfloor.model.calendar import HOUR, MINUTE, duration
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import (
    NO_DUE,
    NO_FAMILY,
    Changeovers,
    Closure,
    Crew,
    Machine,
    Operations,
    Orders,
    Shop,
    Transport,
)
from tests.render.plans import SHIFT

FAMILIES = ("grey primer", "signal red", "black")
MACHINES = (
    Machine("WASH", "Washing bay", pauses=True),
    Machine("BLAST", "Shot blast"),
    Machine("CMM", "Measuring machine", pauses=True, closed=(Closure(70 * 60, 120 * 60, "calibration"),)),
    Machine("PRESS", "Pressure test rig", count=2, crew="fitters", set_up_only=True),
    Machine("BALANCE", "Balancing", pauses=True, crew="fitters"),
    Machine("COAT", "Coating booth", family="grey primer", crew="painters"),
    Machine("ENGRAVE", "Engraving", closed=(Closure(300 * 60, 10 * HOUR, "not open"),)),
)
MINUTES = {"WASH": (15, 25), "BLAST": (20, 35), "CMM": (15, 40), "PRESS": (35, 60), "BALANCE": (20, 45),
           "COAT": (20, 40), "ENGRAVE": (10, 20)}  # fmt: skip
SET_UP = {"CMM": 5, "PRESS": 10, "COAT": 5}


def floor_shop(orders: int = 12, *, seed: int = 3) -> Shop:
    """The hall: breaks, closures, changeovers, a group, two crews, transport, an operation in parts."""
    draw = random.Random(seed)
    job, machine, seconds, set_up, family, heads, notes = [], [], [], [], [], [], {}
    for order in range(orders):
        colour = order % 4 % 3
        for place in sorted(draw.sample(range(len(MACHINES)), 4)):
            name = MACHINES[place].id
            low, high = MINUTES[name]
            job.append(order)
            machine.append(place)
            set_up.append(SET_UP.get(name, 0) * MINUTE)
            seconds.append(draw.randrange(low, high + 1, 5) * MINUTE + set_up[-1])
            family.append(colour if name == "COAT" else NO_FAMILY)
            heads.append(2 if name == "BALANCE" else 1)
    notes = {0: "seal kit on cart 4", 9: "handle with gloves"}
    splittable = np.zeros(len(job), np.int64)
    splittable[[place for place, where in enumerate(machine) if MACHINES[where].id == "BLAST"][:2]] = 1
    return Shop(
        machines=MACHINES,
        orders=Orders(
            tuple(f"TQ-{101 + order}" for order in range(orders)),
            release_s=np.array([0 if order < orders - 2 else HOUR for order in range(orders)]),
        ),
        operations=Operations(
            job, machine, seconds, setup_s=set_up, family=family, heads=heads, notes=notes,
            splittable=splittable,
        ),
        crews=(Crew("fitters", 3, ((360 * 60, 480 * 60, 2),)), Crew("painters", 1)),
        breaks=(Closure(180 * 60, 195 * 60, "tea"), Closure(345 * 60, 375 * 60, "lunch")),
        families=FAMILIES,
        changeovers={
            "COAT": Changeovers(15 * MINUTE, {("grey primer", "signal red"): 10 * MINUTE,
                                              ("black", "grey primer"): 25 * MINUTE})
        },
        transport=Transport(5 * MINUTE, {("WASH", "CMM"): 10 * MINUTE, ("CMM", "WASH"): 10 * MINUTE}),
        clock=SHIFT,
        shift_end_s=8 * HOUR,
    )  # fmt: skip


@cache
def floor_plan(orders: int = 12, *, seed: int = 3, due: bool = True) -> Plan:
    """The hall's plan, with a bound on its crew's work or its busiest machine, whichever is higher."""
    shop = floor_shop(orders, seed=seed)
    schedule = Greedy(shop).schedule()
    if due:
        finish = schedule.completion_s(shop.operations.job, orders)
        spare = np.array([(-20, 40, 90, None)[order % 4] or NO_DUE for order in range(orders)])
        dues = np.where(
            spare == NO_DUE, NO_DUE, finish // 900 * 900 + np.where(spare == NO_DUE, 0, spare) * 60
        )
        shop = replace(shop, orders=replace(shop.orders, due_s=dues))
    return Plan(
        shop=shop,
        schedule=schedule,
        bounds=(machine_bound(shop, "COAT"), machine_bound(shop, "BALANCE")),
        choice=Choice("plain rule", "it is only for drawing", {"unit rounds": "times differ"}),
        inputs=(("orders.csv", "0" * 64), ("shop.toml", "1" * 64)),
        options={"seed": seed},
        remarks=("Drawn for a test.",),
        would_help=("A second COAT would let everything end earlier.",),
    )


def machine_bound(shop: Shop, name: str) -> Bound:
    """A machine's load and breaks; not the best that could be said."""
    machine = next(place for place, machine in enumerate(shop.machines) if machine.id == name)
    load = int(shop.machine_load_s[machine])
    value = shop.machine_clocks[machine].finish(0, load)
    text = f"{name} has {duration(load)} of work, so nothing can end before {shop.clock.say(value)}."
    return Bound("machine", value, {"machine": name, "load_s": load}, text)


def crew_bound(shop: Shop, crew: str, value: int) -> Bound:
    """A bound on a crew, for pages to mark."""
    return Bound("crew", value, {"crew": crew}, f"Crew {crew} is short of heads.")


class Greedy:
    """Operations in turn, each at the first minute that breaks no rule."""

    def __init__(self, shop: Shop) -> None:
        self.shop = shop
        self.rows: list[tuple[int, int, int, int]] = []  # operation, start, end, unit
        self.heads = {crew.id: np.zeros(24 * 60, np.int64) for crew in shop.crews}

    def schedule(self) -> Schedule:
        shop = self.shop
        turn = sorted(range(len(shop)), key=lambda i: (i % 4, shop.operations.job[i] * 5 % 7, i))
        for index in turn:
            operation = shop.operation(index)
            pieces = [operation.seconds]
            if operation.splittable:
                pieces = [operation.seconds // 120 * 60, operation.seconds - operation.seconds // 120 * 60]
            for number, seconds in enumerate(pieces):
                self.place(operation, seconds, operation.setup_s if not number else 0)
        operation, start, end, unit = zip(*self.rows, strict=True)
        return Schedule(np.array(operation), np.array(start), np.array(end), np.array(unit))

    def place(self, operation, seconds: int, set_up: int) -> None:
        machine = self.shop.machines[operation.machine]
        for start in range(0, 24 * HOUR, MINUTE):
            end = self.end(operation, start, seconds)
            if end is None or not self.order_free(operation, start, end):
                continue
            unit = next(
                (u for u in range(1, machine.count + 1) if self.unit_free(operation, u, start, end)), 0
            )
            wanted = self.wanted(operation, start, end, set_up)
            if unit and self.crew_free(operation, wanted):
                if machine.crew:
                    self.heads[machine.crew][wanted] += operation.heads
                self.rows.append((operation.index, start, end, unit))
                return
        raise AssertionError(f"no place for {operation}")

    def end(self, operation, start: int, seconds: int) -> int | None:
        """When it ends, or None where it must not start."""
        clock = self.shop.machine_clocks[operation.machine]
        end = clock.finish(start, seconds)
        if clock.start(clock.worked(start)) != start:
            return None
        if not self.shop.machines[operation.machine].pauses and end != start + seconds:
            return None
        return end

    def order_free(self, operation, start: int, end: int) -> bool:
        shop, ids = self.shop, [machine.id for machine in self.shop.machines]
        if start < shop.orders.release_s[operation.job]:
            return False
        for other, begin, done, _ in self.rows:
            if shop.operations.job[other] != operation.job:
                continue
            there = ids[shop.operations.machine[other]]
            away = shop.transport.seconds(there, operation.machine_id)
            back = shop.transport.seconds(operation.machine_id, there)
            if start < done + away and begin < end + back:
                return False
        return True

    def unit_free(self, operation, unit: int, start: int, end: int) -> bool:
        shop, machine = self.shop, self.shop.machines[operation.machine]
        clock, rule = shop.machine_clocks[operation.machine], shop.changeovers.get(machine.id, Changeovers())
        mine = sorted(
            (begin, done, shop.operation(other).family)
            for other, begin, done, where in self.rows
            if shop.operations.machine[other] == operation.machine and where == unit
        )
        before = [row for row in mine if row[0] < start]
        after = [row for row in mine if row[0] >= start]
        old = before[-1][1:] if before else (0, machine.family)
        if start < old[0] or (after and end > after[0][0]):
            return False
        change = rule.seconds(old[1], operation.family) if old[1] is not None else 0
        if clock.worked(start) - clock.worked(old[0]) < change:
            return False
        later = rule.seconds(operation.family, after[0][2]) if after else 0
        return not after or clock.worked(after[0][0]) - clock.worked(end) >= later

    def wanted(self, operation, start: int, end: int, set_up: int) -> list[int]:
        """The minutes in which it takes heads."""
        machine, clock = self.shop.machines[operation.machine], self.shop.machine_clocks[operation.machine]
        worked = [m for m in range(start, end, MINUTE) if clock.worked(m + MINUTE) > clock.worked(m)]
        return [m // MINUTE for m in (worked[: set_up // MINUTE] if machine.set_up_only else worked)]

    def crew_free(self, operation, wanted: list[int]) -> bool:
        crew = next((c for c in self.shop.crews if c.id == self.shop.machines[operation.machine].crew), None)
        if crew is None:
            return True
        there = np.full(24 * 60, crew.heads)
        for start, end, heads in crew.levels:
            there[start // MINUTE : end // MINUTE] = heads
        return bool((self.heads[crew.id][wanted] + operation.heads <= there[wanted]).all())
