"""From a plan to what its printed sheets show."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING

from shopfloor.model.calendar import duration, minutes_text
from shopfloor.model.schedule import NO_ROUND
from shopfloor.render.dispatch_view import (
    DispatchView,
    MachineList,
    Move,
    RoundRow,
    RoundSheet,
    Run,
    Stop,
    Strip,
)
from shopfloor.render.tables import plan_id, plan_json

if TYPE_CHECKING:
    from shopfloor.model.results import Plan
    from shopfloor.model.shop import Closure, Machine, Shop

STOPS_A_STRIP = 25  # five lines of five boxes: a strip of that length still stands whole on a page
NOTE_ON_STRIP = 120  # characters; the machine's own list has the whole note

# Millimetres, safe on A4 and on Letter: a round sheet without its first column, the least and greatest width
# of a column, its padding, and a letter of an order and of a machine as the style sheet sets them.
_SHEET_MM, _COLUMN_MM, _PADDING_MM = 152.0, (16.0, 50.0), 3.5
_ORDER_LETTER_MM, _MACHINE_LETTER_MM = 2.75, 2.3

_WEEKDAYS = ("Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun")


def dispatch_view(plan: Plan, *, stamp: str | None = None) -> DispatchView:
    """Return what the sheets of `plan` show; linear in the number of assignments."""
    routes = _routes(plan)
    lists = _machine_lists(plan, routes)
    busy = {sheet.machine for sheet in lists}
    return DispatchView(
        plan=plan_id(plan_json(plan)),
        shift=_shift(plan.shop),
        breaks=", ".join(_span(plan.shop, pause) for pause in plan.shop.breaks),
        finish=_finish(plan),
        stamp=stamp or "",
        machines=lists,
        idle=tuple(machine.id for machine in plan.shop.machines if machine.id not in busy),
        strips=_strips(plan, routes),
        round_sheets=_round_sheets(plan),
    )


# ---- sentences -----------------------------------------------------------------------------------


def _shift(shop: Shop) -> str:
    clock, end = shop.clock, shop.shift_end_s
    if clock.start is None:
        return "time counts from 0:00" + (f", shift ends {clock.say(end)}" if end is not None else "")
    day = f"{_WEEKDAYS[clock.start.weekday()]} {clock.start:%Y-%m-%d}"
    return f"{day}, " + (f"{clock.say(0)} to {clock.say(end)}" if end is not None else f"from {clock.say(0)}")


def _finish(plan: Plan) -> str:
    shop, say = plan.shop, plan.shop.clock.say
    if not len(plan.schedule):
        return "There is nothing to do."
    text = f"Everything ends {say(plan.makespan_s)}; nothing can end "
    if plan.proved_optimal:
        text += "earlier, and that is proved."
    else:
        text += f"before {say(plan.lower_bound_s)}, and the {duration(plan.gap_s)} between are not settled."
    if plan.fits_shift is False and shop.shift_end_s is not None:
        text += f" That is {duration(plan.makespan_s - shop.shift_end_s)} past the shift's end."
    return text


def _span(shop: Shop, closure: Closure) -> str:
    return f"{shop.clock.say(closure.start_s)} – {shop.clock.say(closure.end_s)}"


def _one_line(text: str) -> str:
    return " ".join(text.split())


def _cut(text: str, size: int) -> str:
    return text if len(text) <= size else text[: size - 1].rstrip() + "…"


# ---- rows ----------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Row:
    """One assignment, with the words for its times beside the numbers to sort by."""

    start: str
    end: str
    operation: int
    job: int
    machine: int
    unit: int
    start_s: int
    end_s: int
    part: int
    parts: int


def _routes(plan: Plan) -> list[list[_Row]]:
    """Return each order's assignments in the sequence in which they run."""
    shop, schedule = plan.shop, plan.schedule
    say = cache(shop.clock.say)
    routes: list[list[_Row]] = [[] for _ in shop.orders.ids]
    columns = (
        schedule.operation,
        shop.operations.job[schedule.operation],
        shop.operations.machine[schedule.operation],
        schedule.unit,
        schedule.start_s,
        schedule.end_s,
        schedule.part,
        schedule.parts,
    )
    for numbers in zip(*(column.tolist() for column in columns), strict=True):
        row = _Row(say(numbers[4]), say(numbers[5]), *numbers)
        routes[row.job].append(row)
    return routes


def _inside(shop: Shop, row: _Row) -> list[Closure]:
    """Return the breaks for which this run pauses."""
    if not shop.machines[row.machine].pauses:
        return []
    return [pause for pause in shop.breaks if row.start_s < pause.end_s and pause.start_s < row.end_s]


def _minutes(shop: Shop, row: _Row) -> str:
    pauses = _inside(shop, row)
    shut = sum(min(pause.end_s, row.end_s) - max(pause.start_s, row.start_s) for pause in pauses)
    return minutes_text(row.end_s - row.start_s - shut)


def _remarks(shop: Shop, row: _Row) -> tuple[str, ...]:
    remarks = [f"part {row.part} of {row.parts}"] if row.parts > 1 else []
    remarks += [f"break {_span(shop, pause)}" for pause in _inside(shop, row)]
    if shop.shift_end_s is not None and row.end_s > shop.shift_end_s:
        remarks.append("past shift end")
    return tuple(remarks)


def _machine_lists(plan: Plan, routes: Sequence[Sequence[_Row]]) -> tuple[MachineList, ...]:
    shop = plan.shop
    queues: list[list[tuple[_Row, _Row | None, _Row | None]]] = [[] for _ in shop.machines]
    for route in routes:
        for before, row, after in zip([None, *route], route, [*route[1:], None], strict=False):
            queues[row.machine].append((row, before, after))
    lists = []
    for machine, queue, work in zip(shop.machines, queues, shop.machine_load_s.tolist(), strict=True):
        if not queue:
            continue
        queue.sort(key=lambda entry: (entry[0].start_s, entry[0].unit, entry[0].operation))
        runs = tuple(
            Run(
                number=number,
                order=shop.orders.ids[row.job],
                unit=_unit(machine, row),
                start=row.start,
                end=row.end,
                minutes=_minutes(shop, row),
                remarks=_remarks(shop, row),
                note=_one_line(shop.operations.notes.get(row.operation, "")),
                before=Move(shop.machines[before.machine].id, before.end) if before else None,
                after=Move(shop.machines[after.machine].id, after.start) if after else None,
            )
            for number, (row, before, after) in enumerate(queue, 1)
        )
        ends = max((row for row, _, _ in queue), key=lambda row: row.end_s).end
        name = "" if machine.name == machine.id else machine.name
        lists.append(MachineList(machine.id, name, machine.count, duration(work), runs[0].start, ends, runs))
    return tuple(lists)


def _strips(plan: Plan, routes: Sequence[Sequence[_Row]]) -> tuple[Strip, ...]:
    shop, say = plan.shop, plan.shop.clock.say
    strips = []
    for job, route in enumerate(routes):
        if not route:
            continue
        order, finish_s = shop.orders[job], max(row.end_s for row in route)
        due = order.due_s
        stops = [
            Stop(
                number=number,
                machine=shop.machines[row.machine].id,
                unit=_unit(shop.machines[row.machine], row),
                start=row.start,
                end=row.end,
                minutes=_minutes(shop, row),
                remarks=_remarks(shop, row),
                note=_cut(_one_line(shop.operations.notes.get(row.operation, "")), NOTE_ON_STRIP),
            )
            for number, row in enumerate(route, 1)
        ]
        pieces = [stops[first : first + STOPS_A_STRIP] for first in range(0, len(stops), STOPS_A_STRIP)]
        strips += [
            Strip(
                order=order.id,
                strip=number,
                strips=len(pieces),
                release=say(order.release_s) if order.release_s else "",
                due="" if due is None else say(due),
                late=duration(finish_s - due) if due is not None and finish_s > due else "",
                finish=say(finish_s),
                stops=tuple(piece),
            )
            for number, piece in enumerate(pieces, 1)
        ]
    return tuple(strips)


def _unit(machine: Machine, row: _Row) -> int:
    return row.unit if machine.count > 1 else 0


def _round_sheets(plan: Plan) -> tuple[RoundSheet, ...]:
    """Return the grids of a plan in unit rounds; none for any other plan."""
    shop, schedule = plan.shop, plan.schedule
    if not len(schedule) or bool((schedule.round == NO_ROUND).any()):
        return ()
    say = cache(shop.clock.say)
    job = shop.operations.job[schedule.operation].tolist()
    machine = shop.operations.machine[schedule.operation].tolist()
    cells: dict[int, dict[tuple[int, int], str]] = {}
    times: dict[int, tuple[int, int]] = {}
    for rank, order, place, unit, start, end in zip(
        schedule.round.tolist(),
        job,
        machine,
        schedule.unit.tolist(),
        schedule.start_s.tolist(),
        schedule.end_s.tolist(),
        strict=True,
    ):
        cells.setdefault(rank, {})[place, unit] = shop.orders.ids[order]
        first, last = times.get(rank, (start, end))
        times[rank] = min(first, start), max(last, end)
    used = sorted({place for row in cells.values() for place in row})
    heads = {
        (place, unit): shop.machines[place].id + (f" unit {unit}" if shop.machines[place].count > 1 else "")
        for place, unit in used
    }
    blocks = _blocks(used, _column_mm(shop.orders.ids, heads.values()))
    return tuple(
        RoundSheet(
            sheet=number,
            sheets=len(blocks),
            machines=tuple(heads[column] for column in block),
            rows=tuple(
                RoundRow(
                    number=rank,
                    start=say(times[rank][0]),
                    end=say(times[rank][1]),
                    orders=tuple(cells[rank].get(column, "") for column in block),
                )
                for rank in sorted(cells)
            ),
        )
        for number, block in enumerate(blocks, 1)
    )


def _column_mm(orders: Iterable[str], machines: Iterable[str]) -> float:
    """Return the width that the longest order, and the longest word of a machine, ask for."""
    order = max((len(name) for name in orders), default=0)
    machine = max((len(word) for name in machines for word in re.split(r"[\s-]", name)), default=0)
    needed = max(order * _ORDER_LETTER_MM, machine * _MACHINE_LETTER_MM) + _PADDING_MM
    return min(max(needed, _COLUMN_MM[0]), _COLUMN_MM[1])


def _blocks(columns: Sequence[tuple[int, int]], width_mm: float) -> list[Sequence[tuple[int, int]]]:
    """Cut the columns into as few sheets as their width allows, evenly filled."""
    sheets = -(-len(columns) // int(_SHEET_MM // width_mm))
    size, larger = divmod(len(columns), sheets)
    blocks, first = [], 0
    for sheet in range(sheets):
        last = first + size + (sheet < larger)
        blocks.append(columns[first:last])
        first = last
    return blocks
