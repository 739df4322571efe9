"""From a plan to what its Gantt page shows."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta
from typing import TYPE_CHECKING

import numpy as np

from shopfloor.model.calendar import DAY, HOUR, Clock
from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import NO_DUE
from shopfloor.render import gantt_limits as limits
from shopfloor.render import gantt_words as words
from shopfloor.render.gantt_colours import ALL_ALIKE, BY_LATENESS, LATE, NO_DUE_TIME, ON_TIME, by_family
from shopfloor.render.gantt_limits import Detail
from shopfloor.render.gantt_view import (
    BarColumns,
    ChangeColumns,
    CrewRow,
    GanttView,
    IdleGap,
    MachineRow,
    OrderColumns,
    ShutTime,
)
from shopfloor.render.heads import crew_use
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.runs import Runs
from shopfloor.render.shut import HALL_BREAK, NO_REASON

if TYPE_CHECKING:
    from shopfloor.model.results import Plan

WHOLE_S = 12 * HOUR  # a plan no longer than this is shown whole when the page opens
SHIFT_S = 8 * HOUR  # else this much is, or the shift where its end is known


def gantt_view(plan: Plan, *, stamp: str | None = None) -> GanttView:
    """Return what the Gantt page of `plan` shows; pure, O(m log m) for m assignments."""
    shop, runs = plan.shop, Runs(plan)
    horizon = max(plan.makespan_s, plan.lower_bound_s, shop.shift_end_s or 0) or HOUR
    kind, binding = words.what_binds(plan.bounds[0]) if plan.bounds else ("", "")
    shown = limits.detail(runs, horizon)
    rows = _machine_rows(runs, binding if kind == "machine" else None)[: shown.rows]
    families, groups = by_family(runs.families, runs.family, runs.worked_s) if runs.changing else ([], [])
    bars = _bars(plan, runs, shown, bool(families))
    closures = _closures(runs, shown.rows, horizon)
    many = len(runs.schedule) > limits.MANY or not shown.bars.all()
    after = "" if shown.until_s == horizon else f" (those from {shop.clock.say(shown.until_s)} on)"
    return GanttView(
        title=words.title(shop.clock),
        subtitle=words.subtitle(plan),
        stamp=stamp,
        finish=shop.clock.say(plan.makespan_s),
        verdict=words.verdict(plan),
        summary=words.summary(plan),
        start=None if shop.clock.start is None else shop.clock.start.isoformat(timespec="seconds"),
        clock_changes=_clock_changes(shop.clock, horizon),
        horizon_s=horizon,
        window_s=_window(plan, horizon),
        rows=rows,
        orders=_orders(plan, shown, binding if kind == "order" else None),
        bars=bars,
        groups=BY_LATENESS if shop.has_due else ALL_ALIKE,
        families=tuple(families),
        family_groups=tuple(groups),
        by_family=bool(families) and not shop.has_due,
        lines=words.lines(plan),
        shift_end_s=shop.shift_end_s,
        rounds_s=_round_starts(plan),
        closures=closures[: limits.CLOSURES],
        changeovers=_changeovers(runs, shown),
        gaps=_gaps(runs, rows),
        crews=_crews(runs, horizon, binding if kind == "crew" else None),
        load=limits.load(runs, shown.rows, horizon) if many else None,
        detail_s=shown.until_s,
        left_out=limits.left_out(runs, shown, bars, _noted(plan), len(closures), after),
        now_s=None,
        about=words.about(plan),
        care=CARE_NOTICE,
    )


# ---- rows and bars -------------------------------------------------------------------------------


def _machine_rows(runs: Runs, binding: str | None) -> tuple[MachineRow, ...]:
    return tuple(
        MachineRow(
            machine.id, unit, machine.name, machine.id == binding, machine.crew or "", machine.set_up_only
        )
        for machine in runs.shop.machines
        for unit in (range(1, machine.count + 1) if machine.count > 1 else (0,))
    )


def _orders(plan: Plan, shown: Detail, binding: str | None) -> OrderColumns:
    orders, kept = plan.shop.orders, shown.orders
    ids = orders.ids if len(kept) == len(orders) else tuple(orders.ids[job] for job in kept.tolist())
    return OrderColumns(
        ids=ids,
        release_s=orders.release_s[kept],
        due_s=orders.due_s[kept],
        finish_s=plan.schedule.completion_s(plan.shop.operations.job, len(orders))[kept],
        binds=ids.index(binding) if binding in ids else -1,
    )


def _bars(plan: Plan, runs: Runs, shown: Detail, families: bool) -> BarColumns:
    shop, schedule = plan.shop, plan.schedule
    due = shop.orders.due_s
    finish = schedule.completion_s(shop.operations.job, len(shop.orders))
    group = np.where(due == NO_DUE, NO_DUE_TIME, np.where(finish > due, LATE, ON_TIME))
    if not shop.has_due:
        group = np.zeros(len(due), np.int64)
    kept = np.flatnonzero(shown.bars)
    notes = shop.operations.notes
    operation = schedule.operation[kept].tolist() if notes else []
    return BarColumns(
        start_s=schedule.start_s[kept],
        end_s=schedule.end_s[kept],
        row=runs.row[kept],
        order=np.searchsorted(shown.orders, runs.job[kept]),
        group=group[runs.job[kept]],
        family=runs.family[kept] if families else np.zeros(len(kept), np.int64),
        set_up_end_s=runs.set_up_end_s[kept],
        paused_s=(schedule.end_s - schedule.start_s - runs.worked_s)[kept],
        heads=runs.heads[kept],
        way_s=runs.way_s[kept],
        round=np.where(schedule.round == NO_ROUND, 0, schedule.round)[kept],
        part=schedule.part[kept],
        parts=schedule.parts[kept],
        notes=limits.some_notes(
            {bar: notes[index] for bar, index in enumerate(operation) if notes.get(index)}
        ),
    )


def _noted(plan: Plan) -> int:
    """How many bars would have a note."""
    notes = plan.shop.operations.notes
    if not notes:
        return 0
    noted = [index for index, note in notes.items() if note]
    return int(np.isin(plan.schedule.operation, noted).sum())


# ---- the floor -----------------------------------------------------------------------------------


def _closures(runs: Runs, rows: int, horizon: int) -> tuple[ShutTime, ...]:
    """Return the hall's breaks and the closures of machines that have a row, up to the end of the chart."""
    found = [ShutTime(None, shut.start_s, shut.end_s, shut.reason or HALL_BREAK) for shut in runs.shop.breaks]
    for machine, first in zip(runs.shop.machines, runs.first_row.tolist(), strict=True):
        found += [
            ShutTime(row, shut.start_s, shut.end_s, shut.reason or NO_REASON)
            for row in range(first, min(first + machine.count, rows))
            for shut in machine.closed
        ]
    edge = horizon + horizon // 10  # a little past the end of the chart, as far as it can be moved
    return tuple(
        ShutTime(shut.row, max(0, shut.start_s), min(shut.end_s, edge), shut.reason)
        for shut in found
        if shut.start_s < edge and shut.end_s > 0
    )


def _changeovers(runs: Runs, shown: Detail) -> ChangeColumns:
    changes = runs.changes
    kept = shown.bars[changes.run]
    bar = np.cumsum(shown.bars) - 1
    return ChangeColumns(
        bar[changes.run[kept]],
        changes.start_s[kept],
        changes.end_s[kept],
        changes.seconds[kept],
        changes.before[kept],
    )


def _gaps(runs: Runs, rows: Sequence[MachineRow]) -> tuple[IdleGap, ...]:
    """Return the idle time of the machine that binds, in order of its units and of time.

    Of very many gaps only the first are: each matters only to a reader who is close enough to see it.
    """
    binding = [
        machine
        for machine, first in enumerate(runs.first_row.tolist())
        if first < len(rows) and rows[first].binds
    ]
    found = [runs.gaps(machine) for machine in binding]
    return tuple(
        IdleGap(*numbers)
        for gaps in found
        for numbers in zip(
            *(column.tolist() for column in (gaps.row, gaps.start_s, gaps.end_s, gaps.seconds)), strict=True
        )
        if numbers[0] < len(rows)
    )[: limits.GAPS]


def _crews(runs: Runs, horizon: int, binding: str | None) -> tuple[CrewRow, ...]:
    """Return the crews in the shop's order; of very many, those that bind or have the least to spare."""
    rows = []
    for use in crew_use(runs, horizon):
        peak, most = use.peak, int(max(use.used.max(), use.there.max()))
        steps = use.coarse(limits.CREW_STEPS)
        row = CrewRow(use.crew.id, use.crew.id == binding, most, steps.at_s, steps.used, steps.there)
        rows.append((row, peak / most if most else 0.0))
    tightest = sorted(range(len(rows)), key=lambda place: (not rows[place][0].binds, -rows[place][1], place))
    return tuple(rows[place][0] for place in sorted(tightest[: limits.CREWS]))


# ---- time ----------------------------------------------------------------------------------------


def _round_starts(plan: Plan) -> tuple[int, ...]:
    """Return when each round starts; empty where assignments carry no rounds that start together."""
    schedule = plan.schedule
    if not len(schedule) or bool((schedule.round == NO_ROUND).any()):
        return ()
    pairs = np.unique(np.stack([schedule.round, schedule.start_s]), axis=1)
    together = len(np.unique(pairs[0])) == pairs.shape[1]
    return tuple(pairs[1].tolist()) if together else ()


def _window(plan: Plan, horizon: int) -> tuple[int, int]:
    """Return the whole plan where it is short, else one shift from where work begins."""
    if horizon <= WHOLE_S:
        return 0, horizon
    end = plan.shop.shift_end_s
    width = end if end is not None and end <= WHOLE_S else SHIFT_S
    first = int(plan.schedule.start_s.min()) if len(plan.schedule) else 0
    begin = 0 if first < width else first - first % HOUR
    return begin, min(begin + width, horizon)


def _clock_changes(clock: Clock, horizon: int) -> tuple[tuple[int, int], ...]:
    """Find where the wall clock jumps between the start and the horizon, to the second."""
    start = clock.start
    if start is None or clock.zone is None:
        return ((0, 0),)

    def offset(seconds: int) -> int:
        ahead = clock.moment(seconds) - start - timedelta(seconds=seconds)
        return round(ahead.total_seconds())

    changes = [(0, offset(0))]
    step = DAY // 4
    for before in range(0, horizon + DAY, step):
        low, high = before, before + step
        if offset(low) == offset(high):
            continue
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (middle, high) if offset(middle) == offset(before) else (low, middle)
        changes.append((high, offset(high)))
    return tuple(changes)
