"""Sentences and cells of a handover, for the terminal, the page and the tables. Pure."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING

from shopfloor.model.calendar import duration, elapsed
from shopfloor.render.text import cut

if TYPE_CHECKING:
    from shopfloor.replan.handover import Handover, MachineReport, OrderReport
    from shopfloor.replan.reasons import Reason
    from shopfloor.replan.remaining import Left

Say = Callable[[int], str]
NAME = 24

MACHINE_HEAD = ("Machine", "planned", "worked", "set-up", "stopped", "down", "idle", "done", "sequence")
ORDER_HEAD = ("Order", "first plan", "done", "due", "late", "why")


def count(number: int, one: str, many: str = "") -> str:
    """Return a number with its noun."""
    return f"1 {one}" if number == 1 else f"{number:,} {many or one + 's'}"


def minutes(seconds: int) -> str:
    """Write a length as h:mm, rounded to the minute; a dot for none."""
    return elapsed(round(seconds / 60) * 60) if seconds >= 30 else "·"


def share(part: float | None) -> str:
    """Write a share in per cent."""
    return "–" if part is None else f"{part:.0%}"


def summary(found: Handover, say: Say) -> list[str]:
    """Return the handover in a few sentences."""
    open_, late = [row for row in found.orders if row.left], [row for row in found.orders if row.late_s]
    total = found.done + len(found.left)
    lines = [f"{found.done:,} of {count(total, 'operation')} done by {say(found.at_s)}."]
    if found.left:
        work = sum(one.seconds for one in found.left)
        lines[0] += (
            f" {count(len(found.left), 'operation')} of {count(len(open_), 'order')} carry over, "
            f"{duration(round(work / 60) * 60)} of work."
        )
    else:
        lines[0] += " Nothing carries over."
    lines.append(f"{count(len(late), 'order')} late." if late else "No order is late.")
    elements = found.elements
    if elements.PQ:
        lines.append(
            f"Pieces reported: {elements.GQ:,} good, {elements.SQ:,} scrapped "
            f"(scrap ratio {elements.SQ / elements.PQ:.1%})."
        )
    if found.started:
        kept = found.in_sequence / found.started
        lines.append(
            f"{found.in_sequence:,} of {count(found.started, 'operation')} begun kept to the planned "
            f"sequence ({kept:.0%})."
        )
    if found.odd:
        noun = "entry contradicts" if found.odd == 1 else "entries contradict"
        lines.append(f"{found.odd} {noun} others and stand as accepted; figures may be off.")
    return lines


def plans_line(found: Handover, say: Say) -> str:
    """Say which plans were in force."""
    named = [f"{str(plan.data.get('sha256', ''))[:8]} from {say(plan.at_s)}" for plan in found.plans]
    return f"Plan {', then '.join(named)}"


def machine_cells(row: MachineReport) -> tuple[str, ...]:
    """Return the cells of a machine under ``MACHINE_HEAD``."""
    times = row.times
    name = f"{row.machine} ×{row.units}" if row.units > 1 else row.machine
    return (
        name,
        minutes(row.planned_s),
        minutes(times.work_s),
        minutes(row.setup_s),
        minutes(times.stopped_s),
        minutes(times.held_s + times.down_s),
        minutes(times.idle_s),
        f"{row.done}/{row.planned}",
        f"{row.in_sequence}/{row.started}" if row.started else "·",
    )


def order_cells(row: OrderReport, say: Say) -> tuple[str, ...]:
    """Return the cells of an order under ``ORDER_HEAD``."""

    def moment(seconds: int | None) -> str:
        return "–" if seconds is None else say(seconds)

    done = "cancelled" if row.cancelled else moment(row.actual_s) if not row.left else f"{row.left} left"
    late = duration(round(row.late_s / 60) * 60) if row.late_s >= 30 else ""
    return row.order, moment(row.promised_s), done, moment(row.due_s), late, why(row.why)


def why(reasons: Sequence[Reason]) -> str:
    """Return what held an order up as a clause."""
    return "; ".join(map(reason_words, reasons))


def reason_words(one: Reason) -> str:
    """Return one reason as a clause."""
    long = duration(round(one.seconds / 60) * 60)
    said = f": {cut(one.text, 80)}" if one.text else ""
    machine = cut(one.machine, NAME)
    return {
        "down": f"{machine} down {long}{said}",
        "stopped": f"stopped {long} on {machine}{said}",
        "longer": f"{machine} took {long} longer",
        "scrapped": f"scrapped on {machine}{said}",
        "late-start": f"{machine} began {long} late",
        "not-started": f"{machine} not begun",
        "running": f"{machine} under way" + (f", {long} left" if one.seconds else ""),
    }[one.kind]


def notable(found: Handover) -> list[OrderReport]:
    """Return the orders worth telling of: late, behind their plan or cancelled; the latest first."""
    rows = [row for row in found.orders if row.late_s or row.behind_s >= 60 or row.cancelled]
    return sorted(rows, key=lambda row: (-row.late_s, -row.behind_s, row.order))


def left_cells(found: Handover, one: Left, say: Say) -> tuple[str, str, str, str]:
    """Return order, machine, time left and how it stands."""
    shop = found.now.shop
    order = shop.orders.ids[int(shop.operations.job[one.operation])]
    machine = shop.machines[int(shop.operations.machine[one.operation])].id
    stands = ""
    if one.running and one.since_s is not None:
        stands = f"under way since {say(one.since_s)}"
    elif one.repeats:
        stands = "to be run again"
    if one.why:
        stands = f"{stands}; {one.why}" if stands else one.why
    return order, machine, minutes(max(60, one.seconds)), stands


def why_down(row: MachineReport) -> list[str]:
    """Return why a machine was down and why work on it was stopped, a clause each."""
    down = [f"down {minutes(one.seconds)}: {one.text or 'no reason given'}" for one in row.outages]
    return down + [f"stopped {minutes(one.seconds)}: {one.text or 'no reason given'}" for one in row.stops]


def remark_words(text: str, about: str, at: str, who: str) -> str:
    """Return a remark as a line."""
    on = f" on {about}" if about else ""
    by = f" [{who}]" if who else ""
    return f"{at}{on}: {text}{by}"
