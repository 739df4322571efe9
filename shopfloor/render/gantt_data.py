"""The view as the page's script reads it: JSON with its columns packed into text."""

from __future__ import annotations

from dataclasses import fields
from typing import Any

import numpy as np

from shopfloor.model.shop import NO_DUE, Ints
from shopfloor.render.gantt_view import ChangeColumns, CrewRow, GanttView, Load, OrderColumns

# Fields of the view that stand on the page as text; all others travel as data, under their own names.
AS_TEXT = frozenset(
    {"title", "subtitle", "stamp", "finish", "verdict", "summary", "about", "left_out", "care"}
)

_DIGITS = np.frombuffer(b"0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz-_", dtype="S1")
_BITS = 5


def page_data(view: GanttView) -> dict[str, Any]:
    """Return what the page's script reads: every field of the view that is not text, by its name."""
    return {
        "start": view.start,
        "clock_changes": view.clock_changes,
        "horizon_s": view.horizon_s,
        "window_s": view.window_s,
        "rows": _records(view.rows),
        "orders": _orders_data(view.orders),
        "bars": _bars_data(view),
        "groups": _records(view.groups),
        "families": _records(view.families),
        "family_groups": _records(view.family_groups),
        "by_family": view.by_family,
        "lines": _records(view.lines),
        "shift_end_s": view.shift_end_s,
        "rounds_s": view.rounds_s,
        "closures": _records(view.closures),
        "changeovers": _changes_data(view.changeovers, view.bars.start_s),
        "gaps": _records(view.gaps),
        "crews": [_crew_data(row) for row in view.crews],
        "load": None if view.load is None else _load_data(view.load),
        "detail_s": view.detail_s,
        "now_s": view.now_s,
    }


def _records(values: Any) -> list[dict[str, Any]]:
    return [{field.name: getattr(value, field.name) for field in fields(value)} for value in values]


def _orders_data(orders: OrderColumns) -> dict[str, Any]:
    """Due times as how long after `due_from_s` they lie, one more than that: 0 is no due time."""
    has_due = orders.due_s != NO_DUE
    first = min(0, int(orders.due_s.min(initial=0)))
    return {
        "ids": orders.ids,
        "release_s": pack(orders.release_s),
        "due_s": pack(np.where(has_due, np.where(has_due, orders.due_s, 0) - first + 1, 0)),
        "due_from_s": first,
        "finish_s": pack(orders.finish_s),
        "binds": orders.binds,
    }


def _bars_data(view: GanttView) -> dict[str, Any]:
    """Columns, times as steps in the longest unit that fits them all, notes by a list of distinct texts."""
    bars = view.bars
    tick = int(np.gcd.reduce(np.r_[bars.start_s, bars.end_s, bars.set_up_end_s])) if len(bars) else 1
    tick = tick or 1
    noted = np.fromiter(bars.notes, dtype=np.int64, count=len(bars.notes))
    texts = {text: index for index, text in enumerate(dict.fromkeys(bars.notes.values()))}
    which = np.array([texts[text] for text in bars.notes.values()], dtype=np.int64)
    return {
        "size": len(bars),
        "tick_s": tick,
        "start_steps": pack(np.diff(bars.start_s, prepend=0) // tick),
        "lengths": pack((bars.end_s - bars.start_s) // tick),
        "row": pack(bars.row),
        "order": pack(bars.order),
        "group": pack(bars.group),
        "family": pack(bars.family),
        "set_ups": pack((bars.set_up_end_s - bars.start_s) // tick),
        "paused_s": pack(bars.paused_s),
        "heads": pack(bars.heads),
        "way_s": pack(bars.way_s),
        "round": pack(bars.round),
        "part": pack(bars.part),
        "parts": pack(bars.parts),
        "notes": {
            "size": len(bars.notes),
            "bar_steps": pack(np.diff(noted, prepend=0)),
            "text": pack(which),
            "texts": list(texts),
        },
    }


def _changes_data(changes: ChangeColumns, bar_start_s: Ints) -> dict[str, Any]:
    """Times as how long before their bar they begin and end: small numbers, and so few letters."""
    until = bar_start_s[changes.bar]
    return {
        "size": len(changes),
        "bar_steps": pack(np.diff(changes.bar, prepend=0)),
        "ahead_s": pack(until - changes.start_s),
        "done_ahead_s": pack(until - changes.end_s),
        "seconds": pack(changes.seconds),
        "before": pack(changes.before),
    }


def _crew_data(row: CrewRow) -> dict[str, Any]:
    return {
        "crew": row.crew,
        "binds": row.binds,
        "most": row.most,
        "size": len(row.at_s),
        "at_steps": pack(np.diff(row.at_s, prepend=0)),
        "used": pack(row.used),
        "there": pack(row.there),
    }


def _load_data(load: Load) -> dict[str, Any]:
    return {"step_s": load.step_s, "steps": load.steps, "size": len(load.share), "share": pack(load.share)}


def pack(values: Ints) -> str | int:
    """Write a column of whole numbers, none negative, as text; a column of equal numbers as that number.

    Each number is written in base 32, least digit first, with 32 added to every digit that is not its
    last; so numbers below 32 take one letter and no commas are needed. Returns 0 for an empty column.

    Raises
    ------
    ValueError
        If a number is negative.
    """
    if not len(values):
        return 0
    least, most = int(values.min()), int(values.max())
    if least < 0:
        raise ValueError(f"only numbers from 0 can be packed, not {least}")
    if least == most:
        return least
    shifts = np.arange(0, max(1, most.bit_length()), _BITS)
    rest = values[:, None] >> shifts
    digits = (rest & 31) + 32 * (rest >> _BITS > 0)
    used = rest > 0
    used[:, 0] = True
    return _DIGITS[digits[used]].tobytes().decode("ascii")
