"""What the terminal shows: plain text of at most 80 columns, made from a shop and its bounds or its plan."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound, Plan
from shopfloor.model.shop import Closure, Crew, Machine, Shop
from shopfloor.render.heads import crew_use, head_time_s
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.lines import WIDTH
from shopfloor.render.lines import cut as cut
from shopfloor.render.lines import fault_lines as fault_lines
from shopfloor.render.lines import wrap as wrap
from shopfloor.render.runs import Runs
from shopfloor.render.shut import HALL_BREAK, NO_REASON

BAR = 30
ORDERS_SHOWN = 5
LATE_SHOWN = 8
CLOSURES_SHOWN = 3
CREWS_SHOWN = 5
LISTED = 5

CARE = CARE_NOTICE  # one wording for pages, sheets and the terminal


def shift_line(shop: Shop) -> str:
    """Say which shift this is and how much is to be done in it."""
    counts = f"{len(shop):,} operations, {len(shop.orders):,} orders, {len(shop.machines)} machines"
    if shop.clock.start is None:
        return f"{counts}; time counts from 0:00"
    shift = f"Shift from {shop.clock.start:%Y-%m-%d %H:%M}"
    if shop.shift_end_s is not None:
        shift += f" to {shop.clock.say(shop.shift_end_s)} ({duration(shop.shift_end_s)})"
    return wrap(f"{shift}: {counts}")


# ---- loads ---------------------------------------------------------------------------------------


def load_lines(shop: Shop, bounds: Sequence[Bound]) -> list[str]:
    """Return a bar of work for each machine and crew and for the longest orders; who cannot be on time.

    A machine's bar is full when its work takes all the time it is open in the shift, or up to the bound
    where the shift's end is not known; an order's when it takes all of the shift, or reaches the bound.
    """
    scale = shop.shift_end_s or (bounds[0].value_s if bounds else 0) or 1
    until = "the shift" if shop.shift_end_s else "the bound"
    binding = {str(value) for bound in bounds[:1] for value in bound.witness.values()}
    shut = bool(shop.breaks) or any(machine.closed for machine in shop.machines)
    lines = _break_lines(shop)
    lines.append(f"Machine{'':14}work    share of {f'its open time in {until}' if shut else until}")
    for machine, load, clock in zip(
        shop.machines, shop.machine_load_s.tolist(), shop.machine_clocks, strict=True
    ):
        name = f"{machine.id} ×{machine.count}" if machine.count > 1 else machine.id
        opened = int(clock.worked(scale))
        lines.append(_bar(name, load / machine.count, opened, machine.id in binding))
        lines += _closure_lines(shop, machine, opened, scale)
    lines += _crew_bars(shop, scale, until, binding)
    longest = sorted(range(len(shop.orders)), key=lambda job: (-int(shop.job_load_s[job]), job))
    lines += ["", f"Longest orders{'':7}work    share of {until}"]
    for job in longest[:ORDERS_SHOWN]:
        name = shop.orders.ids[job]
        lines.append(_bar(name, int(shop.job_load_s[job]), scale, name in binding))
    return lines + _hopeless_lines(shop)


def _bar(name: str, load: float, scale: int, binds: bool) -> str:
    share = load / scale if scale else math.inf if load else 0
    filled = min(BAR, round(min(share, 1) * BAR))
    over = ">" if share > 1 else " "
    percent = f"{share:>5.0%}" if share < 10 else f"{'10×+':>5}"
    mark = "  binds" if binds else ""
    shown = duration(round(load / 60) * 60) if load >= 60 else duration(round(load))
    return f"{cut(name, 14):<14} {shown:>10}    {'█' * filled}{'·' * (BAR - filled)}{over}{percent}{mark}"


def _break_lines(shop: Shop) -> list[str]:
    if not shop.breaks:
        return []
    return [wrap(f"Breaks for the whole hall: {_shut_times(shop, shop.breaks, HALL_BREAK)}."), ""]


def _closure_lines(shop: Shop, machine: Machine, opened: int, scale: int) -> list[str]:
    """Say how long a machine with closures of its own is open, and why no longer."""
    closed = [shut for shut in machine.closed if shut.start_s < scale]
    if not closed:
        return []
    text = f"open {duration(opened)} of {duration(scale)}; {_shut_times(shop, closed, NO_REASON)}"
    return textwrap.wrap(text, WIDTH, initial_indent=" " * 15, subsequent_indent=" " * 17)


def _shut_times(shop: Shop, shuts: Sequence[Closure], otherwise: str) -> str:
    """Name closures with their times, the first few of them; one without end in sight begins "from"."""
    say, end = shop.clock.say, shop.shift_end_s
    named = [
        f"{cut(shut.reason or otherwise, 30)} "
        + (f"from {say(shut.start_s)}" if end and shut.end_s >= end else _span(shop, shut))
        for shut in shuts[:CLOSURES_SHOWN]
    ]
    more = f" and {len(shuts) - CLOSURES_SHOWN} more" if len(shuts) > CLOSURES_SHOWN else ""
    return ", ".join(named) + more


def _span(shop: Shop, shut: Closure) -> str:
    return f"{shop.clock.say(shut.start_s)} – {shop.clock.say(shut.end_s)}"


def _crew_bars(shop: Shop, scale: int, until: str, binding: set[str]) -> list[str]:
    """Return a bar for each crew: work of one head, against the time that all its heads are there."""
    if not shop.crews:
        return []
    lines = ["", f"Crew{'':13}head time    share of its heads' time in {until}"]
    for crew in shop.crews:
        counts = sorted({crew.heads, *(heads for _, _, heads in crew.levels)})
        heads = "–".join(str(count) for count in dict.fromkeys((counts[0], counts[-1])))
        there = head_time_s(shop, crew, scale)
        lines.append(_bar(f"{crew.id} ×{heads}", _attended_s(shop, crew), there, crew.id in binding))
    return lines


def _attended_s(shop: Shop, crew: Crew) -> int:
    """Return the work that a crew has, in seconds of one head."""
    theirs = [machine.crew == crew.id for machine in shop.machines]
    set_up = [machine.set_up_only for machine in shop.machines]
    columns = shop.operations
    seconds = np.where(np.array(set_up, bool)[columns.machine], columns.setup_s, columns.seconds)
    return int((seconds * columns.heads * np.array(theirs, bool)[columns.machine]).sum())


def _hopeless_lines(shop: Shop) -> list[str]:
    """Name the orders whose own work alone ends after their due time, whatever the plan."""
    orders = shop.orders
    loads = zip(orders.release_s.tolist(), shop.job_load_s.tolist(), orders.due_s.tolist(), strict=True)
    over = [shop.work_clock.finish(release, load) - due if load else 0 for release, load, due in loads]
    late = sorted((job for job in range(len(orders)) if over[job] > 0), key=lambda job: (-over[job], job))
    if not late:
        return []
    worst = ", ".join(f"{cut(orders.ids[job], 20)} by {duration(over[job])}" for job in late[:LATE_SHOWN])
    more = f", and {len(late) - LATE_SHOWN} more" if len(late) > LATE_SHOWN else ""
    return ["", wrap(f"Late whatever the plan, at least: {worst}{more}.")]


# ---- bounds and plans ----------------------------------------------------------------------------


def bound_lines(bounds: Sequence[Bound], makespan_s: int | None = None) -> list[str]:
    """Return the best bound's sentence, and others that tie with it."""
    if not bounds:
        return ["There is nothing to do."]
    lines = [wrap(bounds[0].sentence)]
    ties = [bound for bound in bounds[1:] if bound.value_s == bounds[0].value_s]
    if ties and makespan_s is None:
        lines += [wrap(f"As long: {bound.sentence}", 2) for bound in ties[:3]]
        if len(ties) > 3:
            lines.append(f"  … and {len(ties) - 3} more just as long.")
    return lines


def fit_line(shop: Shop, bound_s: int, reached: bool) -> str | None:
    """Say whether the shift can hold the work, as far as the bound tells; None without a shift end."""
    end = shop.shift_end_s
    if end is None:
        return None
    if bound_s > end:
        return wrap(
            f"This does not fit the shift: it ends {shop.clock.say(end)}, "
            f"{duration(bound_s - end)} too early."
        )
    spare = f"with {duration(end - bound_s)} to spare" if end > bound_s else "to the minute"
    if reached:
        return wrap(f"This fits the shift, which ends {shop.clock.say(end)}, {spare}: proved.")
    return wrap(
        f"No bound rules this shift out: it ends {shop.clock.say(end)}, {spare}. "
        "Only a plan can tell for sure."
    )


def plan_lines(plan: Plan) -> list[str]:
    """Return the summary of a plan: finish and bound, what binds, method, shift, late orders."""
    shop, say = plan.shop, plan.shop.clock.say
    lines = [shift_line(shop), ""]
    if not len(shop):
        return [*lines, "There is nothing to do."]
    if plan.proved_optimal:
        lines.append(
            wrap(f"Everything ends {say(plan.makespan_s)}. Nothing can end earlier, and that is proved:")
        )
    else:
        share = plan.gap_s / plan.lower_bound_s
        lines.append(
            wrap(
                f"Everything ends {say(plan.makespan_s)}. Nothing can end before {say(plan.lower_bound_s)}; "
                f"the {duration(plan.gap_s)} between ({share:.1%}) are not settled."
            )
        )
    lines += [wrap(plan.bounds[0].sentence, 2), ""]
    lines.append(wrap(f"Method: {plan.choice.name}; {plan.choice.why}."))
    lines += [wrap(f"Not {name}: {reason}.", 2) for name, reason in plan.choice.others.items()]
    lines += [wrap(remark) for remark in plan.remarks]
    if plan.stopped != "done":
        how = {"time limit": "ended at its time limit", "interrupted": "was interrupted"}[plan.stopped]
        lines.append(wrap(f"The search {how}; this is the best plan it had."))
    if shop.shift_end_s is not None:
        end = shop.shift_end_s
        lines.append(
            f"It fits the shift, which ends {say(end)}."
            if plan.fits_shift
            else f"It overruns the shift, which ends {say(end)}, by {duration(plan.makespan_s - end)}."
        )
    lines += late_lines(plan) + floor_lines(plan)
    if plan.fits_shift is False or plan.late_orders():
        lines += help_lines(plan.would_help)
    return lines


def floor_lines(plan: Plan) -> list[str]:
    """Say what the plan makes of closures, changeovers and crews, each where there are any."""
    shop, runs = plan.shop, Runs(plan)
    closed = [
        f"{cut(machine.id, 20)} ({_shut_times(shop, shuts, NO_REASON)})"
        for machine in shop.machines
        if (shuts := [shut for shut in machine.closed if shut.start_s < plan.makespan_s])
    ]
    changed = [
        f"{duration(total)} on {cut(shop.machines[place].id, 20)}"
        for place in runs.changing
        if (total := int(runs.change_s[runs.machine == place].sum()))
    ]
    lines = [wrap(f"Closed for a time: {_some(closed)}.")] if closed else []
    lines += [wrap(f"Changeovers take {_some(changed)}.")] if changed else []
    for use in crew_use(runs, plan.makespan_s)[:CREWS_SHOWN]:
        if use.peak:
            there = head_time_s(shop, use.crew, plan.makespan_s)
            share = f", {use.work_s / there:.0%} of their time" if there else ""
            most = int(use.there.max())
            lines.append(
                wrap(f"Crew {cut(use.crew.id, 20)}: at most {use.peak} of {most} heads at work{share}.")
            )
    return ["", *lines] if lines else []


def _some(texts: Sequence[str]) -> str:
    more = f" and {len(texts) - LISTED} more" if len(texts) > LISTED else ""
    return ", ".join(texts[:LISTED]) + more


def help_lines(sentences: Sequence[str]) -> list[str]:
    """Return what would let the work end earlier, best first."""
    if not sentences:
        return []
    return ["", "What would help:", *(wrap(sentence, 2) for sentence in sentences)]


def late_lines(plan: Plan) -> list[str]:
    """Say which orders finish after their due time, latest first."""
    if not plan.shop.has_due:
        return []
    late = plan.late_orders()
    if not late:
        return [] if "Nothing is late." in plan.remarks else ["No order is late."]
    worst = ", ".join(f"{cut(row.order, 20)} by {duration(row.late_s)}" for row in late[:LATE_SHOWN])
    more = f", and {len(late) - LATE_SHOWN} more" if len(late) > LATE_SHOWN else ""
    noun = "1 order is late" if len(late) == 1 else f"{len(late)} orders are late"
    return [wrap(f"{noun}: {worst}{more}.")]
