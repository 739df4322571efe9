"""What stands on the sheets of plan.xlsx: columns of plain values, before any of them becomes a cell.

A fact has a column only where the plan has that fact.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import NO_DUE, Ints
from shopfloor.render.heads import crew_use
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.runs import Runs
from shopfloor.render.shut import closures_of
from shopfloor.render.tables import CSV_COLUMNS, plan_id, plan_json, summary

if TYPE_CHECKING:
    from shopfloor.model.results import Plan
    from shopfloor.model.shop import Crew, Machine, Shop


@dataclass(frozen=True, slots=True)
class Column:
    """One column: its title, what its values are (text, number, moment, minutes, share), and they."""

    title: str
    kind: str
    values: Sequence[Any]


def sheets(plan: Plan, stamp: str | None) -> dict[str, list[Column]]:
    """Return the sheets of the workbook of `plan`, title to columns; linear in the number of runs."""
    runs = Runs(plan)
    return {
        "Plan": _plan_columns(plan) + _used(_run_columns(runs)),
        "Machines": _machine_columns(plan) + _used(_floor_columns(plan, runs)),
        "Orders": _order_columns(plan),
        "Bounds": _bound_columns(plan),
        "Notes": _note_columns(plan, stamp),
    }


def _used(columns: Iterable[Column]) -> list[Column]:
    """Return the columns in which anything stands."""
    return [column for column in columns if any(value is not None for value in column.values)]


def _plan_columns(plan: Plan) -> list[Column]:
    shop, schedule = plan.shop, plan.schedule
    orders, machines, notes = shop.orders.ids, shop.machines, shop.operations.notes
    operation = schedule.operation
    values: tuple[tuple[str, Sequence[Any]], ...] = (
        ("text", [orders[index] for index in shop.operations.job[operation].tolist()]),
        ("text", [machines[index].id for index in shop.operations.machine[operation].tolist()]),
        ("number", schedule.unit.tolist()),
        ("moment", schedule.start_s.tolist()),
        ("moment", schedule.end_s.tolist()),
        ("number", [None if rank == NO_ROUND else rank for rank in schedule.round.tolist()]),
        ("number", schedule.part.tolist()),
        ("number", schedule.parts.tolist()),
        ("text", [notes.get(index) for index in operation.tolist()]),
    )
    return [Column(title, *column) for title, column in zip(CSV_COLUMNS, values, strict=True)]


def _machine_columns(plan: Plan) -> list[Column]:
    shop, schedule = plan.shop, plan.schedule
    place = shop.operations.machine[schedule.operation]
    first = np.full(len(shop.machines), np.iinfo(np.int64).max)
    last = np.zeros(len(shop.machines), np.int64)
    np.minimum.at(first, place, schedule.start_s)
    np.maximum.at(last, place, schedule.end_s)
    runs = np.bincount(place, minlength=len(shop.machines)).tolist()
    units = [machine.count for machine in shop.machines]
    work = shop.machine_load_s.tolist()
    span = plan.makespan_s or 1
    return [
        Column("machine", "text", [machine.id for machine in shop.machines]),
        Column("name", "text", [machine.name or None for machine in shop.machines]),
        Column("units", "number", units),
        Column("runs", "number", runs),
        Column("work_min", "minutes", work),
        Column("busy", "share", [load / (span * count) for load, count in zip(work, units, strict=True)]),
        Column("first_start", "moment", _where(runs, first.tolist())),
        Column("last_end", "moment", _where(runs, last.tolist())),
    ]


def _run_columns(runs: Runs) -> list[Column]:
    """What the floor's rules make of each run."""
    changing = np.isin(runs.machine, runs.changing)
    names = [runs.families[index] or None for index in runs.family.tolist()]
    paused = runs.schedule.end_s - runs.schedule.start_s - runs.worked_s
    return [
        Column("family", "text", _where(changing, names)),
        Column("changeover_min", "minutes", _not_zero(runs.change_s)),
        Column("set_up_min", "minutes", _not_zero(runs.set_up_s)),
        Column("paused_min", "minutes", _not_zero(paused)),
        Column("heads", "number", _not_zero(runs.heads)),
        Column("way_min", "minutes", _not_zero(runs.way_s)),
    ]


def _floor_columns(plan: Plan, runs: Runs) -> list[Column]:
    """What the floor's rules make of each machine, and who attends it."""
    shop = plan.shop
    total = {
        name: _not_zero(_sum(values, runs.machine, len(shop.machines)))
        for name, values in (("changeover", runs.change_s), ("set_up", runs.set_up_s))
    }
    crews = {use.crew.id: use for use in crew_use(runs, plan.makespan_s)}
    attending = [crews.get(machine.crew or "") for machine in shop.machines]
    return [
        Column("changeover_min", "minutes", total["changeover"]),
        Column("set_up_min", "minutes", total["set_up"]),
        Column("closed", "text", [_closed(shop, machine) for machine in shop.machines]),
        Column("crew", "text", [machine.crew for machine in shop.machines]),
        Column("attended", "text", [_attended(machine) for machine in shop.machines]),
        Column("crew_heads", "text", [_there(shop, use.crew) if use else None for use in attending]),
        Column("crew_at_most", "number", [use.peak if use else None for use in attending]),
    ]


def _closed(shop: Shop, machine: Machine) -> str | None:
    """Say when a machine is shut, for breaks or by itself; None where it never is."""
    say = shop.clock.say
    shuts = closures_of(shop, machine)
    return "; ".join(f"{say(shut.start_s)} – {say(shut.end_s)} {shut.reason}" for shut in shuts) or None


def _attended(machine: Machine) -> str | None:
    if machine.crew is None:
        return None
    return "set-up" if machine.set_up_only else "always"


def _there(shop: Shop, crew: Crew) -> str:
    say = shop.clock.say
    levels = (f"{heads} from {say(start)} to {say(end)}" for start, end, heads in crew.levels)
    return "; ".join([str(crew.heads), *levels])


def _sum(values: Ints, machine: Ints, size: int) -> Ints:
    return np.bincount(machine, weights=values, minlength=size).astype(np.int64)


def _not_zero(values: Ints) -> list[Any]:
    return [value or None for value in values.tolist()]


def _order_columns(plan: Plan) -> list[Column]:
    shop, schedule = plan.shop, plan.schedule
    job = shop.operations.job
    begin = np.full(len(shop.orders), np.iinfo(np.int64).max)
    np.minimum.at(begin, job[schedule.operation], schedule.start_s)
    finish = schedule.completion_s(job, len(shop.orders))
    visits = np.bincount(job, minlength=len(shop.orders)).tolist()
    release, due = shop.orders.release_s.tolist(), shop.orders.due_s
    late = np.maximum(finish - np.minimum(due, finish), 0).tolist()
    return [
        Column("order", "text", shop.orders.ids),
        Column("release", "moment", _where(release, release)),
        Column("due", "moment", _where((due != NO_DUE).tolist(), due.tolist())),
        Column("priority", "number", shop.orders.priority.tolist()),
        Column("operations", "number", visits),
        Column("work_min", "minutes", shop.job_load_s.tolist()),
        Column("start", "moment", _where(visits, begin.tolist())),
        Column("finish", "moment", _where(visits, finish.tolist())),
        Column("late_min", "minutes", _where(late, late)),
    ]


def _bound_columns(plan: Plan) -> list[Column]:
    bounds = summary(plan)["bounds"]
    return [
        Column("kind", "text", [bound["kind"] for bound in bounds]),
        Column("not_before", "moment", [bound["value_s"] for bound in bounds]),
        Column("minutes", "minutes", [bound["value_s"] for bound in bounds]),
        Column("sentence", "text", [bound["sentence"] for bound in bounds]),
        Column("witness", "text", [json.dumps(bound["witness"], ensure_ascii=False) for bound in bounds]),
    ]


def _note_columns(plan: Plan, stamp: str | None) -> list[Column]:
    data, clock = summary(plan), plan.shop.clock
    rows: list[tuple[str, Any]] = [
        ("care", CARE_NOTICE),
        ("plan", plan_id(plan_json(plan))),
        ("printed", stamp),
        ("shift_start", data["shift_start"] or "time counts from 0:00"),
        ("shift_end", data["shift_end"]),
        ("everything ends", clock.write(plan.makespan_s)),
        ("nothing can end before", clock.write(plan.lower_bound_s)),
        ("proved optimal", "yes" if plan.proved_optimal else "no"),
        ("fits the shift", None if plan.fits_shift is None else "yes" if plan.fits_shift else "no"),
        ("method", f"{plan.choice.name}: {plan.choice.why}"),
        *((f"not {name}", reason) for name, reason in plan.choice.others.items()),
        *(("remark", remark) for remark in plan.remarks),
        *(("would help", sentence) for sentence in plan.would_help),
        ("repeatable", "yes" if plan.repeatable else "no"),
        ("options", json.dumps(data["options"], ensure_ascii=False)),
        *((f"SHA-256 of {name}", digest) for name, digest in plan.inputs),
        ("tool", f"shopfloor {data['tool_version']}"),
    ]
    kept = [(name, value) for name, value in rows if value]
    return [
        Column("what", "text", [name for name, _ in kept]),
        Column("value", "text", [value for _, value in kept]),
    ]


def _where(wanted: Iterable[Any], values: Iterable[Any]) -> list[Any]:
    return [value if keep else None for keep, value in zip(wanted, values, strict=True)]
