"""The audit against a checker that plays plans through second by second, on generated halls and plans."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from hypothesis import given, note, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_STEP, Closure, Crew, Shop
from shopfloor.model.stated import StatedPlan
from tests.audit.simple import legal
from tests.strategies import shops


@st.composite
def halls(draw: st.DrawFn) -> Shop:
    """Small shops with groups, releases, steps, splits, and now and then a break or a crew."""
    hall = draw(shops(max_orders=3, max_operations=5, groups=True, dues=False))
    size = len(hall)
    cut = draw(st.lists(st.sampled_from([0, 0, 1]), min_size=size, max_size=size))
    # A plan does not tell operations alike from each other, so those take the same heads.
    pairs = list(zip(hall.operations.job.tolist(), hall.operations.machine.tolist(), strict=True))
    heads_of = {pair: draw(st.integers(0, 2)) for pair in dict.fromkeys(pairs)}
    heads = [heads_of[pair] for pair in pairs]
    crews = draw(st.sampled_from([(), (), (Crew("Blue", 2),)]))
    starts = draw(st.sampled_from([(), (), (3,), (2, 6)]))
    machines = tuple(
        replace(machine, pauses=draw(st.booleans()), crew="Blue" if crews and draw(st.booleans()) else None)
        for machine in hall.machines
    )
    return replace(
        hall,
        machines=machines,
        crews=crews,
        breaks=tuple(Closure(start, start + 2) for start in starts),
        operations=replace(hall.operations, splittable=cut, heads=heads),
    )


def placed(draw: st.DrawFn, hall: Shop) -> StatedPlan | None:
    """Place operation after operation, each second by second where its order and a unit are free.

    None when the steps, breaks and crew leave one nowhere to go within the horizon.
    """
    horizon = 60
    rank = draw(st.permutations(range(len(hall))))
    first = sorted(range(len(hall)), key=lambda k: (hall.operations.step[k], rank[k]))
    busy: set[tuple[str, int, int, int]] = set()
    crew_taken = np.zeros(horizon, int)
    closed = {s for pause in hall.breaks for s in range(pause.start_s, pause.end_s)}
    ends: dict[int, int] = {}
    rows: list[tuple[int, int, int, int]] = []
    for index in first:
        operation = hall.operation(index)
        machine = hall.machines[operation.machine]
        ready = int(hall.orders.release_s[operation.job])
        if operation.step is not None:
            below = [ends[k] for k in ends if hall.operations.job[k] == operation.job
                     and NO_STEP < hall.operations.step[k] < operation.step]  # fmt: skip
            ready = max([ready, *below])
        cut = operation.splittable and operation.seconds > 1 and draw(st.booleans())
        one = draw(st.integers(1, operation.seconds - 1)) if cut else operation.seconds
        for length in (one, operation.seconds - one) if cut else (one,):
            for start in range(ready + draw(st.integers(0, 2)), horizon):
                seconds: list[int] = []
                at = start
                while len(seconds) < length and at < horizon:
                    if at in closed and machine.pauses and seconds:
                        at += 1
                        continue
                    if at in closed:
                        break
                    seconds.append(at)
                    at += 1
                span = range(start, at)
                units = [
                    unit
                    for unit in range(1, machine.count + 1)
                    if not any(("machine", operation.machine, unit, s) in busy for s in span)
                ]
                fits = len(seconds) == length and units
                fits = fits and not any(("order", operation.job, 0, s) in busy for s in span)
                if machine.crew and fits:
                    fits = bool((crew_taken[start:at] + operation.heads <= 2).all())
                if fits:
                    unit = draw(st.sampled_from(units))
                    busy |= {("machine", operation.machine, unit, s) for s in span}
                    busy |= {("order", operation.job, 0, s) for s in span}
                    if machine.crew:
                        crew_taken[start:at] += operation.heads
                    rows.append((index, start, at, unit))
                    ready = ends[index] = at
                    break
            else:
                return None
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


def _mutate(draw: st.DrawFn, hall: Shop, plan: StatedPlan) -> StatedPlan:
    """Change one thing about one row."""
    row = draw(st.integers(0, len(plan) - 1))
    columns = {
        name: np.array(getattr(plan, name), copy=True)
        for name in ("row", "unit", "start_s", "end_s", "round", "part", "parts")
    }
    order, machine = list(plan.order), list(plan.machine)
    what = draw(
        st.sampled_from(["move", "stretch", "drop", "repeat", "machine", "order", "unit", "swap", "part"])
    )
    note(f"{what} row {row}")
    if what == "move":
        shift = draw(st.integers(-4, 4))
        columns["start_s"][row] += shift
        columns["end_s"][row] += shift
    elif what == "stretch":
        columns["end_s"][row] += draw(st.integers(-2, 2))
    elif what == "machine":
        machine[row] = draw(st.sampled_from([m.id for m in hall.machines]))
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
    else:
        keep = [k for k in range(len(plan)) if not (what == "drop" and k == row)]
        keep += [row] if what == "repeat" else []
        columns = {name: column[keep] for name, column in columns.items()}
        order, machine = [order[k] for k in keep], [machine[k] for k in keep]
    return StatedPlan(order=order, machine=machine, **columns)


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
        **{
            name: getattr(plan, name)[order]
            for name in ("row", "unit", "start_s", "end_s", "round", "part", "parts")
        },
    )
    assert (audit(hall, plan) == []) == (audit(hall, shuffled) == [])
