"""Exactly what the Gantt page shows, as one documented value; the page adds drawing and no facts.

Times are whole seconds since the shift's start, as everywhere inside the tool.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import TYPE_CHECKING

import numpy as np

from shopfloor.model.calendar import DAY, HOUR, Clock, duration
from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import NO_DUE, Ints
from shopfloor.render.html import CARE_NOTICE

if TYPE_CHECKING:
    from shopfloor.model.results import Bound, Plan
    from shopfloor.model.shop import Shop

WHOLE_S = 12 * HOUR  # a plan no longer than this is shown whole when the page opens
SHIFT_S = 8 * HOUR  # else this much is, or the shift where its end is known
NAMES_SHOWN = 5  # on one line of the summary
HELPS_SHOWN = 2


@dataclass(frozen=True, slots=True)
class SummaryLine:
    """One line of the strip above the chart: a word in front and a sentence."""

    label: str
    text: str


@dataclass(frozen=True, slots=True)
class ColourGroup:
    """How the bars of one group look: `fill` colour, and the `name` that the legend gives it.

    Groups must stay apart in print without colour: fills differ in brightness and each has its own
    `pattern` (``plain``, ``dots``, ``stripes``, ``back-stripes``, ``grid``); `ink` is for text on the fill.
    """

    name: str
    fill: str
    ink: str
    pattern: str


# In the order of the index that bars carry. Brightness (CIE L*, about): 73, 36, 90. The pair light blue
# and dark vermilion stays apart under every common kind of colour blindness.
BY_LATENESS = (
    ColourGroup("on time", "#93bfe2", "#10202f", "plain"),
    ColourGroup("late", "#9c3412", "#ffffff", "stripes"),
    ColourGroup("no due time", "#e6e2d8", "#10202f", "dots"),
)
ON_TIME, LATE, NO_DUE_TIME = range(3)
# Where no order has a due time there is nothing to tell apart, and a pattern would only make noise.
ALL_ALIKE = (ColourGroup("no due time", "#93bfe2", "#10202f", "plain"),)


@dataclass(frozen=True, slots=True)
class MachineRow:
    """One machine, or one unit of a group: a row of the chart.

    `unit` is 0 for a machine that is no group; `name` is the longer name, where one is known;
    `binds` marks the machine that the best bound rests on.
    """

    machine: str
    unit: int
    name: str
    binds: bool

    @property
    def label(self) -> str:
        """The row as people say it; units are numbered only where there are several."""
        return f"{self.machine} unit {self.unit}" if self.unit else self.machine


@dataclass(frozen=True, slots=True)
class MarkedTime:
    """A vertical line: `kind` is ``finish``, ``bound``, ``proved`` (both in one), or ``shift``.

    `text` is written beside the line where it fits inside the frame, `short` where it does not.
    """

    kind: str
    at_s: int
    text: str
    short: str


@dataclass(frozen=True, slots=True)
class ShutTime:
    """A time when one row, or with `row` None the whole hall, is shut; drawn hatched and named."""

    row: int | None
    start_s: int
    end_s: int
    reason: str


@dataclass(frozen=True, slots=True)
class Changeover:
    """Setup before a run on one row; drawn apart from the runs."""

    row: int
    start_s: int
    end_s: int
    text: str


@dataclass(frozen=True, eq=False)
class OrderColumns:
    """The orders as columns, one entry an order, in the order of the file.

    Attributes
    ----------
    ids
        As written in the file, also inside bars.
    release_s, due_s
        Earliest start and wanted finish; -1 where there is no due time.
    binds
        Index of the order that the best bound rests on, or -1.
    """

    ids: tuple[str, ...]
    release_s: Ints
    due_s: Ints
    binds: int


@dataclass(frozen=True, eq=False)
class BarColumns:
    """The bars as columns, one entry an assignment, by start.

    Attributes
    ----------
    start_s, end_s
        From when to when.
    row, order
        Index into the machine rows and the orders.
    group
        Index into the colour groups.
    round
        1 …, or 0 outside unit rounds.
    part, parts
        Which piece of how many of its operation.
    notes
        Bar index to note, only where the file had one.
    """

    start_s: Ints
    end_s: Ints
    row: Ints
    order: Ints
    group: Ints
    round: Ints
    part: Ints
    parts: Ints
    notes: dict[int, str]

    def __len__(self) -> int:
        return len(self.start_s)


@dataclass(frozen=True, eq=False)
class GanttView:
    """Everything the Gantt page shows.

    Attributes
    ----------
    title, subtitle
        Heading: which shift; what it was made from and how much it holds.
    stamp
        Time of printing as text, if wanted.
    finish
        The makespan as people say it; the largest text on the page.
    verdict
        Half a sentence under it: proved earliest, or how far above the bound.
    summary
        At most five lines: bound, what binds, late orders, the shift, what would help.
    start
        Wall time of second zero as ``YYYY-MM-DDTHH:MM:SS``, or None to show elapsed time.
    clock_changes
        Pairs ``(from_s, offset_s)``: from then on the wall clock is ahead of elapsed time by that much.
    horizon_s
        Where the chart ends; the whole plan, its bound and the shift lie before.
    window_s
        From when to when the chart shows at first.
    rows
        Machines and units, in the shop's order.
    orders, bars
        Columns.
    groups
        Colour groups, for bars and legend.
    lines
        Finish, bound and the shift's end.
    shift_end_s
        From here on the chart is shaded; None when it is not known.
    rounds_s
        When each round starts, for faint boundaries; empty outside unit rounds.
    closures, changeovers
        Drawn where there are any.
    now_s
        A line at this time, or None. The reader can switch on one that follows the computer's clock.
    about
        Terms and texts on how the plan was made.
    care
        The notice that every page carries.
    """

    title: str
    subtitle: str
    stamp: str | None
    finish: str
    verdict: str
    summary: tuple[SummaryLine, ...]
    start: str | None
    clock_changes: tuple[tuple[int, int], ...]
    horizon_s: int
    window_s: tuple[int, int]
    rows: tuple[MachineRow, ...]
    orders: OrderColumns
    bars: BarColumns
    groups: tuple[ColourGroup, ...]
    lines: tuple[MarkedTime, ...]
    shift_end_s: int | None
    rounds_s: tuple[int, ...]
    closures: tuple[ShutTime, ...]
    changeovers: tuple[Changeover, ...]
    now_s: int | None
    about: tuple[tuple[str, str], ...]
    care: str


def gantt_view(plan: Plan, *, stamp: str | None = None) -> GanttView:
    """Return what the Gantt page of `plan` shows; pure, O(m log m) for m assignments."""
    shop = plan.shop
    horizon = max(plan.makespan_s, plan.lower_bound_s, shop.shift_end_s or 0) or HOUR
    kind, binding = what_binds(plan.bounds[0]) if plan.bounds else ("", "")
    rows, first_row = _machine_rows(shop, binding if kind == "machine" else None)
    return GanttView(
        title=_title(shop.clock),
        subtitle=_subtitle(plan),
        stamp=stamp,
        finish=shop.clock.say(plan.makespan_s),
        verdict=_verdict(plan),
        summary=_summary(plan),
        start=None if shop.clock.start is None else shop.clock.start.isoformat(timespec="seconds"),
        clock_changes=_clock_changes(shop.clock, horizon),
        horizon_s=horizon,
        window_s=_window(plan, horizon),
        rows=rows,
        orders=OrderColumns(
            ids=shop.orders.ids,
            release_s=shop.orders.release_s,
            due_s=np.where(shop.orders.due_s == NO_DUE, -1, shop.orders.due_s),
            binds=shop.orders.ids.index(binding) if kind == "order" and binding in shop.orders.ids else -1,
        ),
        bars=_bars(plan, first_row),
        groups=BY_LATENESS if shop.has_due else ALL_ALIKE,
        lines=_lines(plan),
        shift_end_s=shop.shift_end_s,
        rounds_s=_round_starts(plan),
        closures=tuple(
            ShutTime(None, closed.start_s, closed.end_s, closed.reason or "break") for closed in shop.breaks
        ),
        changeovers=(),
        now_s=None,
        about=_about(plan),
        care=CARE_NOTICE,
    )


def what_binds(bound: Bound) -> tuple[str, str]:
    """Return what a bound rests on as ``("machine" or "order", id)``, or two blanks if neither."""
    witness = bound.witness
    if "node" in witness:
        return str(witness["node"]), str(witness["id"])
    for kind in ("machine", "order"):
        if kind in witness:
            return kind, str(witness[kind])
    return "", ""


def _machine_rows(shop: Shop, binding: str | None) -> tuple[tuple[MachineRow, ...], Ints]:
    """Return the rows, and for each machine the row of its first unit."""
    rows: list[MachineRow] = []
    first: list[int] = []
    for machine in shop.machines:
        first.append(len(rows))
        units = range(1, machine.count + 1) if machine.count > 1 else (0,)
        rows += [MachineRow(machine.id, unit, machine.name, machine.id == binding) for unit in units]
    return tuple(rows), np.array(first, dtype=np.int64)


def _bars(plan: Plan, first_row: Ints) -> BarColumns:
    shop, schedule = plan.shop, plan.schedule
    job = shop.operations.job[schedule.operation]
    machine = shop.operations.machine[schedule.operation]
    due = shop.orders.due_s
    finish = schedule.completion_s(shop.operations.job, len(shop.orders))
    group = np.where(due == NO_DUE, NO_DUE_TIME, np.where(finish > due, LATE, ON_TIME))
    if not shop.has_due:
        group = np.zeros(len(due), np.int64)
    notes = shop.operations.notes
    return BarColumns(
        start_s=schedule.start_s,
        end_s=schedule.end_s,
        row=first_row[machine] + schedule.unit - 1,
        order=job,
        group=group[job],
        round=np.where(schedule.round == NO_ROUND, 0, schedule.round),
        part=schedule.part,
        parts=schedule.parts,
        notes={
            bar: notes[operation]
            for bar, operation in enumerate(schedule.operation.tolist() if notes else [])
            if notes.get(operation)
        },
    )


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


_DAYS = ("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
_MONTHS = (
    *("January", "February", "March", "April", "May", "June"),
    *("July", "August", "September", "October", "November", "December"),
)


def _date(moment: datetime) -> str:
    return f"{_DAYS[moment.weekday()]} {moment.day} {_MONTHS[moment.month - 1]} {moment.year}"


def _title(clock: Clock) -> str:
    if clock.start is None:
        return "Shift plan, elapsed time"
    return f"Shift plan, {_date(clock.start)} from {clock.start:%H:%M}"


def _subtitle(plan: Plan) -> str:
    shop = plan.shop
    counts = ", ".join(
        f"{size:,} {noun}{'' if size == 1 else 's'}"
        for size, noun in (
            (len(shop.operations), "operation"),
            (len(shop.orders), "order"),
            (len(shop.machines), "machine"),
        )
    )
    files = ", ".join(name for name, _ in plan.inputs)
    return f"{files}: {counts}" if files else counts


def _verdict(plan: Plan) -> str:
    if not plan.bounds:
        return "there is nothing to do"
    if plan.proved_optimal:
        return "proved: nothing can end earlier"
    return f"{_gap(plan)} above the bound"


def _gap(plan: Plan) -> str:
    share = f" ({plan.gap_s / plan.lower_bound_s:.1%})" if plan.lower_bound_s else ""
    return f"{duration(plan.gap_s)}{share}"


def _lines(plan: Plan) -> tuple[MarkedTime, ...]:
    say = plan.shop.clock.say
    lines = []
    if plan.bounds and plan.proved_optimal:
        text = f"ends {say(plan.makespan_s)}: bound = finish, proved"
        lines.append(MarkedTime("proved", plan.makespan_s, text, f"ends {say(plan.makespan_s)}, proved"))
    elif plan.bounds:
        lower, ends = say(plan.lower_bound_s), f"ends {say(plan.makespan_s)}"
        lines.append(MarkedTime("bound", plan.lower_bound_s, plan.bounds[0].sentence, f"bound {lower}"))
        lines.append(MarkedTime("finish", plan.makespan_s, f"{ends}, {_gap(plan)} above the bound", ends))
    end = plan.shop.shift_end_s
    if end is not None:
        lines.append(MarkedTime("shift", end, f"shift ends {say(end)}", f"shift ends {say(end)}"))
    return tuple(lines)


def _summary(plan: Plan) -> tuple[SummaryLine, ...]:
    """Return the strip: bound, what binds, late orders, the shift, and where it is wanted what would help."""
    if not plan.bounds:
        return ()
    lines = [SummaryLine("Bound", plan.bounds[0].sentence)]
    binds = _binds(plan)
    if binds:
        lines.append(SummaryLine("Binds", binds))
    if plan.shop.has_due:
        lines.append(SummaryLine("Late", _late(plan)))
    if plan.shop.shift_end_s is not None:
        lines.append(SummaryLine("Shift", _fit(plan, plan.shop.shift_end_s)))
    if plan.would_help and (plan.fits_shift is False or plan.late_orders()):
        lines.append(SummaryLine("Would help", " ".join(plan.would_help[:HELPS_SHOWN])))
    return tuple(lines)


def _binds(plan: Plan) -> str:
    """Name everything whose bound equals the best, the best first."""
    named = []
    for bound in plan.bounds:
        kind, name = what_binds(bound)
        if name and bound.value_s == plan.lower_bound_s and f"{kind} {name}" not in named:
            named.append(f"{kind} {name}")
    if not named:
        return ""
    others = f"; just as long: {', '.join(named[1:4])}" if named[1:] else ""
    more = f" and {len(named) - 4} more" if len(named) > 4 else ""
    return f"{named[0]}{others}{more}"


def _late(plan: Plan) -> str:
    late = plan.late_orders()
    with_due = int((plan.shop.orders.due_s != NO_DUE).sum())
    if not late:
        return f"none of {with_due:,} orders with a due time" if with_due > 1 else "the order is on time"
    worst = ", ".join(f"{row.order} by {duration(row.late_s)}" for row in late[:NAMES_SHOWN])
    more = f", and {len(late) - NAMES_SHOWN:,} more" if len(late) > NAMES_SHOWN else ""
    return f"{len(late):,} of {with_due:,} orders: {worst}{more}"


def _fit(plan: Plan, end: int) -> str:
    shop, say = plan.shop, plan.shop.clock.say
    if plan.makespan_s <= end:
        spare = f"{duration(end - plan.makespan_s)} to spare" if plan.makespan_s < end else "to the minute"
        return f"all fits; the shift ends {say(end)}, {spare}"
    past = plan.schedule.operation[plan.schedule.end_s > end]
    jobs = np.unique(shop.operations.job[past])
    names = ", ".join(shop.orders.ids[job] for job in jobs[:NAMES_SHOWN].tolist())
    more = f" and {len(jobs) - NAMES_SHOWN:,} more" if len(jobs) > NAMES_SHOWN else ""
    noun = "order is" if len(jobs) == 1 else "orders are"
    return (
        f"overruns {say(end)} by {duration(plan.makespan_s - end)}; "
        f"{len(jobs):,} {noun} not done by then: {names}{more}"
    )


def _about(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return how the plan was made, as terms and texts."""
    about = [("Method", f"{plan.choice.name}: {plan.choice.why}")]
    about += [(f"Not {name}", reason) for name, reason in plan.choice.others.items()]
    about += [("Remark", remark) for remark in plan.remarks]
    about += [("Also proved", bound.sentence) for bound in plan.bounds[1:4]]
    if plan.stopped != "done":
        about.append(("Search", f"ended by {plan.stopped}; this is the best plan it had"))
    if not plan.repeatable:
        about.append(("Repeatable", "no: a search against the clock may end with another plan next time"))
    about += [(f"Made from {name}", f"SHA-256 {digest}") for name, digest in plan.inputs]
    options = ", ".join(f"{name} {value}" for name, value in sorted(plan.options.items()))
    if options:
        about.append(("Options", options))
    return tuple(about)
