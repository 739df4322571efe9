"""What the terminal shows: plain text of at most 80 columns, made from a shop and its bounds or its plan."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Sequence

from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound, Fault, Plan
from shopfloor.model.shop import Shop
from shopfloor.settings import MAX_FAULTS_SHOWN

WIDTH = 80
BAR = 30
ORDERS_SHOWN = 5
LATE_SHOWN = 8

CARE = (
    "This is a plan, not a permit: isolate and lock out before setting up or clearing a machine. Site "
    "procedures, local rules and authorised people come first."
)


def wrap(text: str, indent: int = 0) -> str:
    """Fold a sentence to the width of the terminal, further lines indented by two more."""
    return textwrap.fill(
        text,
        WIDTH,
        initial_indent=" " * indent,
        subsequent_indent=" " * (indent + 2),
        break_on_hyphens=False,
    )


def cut(text: str, width: int) -> str:
    """Shorten a name to `width` characters; control characters never reach the terminal."""
    clean = "".join(c if c.isprintable() else "?" for c in text)
    return clean if len(clean) <= width else clean[: width - 1] + "…"


def shift_line(shop: Shop) -> str:
    """Say which shift this is and how much is to be done in it."""
    counts = f"{len(shop):,} operations, {len(shop.orders):,} orders, {len(shop.machines)} machines"
    if shop.clock.start is None:
        return f"{counts}; time counts from 0:00"
    shift = f"Shift from {shop.clock.start:%Y-%m-%d %H:%M}"
    if shop.shift_end_s is not None:
        shift += f" to {shop.clock.say(shop.shift_end_s)} ({duration(shop.shift_end_s)})"
    return wrap(f"{shift}: {counts}")


def load_lines(shop: Shop, bounds: Sequence[Bound]) -> list[str]:
    """Return a bar of work for each machine and for the longest orders, against the shift or the bound."""
    scale = shop.shift_end_s or (bounds[0].value_s if bounds else 0) or 1
    against = "the shift" if shop.shift_end_s else "the bound"
    binding = {str(value) for bound in bounds[:1] for value in bound.witness.values()}
    machines = [
        (
            f"{machine.id} ×{machine.count}" if machine.count > 1 else machine.id,
            load / machine.count,
            machine.id,
        )
        for machine, load in zip(shop.machines, shop.machine_load_s.tolist(), strict=True)
    ]
    longest = sorted(range(len(shop.orders)), key=lambda job: (-int(shop.job_load_s[job]), job))[
        :ORDERS_SHOWN
    ]
    orders = [(shop.orders.ids[job], int(shop.job_load_s[job]), shop.orders.ids[job]) for job in longest]
    lines = [f"Machine{'':14}work    share of {against}"]
    lines += [_bar(name, load, scale, known in binding) for name, load, known in machines]
    lines += ["", f"Longest orders{'':7}work    share of {against}"]
    return lines + [_bar(name, load, scale, known in binding) for name, load, known in orders]


def _bar(name: str, load: float, scale: int, binds: bool) -> str:
    share = load / scale
    filled = min(BAR, round(share * BAR))
    over = ">" if share > 1 else " "
    mark = "  binds" if binds else ""
    shown = duration(round(load / 60) * 60) if load >= 60 else duration(round(load))
    return f"{cut(name, 14):<14} {shown:>10}    {'█' * filled}{'·' * (BAR - filled)}{over}{share:>5.0%}{mark}"


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
            f"This does not fit the shift: it ends {shop.clock.say(end)}, {duration(bound_s - end)} too early."
        )
    spare = f"with {duration(end - bound_s)} to spare" if end > bound_s else "to the minute"
    if reached:
        return wrap(f"This fits the shift, which ends {shop.clock.say(end)}, {spare}: proved.")
    return wrap(
        f"No bound rules this shift out: it ends {shop.clock.say(end)}, {spare}. Only a plan can tell for sure."
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
        lines.append(wrap(f"The search ended by {plan.stopped}; this is the best plan it had."))
    if shop.shift_end_s is not None:
        end = shop.shift_end_s
        lines.append(
            f"It fits the shift, which ends {say(end)}."
            if plan.fits_shift
            else f"It overruns the shift, which ends {say(end)}, by {duration(plan.makespan_s - end)}."
        )
    lines += late_lines(plan)
    if plan.fits_shift is False or plan.late_orders():
        lines += help_lines(plan.would_help)
    return lines


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
        return ["No order is late."]
    worst = ", ".join(f"{cut(row.order, 20)} by {duration(row.late_s)}" for row in late[:LATE_SHOWN])
    more = f", and {len(late) - LATE_SHOWN} more" if len(late) > LATE_SHOWN else ""
    noun = "1 order is late" if len(late) == 1 else f"{len(late)} orders are late"
    return [wrap(f"{noun}: {worst}{more}.")]


def fault_lines(faults: Iterable[Fault]) -> list[str]:
    """Return every fault on lines of its own, and how many were left out when there are very many."""
    listed = list(faults)
    lines = [wrap(cut(fault.text(), 2_000)) for fault in listed[:MAX_FAULTS_SHOWN]]
    if len(listed) > MAX_FAULTS_SHOWN:
        lines.append(f"… and {len(listed) - MAX_FAULTS_SHOWN:,} more.")
    return lines
