"""From a plan to what its printed sheets show."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING

import numpy as np

from shopfloor.model.calendar import duration, minutes_text
from shopfloor.render.dispatch_rounds import round_sheets
from shopfloor.render.dispatch_view import (
    Aside,
    DispatchView,
    MachineList,
    Move,
    Run,
    Stop,
    Strip,
)
from shopfloor.render.runs import Runs
from shopfloor.render.shut import closures_of
from shopfloor.render.tables import plan_id, plan_json

if TYPE_CHECKING:
    from shopfloor.model.results import Plan
    from shopfloor.model.shop import Closure, Machine, Shop

STOPS_A_STRIP = 25  # five lines of five boxes: a strip of that length still stands whole on a page
NOTE_ON_STRIP = 120  # characters; the machine's own list has the whole note

_WEEKDAYS = ("Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun")


def dispatch_view(plan: Plan, *, stamp: str | None = None) -> DispatchView:
    """Return what the sheets of `plan` show; linear in the number of assignments."""
    runs = Runs(plan)
    routes = _routes(plan, runs)
    lists = _machine_lists(plan, runs, routes)
    busy = {sheet.machine for sheet in lists}
    return DispatchView(
        plan=plan_id(plan_json(plan)),
        shift=_shift(plan.shop),
        breaks=", ".join(_span(plan.shop, pause) for pause in plan.shop.breaks),
        finish=_finish(plan),
        stamp=stamp or "",
        machines=lists,
        idle=tuple(machine.id for machine in plan.shop.machines if machine.id not in busy),
        strips=_strips(plan, runs, routes),
        round_sheets=round_sheets(plan),
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
    """One assignment, with the words for its times beside the numbers to sort by.

    `change` is its place in the plan's changeovers, -1 for none.
    """

    start: str
    end: str
    run: int
    operation: int
    job: int
    machine: int
    unit: int
    start_s: int
    end_s: int
    part: int
    parts: int
    worked_s: int
    set_up_s: int
    family: int
    heads: int
    way_s: int
    change: int


def _routes(plan: Plan, runs: Runs) -> list[list[_Row]]:
    """Return each order's assignments in the sequence in which they run."""
    shop, schedule = plan.shop, plan.schedule
    say = cache(shop.clock.say)
    change = np.full(len(schedule), -1)
    change[runs.changes.run] = np.arange(len(runs.changes))
    routes: list[list[_Row]] = [[] for _ in shop.orders.ids]
    columns = (
        np.arange(len(schedule)),
        schedule.operation,
        runs.job,
        runs.machine,
        schedule.unit,
        schedule.start_s,
        schedule.end_s,
        schedule.part,
        schedule.parts,
        runs.worked_s,
        runs.set_up_s,
        runs.family,
        runs.heads,
        runs.way_s,
        change,
    )
    for numbers in zip(*(column.tolist() for column in columns), strict=True):
        row = _Row(say(numbers[5]), say(numbers[6]), *numbers)
        routes[row.job].append(row)
    return routes


class _Writer:
    """Rows to words, for one plan."""

    def __init__(self, plan: Plan, runs: Runs) -> None:
        self.shop, self.runs = plan.shop, runs
        self.say = cache(plan.shop.clock.say)
        self.shuts = [closures_of(plan.shop, machine) for machine in plan.shop.machines]
        self.changing = frozenset(runs.changing)

    def note(self, row: _Row) -> str:
        return _one_line(self.shop.operations.notes.get(row.operation, ""))

    def inside(self, row: _Row) -> list[Closure]:
        """Return the closures for which a run pauses."""
        if row.worked_s == row.end_s - row.start_s:
            return []
        shuts = self.shuts[row.machine]
        return [shut for shut in shuts if row.start_s < shut.end_s and shut.start_s < row.end_s]

    def remarks(self, row: _Row) -> list[str]:
        remarks = [f"part {row.part} of {row.parts}"] if row.parts > 1 else []
        remarks += [
            f"pauses {self.say(shut.start_s)} – {self.say(shut.end_s)}: {_one_line(shut.reason)}"
            for shut in self.inside(row)
        ]
        end = self.shop.shift_end_s
        return [*remarks, "past shift end"] if end is not None and row.end_s > end else remarks

    def family(self, row: _Row) -> str:
        """The family where a changeover may hang on it, else nothing."""
        return _family(self.runs.families[row.family]) if row.machine in self.changing else ""

    def changeover(self, row: _Row) -> Aside:
        """Return the changeover before a run that has one."""
        changes, families = self.runs.changes, self.runs.families
        before = _family(families[int(changes.before[row.change])])
        return Aside(
            what=f"changeover from {before} to {_family(families[row.family])}",
            unit=_unit(self.shop.machines[row.machine], row),
            start=self.say(int(changes.start_s[row.change])),
            end=self.say(int(changes.end_s[row.change])),
            minutes=minutes_text(int(changes.seconds[row.change])),
            changeover=True,
        )

    def closed(self, shut: Closure) -> Aside:
        return Aside(
            what=_one_line(shut.reason),
            unit=0,
            start=self.say(shut.start_s),
            end=self.say(shut.end_s),
            minutes=minutes_text(shut.end_s - shut.start_s),
            changeover=False,
        )

    def move(self, row: _Row, time: str, way_s: int) -> Move:
        way = duration(way_s) if way_s else ""
        return Move(self.shop.machines[row.machine].id, time, way)


def _family(name: str) -> str:
    return _one_line(name) or "no family"


# ---- machine lists -------------------------------------------------------------------------------


def _machine_lists(plan: Plan, runs: Runs, routes: Sequence[Sequence[_Row]]) -> tuple[MachineList, ...]:
    shop, writer = plan.shop, _Writer(plan, runs)
    queues: list[list[_Visit]] = [[] for _ in shop.machines]
    for route in routes:
        for before, row, after in zip([None, *route], route, [*route[1:], None], strict=False):
            queues[row.machine].append(_Visit(row, before, after))
    changes = np.bincount(runs.machine, weights=runs.change_s, minlength=len(shop.machines))
    lists = []
    for place, queue in enumerate(queues):
        if not queue:
            continue
        queue.sort(key=lambda visit: (visit.row.start_s, visit.row.unit, visit.row.operation))
        machine = shop.machines[place]
        rows = [visit.row for visit in queue]
        alike = len({row.heads for row in rows}) == 1
        lists.append(
            MachineList(
                machine=machine.id,
                name="" if machine.name == machine.id else machine.name,
                units=machine.count,
                work=duration(int(shop.machine_load_s[place])),
                changes=duration(int(changes[place])) if changes[place] else "",
                crew=_crew(machine, rows[0].heads if alike else None),
                first=rows[0].start,
                last=max(rows, key=lambda row: row.end_s).end,
                runs=_runs(writer, queue, alike),
            )
        )
    return tuple(lists)


@dataclass(frozen=True, slots=True)
class _Visit:
    """A row with the rows before and after it in its order."""

    row: _Row
    before: _Row | None
    after: _Row | None


def _crew(machine: Machine, heads: int | None) -> str:
    """Say who attends a machine; `heads` where every run takes so many."""
    if machine.crew is None:
        return ""
    each = "" if heads is None else f", {heads} head{'s' if heads != 1 else ''}"
    return f"crew {_one_line(machine.crew)}{each}{' for the set-up only' if machine.set_up_only else ''}"


def _runs(writer: _Writer, queue: Sequence[_Visit], alike: bool) -> tuple[Run, ...]:
    """Return the lines of a list, each with the closures and the changeover before it in sequence.

    A closure inside a run of a machine of one unit is told by that run and nowhere else.
    """
    first = queue[0].row
    machine = writer.shop.machines[first.machine]
    shuts = list(writer.shuts[first.machine])
    if machine.count == 1:
        told = {shut.start_s for visit in queue for shut in writer.inside(visit.row)}
        shuts = [shut for shut in shuts if shut.start_s not in told]
    lines = []
    for number, visit in enumerate(queue, 1):
        row, before, after = visit.row, visit.before, visit.after
        asides: list[tuple[int, Aside]] = []
        while shuts and shuts[0].start_s <= row.start_s:
            asides.append((shuts[0].start_s, writer.closed(shuts.pop(0))))
        if row.change >= 0:
            asides.append((int(writer.runs.changes.start_s[row.change]), writer.changeover(row)))
        lines.append(
            Run(
                number=number,
                order=writer.shop.orders.ids[row.job],
                unit=_unit(machine, row),
                start=row.start,
                end=row.end,
                minutes=minutes_text(row.worked_s),
                set_up=minutes_text(row.set_up_s) if row.set_up_s else "",
                family=writer.family(row),
                heads="" if alike else str(row.heads),
                remarks=tuple(writer.remarks(row)),
                note=writer.note(row),
                before=writer.move(before, before.end, 0) if before else None,
                after=writer.move(after, after.start, row.way_s) if after else None,
                asides=tuple(aside for _, aside in sorted(asides, key=lambda pair: pair[0])),
            )
        )
    return tuple(lines)


# ---- travellers ----------------------------------------------------------------------------------


def _strips(plan: Plan, runs: Runs, routes: Sequence[Sequence[_Row]]) -> tuple[Strip, ...]:
    shop, writer = plan.shop, _Writer(plan, runs)
    strips = []
    for job, route in enumerate(routes):
        if not route:
            continue
        order, finish_s = shop.orders[job], max(row.end_s for row in route)
        due = order.due_s
        stops = [_stop(writer, number, row) for number, row in enumerate(route, 1)]
        pieces = [stops[first : first + STOPS_A_STRIP] for first in range(0, len(stops), STOPS_A_STRIP)]
        strips += [
            Strip(
                order=order.id,
                strip=number,
                strips=len(pieces),
                release=writer.say(order.release_s) if order.release_s else "",
                due="" if due is None else writer.say(due),
                late=duration(finish_s - due) if due is not None and finish_s > due else "",
                finish=writer.say(finish_s),
                stops=tuple(piece),
            )
            for number, piece in enumerate(pieces, 1)
        ]
    return tuple(strips)


def _stop(writer: _Writer, number: int, row: _Row) -> Stop:
    machine = writer.shop.machines[row.machine]
    remarks = [f"set-up {minutes_text(row.set_up_s)} min"] if row.set_up_s else []
    remarks += [family] if (family := writer.family(row)) else []
    if row.change >= 0:
        remarks.append(f"changeover before {writer.changeover(row).minutes} min")
    remarks += [f"{row.heads} heads"] if row.heads > 1 else []
    return Stop(
        number=number,
        machine=machine.id,
        unit=_unit(machine, row),
        start=row.start,
        end=row.end,
        minutes=minutes_text(row.worked_s),
        remarks=(*remarks, *writer.remarks(row)),
        note=_cut(writer.note(row), NOTE_ON_STRIP),
        way=duration(row.way_s) if row.way_s else "",
    )


def _unit(machine: Machine, row: _Row) -> int:
    return row.unit if machine.count > 1 else 0
