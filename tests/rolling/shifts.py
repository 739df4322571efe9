"""Made-up halls with every rule, shifts played on them with delays, and what goes wrong in them."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable
from datetime import datetime
from random import Random

import numpy as np

from shopfloor.journal.entries import Entry
from shopfloor.journal.errors import RefusedError
from shopfloor.journal.events import Journal, Recorder
from shopfloor.journal.pieces import issued_plan
from shopfloor.model.actuals import Kind, Status
from shopfloor.model.calendar import MINUTE, Clock
from shopfloor.model.results import Choice, Plan
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
from shopfloor.model.stated import state as stated
from shopfloor.openshop.floor.rules import NONE, Rules
from shopfloor.openshop.floor.timetable import serial
from shopfloor.openshop.units import assign_units
from shopfloor.render.tables import plan_json
from shopfloor.rolling.plan import Replan

CLOCK = Clock(datetime(2026, 3, 2, 6))
BY = Recorder(now_s=10**6)  # a clock that finds nothing in the future


def hall(seed: int) -> Shop:
    """A small hall in which any rule of the floor may hold; no order visits a machine twice."""
    random = Random(seed)
    size, count = random.randrange(3, 12), random.randrange(2, 6)
    names = [f"M{k}" for k in range(count)]
    visits = [
        (job, machine)
        for job in range(size)
        for machine in random.sample(range(count), random.randrange(1, count + 1))
    ]
    pick = random.choice

    def each(*values: int) -> list[int]:
        return [pick(values) for _ in visits]

    release = np.array([pick([0, 0, 0, 1800, 4000]) for _ in range(size)])
    due = np.array([pick([NO_DUE, random.randrange(4000, 20000)]) for _ in range(size)])
    return Shop(
        machines=tuple(_machine(name, random) for name in names),
        orders=Orders(
            tuple(f"J{k}" for k in range(size)),
            release_s=release,
            due_s=np.maximum(due, release),
            priority=np.array([pick([1.0, 2.0]) for _ in range(size)]),
        ),
        operations=Operations(
            np.array([job for job, _ in visits]),
            np.array([machine for _, machine in visits]),
            np.array([random.randrange(2, 9) * 300 for _ in visits]),
            step=np.array(each(-1, -1, 0, 1, 2)),
            splittable=np.array(each(0, 0, 0, 0, 0, 0, 0, 1)),
            heads=np.array(each(0, 1, 1, 2)),
            family=np.array(each(-1, 0, 1)),
            setup_s=np.array(each(0, 0, 300)),
        ),
        crews=(Crew("c", pick([2, 3, 4]), ((6000, 9600, 2),) if random.random() < 0.5 else ()),),
        breaks=(Closure(3600, 4500, "tea"), Closure(12000, 13800, "lunch")) if random.random() < 0.6 else (),
        families=("r", "b"),
        changeovers={
            name: Changeovers(pick([300, 600]), {("r", "b"): 300}) for name in names if random.random() < 0.4
        },
        transport=Transport(300, {("M0", "M1"): pick([300, 500])}) if random.random() < 0.5 else Transport(),
        clock=pick([CLOCK, Clock()]),
        shift_end_s=8 * 3600,
    )


def _machine(name: str, random: Random) -> Machine:
    at = random.randrange(30, 200) * MINUTE
    crew = random.choice(["c", None])
    return Machine(
        name,
        count=random.choice([1, 1, 2, 3]),
        pauses=random.random() < 0.5,
        crew=crew,
        set_up_only=crew is not None and random.random() < 0.4,
        closed=(Closure(at, at + 1200, "own"),) if random.random() < 0.3 else (),
        family=random.choice([None, "r", "b", "grey"]),
    )


def rounds_hall(seed: int, *, groups: bool = False, crew: int | None = None) -> Shop:
    """A hall of equal rounds, half an hour each, with and without groups and a crew."""
    random = Random(seed)
    size, count = random.randrange(6, 16), random.randrange(3, 6)
    visits = [
        (job, machine)
        for job in range(size)
        for machine in random.sample(range(count), random.randrange(1, count + 1))
    ]
    shop = Shop(
        machines=tuple(Machine(f"M{k}", count=random.choice([1, 2]) if groups else 1) for k in range(count)),
        orders=Orders(tuple(f"J{k}" for k in range(size))),
        operations=Operations(
            np.array([job for job, _ in visits]),
            np.array([machine for _, machine in visits]),
            np.full(len(visits), 1800),
        ),
        clock=CLOCK,
        unit_rounds=True,
    )
    return shop if crew is None else shop.with_crew(crew)


def listed_plan(shop: Shop, seed: int) -> Plan | None:
    """A legal plan from a list in random order; None where a crew is never large enough."""
    rules, random = Rules.of(shop), Random(seed)
    sequence = list(range(len(shop)))
    random.shuffle(sequence)
    sequence.sort(key=lambda k: rules.step[k])
    table = serial(rules, sequence)
    if table is None:
        return None
    spots = [spot for spot in table.spots if spot is not None]
    start, end = (
        np.array(column) for column in zip(*((spot.start, spot.end) for spot in spots), strict=True)
    )
    unit = np.array([spot.unit for spot in spots])
    unit = np.where(unit == NONE, assign_units(shop, start, end), unit + 1)
    return Plan(shop, Schedule(np.arange(len(shop)), start, end, unit=unit), (), Choice("list", "", {}))


# ---- the shift -----------------------------------------------------------------------------------------


def opened(made: Plan) -> Journal:
    """A journal in memory that begins with a plan."""
    text = plan_json(made)
    return Journal.in_memory(issued_plan(stated(made), json.loads(text), sha256=_sha(text)))


def issue(book: Journal, found: Replan, at_s: int) -> None:
    """Put a replan in force."""
    text = plan_json(found.plan)
    plan = issued_plan(stated(found.plan), json.loads(text), sha256=_sha(text), numbers=found.numbers)
    book.issue(plan, BY, at_s=at_s)


def _sha(text: str) -> str:
    return hashlib.sha256(text.encode()).hexdigest()


def put(book: Journal, entries: Iterable[Entry]) -> None:
    """Record what the journal takes; what cannot be is left out."""
    for entry in entries:
        try:
            book.record([entry], BY)
        except RefusedError:
            continue


def play(book: Journal, made: Plan, from_s: int, until_s: int, seed: int, wobble: float = 0.0) -> None:
    """Carry a plan out between two moments, each operation up to `wobble` longer or shorter than planned."""
    random, shop = Random(seed), made.shop
    running = {
        (piece.key.order, piece.key.machine, piece.start_s): piece
        for piece in book.state(from_s).pieces.values()
        if piece.runs and piece.runs[-1].end_s is None
    }
    events: list[tuple[int, int, Entry]] = []
    unit_free: dict[tuple[str, int], int] = {}
    order_free: dict[str, int] = {}
    for row in made.schedule:
        order = shop.orders.ids[int(shop.operations.job[row.operation])]
        name = shop.machines[int(shop.operations.machine[row.operation])].id
        place, never = (name, row.unit), 10**9
        begun = running.get((order, name, row.start_s))
        length = row.end_s - row.start_s
        if wobble:
            length = max(MINUTE, int(length * (1 + random.uniform(-wobble, wobble))) // MINUTE * MINUTE)
        start = max(row.start_s, unit_free.get(place, 0), order_free.get(order, 0), from_s)
        piece = 0
        if begun is not None:
            start, piece = row.start_s, begun.key.piece
        elif start >= until_s:
            unit_free[place] = order_free[order] = never
            continue
        else:
            events.append((start, 1, Entry(Kind.STARTED, start, order=order, machine=name, unit=row.unit)))
        end = max(from_s, start + length)
        unit_free[place] = order_free[order] = end
        if end <= until_s:
            done = Entry(Kind.FINISHED, end, order=order, machine=name, piece=piece, data={"good": 1})
            events.append((end, 0, done))
    put(book, (entry for _, _, entry in sorted(events, key=lambda event: event[:2])))


def disrupt(book: Journal, shop: Shop, at_s: int, seed: int) -> None:
    """Let things go wrong at a moment: stops, reports, scrap, outages, people, orders."""
    random = Random(seed)
    entries: list[Entry] = []
    for piece in book.state(at_s).of(Status.RUNNING):
        what = random.random()
        named = {"order": piece.key.order, "machine": piece.key.machine, "piece": piece.key.piece}
        if what < 0.2:
            entries.append(Entry(Kind.STOPPED, at_s, data={"reason": "no gauge"}, **named))
        elif what < 0.4:
            entries.append(Entry(Kind.LEFT, at_s, data={"left_s": random.randrange(3000)}, **named))
        elif what < 0.6:
            entries.append(Entry(Kind.FINISHED, at_s, data={"good": 0, "scrap": 3}, **named))
    for machine in shop.machines:
        for unit in range(machine.count + 1):
            if random.random() < 0.1:
                entries.append(Entry(Kind.DOWN, at_s, machine=machine.id, unit=unit, data={"reason": "seal"}))
            elif random.random() < 0.3:
                entries.append(Entry(Kind.UP, at_s, machine=machine.id, unit=unit))
    if random.random() < 0.3:
        entries.append(Entry(Kind.CREW, at_s, data={"heads": random.randrange(1, 5)}))
    if random.random() < 0.4:
        visits = [(machine.id, random.randrange(2, 6) * 300) for machine in shop.machines[:2]]
        hot = {"operations": visits, "due_s": at_s + random.randrange(1000, 9000), "priority": 4.0}
        entries.append(Entry(Kind.ADDED, at_s, order=f"HOT-{at_s}", data=hot))
    if random.random() < 0.3:
        entries.append(Entry(Kind.CANCELLED, at_s, order=random.choice(shop.orders.ids)))
    if random.random() < 0.3:
        entries.append(
            Entry(Kind.CHANGED, at_s, order=random.choice(shop.orders.ids), data={"due_s": at_s + 5000})
        )
    put(book, entries)
