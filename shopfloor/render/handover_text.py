"""A handover for the terminal and as plain data. Pure."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from shopfloor.render import handover_words as words
from shopfloor.render.handover_words import Say
from shopfloor.render.text import cut, wrap

if TYPE_CHECKING:
    from shopfloor.model.calendar import Clock
    from shopfloor.replan.figures import Elements
    from shopfloor.replan.handover import Handover, MachineReport, OrderReport
    from shopfloor.replan.reasons import Reason
    from shopfloor.replan.remaining import Left

LISTED = 15  # orders and operations that the terminal lists; the page, the tables and --json have all
_WIDTHS = (7, 7, 7, 8, 6, 7, 7, 9)


def handover_lines(found: Handover, clock: Clock, figures: Any) -> list[str]:
    """Return the handover as lines of at most 80 columns; `figures` is :mod:`shopfloor.replan.figures`."""
    say = clock.say
    shift = "Time counts from 0:00" if clock.start is None else f"Shift from {clock.start:%Y-%m-%d %H:%M}"
    lines = [wrap(f"{shift}, handed over at {say(found.at_s)}. {words.plans_line(found, say)}."), ""]
    lines += [wrap(sentence) for sentence in words.summary(found, say)]
    lines += ["", _machine_line(words.MACHINE_HEAD), *(_machine_line(cells) for cells in _cells(found))]
    outages = [(row.machine, text) for row in found.machines for text in words.why_down(row)]
    if outages:
        lines += ["", *(wrap(f"{cut(machine, 14):<14} {cut(text, 300)}", 2) for machine, text in outages)]
    lines += _orders(found, say)
    lines += _left(found, say)
    if found.remarks:
        lines += ["", "Remarks", *(wrap(text, 2) for text in remarks(found, say))]
    return [*lines, "", *(wrap(line) for line in figure_lines(found.elements, figures))]


def _cells(found: Handover) -> list[tuple[str, ...]]:
    return [words.machine_cells(row) for row in found.machines]


def _machine_line(cells: Sequence[str]) -> str:
    rest = "".join(f" {cell:>{width}}" for cell, width in zip(cells[1:], _WIDTHS, strict=True))
    return f"{cut(cells[0], 13):<13}{rest}"


def _orders(found: Handover, say: Say) -> list[str]:
    rows = words.notable(found)
    if not rows:
        return []
    lines = ["", f"{'Order':<20} {'first plan':>10} {'done':>10} {'due':>10}  late"]
    for row in rows[:LISTED]:
        order, promised, done, due, late, why = words.order_cells(row, say)
        lines.append(f"{cut(order, 20):<20} {promised:>10} {done:>10} {due:>10}  {late}".rstrip())
        if why:
            lines.append(wrap(why, 4))
    return lines + _more(len(rows) - LISTED, "orders")


def _left(found: Handover, say: Say) -> list[str]:
    if not found.left:
        return []
    lines = ["", "Carries over"]
    for one in found.left[:LISTED]:
        order, machine, left, stands = words.left_cells(found, one, say)
        lines.append(wrap(f"{cut(order, 20):<20} {cut(machine, 14):<14} {left:>5}  {cut(stands, 200)}", 2))
    return lines + _more(len(found.left) - LISTED, "operations")


def _more(count: int, noun: str) -> list[str]:
    return [f"  … and {count:,} more {noun}"] if count > 0 else []


def remarks(found: Handover, say: Say) -> list[str]:
    """Return the remarks as lines."""
    return [
        words.remark_words(
            cut(str(event.data.get("text", "")), 1_000),
            " ".join(cut(name, words.NAME) for name in (event.order, event.machine) if name),
            say(event.at_s),
            cut(event.who, words.NAME),
        )
        for event in found.remarks
    ]


def figure_lines(elements: Elements, figures: Any) -> list[str]:
    """Return the figures of the whole hall in a sentence, with their source."""
    said = [
        f"{figure.name} {words.share(figure.of(elements))} ({figure.formula})"
        for figure in figures.FIGURES.values()
        if figure.of(elements) is not None
    ]
    return [f"{', '.join(said)}. Source: {figures.SOURCE}."] if said else []


# ---- plain data ------------------------------------------------------------------------------------


def handover_data(found: Handover, figures: Any) -> dict[str, Any]:
    """Return the handover as plain data for ``--json``; seconds count from the shift's start."""
    return {
        "ok": True,
        "at_s": found.at_s,
        "plans": [{"sha256": plan.data.get("sha256"), "at_s": plan.at_s} for plan in found.plans],
        "operations": found.done + len(found.left),
        "done": found.done,
        "started": found.started,
        "in_sequence": found.in_sequence,
        "good": found.elements.GQ,
        "scrap": found.elements.SQ,
        "iso_22400_2": {"source": figures.SOURCE, **_elements(found.elements, figures)},
        "machines": [_machine_data(row, figures) for row in found.machines],
        "orders": [_order_data(row) for row in found.orders],
        "carry_over": [_left_data(found, one) for one in found.left],
        "remarks": [
            {
                "no": event.seq,
                "at_s": event.at_s,
                "order": event.order or None,
                "machine": event.machine or None,
                "who": event.who or None,
                "text": event.data.get("text", ""),
            }
            for event in found.remarks
        ],
        "odd": found.odd,
    }


def _elements(elements: Elements, figures: Any) -> dict[str, Any]:
    times = {f"{symbol}_s": getattr(elements, symbol) for symbol in figures.TIMES}
    shares = {name: figure.of(elements) for name, figure in figures.FIGURES.items()}
    return {**times, **{name: None if v is None else round(v, 4) for name, v in shares.items()}}


def _machine_data(row: MachineReport, figures: Any) -> dict[str, Any]:
    return {
        "machine": row.machine,
        "units": row.units,
        "open_s": row.times.open_s,
        "planned_s": row.planned_s,
        "work_s": row.times.work_s,
        "setup_s": row.setup_s,
        "stopped_s": row.times.stopped_s,
        "down_s": row.times.held_s + row.times.down_s,
        "idle_s": row.times.idle_s,
        "overrun_s": row.times.overrun_s,
        "planned": row.planned,
        "done": row.done,
        "started": row.started,
        "in_sequence": row.in_sequence,
        "outages": [{"reason": one.text, "seconds": one.seconds} for one in row.outages],
        "stops": [{"reason": one.text, "seconds": one.seconds} for one in row.stops],
        "good": row.elements.GQ,
        "scrap": row.elements.SQ,
        "iso_22400_2": _elements(row.elements, figures),
    }


def _order_data(row: OrderReport) -> dict[str, Any]:
    return {
        "order": row.order,
        "promised_s": row.promised_s,
        "planned_s": row.planned_s,
        "actual_s": row.actual_s,
        "due_s": row.due_s,
        "late_s": row.late_s,
        "behind_s": row.behind_s,
        "left": row.left,
        "cancelled": row.cancelled,
        "why": [_reason_data(one) for one in row.why],
    }


def _reason_data(one: Reason) -> dict[str, Any]:
    return {"kind": one.kind, "machine": one.machine, "seconds": one.seconds, "text": one.text}


def _left_data(found: Handover, one: Left) -> dict[str, Any]:
    return {
        "order": one.key.order,
        "machine": one.key.machine,
        "piece": one.key.piece,
        "left_s": one.seconds,
        "setup_s": one.setup_s,
        "running": one.running,
        "unit": one.unit or None,
        "since_s": one.since_s,
        "repeats": one.repeats,
        "why": one.why,
    }
