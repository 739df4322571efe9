"""The sentences of the Gantt page: heading, verdict, summary, lines, and how the plan was made."""

from __future__ import annotations

from datetime import datetime
from typing import TYPE_CHECKING

import numpy as np

from shopfloor.model.calendar import Clock, duration
from shopfloor.model.shop import NO_DUE
from shopfloor.render.gantt_view import MarkedTime, SummaryLine

if TYPE_CHECKING:
    from shopfloor.model.results import Bound, Plan

NAMES_SHOWN = 5  # on one line of the summary
HELPS_SHOWN = 2


def what_binds(bound: Bound) -> tuple[str, str]:
    """Return what a bound rests on: ``machine``, ``order`` or ``crew`` and its name, else two blanks."""
    witness = bound.witness
    if "node" in witness:
        return str(witness["node"]), str(witness["id"])
    for kind in ("machine", "order", "crew"):
        if kind in witness:
            return kind, str(witness[kind])
    return "", ""


_DAYS = ("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
_MONTHS = (
    *("January", "February", "March", "April", "May", "June"),
    *("July", "August", "September", "October", "November", "December"),
)


def _date(moment: datetime) -> str:
    return f"{_DAYS[moment.weekday()]} {moment.day} {_MONTHS[moment.month - 1]} {moment.year}"


def title(clock: Clock) -> str:
    """Return which shift this is."""
    if clock.start is None:
        return "Shift plan, elapsed time"
    return f"Shift plan, {_date(clock.start)} from {clock.start:%H:%M}"


def subtitle(plan: Plan) -> str:
    """Return what the plan was made from and how much it holds."""
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


def verdict(plan: Plan) -> str:
    """Return half a sentence: proved earliest, or how far above the bound."""
    if not plan.bounds:
        return "there is nothing to do"
    if plan.proved_optimal:
        return "proved: nothing can end earlier"
    return f"{_gap(plan)} above the bound"


def _gap(plan: Plan) -> str:
    share = f" ({plan.gap_s / plan.lower_bound_s:.1%})" if plan.lower_bound_s else ""
    return f"{duration(plan.gap_s)}{share}"


def lines(plan: Plan) -> tuple[MarkedTime, ...]:
    """Return the times to mark: finish and bound, and the shift's end where it is known."""
    say = plan.shop.clock.say
    marked = []
    if plan.bounds and plan.proved_optimal:
        text = f"ends {say(plan.makespan_s)}: bound = finish, proved"
        marked.append(MarkedTime("proved", plan.makespan_s, text, f"ends {say(plan.makespan_s)}, proved"))
    elif plan.bounds:
        lower, ends = say(plan.lower_bound_s), f"ends {say(plan.makespan_s)}"
        marked.append(MarkedTime("bound", plan.lower_bound_s, plan.bounds[0].sentence, f"bound {lower}"))
        marked.append(MarkedTime("finish", plan.makespan_s, f"{ends}, {_gap(plan)} above the bound", ends))
    end = plan.shop.shift_end_s
    if end is not None:
        marked.append(MarkedTime("shift", end, f"shift ends {say(end)}", f"shift ends {say(end)}"))
    return tuple(marked)


def summary(plan: Plan) -> tuple[SummaryLine, ...]:
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


def about(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return how the plan was made, as terms and texts."""
    facts = [("Method", f"{plan.choice.name}: {plan.choice.why}")]
    facts += [(f"Not {name}", reason) for name, reason in plan.choice.others.items()]
    facts += [("Remark", remark) for remark in plan.remarks]
    facts += [("Also proved", bound.sentence) for bound in plan.bounds[1:4]]
    if plan.stopped != "done":
        facts.append(("Search", f"ended by {plan.stopped}; this is the best plan it had"))
    if not plan.repeatable:
        facts.append(("Repeatable", "no: a search against the clock may end with another plan next time"))
    facts += [(f"Made from {name}", f"SHA-256 {digest}") for name, digest in plan.inputs]
    options = ", ".join(f"{name} {value}" for name, value in sorted(plan.options.items()))
    if options:
        facts.append(("Options", options))
    return tuple(facts)
