"""The audit against a checker that plays plans through second by second, on generated halls and plans."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import (
    Changeovers,
    Closure,
    Crew,
    Machine,
    Operation,
    Orders,
    Shop,
    Transport,
    shop_of,
)
from shopfloor.model.stated import StatedPlan
from tests.audit.simple import legal
from tests.strategies import shops

CHANGEOVERS = (Changeovers(2), Changeovers(1, {("F0", "F1"): 2}))
TRANSPORT = (Transport(1), Transport(2, {("M0", "M1"): 3}))
LEVELS = ((), ((4, 9, 1),), ((0, 3, 3), (5, 6, 0)))
CLOSED = ((), (Closure(4, 6),), (Closure(1, 2), Closure(5, 8)))
BREAKS = ((), (Closure(3, 5),), (Closure(2, 4), Closure(6, 8)))
FEATURES = ("split", "closure", "crew", "changeover", "transport")


@st.composite
def full_shops(draw: st.DrawFn) -> Shop:
    """Every order on every machine, so that each row has neighbours."""
    orders, machines = draw(st.sampled_from([(2, 2), (3, 1), (3, 2)]))
    matrix = [[draw(st.integers(1, 3)) for _ in range(machines)] for _ in range(orders)]
    hall = shop_of(matrix)
    names = tuple(f"J{k}" for k in range(orders))
    return replace(
        hall,
        orders=Orders(names),
        machines=tuple(replace(machine, id=f"M{k}") for k, machine in enumerate(hall.machines)),
    )


@st.composite
def halls(draw: st.DrawFn) -> Shop:
    """Small shops with groups, releases and steps, or full ones, and some of what else a hall can have."""
    hall = draw(shops(max_orders=3, max_operations=5, groups=True, dues=False) | full_shops())
    has = draw(st.sets(st.sampled_from(FEATURES), max_size=2))
    machines = hall.machines
    # A plan does not tell operations alike from each other, so those take the same heads and set-up.
    pairs = list(zip(hall.operations.job.tolist(), hall.operations.machine.tolist(), strict=True))
    if "split" in has:
        cut = draw(st.lists(st.integers(0, 1), min_size=len(hall), max_size=len(hall)))
        hall = replace(hall, operations=replace(hall.operations, splittable=cut))
    if "closure" in has:
        hall = replace(hall, breaks=draw(st.sampled_from(BREAKS)))
        machines = tuple(
            replace(machine, pauses=draw(st.booleans()), closed=draw(st.sampled_from(CLOSED)))
            for machine in machines
        )
    if "crew" in has:
        heads = {pair: draw(st.integers(1, 2)) for pair in dict.fromkeys(pairs)}
        set_up = {pair: draw(st.integers(0, 1)) for pair in dict.fromkeys(pairs)}
        columns = replace(
            hall.operations, heads=[heads[pair] for pair in pairs], setup_s=[set_up[pair] for pair in pairs]
        )
        hall = replace(hall, crews=(Crew("Blue", 2, draw(st.sampled_from(LEVELS))),), operations=columns)
        machines = tuple(
            replace(
                machine,
                crew=draw(st.sampled_from(["Blue", "Blue", None])),
                set_up_only=draw(st.sampled_from([False, False, True])),
            )
            for machine in machines
        )
    if "changeover" in has:
        family = [draw(st.integers(-1, 1)) for _ in hall.orders.ids]
        hall = replace(
            hall,
            families=("F0", "F1"),
            changeovers={machine.id: draw(st.sampled_from(CHANGEOVERS)) for machine in machines},
            operations=replace(hall.operations, family=[family[job] for job, _ in pairs]),
        )
        machines = tuple(
            replace(machine, family=draw(st.sampled_from([None, "F0", "F1"]))) for machine in machines
        )
    if "transport" in has:
        hall = replace(hall, transport=draw(st.sampled_from(TRANSPORT)))
    return replace(hall, machines=machines)


HORIZON = 60


class Floor:
    """A hall being filled: every operation goes after what its order and its unit have done so far."""

    def __init__(self, hall: Shop) -> None:
        self.hall = hall
        self.order_free: dict[int, tuple[int, str]] = {}
        self.unit_free: dict[tuple[str, int], tuple[int, str | None]] = {}
        self.taken: Counter[int] = Counter()  # heads, by second
        self.worked: Counter[int] = Counter()  # seconds, by operation

    def shut(self, machine: Machine) -> set[int]:
        return {s for shut in (*self.hall.breaks, *machine.closed) for s in range(shut.start_s, shut.end_s)}

    def end(self, operation: Operation, unit: int, start: int, length: int) -> int | None:
        """When `length` seconds begun at `start` end on a unit; None when they cannot begin there then."""
        machine = self.hall.machines[operation.machine]
        shut = self.shut(machine)
        seconds: list[int] = []
        for second in range(start, HORIZON):
            if second not in shut:
                seconds.append(second)
            elif not seconds or not machine.pauses:
                return None
            if len(seconds) == length:
                break
        else:
            return None
        left, last = self.order_free.get(operation.job, (-9, machine.id))
        if start < left + self.hall.transport.seconds(last, machine.id):
            return None
        free, family = self.unit_free.get((machine.id, unit), (0, machine.family))
        gap = set(range(free, start)) - shut
        times = self.hall.changeovers.get(machine.id, Changeovers())
        change = times.seconds(family or "", operation.family)
        if start < free or (family is not None and len(gap) < change):
            return None
        for second in self.attended(operation, seconds):
            levels = [heads for a, b, heads in self.hall.crews[0].levels if a <= second < b]
            if self.taken[second] + operation.heads > (levels or [self.hall.crews[0].heads])[0]:
                return None
        return seconds[-1] + 1

    def attended(self, operation: Operation, seconds: list[int]) -> list[int]:
        machine = self.hall.machines[operation.machine]
        if machine.crew is None:
            return []
        left = max(0, operation.setup_s - self.worked[operation.index])
        return seconds[:left] if machine.set_up_only else seconds

    def put(self, operation: Operation, unit: int, start: int, end: int) -> None:
        machine = self.hall.machines[operation.machine]
        seconds = [second for second in range(start, end) if second not in self.shut(machine)]
        for second in self.attended(operation, seconds):
            self.taken[second] += operation.heads
        self.worked[operation.index] += len(seconds)
        self.order_free[operation.job] = (end, machine.id)
        self.unit_free[machine.id, unit] = (end, operation.family)


def placed(draw: st.DrawFn, hall: Shop) -> StatedPlan | None:
    """Place operation after operation, up the steps; None when one has nowhere to go within the horizon."""
    floor = Floor(hall)
    rank = draw(st.permutations(range(len(hall))))
    rows: list[tuple[int, int, int, int]] = []
    for index in sorted(range(len(hall)), key=lambda k: (hall.operations.step[k], rank[k])):
        operation = hall.operation(index)
        cut = operation.splittable and operation.seconds > 1 and draw(st.booleans())
        one = draw(st.integers(1, operation.seconds - 1)) if cut else operation.seconds
        for length in (one, operation.seconds - one) if cut else (one,):
            units = draw(st.permutations(range(1, hall.machines[operation.machine].count + 1)))
            first = int(hall.orders.release_s[operation.job]) + draw(st.integers(0, 2))
            spots = (
                (unit, start, end)
                for start in range(first, HORIZON)
                for unit in units
                if (end := floor.end(operation, unit, start, length)) is not None
            )
            spot = next(spots, None)
            if spot is None:
                return None
            floor.put(operation, *spot)
            unit, start, end = spot
            rows.append((index, start, end, unit))
    operation_of, start_s, end_s, unit_of = (list(column) for column in zip(*rows, strict=True))
    return _stated(hall, Schedule(operation_of, start_s, end_s, unit=unit_of))


def _stated(hall: Shop, schedule: Schedule) -> StatedPlan:
    of = schedule.operation
    return StatedPlan(
        row=np.arange(2, len(of) + 2),
        order=[hall.orders.ids[k] for k in hall.operations.job[of]],
        machine=[hall.machines[k].id for k in hall.operations.machine[of]],
        unit=schedule.unit,
        start_s=schedule.start_s,
        end_s=schedule.end_s,
        round=schedule.round,
        part=schedule.part,
        parts=schedule.parts,
    )


@st.composite
def legal_plans(draw: st.DrawFn) -> tuple[Shop, StatedPlan]:
    """A hall and a plan that keeps its rules."""
    hall = draw(halls())
    plan = placed(draw, hall)
    while plan is None:
        hall = draw(halls())
        plan = placed(draw, hall)
    return hall, plan


EDITS = (
    "move",
    "move",
    "swap",
    "stretch",
    "drop",
    "repeat",
    "machine",
    "order",
    "unit",
    "swap",
    "part",
    "cut",
)
COLUMNS = ("row", "unit", "start_s", "end_s", "round", "part", "parts")


def _mutate(draw: st.DrawFn, hall: Shop, plan: StatedPlan) -> StatedPlan:
    """Change one thing about one row."""
    row = draw(st.integers(0, len(plan) - 1))
    columns = {name: np.array(getattr(plan, name), copy=True) for name in COLUMNS}
    order, machine = np.array(plan.order, object), np.array(plan.machine, object)
    keep = list(range(len(plan)))
    what = draw(st.sampled_from(EDITS))
    if what == "move":
        shift = draw(st.integers(-3, 3))
        columns["start_s"][row] += shift
        columns["end_s"][row] += shift
    elif what == "stretch":
        columns["end_s"][row] += draw(st.integers(-2, 2))
    elif what == "machine":
        machine[row] = draw(st.sampled_from([*(m.id for m in hall.machines), "M9"]))
    elif what == "order":
        order[row] = draw(st.sampled_from([*hall.orders.ids, "J9"]))
    elif what == "unit":
        columns["unit"][row] = draw(st.integers(0, 3))
    elif what == "part":
        columns["part"][row] = draw(st.integers(1, 2))
        columns["parts"][row] = draw(st.integers(1, 2))
    elif what == "swap":
        other = draw(st.integers(0, len(plan) - 1))
        for name in ("start_s", "end_s"):
            columns[name][[row, other]] = columns[name][[other, row]]
    elif what == "drop":
        keep.remove(row)
    else:
        keep.append(row)
        columns = {name: column[keep] for name, column in columns.items()}
        if what == "cut":
            at = draw(st.integers(plan.start_s[row], plan.end_s[row]))
            columns["end_s"][row] = columns["start_s"][-1] = at
            columns["part"][-1] += 1
            columns["parts"][[row, -1]] += 1
        keep, order, machine = list(range(len(keep))), order[keep], machine[keep]
    return StatedPlan(
        order=order[keep].tolist(),
        machine=machine[keep].tolist(),
        **{name: column[keep] for name, column in columns.items()},
    )


@st.composite
def edited_plans(draw: st.DrawFn) -> tuple[Shop, StatedPlan]:
    """A hall and a legal plan of it after one or two edits."""
    hall, plan = draw(legal_plans())
    for _ in range(draw(st.integers(1, 2))):
        if len(plan):
            plan = _mutate(draw, hall, plan)
    return hall, plan


@settings(max_examples=300, deadline=None)
@given(legal_plans())
def test_a_legal_plan_is_clean(case: tuple[Shop, StatedPlan]) -> None:
    hall, plan = case
    assert legal(hall, plan)
    assert audit(hall, plan) == []


@settings(max_examples=600, deadline=None)
@given(edited_plans())
def test_an_edit_is_caught_unless_it_is_legal(case: tuple[Shop, StatedPlan]) -> None:
    hall, plan = case
    assert (audit(hall, plan) == []) == legal(hall, plan)


@settings(max_examples=200, deadline=None)
@given(edited_plans(), st.randoms(use_true_random=False))
def test_the_order_of_rows_does_not_matter(case: tuple[Shop, StatedPlan], random: object) -> None:
    """The same rules are broken, as often, whatever the order of the rows."""
    hall, plan = case
    order = list(range(len(plan)))
    random.shuffle(order)  # type: ignore[attr-defined]
    shuffled = StatedPlan(
        order=[plan.order[k] for k in order],
        machine=[plan.machine[k] for k in order],
        **{name: getattr(plan, name)[order] for name in COLUMNS},
    )
    assert (audit(hall, plan) == []) == (audit(hall, shuffled) == [])
