"""Small halls and plans written by hand, as a shift lead would read them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import datetime
from typing import Any

import numpy as np

from shopfloor.model.calendar import MINUTE, Clock
from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import NO_STEP, Changeovers, Closure, Crew, Machine, Operations, Orders, Shop
from shopfloor.model.stated import StatedPlan

SIX = Clock(datetime(2026, 3, 2, 6, 0))


@dataclass(frozen=True)
class Row:
    """One row of a plan; `start` and `end` are wall times."""

    order: str
    machine: str
    start: str
    end: str
    unit: int = 1
    round: int = NO_ROUND
    part: int = 1
    parts: int = 1


def stated(rows: list[Row], clock: Clock = SIX, **claims: Any) -> StatedPlan:
    """The plan of these rows; the first is row 2 of its file."""
    return StatedPlan(
        row=np.arange(2, len(rows) + 2),
        order=[row.order for row in rows],
        machine=[row.machine for row in rows],
        start_s=[clock.read(f"2026-03-02T{row.start}") for row in rows],
        end_s=[clock.read(f"2026-03-02T{row.end}") for row in rows],
        unit=[row.unit for row in rows],
        round=[row.round for row in rows],
        part=[row.part for row in rows],
        parts=[row.parts for row in rows],
        **claims,
    )


def shop(
    machines: dict[str, int],
    needs: list[tuple[Any, ...]],
    *,
    release: dict[str, str] | None = None,
    end: str | None = None,
    breaks: tuple[Closure, ...] = (),
    pausing: tuple[str, ...] = (),
    crew: dict[str, int] | None = None,
) -> Shop:
    """A hall from six o'clock: machines with their units; needs as order, machine, minutes[, step[, cut]]."""
    orders = list(dict.fromkeys(need[0] for need in needs))
    names = list(machines)
    full = [(*need, *(None, False)[len(need) - 3 :]) for need in needs]
    return Shop(
        machines=tuple(
            Machine(name, count=count, pauses=name in pausing, crew=next(iter(crew or {}), None))
            for name, count in machines.items()
        ),
        crews=tuple(Crew(name, heads) for name, heads in (crew or {}).items()),
        breaks=breaks,
        orders=Orders(
            tuple(orders), release_s=[SIX.read((release or {}).get(order, "06:00")) for order in orders]
        ),
        operations=Operations(
            [orders.index(need[0]) for need in full],
            [names.index(need[1]) for need in full],
            [need[2] * MINUTE for need in full],
            step=[NO_STEP if need[3] is None else need[3] for need in full],
            splittable=[int(need[4]) for need in full],
        ),
        clock=SIX,
        shift_end_s=None if end is None else SIX.read(end),
    )


def changed(rows: list[Row], number: int, **changes: Any) -> list[Row]:
    """The rows with row `number` of the file changed."""
    return [replace(row, **changes) if place == number else row for place, row in enumerate(rows, 2)]


HALL = shop(
    {"Wash": 1, "CMM": 1, "Test": 2},
    [
        ("TQ-101", "Wash", 30),
        ("TQ-101", "CMM", 60),
        ("TQ-102", "Wash", 30),
        ("TQ-102", "Test", 60),
        ("TQ-103", "Test", 60),
    ],
    release={"TQ-102": "06:30"},
    end="14:00",
)
PLAN = [
    Row("TQ-101", "Wash", "06:00", "06:30"),
    Row("TQ-101", "CMM", "06:30", "07:30"),
    Row("TQ-102", "Wash", "06:30", "07:00"),
    Row("TQ-102", "Test", "07:00", "08:00"),
    Row("TQ-103", "Test", "06:00", "07:00", unit=2),
]

# Three orders in three rounds of half an hour.
ROUNDS = shop({"Wash": 1, "CMM": 1, "Test": 2}, [
    ("TQ-101", "Wash", 30), ("TQ-101", "CMM", 30), ("TQ-102", "Wash", 30), ("TQ-102", "Test", 30),
    ("TQ-103", "Test", 30), ("TQ-103", "CMM", 30),
])  # fmt: skip
IN_ROUNDS = [
    Row("TQ-101", "Wash", "06:00", "06:30", round=1),
    Row("TQ-102", "Test", "06:00", "06:30", round=1),
    Row("TQ-103", "Test", "06:00", "06:30", round=1, unit=2),
    Row("TQ-102", "Wash", "06:30", "07:00", round=2),
    Row("TQ-101", "CMM", "06:30", "07:00", round=2),
    Row("TQ-103", "CMM", "07:00", "07:30", round=3),
]

# An order that may be cut on Wash, where it comes twice, and has a route.
CUT = shop(
    {"Wash": 1, "CMM": 1}, [("TQ-101", "Wash", 60, None, True), ("TQ-102", "Wash", 20), ("TQ-102", "CMM", 30)]
)
IN_PARTS = [
    Row("TQ-101", "Wash", "06:00", "06:40", part=1, parts=2),
    Row("TQ-102", "Wash", "06:40", "07:00"),
    Row("TQ-101", "Wash", "07:00", "07:20", part=2, parts=2),
    Row("TQ-102", "CMM", "07:00", "07:30"),
]

ROUTE = shop({"Wash": 1, "CMM": 1, "Test": 1}, [
    ("TQ-101", "Wash", 30, 1), ("TQ-101", "CMM", 60, 2), ("TQ-101", "Test", 30), ("TQ-102", "Wash", 30, 5),
])  # fmt: skip
ON_ROUTE = [
    Row("TQ-101", "Wash", "06:00", "06:30"),
    Row("TQ-102", "Wash", "06:30", "07:00"),
    Row("TQ-101", "Test", "06:30", "07:00"),
    Row("TQ-101", "CMM", "07:00", "08:00"),
]

# A tea break at half past six; the oven goes on after it, the press does not.
TEA = shop(
    {"Press": 1, "Oven": 1},
    [("TQ-101", "Press", 30), ("TQ-101", "Oven", 30), ("TQ-102", "Oven", 30)],
    breaks=(Closure(1800, 2700, "tea"),),
    pausing=("Oven",),
)
AROUND_TEA = [
    Row("TQ-101", "Press", "06:00", "06:30"),
    Row("TQ-102", "Oven", "06:10", "06:55"),
    Row("TQ-101", "Oven", "06:55", "07:25"),
]

# Three machines that one crew of two attends.
CREW = shop(
    {"Wash": 1, "CMM": 1, "Test": 1},
    [("TQ-101", "Wash", 30), ("TQ-102", "CMM", 30), ("TQ-103", "Test", 30)],
    crew={"Blue": 2},
)
BY_CREW = [
    Row("TQ-101", "Wash", "06:00", "06:30"),
    Row("TQ-102", "CMM", "06:10", "06:40"),
    Row("TQ-103", "Test", "06:30", "07:00"),
]

# A paint booth for two colours, shut for ten minutes in the first change.
BOOTH = shop({"Booth": 1}, [("TQ-101", "Booth", 30), ("TQ-102", "Booth", 30), ("TQ-103", "Booth", 30)])
PAINT = replace(
    BOOTH,
    families=("grey", "white"),
    changeovers={"Booth": Changeovers(1200)},
    machines=(replace(BOOTH.machines[0], closed=(Closure(2100, 2700, "filter"),)),),
    operations=replace(BOOTH.operations, family=[0, 1, 0]),
)
PAINTED = [
    Row("TQ-101", "Booth", "06:00", "06:30"),
    Row("TQ-102", "Booth", "07:00", "07:30"),
    Row("TQ-103", "Booth", "07:50", "08:20"),
]
